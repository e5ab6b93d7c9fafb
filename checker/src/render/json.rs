//! The report for other programs: JSON, version 1, and its schema.
//! Must not know anything that the report does not say.
//!
//! Every key is always there, `null` where it does not apply, in alphabetical order. A number is
//! rounded to nine significant digits and written as the shortest decimal that reads back as that
//! value, so that two runs, on any platform, give the same bytes.

pub mod compare;
pub mod form;
pub mod parts;
mod pictures;
mod size;
mod spread;

use std::collections::HashSet;
use std::path::PathBuf;

use schemars::generate::SchemaSettings;
use sha2::{Digest, Sha256};

use crate::Outcome;
use crate::finding::{self as found, Severity, Site, WaiverState};
use crate::source::{File, Sources};

use form::{Level, Number};

use super::run::Run;
use super::shown::{Origin, Shown, hex, margin_fingerprint, shown};

/// The version of the form.
pub const VERSION: u32 = 1;
/// The name of the schema.
pub const SCHEMA: &str = "urn:ampspec:report:1";

/// The schema of the report as text.
#[must_use]
pub fn schema() -> String {
    let generator = SchemaSettings::draft2020_12()
        .for_serialize()
        .into_generator();
    let mut schema = generator.into_root_schema_for::<form::Document>();
    schema.insert("$id".to_owned(), SCHEMA.into());
    lines(&schema)
}

/// The report of a run as text.
#[must_use]
pub fn render(run: &Run) -> String {
    lines(&report(run))
}

pub use size::sized;
pub use spread::spread;

/// Any value as indented JSON with a line end.
pub(super) fn lines(value: &impl serde::Serialize) -> String {
    // the types hold nothing that JSON cannot say
    let mut text = serde_json::to_string_pretty(value).unwrap_or_default();
    text.push('\n');
    text
}

/// A number as this form writes it.
pub(super) fn nine_digits(value: f64) -> Number {
    Number(value)
}

/// The report of a run.
#[must_use]
pub fn report(run: &Run) -> form::Report {
    let c = run.counts;
    let mut files = Files::default();
    for outcome in &run.outcomes {
        files.add(outcome);
    }
    form::Report {
        ampspec_report: VERSION,
        baseline_stale: run.stale.iter().map(stale).collect(),
        builds: run
            .outcomes
            .iter()
            .flat_map(|o| o.report.builds.iter().map(|b| build(o, b)))
            .collect(),
        command: run.command.to_owned(),
        exit_status: run.exit_status(),
        fail_on: run.fail_on.name().to_owned(),
        files: files.list,
        policies: policies(run),
        schema: SCHEMA.to_owned(),
        size: None,
        spread: None,
        summary: form::Summary {
            assumed: c.assumed,
            error: c.error,
            information: c.information,
            known: c.known,
            ok: c.ok,
            over: c.over,
            thin: c.thin,
            unchecked: c.unchecked,
            waived: c.waived,
            warning: c.warning,
        },
        tool: tool(),
        waivers: run
            .outcomes
            .iter()
            .flat_map(|o| o.report.waivers.iter().map(|w| waiver(&o.sources, w)))
            .collect(),
    }
}

fn stale(entry: &crate::baseline::Entry) -> form::Stale {
    form::Stale {
        about: entry.about.clone(),
        file: entry.file.clone(),
        fingerprint: entry.fingerprint.clone(),
        rule: entry.rule.clone(),
    }
}

/// Every file read, once, in the order in which it is first met, with the findings that lie in it.
#[derive(Default)]
struct Files {
    list: Vec<form::File>,
    known: std::collections::HashMap<PathBuf, usize>,
}

impl Files {
    fn add(&mut self, outcome: &Outcome) {
        let Outcome { sources, report } = outcome;
        for (_, file) in sources.iter() {
            if !self.known.contains_key(&file.path) {
                self.known.insert(file.path.clone(), self.list.len());
                self.list.push(of_file(sources, file));
            }
        }
        for one in shown(sources, report) {
            let at = sources
                .file(one.site.file)
                .and_then(|f| self.known.get(&f.path));
            if let Some(file) = at.and_then(|at| self.list.get_mut(*at)) {
                let alike = file.findings.iter().filter(|f| f.rule == one.rule).count();
                file.findings.extend(finding(sources, &one, alike + 1));
            }
        }
    }
}

fn of_file(sources: &Sources, file: &File) -> form::File {
    form::File {
        findings: Vec::new(),
        path: file.name.clone(),
        sha256: hex(&Sha256::digest(file.tree.text.as_bytes())),
        uses: file
            .uses
            .iter()
            .filter_map(|id| sources.file(*id))
            .map(|f| f.name.clone())
            .collect(),
    }
}

