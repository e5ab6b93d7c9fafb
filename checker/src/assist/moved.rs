//! Carries what a check found over to a text that differs in comments and layout only.
//! Must not know what was found.

use std::sync::Arc;

use ampspec_grammar::{Block, Item, Line, Piece, PieceKind, Span, Token, Tree};

use crate::Outcome;
use crate::finding::{FileId, Related, Report, Site};
use crate::source::Sources;

/// Whether two trees say the same in the same words, comments and layout aside, both without fault.
#[must_use]
pub fn same_words(a: &Tree, b: &Tree) -> bool {
    let token = |x: Token, y: Token| x.kind == y.kind && x.text(&a.text) == y.text(&b.text);
    let tokens = |x: &[Token], y: &[Token]| {
        x.len() == y.len() && x.iter().zip(y).all(|(x, y)| token(*x, *y))
    };
    let line = |x: &Line, y: &Line| {
        let groups = x
            .groups
            .iter()
            .zip(&y.groups)
            .all(|(x, y)| tokens(&x.tokens, &y.tokens));
        token(x.key, y.key) && x.groups.len() == y.groups.len() && groups
    };
    let block = |x: &Block, y: &Block| {
        let lines = x.lines.iter().zip(&y.lines).all(|(x, y)| line(x, y));
        token(x.kind, y.kind)
            && tokens(&x.header, &y.header)
            && x.lines.len() == y.lines.len()
            && lines
    };
    let item = |x: &Item, y: &Item| match (x, y) {
        (Item::Block(x), Item::Block(y)) => block(x, y),
        (Item::Line(x), Item::Line(y)) => line(x, y),
        _ => false,
    };
    let whole = a.problems.is_empty() && b.problems.is_empty() && a.items.len() == b.items.len();
    whole && a.items.iter().zip(&b.items).all(|(x, y)| item(x, y))
}

/// The outcome with the places of some files moved to new trees, each of which says the same words
/// as the old one. `None` if one does not.
#[must_use]
pub fn moved(outcome: &Outcome, trees: &[(FileId, Arc<Tree>)]) -> Option<Outcome> {
    let mut maps: Vec<(FileId, Map)> = Vec::with_capacity(trees.len());
    for (file, tree) in trees {
        let old = &outcome.sources.file(*file)?.tree;
        if !same_words(old, tree) {
            return None;
        }
        maps.push((*file, Map::new(old, tree)?));
    }
    let mut sources = Sources::default();
    for (id, file) in outcome.sources.iter() {
        let new = trees
            .iter()
            .find(|(at, _)| *at == id)
            .map_or(&file.tree, |(_, tree)| tree);
        sources.add(file.path.clone(), file.name.clone(), Arc::clone(new));
        file.uses
            .iter()
            .for_each(|used| sources.note_use(id, *used));
    }
    let mut report = outcome.report.clone();
    each_site(&mut report, &|site| {
        if let Some((_, map)) = maps.iter().find(|(file, _)| *file == site.file) {
            site.span = Span::new(map.at(site.span.start), map.at(site.span.end));
        }
    });
    Some(Outcome { sources, report })
}

/// Where the words of one text stand in another.
struct Map(Vec<(Span, usize)>);

impl Map {
    fn new(old: &Tree, new: &Tree) -> Option<Self> {
        let words = |p: &Piece| !matches!(p.kind, PieceKind::Blank | PieceKind::Comment);
        let olds: Vec<Piece> = old.pieces().filter(words).collect();
        let news: Vec<Piece> = new.pieces().filter(words).collect();
        let same = olds.len() == news.len()
            && olds
                .iter()
                .zip(&news)
                .all(|(a, b)| a.kind == b.kind && a.span.len() == b.span.len());
        same.then(|| {
            Self(
                olds.iter()
                    .zip(&news)
                    .map(|(a, b)| (a.span, b.span.start))
                    .collect(),
            )
        })
    }

    /// The new place of an offset at or inside a word; elsewhere, the end of the word before it.
    fn at(&self, offset: usize) -> usize {
        let after = self.0.partition_point(|(old, _)| old.start <= offset);
        match after.checked_sub(1).and_then(|at| self.0.get(at)) {
            Some((old, new)) => new + (offset - old.start).min(old.len()),
            None => 0,
        }
    }
}

fn each_site(report: &mut Report, change: &dyn Fn(&mut Site)) {
    let related = |all: &mut Vec<Related>| all.iter_mut().for_each(|r| change(&mut r.site));
    for finding in &mut report.findings {
        change(&mut finding.site);
        related(&mut finding.related);
        finding.edits.iter_mut().for_each(|e| change(&mut e.site));
    }
    for build in &mut report.builds {
        change(&mut build.site);
        build.assumed.iter_mut().for_each(|a| change(&mut a.site));
        build.derived.iter_mut().for_each(|d| change(&mut d.site));
        for margin in &mut build.margins {
            change(&mut margin.site);
            related(&mut margin.related);
            margin
                .working
                .iter_mut()
                .flat_map(|s| &mut s.from)
                .for_each(change);
            margin
                .changes
                .iter_mut()
                .flat_map(|c| &mut c.edits)
                .for_each(|e| change(&mut e.site));
        }
    }
    let entries = report.policies.iter_mut().flat_map(|p| &mut p.entries);
    entries.filter_map(|e| e.site.as_mut()).for_each(change);
    report.waivers.iter_mut().for_each(|w| change(&mut w.site));
}
