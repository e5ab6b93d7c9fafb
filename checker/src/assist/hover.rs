//! What is known of the word under the cursor: its meaning, what was solved from it, its margins.
//! Must not know any particular key or rule.

use ampspec_grammar::{Span, Token, TokenKind, Tree};

use crate::Outcome;
use crate::finding::{BuildReport, Margin, Measure, Site, Step};
use crate::policy;
use crate::render::escape::{markdown as plain, markdown_code as code};
use crate::render::figure::figure;
use crate::render::margins::{governed, tally};
use crate::render::{explain, message};
use crate::rules;
use crate::vocabulary::{Block, STATEMENTS, Takes, block_kind};

use super::Scene;
use super::complete::key_help;
use super::cursor::{Place, line_at, place, token_at};
use super::web::Declaration;

/// Most margins listed in one hover.
const LISTED: usize = 12;

/// What is shown beside a word.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Hover {
    /// Markdown; text from the spec is escaped.
    pub markdown: String,
    /// The word.
    pub span: Span,
}

/// What is known of the word at an offset.
#[must_use]
pub fn hover(scene: &Scene<'_>, offset: usize) -> Option<Hover> {
    let token = token_at(scene.tree, offset)?;
    let said = said(scene, token, offset)?;
    Some(Hover {
        markdown: said,
        span: token.span,
    })
}

/// Whether the answer at an offset needs what a check found; the rest stands in text and vocabulary.
#[must_use]
pub fn needs_check(tree: &Tree, offset: usize) -> bool {
    let Some(token) = token_at(tree, offset) else {
        return false;
    };
    match line_at(tree, offset) {
        Some((Some(_), line)) => line.key != token,
        Some((None, _)) => false,
        None => tree.blocks().any(|b| b.header.contains(&token)),
    }
}

fn said(scene: &Scene<'_>, token: Token, offset: usize) -> Option<String> {
    let text = scene.text();
    let word = token.text(text);
    if token.kind == TokenKind::Word
        && let Some(rule) = rules::find(word)
    {
        return Some(explain::markdown(rule));
    }
    let Some((block, line)) = line_at(scene.tree, offset) else {
        return header(scene, token);
    };
    let kind = block.and_then(|b| block_kind(b.kind.text(text)));
    if line.key == token {
        let key = match kind {
            Some(kind) => kind.key(word)?,
            None => STATEMENTS.iter().find(|k| k.name == word)?,
        };
        let readers: Vec<String> = kind.map_or_else(Vec::new, |k| readers(k, key.name));
        let read = if readers.is_empty() {
            String::new()
        } else {
            format!("\n\nread by {}", readers.join(", "))
        };
        return Some(format!(
            "**{}**\n\n{}{read}",
            plain(key.name),
            key_help(key)
        ));
    }
    if token.kind == TokenKind::Word
        && let Some(name) = scene.web.name_at(scene.path, offset)
    {
        let found = scene
            .web
            .find(scene.path, word)
            .filter(|d| name.kind == "any" || d.kind.kind == name.kind);
        match found {
            Some(declared) => return Some(of_block(scene, &declared)),
            None if policy::NAMES.contains(&word) => {
                return Some(format!("**{}**: a built-in policy", plain(word)));
            }
            None => {}
        }
    }
    let Place::Values(values) = place(scene.tree, offset, &scene.web.kinds(scene.path)) else {
        return None;
    };
    let item = values
        .key
        .shape()
        .items
        .iter()
        .find(|i| i.label == Some(word));
    let mut out = match item {
        Some(item) => format!(
            "{} of {}",
            code(&crate::build::lower::describe(item)),
            code(values.key.name)
        ),
        None => {
            let choice = values
                .key
                .shape()
                .items
                .iter()
                .any(|i| matches!(&i.takes, Takes::Choice(words) if words.contains(&word)));
            let what = if choice {
                format!("{} of ", code(word))
            } else {
                String::new()
            };
            format!(
                "{what}{}: {}",
                code(values.key.name),
                plain(values.key.meaning)
            )
        }
    };
    for (outcome, file) in scene.checks() {
        out.push_str(&of_line(
            outcome,
            Site {
                file,
                span: line.span,
            },
        ));
    }
    Some(out)
}

/// The rules that read a key.
fn readers(kind: &Block, key: &str) -> Vec<String> {
    let reads = |r: &&'static crate::rule::Rule| {
        r.reads
            .iter()
            .any(|k| k.split_once('.') == Some((kind.kind, key)))
    };
    rules::all().filter(reads).map(|r| code(r.name)).collect()
}

/// A word of a header.
fn header(scene: &Scene<'_>, token: Token) -> Option<String> {
    let text = scene.text();
    let block = scene
        .tree
        .blocks()
        .find(|b| b.kind == token || b.header.contains(&token))?;
    let kind = block_kind(block.kind.text(text))?;
    if block.kind == token || kind.flavours.contains(&token.text(text)) {
        let required: Vec<String> = kind
            .keys
            .iter()
            .filter(|k| k.default.starts_with("req"))
            .map(|k| code(k.name))
            .collect();
        let required = if required.is_empty() {
            String::new()
        } else {
            format!("\n\nrequired: {}", required.join(", "))
        };
        return Some(format!(
            "**{}**: {}{required}",
            plain(kind.kind),
            plain(kind.meaning)
        ));
    }
    let declared = scene.web.find(scene.path, token.text(text))?;
    Some(of_block(scene, &declared))
}