/// What is wrong with text or data, or a missing key; margins past their allowance are with their build.
fn finding(sources: &Sources, one: &Shown<'_>, ordinal: usize) -> Option<form::Finding> {
    let (hint, readings, edits): (String, &[(String, String)], &[found::TextEdit]) =
        match &one.origin {
            Origin::Margins(_) => return None,
            Origin::Waiting(..) => (one.help(), &[], &[]),
            Origin::Text(f) => (f.hint.clone(), &f.readings, &f.edits),
        };
    Some(form::Finding {
        edits: edits.iter().map(|e| edit(sources, e)).collect(),
        fingerprint: one.fingerprint(sources),
        hint: some(&hint),
        id: format!("{}/{ordinal}", one.rule),
        known: one.known,
        message: one.message.clone(),
        readings: readings
            .iter()
            .map(|(text, means)| form::Reading {
                means: means.clone(),
                text: text.clone(),
            })
            .collect(),
        related: related(sources, one.related),
        rule: one.rule.to_owned(),
        severity: level(one.severity),
        span: span(sources, one.site),
        waiver: one.waiver.map(accepted),
    })
}

/// Policies by name, each once.
fn policies(run: &Run) -> Vec<form::Policy> {
    let mut seen = HashSet::new();
    let mut out = Vec::new();
    for Outcome { sources, report } in &run.outcomes {
        for policy in &report.policies {
            let own = policy.entries.iter().any(|e| e.site.is_some());
            // a built-in policy is the same in every file
            if own || seen.insert(&policy.name) {
                out.push(form::Policy {
                    entries: policy.entries.iter().map(|e| entry(sources, e)).collect(),
                    from: policy.from.clone(),
                    name: policy.name.clone(),
                });
            }
        }
    }
    out
}

fn entry(sources: &Sources, e: &found::PolicyEntry) -> form::Entry {
    form::Entry {
        allowance: qty(e.allowance),
        rule: e.rule.to_owned(),
        severity: level(e.severity),
        source: some(e.source),
        span: e.site.map(|s| span(sources, s)),
    }
}

fn build(outcome: &Outcome, b: &found::BuildReport) -> form::Build {
    let sources = &outcome.sources;
    form::Build {
        alternate: b.alternate.clone(),
        assumed: b
            .assumed
            .iter()
            .map(|a| form::Assumed {
                key: a.key.clone(),
                value: a.value.map(qty),
                why: a.why.to_owned(),
            })
            .collect(),
        curves: b
            .curves
            .as_ref()
            .map(|all| all.iter().map(pictures::picture).collect()),
        derived: b.derived.iter().map(|d| derived(sources, d)).collect(),
        duty: b.duty.clone(),
        margins: b.margins.iter().map(|m| margin(outcome, b, m)).collect(),
        name: b.name.clone(),
        path: sources
            .file(b.site.file)
            .map(|f| f.name.clone())
            .unwrap_or_default(),
        policy: b.policy.clone(),
        settled: b.settled,
        span: span(sources, b.site),
    }
}

fn derived(sources: &Sources, d: &found::Derived) -> form::Derived {
    form::Derived {
        corner: form::Corner {
            ambient: d.corner.ambient.to_owned(),
            channels_driven: d.corner.channels_driven,
            drive: d.corner.drive.to_owned(),
            mains: d.corner.mains.to_owned(),
        },
        name: d.name.to_owned(),
        of: some(&d.of),
        span: span(sources, d.site),
        value: qty(d.value),
    }
}

fn margin(outcome: &Outcome, b: &found::BuildReport, m: &found::Margin) -> form::Margin {
    let Outcome { sources, report } = outcome;
    form::Margin {
        allowance: m.allowance.map(qty),
        changes: m.changes.iter().map(|c| change(sources, c)).collect(),
        fingerprint: margin_fingerprint(b, m),
        id: m.id.clone(),
        known: m.known,
        margin_percent: m.margin_percent().map(Number),
        needs: m.needs.clone(),
        note: some(&m.note),
        part: part(&m.part),
        rating: m.rating.map(qty),
        related: related(sources, &m.related),
        rule: m.rule.to_owned(),
        severity: level(m.severity),
        span: span(sources, m.site),
        stress: m.stress.map(qty),
        used_percent: m.used_percent.map(Number),
        verdict: verdict(m.verdict),
        waiver: m.waiver.and_then(|at| report.waivers.get(at)).map(accepted),
        witness: witness(&m.witness),
        working: m.working.iter().map(|s| step(sources, s)).collect(),
    }
}

fn part(p: &found::Part) -> form::Part {
    form::Part {
        block: p.block.clone(),
        key: p.key.to_owned(),
        name: p.name.clone(),
        order_code: p.order_code.clone(),
        polarity: p.polarity.map(str::to_owned),
        quantity: p.quantity,
        refs: p.refs.clone(),
    }
}

