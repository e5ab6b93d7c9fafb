//! Findings in a terminal: the source with marks, the message, what would pass, and a total.
//! Must not know what a finding is about.

use std::borrow::Cow;
use std::fmt::{self, Write};

use ampspec_grammar::{LineIndex, Span};
use miette::{
    Diagnostic, GraphicalReportHandler, GraphicalTheme, LabeledSpan, MietteError,
    MietteSpanContents, SourceCode, SourceSpan, SpanContents,
};

use crate::finding::{FileId, Severity, WaiverState};
use crate::source::{File, Sources};

use super::escape;
use super::message::Detail;
use super::run::{Counts, Run};
use super::shown::{Shown, shown};

/// Marks in one finding; more are listed below it.
const MARKS: usize = 6;
/// Bytes of a long line that are shown before and after a mark.
const AROUND: usize = 160;

/// How to draw.
#[derive(Clone, Copy, Debug)]
pub struct Style {
    /// Columns.
    pub width: usize,
    /// With colour.
    pub colour: bool,
}

impl Default for Style {
    /// As when nobody looks: a fixed width, no colour.
    fn default() -> Self {
        Self {
            width: 100,
            colour: false,
        }
    }
}

/// The findings of a run and the total.
#[must_use]
pub fn check(run: &Run, style: Style) -> String {
    super::text(|out| write_check(out, run, style))
}

fn write_check(out: &mut String, run: &Run, style: Style) -> fmt::Result {
    let theme = if style.colour {
        GraphicalTheme::unicode()
    } else {
        GraphicalTheme::unicode_nocolor()
    };
    let handler = GraphicalReportHandler::new_themed(theme)
        .with_width(style.width)
        .with_urls(false);
    for outcome in &run.outcomes {
        findings(
            out,
            &handler,
            &outcome.sources,
            &shown(&outcome.sources, &outcome.report),
        )?;
        for waiver in outcome
            .report
            .waivers
            .iter()
            .filter(|w| w.state == WaiverState::Honoured)
        {
            let name = outcome
                .sources
                .file(waiver.site.file)
                .map_or("", |f| &f.name);
            let line = outcome.sources.file(waiver.site.file).map_or(0, |f| {
                f.tree.line_index().position(waiver.site.span.start).line
            });
            let scope = [
                ("of", &waiver.part),
                ("in", &waiver.build),
                ("with", &waiver.alternate),
            ];
            let scope: String = scope
                .iter()
                .filter_map(|(word, name)| name.as_ref().map(|n| format!(" {word} {n}")))
                .collect();
            let text = format!(
                "waived: {}{scope} ({name}:{line}): {}",
                waiver.rule, waiver.reason
            );
            writeln!(out, "{}", escape::terminal(&text))?;
        }
    }
    for line in run.stale_lines() {
        writeln!(out, "{}", escape::terminal(&line))?;
    }
    writeln!(out, "{}", total(run))
}

/// `kit.ampspec: 2 errors, ...`, or how many files.
#[must_use]
pub fn total(run: &Run) -> String {
    let Counts {
        builds,
        ok,
        thin,
        over,
        unchecked,
        ..
    } = run.counts;
    let of = match run.outcomes.as_slice() {
        [one] => one.sources.iter().next().map_or(String::new(), |(_, f)| {
            escape::terminal(&f.name).into_owned()
        }),
        many => format!("{} files", many.len()),
    };
    let plural = |n: usize, one: &str| format!("{n} {one}{}", if n == 1 { "" } else { "s" });
    let margins = plural(ok + thin + over + unchecked, "margin");
    format!(
        "{of}: {} ({}, {margins})",
        run.counts.line(),
        plural(builds, "build")
    )
}

fn findings(
    out: &mut String,
    handler: &GraphicalReportHandler,
    sources: &Sources,
    all: &[Shown<'_>],
) -> fmt::Result {
    let mut pages = Pages::default();
    for one in all.iter().filter(|s| s.open()) {
        let Some(page) = pages.get(sources, one.site.file) else {
            continue;
        };
        handler.render_report(out, &Drawn::new(one, sources, page))?;
        out.write_char('\n')?;
    }
    Ok(())
}

/// The files of one report, each made ready when it is first pointed at.
#[derive(Default)]
struct Pages<'a>(Vec<(FileId, Page<'a>)>);

impl<'a> Pages<'a> {
    fn get(&mut self, sources: &'a Sources, file: FileId) -> Option<&Page<'a>> {
        let at = match self.0.iter().position(|p| p.0 == file) {
            Some(at) => at,
            None => {
                self.0.push((file, Page::new(sources.file(file)?)));
                self.0.len() - 1
            }
        };
        self.0.get(at).map(|p| &p.1)
    }
}

/// A file as it is drawn: harmless text, byte for byte as long as the file, over the file's line index.
struct Page<'a> {
    name: String,
    text: Cow<'a, str>,
    lines: &'a LineIndex,
}

impl<'a> Page<'a> {
    fn new(file: &'a File) -> Self {
        Self {
            name: escape::terminal(&file.name).into_owned(),
            text: escape::source(&file.tree.text),
            lines: file.tree.line_index(),
        }
    }