/// A declared block: what it is and its margins.
fn of_block(scene: &Scene<'_>, declared: &Declaration) -> String {
    let title = declared
        .title
        .as_ref()
        .map(|t| format!(" \"{}\"", plain(t)))
        .unwrap_or_default();
    let mut out = format!(
        "**{} {}**{title}",
        plain(declared.kind.kind),
        plain(&declared.name)
    );
    for outcome in scene.outcomes {
        for build in &outcome.report.builds {
            if build.name == declared.name {
                out.push_str(&format!(
                    "\n\n{}\n\n{}",
                    plain(&governed(build)),
                    plain(&tally(build))
                ));
            }
        }
        let own = |m: &Margin| m.part.name == declared.name || m.part.block == declared.name;
        out.push_str(&margins(outcome, own));
    }
    out
}

/// What a line takes part in: numbers beside it, and its margins with their working.
fn of_line(outcome: &Outcome, line: Site) -> String {
    let on = |site: Site| {
        site.file == line.file
            && line.span.start <= site.span.start
            && site.span.end <= line.span.end
    };
    let mut out = String::new();
    let mut numbers: Vec<String> = Vec::new();
    for build in &outcome.report.builds {
        for d in build.derived.iter().filter(|d| on(d.site)) {
            let of = if d.of.is_empty() {
                String::new()
            } else {
                format!(" {}", d.of)
            };
            let text = format!(
                "- {}{}: {} ({} mains, {}) in {}",
                plain(d.name),
                plain(&of),
                plain(&figure(d.value)),
                d.corner.mains,
                d.corner.drive,
                plain(&message::build_name(build))
            );
            if !numbers.contains(&text) {
                numbers.push(text);
            }
        }
    }
    numbers.truncate(LISTED);
    if !numbers.is_empty() {
        out.push_str(&format!("\n\n{}", numbers.join("\n")));
    }
    out.push_str(&margins(outcome, |m| on(m.site)));
    let sited = worst(outcome, |m| on(m.site));
    if let Some((build, margin)) = sited.or_else(|| {
        worst(outcome, |m| {
            m.working.iter().any(|s| s.from.iter().any(|f| on(*f)))
        })
    }) {
        out.push_str(&working(build, margin));
    }
    out
}

fn worst(outcome: &Outcome, wanted: impl Fn(&Margin) -> bool) -> Option<(&BuildReport, &Margin)> {
    let all = outcome
        .report
        .builds
        .iter()
        .flat_map(|b| b.margins.iter().map(move |m| (b, m)));
    all.filter(|(_, m)| wanted(m))
        .min_by(|a, b| crate::render::shown::governing(a.1, b.1))
}

/// A table of margins, the governing ones first.
fn margins(outcome: &Outcome, wanted: impl Fn(&Margin) -> bool) -> String {
    let all = outcome
        .report
        .builds
        .iter()
        .flat_map(|b| b.margins.iter().map(move |m| (b, m)));
    let mut found: Vec<(&BuildReport, &Margin)> = all.filter(|(_, m)| wanted(m)).collect();
    if found.is_empty() {
        return String::new();
    }
    found.sort_by(|a, b| crate::render::shown::governing(a.1, b.1));
    let more = found.len().saturating_sub(LISTED);
    let mut out = "\n\n| margin | of | in | used |\n|---|---|---|---|".to_owned();
    for (build, margin) in found.into_iter().take(LISTED) {
        let used = match margin.used_percent {
            Some(_) => format!(
                "{}: {}",
                message::brief(margin),
                message::verdict(margin.verdict)
            ),
            None => message::brief(margin),
        };
        out.push_str(&format!(
            "\n| {} | {} | {} | {} |",
            code(margin.rule),
            plain(&message::part_name(margin)),
            plain(&message::build_name(build)),
            plain(&used)
        ));
    }
    if more > 0 {
        out.push_str(&format!("\n\nand {more} more"));
    }
    out
}

/// How the numbers of a margin were had.
fn working(build: &BuildReport, margin: &Margin) -> String {
    let mut out = format!(
        "\n\n{} of {} in {}",
        code(margin.rule),
        plain(&message::part_name(margin)),
        plain(&message::build_name(build))
    );
    let worst = message::worst_at(&margin.witness);
    if !worst.is_empty() {
        out.push_str(&format!(", worst at {}", plain(&worst)));
    }
    for step in &margin.working {
        out.push_str(&format!("\n- {}", one_step(step)));
    }
    out
}

fn one_step(step: &Step) -> String {
    let value = plain(&figure(Measure::new(step.value, step.unit)));
    let how = if step.expression.is_empty() {
        String::new()
    } else {
        format!(" = {}", code(step.expression))
    };
    let source = if step.source.is_empty() {
        String::new()
    } else {
        format!(" ({})", plain(step.source))
    };
    format!(
        "{}{how} = {value}: {}{source}",
        code(step.symbol),
        plain(step.meaning)
    )
}

/// How a page is written.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum PageForm {
    /// As Markdown.
    Markdown,
    /// As a page of HTML that stands by itself.
    Html,
}

/// The margins of a spec as a page: what the editor shows beside it.
#[must_use]
pub fn page(outcome: Outcome, form: PageForm) -> String {
    let run =
        crate::render::run::Run::new("margins", crate::render::run::FailOn::Error, vec![outcome]);
    match form {
        PageForm::Markdown => crate::render::markdown::margins(&run),
        PageForm::Html => crate::render::html::margins(&run),
    }
}
