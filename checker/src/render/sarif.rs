//! Findings as SARIF 2.1.0, the form that code-scanning services read.
//! Must not know what a finding is about.
//!
//! Every margin is a result of its own, never a cluster, so that a result keeps its fingerprint
//! when another margin comes to lead.

use serde_json::{Value, json};

use crate::Outcome;
use crate::baseline::Entry;
use crate::finding::{Related, Severity, Site, TextEdit, Verdict, Waiver};
use crate::rule::Rule;
use crate::rules;
use crate::source::Sources;

use super::escape::{sarif as plain, uri};
use super::message;
use super::run::Run;
use super::shown::{Origin, Placed, Shown, margin_fingerprint, shown};

/// The report of a run.
#[must_use]
pub fn check(run: &Run) -> String {
    let mut results = Vec::new();
    for outcome in &run.outcomes {
        for one in shown(&outcome.sources, &outcome.report) {
            match &one.origin {
                Origin::Margins(group) => results.extend(group.iter().map(|p| margin(outcome, *p))),
                _ => results.push(finding(outcome, &one)),
            }
        }
    }
    results.extend(run.stale.iter().map(absent));
    let driver = json!({
        "name": "derate",
        "version": env!("CARGO_PKG_VERSION"),
        "semanticVersion": env!("CARGO_PKG_VERSION"),
        "rules": rules::all().map(metadata).collect::<Vec<_>>(),
    });
    super::json::lines(&json!({
        "$schema": "https://json.schemastore.org/sarif-2.1.0.json",
        "version": "2.1.0",
        "runs": [{
            "tool": { "driver": driver },
            "columnKind": "unicodeCodePoints",
            "originalUriBaseIds": { "SRCROOT": { "description": { "text": "The folder in which derate was started." } } },
            "invocations": [{ "executionSuccessful": true, "exitCode": run.exit_status() }],
            "results": results,
        }],
    }))
}

fn metadata(rule: &Rule) -> Value {
    json!({
        "id": rule.name,
        "shortDescription": { "text": rule.compares },
        "fullDescription": { "text": message::prose(rule) },
        "help": {
            "text": format!("{}\n\nFormula: {}\nSource: {}", message::prose(rule), rule.formula, rule.source),
        },
        "properties": { "tags": [rule.family()] },
    })
}

fn result(rule: &str, severity: Severity, text: String, fingerprint: String) -> Value {
    let mut result = json!({
        "ruleId": rule,
        "level": match severity {
            Severity::Error => "error",
            Severity::Warning => "warning",
            Severity::Information => "note",
        },
        "message": { "text": plain(&text) },
        "partialFingerprints": { "derate/v1": fingerprint },
    });
    if let Some(index) = rules::all().position(|r| r.name == rule) {
        put(&mut result, "ruleIndex", json!(index));
    }
    result
}

fn put(object: &mut Value, key: &str, value: Value) {
    if let Some(object) = object.as_object_mut() {
        object.insert(key.to_owned(), value);
    }
}

fn finding(outcome: &Outcome, one: &Shown<'_>) -> Value {
    let sources = &outcome.sources;
    let help = one.help();
    let text = if help.is_empty() {
        one.message.clone()
    } else {
        format!("{}\n{help}", one.message)
    };
    let mut result = result(one.rule, one.severity, text, one.fingerprint(sources));
    place(&mut result, sources, one.site, one.related);
    let fixes = one
        .fixes
        .iter()
        .map(|f| fix(sources, &f.title, &f.edits))
        .collect();
    finish(&mut result, fixes, one.waiver);
    if one.known {
        put(&mut result, "baselineState", json!("unchanged"));
    }
    result
}

/// What the baseline holds and this run does not find any more.
fn absent(entry: &Entry) -> Value {
    let text = format!("{}: no longer found", entry.about);
    let mut result = result(
        &entry.rule,
        Severity::Information,
        text,
        entry.fingerprint.clone(),
    );
    let place = json!([{ "physicalLocation": { "artifactLocation": { "uri": uri(&entry.file), "uriBaseId": "SRCROOT" } } }]);
    put(&mut result, "locations", place);
    put(&mut result, "baselineState", json!("absent"));
    result
}