    /// The nearest character boundary at or before a byte.
    fn floor(&self, at: usize) -> usize {
        let at = at.min(self.text.len());
        (at.saturating_sub(3)..=at)
            .rev()
            .find(|i| self.text.is_char_boundary(*i))
            .unwrap_or(0)
    }

    /// A span that lies in the text. An empty mark at the end of the text would have nothing to stand
    /// under, so it takes the last character.
    fn clamp(&self, span: Span) -> Span {
        let last = self.text.trim_end_matches(['\n', '\r']).len();
        let start = self.floor(span.start.min(last));
        let end = self.floor(span.end.min(last)).max(start);
        if start == last {
            Span::new(self.floor(last.saturating_sub(1)), last)
        } else {
            Span::new(start, end)
        }
    }

    /// From the start of the line that holds `from` to the end of the line that holds `to`, cut where
    /// a line is too long to be shown.
    fn window(&self, from: usize, to: usize, before: usize, after: usize) -> Span {
        let first = self.lines.line_of(from).saturating_sub(before);
        let last = self
            .lines
            .line_of(to)
            .saturating_add(after)
            .min(self.lines.line_count().saturating_sub(1));
        let start = self.lines.line_span(first).start;
        let end = self.lines.line_span(last).end;
        Span::new(
            start.max(self.floor(from.saturating_sub(AROUND * (before + 1)))),
            end.min(self.floor(to + AROUND * (after + 1))),
        )
    }
}

impl SourceCode for Page<'_> {
    /// Reads through the prebuilt line index; the reader that comes with strings counts lines from the
    /// start of the text for every mark.
    fn read_span<'b>(
        &'b self,
        span: &SourceSpan,
        before: usize,
        after: usize,
    ) -> Result<Box<dyn SpanContents<'b> + 'b>, MietteError> {
        let from = self.floor(span.offset());
        let to = self
            .floor(span.offset().saturating_add(span.len()))
            .max(from);
        // without context the answer is the span itself: its line and column head the snippet
        let window = if before + after == 0 {
            Span::new(from, to)
        } else {
            self.window(from, to, before, after)
        };
        let place = self.lines.position(window.start);
        let lines = self.lines.line_of(window.end) + 2 - place.line;
        Ok(Box::new(MietteSpanContents::new_named(
            self.name.clone(),
            window.slice(&self.text).as_bytes(),
            SourceSpan::from((window.start, window.len())),
            place.line - 1,
            place.column - 1,
            lines,
        )))
    }
}

/// One finding as it is drawn.
struct Drawn<'a> {
    rule: &'a str,
    severity: Severity,
    message: String,
    help: String,
    marks: Vec<LabeledSpan>,
    page: &'a Page<'a>,
}

impl<'a> Drawn<'a> {
    fn new(one: &'a Shown<'_>, sources: &Sources, page: &'a Page<'a>) -> Self {
        let span = |s: Span| {
            let s = page.clamp(s);
            (s.start, s.len())
        };
        let label =
            |text: &str| Some(escape::terminal(text).into_owned()).filter(|t| !t.is_empty());
        let mut marks = vec![LabeledSpan::new_primary_with_span(
            label(&one.mark),
            span(one.site.span),
        )];
        let mut help: Vec<String> = one.details.iter().map(said).collect();
        for related in one.related {
            if related.site.file == one.site.file && marks.len() < MARKS {
                marks.push(LabeledSpan::new_with_span(
                    label(&related.message),
                    span(related.site.span),
                ));
            } else if let Some(file) = sources.file(related.site.file) {
                let line = file
                    .tree
                    .line_index()
                    .position(related.site.span.start)
                    .line;
                help.push(said(&Detail::new(
                    "see",
                    format!("{}:{line}: {}", file.name, related.message),
                )));
            }
        }
        Self {
            rule: one.rule,
            severity: one.severity,
            message: escape::terminal(&one.message).into_owned(),
            help: help.join("\n"),
            marks,
            page,
        }
    }
}

fn said(detail: &Detail) -> String {
    let text = escape::terminal(&detail.text);
    if detail.label.is_empty() {
        text.into_owned()
    } else {
        format!("{}: {text}", detail.label)
    }
}

impl fmt::Display for Drawn<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.message)
    }
}

impl fmt::Debug for Drawn<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.message)
    }
}

impl std::error::Error for Drawn<'_> {}

impl Diagnostic for Drawn<'_> {
    fn code<'b>(&'b self) -> Option<Box<dyn fmt::Display + 'b>> {
        Some(Box::new(self.rule))
    }
    fn severity(&self) -> Option<miette::Severity> {
        Some(match self.severity {
            Severity::Error => miette::Severity::Error,
            Severity::Warning => miette::Severity::Warning,
            Severity::Information => miette::Severity::Advice,
        })
    }
    fn help<'b>(&'b self) -> Option<Box<dyn fmt::Display + 'b>> {
        (!self.help.is_empty()).then(|| Box::new(&self.help) as Box<dyn fmt::Display>)
    }
    fn source_code(&self) -> Option<&dyn SourceCode> {
        Some(self.page)
    }
    fn labels(&self) -> Option<Box<dyn Iterator<Item = LabeledSpan> + '_>> {
        Some(Box::new(self.marks.iter().cloned()))
    }
}
