//! What each use of a board needs: the smallest usual value of every bought part, each solved in place.
//! Must not know any particular rule's arithmetic: a value passes where the margins that it moves do.

mod board;
mod choice;
mod item;
mod offer;
mod search;
mod seller;
#[cfg(test)]
mod tests;
mod walk;

use std::collections::BTreeSet;
use std::path::Path;

use crate::Options;
use crate::build::statement::Declared;
use crate::finding::{Margin, Measure, Verdict};
use crate::proposal::stands_in_the_way as fails;
use crate::solver::Solver;
use crate::source::{Files, Sources};

/// A margin that a choice leaves.
#[derive(Clone, Debug, PartialEq)]
pub struct Left {
    /// [`Margin::id`].
    pub id: String,
    /// The rule.
    pub rule: &'static str,
    /// The part.
    pub part: String,
    /// Its verdict.
    pub verdict: Verdict,
    /// Used, per cent.
    pub used: Option<f64>,
}

impl Left {
    fn of(margin: &Margin) -> Self {
        Self {
            id: margin.id.clone(),
            rule: margin.rule,
            part: margin.part.name.clone(),
            verdict: margin.verdict,
            used: margin.used_percent,
        }
    }
}

/// What one build needs of one thing.
#[derive(Clone, Debug, PartialEq)]
pub struct Row {
    /// The build.
    pub build: String,
    /// `transformer rating`.
    pub item: &'static str,
    /// The least figure that passes, where one is known; else the usual value that does.
    pub needed: Option<Measure>,
    /// The smallest usual value that passes, as the language spells it; `None` where none does.
    pub offered: Option<String>,
    /// What the file says now; empty where it says nothing.
    pub stated: String,
    /// As lines of the language.
    pub statements: Vec<String>,
    /// Every margin that the choice moves, as it leaves them, worst first.
    pub margins: Vec<Left>,
    /// The margin that keeps the next smaller value from passing, or every value where none is
    /// offered, with that value.
    pub limited: Option<(String, Left)>,
}

/// Whether a use of the board is allowed.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Answer {
    /// With one supply for all channels.
    Allowed,
    /// On a condition.
    Condition,
    /// Not.
    Not,
}

impl Answer {
    /// As reports write it.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Allowed => "allowed",
            Self::Condition => "condition",
            Self::Not => "not",
        }
    }
}

/// One cell of the table that a seller publishes.
#[derive(Clone, Debug, PartialEq)]
pub struct Cell {
    /// Amplifier channels.
    pub channels: u32,
    /// The load.
    pub load: String,
    /// The mains, as the file words it.
    pub mains: String,
    /// Whether it is allowed.
    pub answer: Answer,
    /// What it takes, the condition, or the reason.
    pub words: String,
}

/// What a file's builds need.
#[derive(Clone, Debug, Default)]
pub struct Sized {
    /// One for each build and thing.
    pub rows: Vec<Row>,
    /// The seller's table; empty where every build states its supply.
    pub cells: Vec<Cell>,
    /// Blocks and lines to paste: the build and the text.
    pub pasted: Vec<(String, String)>,
    /// Margins that are past their allowance whatever the size: the build, the margin.
    pub elsewhere: Vec<(String, Left)>,
    /// The files.
    pub sources: Sources,
}

/// Size every build of a file.
///
/// # Errors
/// When the file cannot be read; the text says why.
pub fn size(
    files: &dyn Files,
    path: &Path,
    shown: &str,
    options: &Options,
) -> Result<Sized, String> {
    let solver = Solver::read(files, path, shown, options)?;
    let mut sized = Sized::default();
    let mut bare = None;
    for build in solver.builds() {
        if states_supply(&solver, build) {
            walk::in_place(&solver, build, &mut sized);
        } else {
            bare = bare.or(Some(build));
            let board = board::Board::of(&solver, build, files, path, shown, options);
            offer::rows(&board, &mut sized);
        }
    }
    if let Some(build) = bare {
        let board = board::Board::of(&solver, build, files, path, shown, options);
        sized.cells = seller::table(&board);
    }
    sized.sources = solver.project.sources;
    Ok(sized)
}

fn states_supply(solver: &Solver, build: &Declared) -> bool {
    let view = solver.view(build, &[]);
    view.seen(build).line("supply").is_some_and(|l| !l.none)
}

/// Whether two solutions leave a margin exactly as it was.
fn alike(a: &Margin, b: &Margin) -> bool {
    a.verdict == b.verdict
        && match (a.used_percent, b.used_percent) {
            (Some(x), Some(y)) => (x - y).abs() <= 1e-9 * x.abs().max(1.0),
            (x, y) => x.is_some() == y.is_some(),
        }
}

/// The margins that differ between any of several solutions, by id.
fn moved(solutions: &[&[Margin]]) -> BTreeSet<String> {
    let mut moved = BTreeSet::new();
    let Some((first, rest)) = solutions.split_first() else {
        return moved;
    };
    for other in rest {
        for margin in first.iter().chain(other.iter()) {
            let of = |all: &[Margin]| all.iter().find(|m| m.id == margin.id).cloned();
            let same = match (of(first), of(other)) {
                (Some(a), Some(b)) => alike(&a, &b),
                _ => false,
            };
            if !same {
                moved.insert(margin.id.clone());
            }
        }
    }
    moved
}

/// What could not be solved at all, though nothing is missing: a supply that gives out.
fn collapsed(margin: &Margin) -> bool {
    let family = margin.rule.split('.').next().unwrap_or_default();
    margin.verdict == Verdict::Unchecked
        && margin.needs.is_empty()
        && matches!(family, "power" | "current" | "supply")
}

/// The worst of the margins that fail and are moved by what is sized.
fn blocking<'m>(margins: &'m [Margin], moved: &BTreeSet<String>) -> Option<&'m Margin> {
    let used = |m: &Margin| m.used_percent.unwrap_or(f64::INFINITY);
    margins
        .iter()
        .filter(|m| collapsed(m) || (fails(m) && moved.contains(&m.id)))
        .max_by(|a, b| a.verdict.cmp(&b.verdict).then(used(a).total_cmp(&used(b))))
}

/// The margins that are moved, worst first.
fn left(margins: &[Margin], moved: &BTreeSet<String>) -> Vec<Left> {
    let used = |m: &Margin| m.used_percent.unwrap_or(f64::NEG_INFINITY);
    let mut left: Vec<&Margin> = margins.iter().filter(|m| moved.contains(&m.id)).collect();
    left.sort_by(|a, b| b.verdict.cmp(&a.verdict).then(used(b).total_cmp(&used(a))));
    left.into_iter().map(Left::of).collect()
}