fn margin(outcome: &Outcome, Placed { build, margin: m }: Placed<'_>) -> Value {
    let (sources, report) = (&outcome.sources, &outcome.report);
    let text = message::whole(super::rule(m.rule), m, build);
    let severity = if m.verdict == Verdict::Unchecked {
        Severity::Information
    } else {
        m.severity
    };
    let mut result = result(m.rule, severity, text, margin_fingerprint(build, m));
    place(&mut result, sources, m.site, &m.related);
    put(
        &mut result,
        "properties",
        json!({
            "build": plain(&build.name),
            "alternate": build.alternate.as_deref().map(plain),
            "part": plain(&m.part.name),
            "usedPercent": m.used_percent.map(super::json::nine_digits),
            "verdict": message::verdict(m.verdict),
        }),
    );
    let fixes = m
        .changes
        .iter()
        .filter(|c| !c.edits.is_empty())
        .map(|c| fix(sources, &c.title, &c.edits))
        .collect();
    finish(
        &mut result,
        fixes,
        m.waiver.and_then(|at| report.waivers.get(at)),
    );
    if m.known {
        put(&mut result, "baselineState", json!("unchanged"));
    }
    result
}

fn place(result: &mut Value, sources: &Sources, site: Site, related: &[Related]) {
    put(
        result,
        "locations",
        json!([{ "physicalLocation": location(sources, site) }]),
    );
    let others: Vec<Value> = related
        .iter()
        .enumerate()
        .map(|(id, r)| json!({ "id": id, "message": { "text": plain(&r.message) }, "physicalLocation": location(sources, r.site) }))
        .collect();
    if !others.is_empty() {
        put(result, "relatedLocations", Value::Array(others));
    }
}

fn finish(result: &mut Value, fixes: Vec<Value>, waiver: Option<&Waiver>) {
    if !fixes.is_empty() {
        put(result, "fixes", Value::Array(fixes));
    }
    if let Some(waiver) = waiver {
        let accepted = json!([{ "kind": "inSource", "status": "accepted", "justification": plain(&waiver.reason) }]);
        put(result, "suppressions", accepted);
    }
}

fn location(sources: &Sources, site: Site) -> Value {
    json!({ "artifactLocation": artifact(sources, site), "region": region(sources, site) })
}

fn artifact(sources: &Sources, site: Site) -> Value {
    let name = sources.file(site.file).map_or("", |f| &f.name);
    json!({ "uri": uri(name), "uriBaseId": "SRCROOT" })
}

/// Lines and columns from 1, columns in characters, the end exclusive.
fn region(sources: &Sources, site: Site) -> Value {
    let Some(file) = sources.file(site.file) else {
        return json!({ "startLine": 1 });
    };
    let lines = file.tree.line_index();
    let (from, to) = (
        lines.position(site.span.start),
        lines.position(site.span.end),
    );
    json!({ "startLine": from.line, "startColumn": from.column, "endLine": to.line, "endColumn": to.column })
}

/// Replacements grouped by file, as the form wants them.
fn fix(sources: &Sources, title: &str, edits: &[TextEdit]) -> Value {
    let mut files: Vec<(Site, Vec<Value>)> = Vec::new();
    for edit in edits {
        let replacement = json!({ "deletedRegion": region(sources, edit.site), "insertedContent": { "text": edit.text } });
        match files.iter_mut().find(|f| f.0.file == edit.site.file) {
            Some(file) => file.1.push(replacement),
            None => files.push((edit.site, vec![replacement])),
        }
    }
    let changes: Vec<Value> = files
        .into_iter()
        .map(|(site, replacements)| json!({ "artifactLocation": artifact(sources, site), "replacements": replacements }))
        .collect();
    json!({ "description": { "text": plain(title) }, "artifactChanges": changes })
}