fn witness(w: &found::Witness) -> form::Witness {
    form::Witness {
        also_at: w.also_at.clone(),
        ambient_c: w.ambient_c.map(Number),
        amplitude_v: w.amplitude_v.map(Number),
        angle_deg: w.angle_deg.map(Number),
        bank_a: w.bank_a.map(Number),
        case_c: w.case_c.map(Number),
        channels_driven: w.channels_driven,
        curve: w.curve.clone(),
        device_a: w.device_a.map(Number),
        device_v: w.device_v.map(Number),
        duty: w.duty.clone(),
        frequency_hz: w.frequency_hz.map(Number),
        junction_c: w.junction_c.map(Number),
        load: w.load.clone(),
        mains_hz: w.mains_hz.map(Number),
        mains_v: w.mains_v.map(Number),
        power_w: w.power_w.map(Number),
        rail_v: w.rail_v.map(Number),
        sink_c: w.sink_c.map(Number),
        tolerance: w
            .tolerance
            .iter()
            .map(|(part, end)| (part.clone(), (*end).to_owned()))
            .collect(),
    }
}

fn step(sources: &Sources, s: &found::Step) -> form::Step {
    form::Step {
        expression: some(s.expression),
        from: s.from.iter().map(|site| span(sources, *site)).collect(),
        meaning: s.meaning.to_owned(),
        source: some(s.source),
        symbol: s.symbol.to_owned(),
        unit: s.unit.to_owned(),
        value: Number(s.value),
    }
}

fn change(sources: &Sources, c: &found::Change) -> form::Change {
    let moves = |m: &found::AlsoMoves| form::Moves {
        id: m.id.clone(),
        used_percent_after: Number(m.used_after),
        used_percent_before: Number(m.used_before),
    };
    form::Change {
        also_moves: c.also_moves.iter().map(moves).collect(),
        edits: c.edits.iter().map(|e| edit(sources, e)).collect(),
        statements: c.statements.clone(),
        title: c.title.clone(),
        used_percent_after: Number(c.used_after),
    }
}

fn edit(sources: &Sources, e: &found::TextEdit) -> form::Edit {
    form::Edit {
        span: span(sources, e.site),
        text: e.text.clone(),
    }
}

fn related(sources: &Sources, all: &[found::Related]) -> Vec<form::Related> {
    all.iter()
        .map(|r| form::Related {
            message: r.message.clone(),
            span: span(sources, r.site),
        })
        .collect()
}

fn waiver(sources: &Sources, w: &found::Waiver) -> form::Waiver {
    form::Waiver {
        alternate: w.alternate.clone(),
        build: w.build.clone(),
        by: w.by.clone(),
        part: w.part.clone(),
        reason: w.reason.clone(),
        rule: w.rule.clone(),
        span: span(sources, w.site),
        state: match w.state {
            WaiverState::Honoured => form::State::Honoured,
            WaiverState::Refused => form::State::Refused,
            WaiverState::Stale => form::State::Stale,
            WaiverState::Expired => form::State::Expired,
        },
        until: w.until.clone(),
    }
}

fn accepted(w: &found::Waiver) -> form::Accepted {
    form::Accepted {
        by: w.by.clone(),
        reason: w.reason.clone(),
        until: w.until.clone(),
    }
}

fn span(sources: &Sources, site: Site) -> form::Span {
    let Some(file) = sources.file(site.file) else {
        let nowhere = || form::Place {
            byte: 0,
            column: 1,
            line: 1,
        };
        return form::Span {
            end: nowhere(),
            path: String::new(),
            start: nowhere(),
        };
    };
    let lines = file.tree.line_index();
    let place = |byte: usize| {
        let byte = byte.min(file.tree.text.len());
        let at = lines.position(byte);
        form::Place {
            byte,
            column: at.column,
            line: at.line,
        }
    };
    form::Span {
        end: place(site.span.end),
        path: file.name.clone(),
        start: place(site.span.start),
    }
}

fn qty(m: found::Measure) -> form::Qty {
    form::Qty {
        unit: m.unit.to_owned(),
        value: Number(m.value),
    }
}

fn verdict(verdict: found::Verdict) -> form::Verdict {
    match verdict {
        found::Verdict::Ok => form::Verdict::Ok,
        found::Verdict::Thin => form::Verdict::Thin,
        found::Verdict::Over => form::Verdict::Over,
        found::Verdict::Unchecked => form::Verdict::Unchecked,
    }
}

fn tool() -> form::Tool {
    form::Tool {
        name: "derate".to_owned(),
        version: env!("CARGO_PKG_VERSION").to_owned(),
    }
}

fn level(severity: Severity) -> Level {
    match severity {
        Severity::Error => Level::Error,
        Severity::Warning => Level::Warning,
        Severity::Information => Level::Information,
    }
}

fn some(text: &str) -> Option<String> {
    (!text.is_empty()).then(|| text.to_owned())
}
