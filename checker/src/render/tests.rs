//! The forms, over one report made by hand.

use super::sample::{self, HOSTILE, run};
use super::terminal::Style;
use super::*;

#[test]
fn terminal() {
    insta::assert_snapshot!(
        "check-terminal",
        super::terminal::check(&run("check"), Style::default())
    );
    insta::assert_snapshot!(
        "margins-terminal",
        margins::terminal(&run("margins"), Style::default())
    );
}

#[test]
fn terminal_in_colour() {
    let text = super::terminal::check(
        &run("check"),
        Style {
            width: 100,
            colour: true,
        },
    );
    let first: Vec<&str> = text.lines().take(12).collect();
    insta::assert_snapshot!("check-colour", first.join("\n").replace('\u{1b}', "ESC"));
}

#[test]
fn markdown_forms() {
    insta::assert_snapshot!("check-markdown", markdown::check(&run("check")));
    insta::assert_snapshot!("margins-markdown", markdown::margins(&run("margins")));
}

#[test]
fn other_forms() {
    insta::assert_snapshot!("check-json", json::render(&run("check")));
    // the registry of rules grows; what is snapped here must not
    let mut log: serde_json::Value = serde_json::from_str(&sarif::check(&run("check"))).unwrap();
    let rules = log.pointer_mut("/runs/0/tool/driver/rules").unwrap().take();
    assert_eq!(rules.as_array().unwrap().len(), crate::rules::all().count());
    for result in log
        .pointer_mut("/runs/0/results")
        .unwrap()
        .as_array_mut()
        .unwrap()
    {
        result.as_object_mut().unwrap().remove("ruleIndex");
    }
    insta::assert_snapshot!("check-sarif", json::lines(&log));
    insta::assert_snapshot!("check-test-xml", test_xml::check(&run("check")));
    insta::assert_snapshot!("check-annotations", annotations::check(&run("check")));
    insta::assert_snapshot!(
        "margins-csv",
        csv::margins(&run("margins")).replace("\r\n", "\n")
    );
    insta::assert_snapshot!("margins-html", html::margins(&run("margins")));
}

#[test]
fn the_json_fits_its_schema() {
    let schema: serde_json::Value = serde_json::from_str(&json::schema()).unwrap();
    let report: serde_json::Value = serde_json::from_str(&json::render(&run("check"))).unwrap();
    let validator = jsonschema::draft202012::new(&schema).unwrap();
    let errors: Vec<String> = validator
        .iter_errors(&report)
        .map(|e| format!("{e} at {}", e.instance_path))
        .collect();
    assert_eq!(errors, Vec::<String>::new());
    // it also refuses: an unknown key, a missing key, a word that is none
    for damage in ["extra", "missing", "word"] {
        let mut damaged = report.clone();
        let margin = damaged
            .pointer_mut("/builds/0/margins/0")
            .unwrap()
            .as_object_mut()
            .unwrap();
        match damage {
            "extra" => drop(margin.insert("colour".to_owned(), "red".into())),
            "missing" => drop(margin.remove("witness")),
            _ => drop(margin.insert("verdict".to_owned(), "fine".into())),
        }
        assert!(!validator.is_valid(&damaged), "{damage}");
    }
}

#[test]
fn keys_are_sorted_and_always_there() {
    fn walk(text: &str) {
        // pretty JSON: a key's depth is its indentation
        let mut open: Vec<(usize, String)> = Vec::new();
        for line in text.lines() {
            let depth = line.len() - line.trim_start().len();
            open.retain(|(d, _)| *d <= depth);
            if line.trim_start().starts_with(['}', '{']) {
                open.retain(|(d, _)| *d < depth + 2);
            }
            let Some((key, _)) = line
                .trim_start()
                .strip_prefix('"')
                .and_then(|l| l.split_once("\": "))
            else {
                continue;
            };
            if let Some((_, before)) = open.iter().find(|(d, _)| *d == depth) {
                assert!(before.as_str() < key, "{before} before {key}");
            }
            open.retain(|(d, _)| *d < depth);
            open.push((depth, key.to_owned()));
        }
    }
    walk(&json::render(&run("check")));
    walk(&explain::json(crate::rules::all()));
}

#[test]
fn two_runs_give_the_same_bytes() {
    assert_eq!(json::render(&run("check")), json::render(&run("check")));
    assert_eq!(sarif::check(&run("check")), sarif::check(&run("check")));
}

#[test]
fn hostile_names_stay_names() {
    let (check, summary) = (run("check"), run("margins"));
    let hidden = |text: &str| {
        text.chars()
            .any(|c| c != '\n' && c != '\r' && escape::hidden(c))
    };
    for text in [
        super::terminal::check(&check, Style::default()),
        margins::terminal(&summary, Style::default()),
    ] {
        assert!(!hidden(&text));
        assert!(text.contains("\\u{1b}[31m"));
    }
    for text in [html::margins(&summary), test_xml::check(&check)] {
        assert!(!hidden(&text));
        assert!(!text.contains("<script") && !text.contains("]]>"));
        assert!(text.contains("&lt;script&gt;"));
    }
    for text in [markdown::check(&check), markdown::margins(&summary)] {
        assert!(!hidden(&text));
        assert!(!text.contains("<script") && !text.contains("@all") && !text.contains("<b>"));
        // every row of a table has as many cells as its head
        for row in text.lines().filter(|l| l.starts_with('|')) {
            assert_eq!(row.replace("\\|", "").matches('|').count(), 10, "{row}");
        }
    }
    let notes = annotations::check(&check);
    assert!(!hidden(&notes));
    assert!(
        notes
            .lines()
            .filter(|l| l.starts_with("::"))
            .all(|l| l.contains(" file=") || l.contains(" title=derate"))
    );
    assert_eq!(
        notes
            .lines()
            .filter(|l| l.contains(HOSTILE.get(..8).unwrap()))
            .count(),
        2
    );
    for row in csv::margins(&summary).split("\r\n") {
        assert!(!hidden(row));
        for cell in row.split(',') {
            let cell = cell.trim_start_matches('"');
            let formula =
                cell.starts_with(['=', '+', '@', '|', '-']) && cell.parse::<f64>().is_err();
            assert!(!formula, "{cell}");
        }
    }
    let text = sarif::check(&check);
    assert!(!hidden(&text));
    assert!(text.contains("[a] (b)") && !text.contains("[a](b)"));
    let report: serde_json::Value = serde_json::from_str(&json::render(&check)).unwrap();
    assert!(report.to_string().contains("<script>")); // as data it is left alone
}

/// Marks at every place of a text, also where there is none, never fail.
#[test]
fn any_span_can_be_drawn() {
    use crate::finding::{Finding, Report, Severity, Site};
    use ampspec_grammar::Span;
    for text in [
        "",
        "\n",
        "a",
        "µ\r\n\r\n",
        "a\rb\n\tµΩ\u{1b}x\u{202e}\n\n\n",
    ] {
        for start in 0..text.len() + 3 {
            for end in start..text.len() + 3 {
                let mut sources = crate::source::Sources::default();
                let file = sources.add(
                    "k".into(),
                    "k".into(),
                    std::sync::Arc::new(ampspec_grammar::parse(text)),
                );
                let site = Site {
                    file,
                    span: Span::new(start, end),
                };
                let finding = Finding {
                    rule: "data.source",
                    severity: Severity::Error,
                    message: "m".into(),
                    hint: String::new(),
                    readings: vec![],
                    site,
                    related: vec![],
                    edits: vec![],
                    waiver: None,
                    known: false,
                    build: None,
                };
                let report = Report {
                    findings: vec![finding],
                    ..Report::default()
                };
                let run = run::Run::new(
                    "check",
                    run::FailOn::Error,
                    vec![crate::Outcome { sources, report }],
                );
                let drawn = super::terminal::check(&run, Style::default());
                assert!(
                    !drawn.contains("Failed to read"),
                    "{text:?} {start}..{end}\n{drawn}"
                );
                assert!(serde_json::from_str::<serde_json::Value>(&json::render(&run)).is_ok());
            }
        }
    }
}

#[test]
fn a_fingerprint_does_not_move_with_the_lines() {
    let fingerprints = |outcome: &crate::Outcome| -> Vec<String> {
        shown::shown(&outcome.sources, &outcome.report)
            .iter()
            .map(|s| s.fingerprint(&outcome.sources))
            .collect()
    };
    let here = sample::outcome();
    let all = fingerprints(&here);
    let distinct: std::collections::HashSet<&String> = all.iter().collect();
    assert_eq!(distinct.len(), all.len());
    assert_eq!(all, fingerprints(&sample::outcome()));
}

#[test]
fn the_schema() {
    insta::assert_snapshot!("schema", json::schema());
}

#[test]
fn rules_are_explained() {
    let rule = sample::rule("sample.rule").unwrap();
    insta::assert_snapshot!("explain-terminal", explain::terminal(rule, 80));
    insta::assert_snapshot!("explain-markdown", explain::markdown(rule));
}

/// Names from a spec in titles, captions, keys and drawings.
#[test]
fn hostile_names_stay_names_in_pictures() {
    use crate::curves::{Axis, Fact, Kind, Line, Mark, Panel, Picture, Role};
    use crate::finding::Measure;
    let axis = |log| Axis {
        name: "current",
        unit: "A",
        log,
    };
    let panel = |log| Panel {
        x: axis(log),
        y: axis(log),
        lines: vec![Line {
            role: Role::Locus,
            label: HOSTILE.to_owned(),
            points: vec![(1.0, 2.0), (30.0, 0.4), (f64::NAN, 1.0)],
        }],
        marks: vec![Mark {
            role: Role::Worst,
            label: HOSTILE.to_owned(),
            x: 3.0,
            y: 1.0,
            value: Some(Measure::new(79.0, "%")),
        }],
    };
    let kinds = [
        Kind::SafeArea,
        Kind::Limiter,
        Kind::Impedance,
        Kind::Rail,
        Kind::Ripple,
        Kind::Heat,
        Kind::Ladder,
    ];
    let picture = |kind| Picture {
        kind,
        of: vec![HOSTILE.to_owned()],
        region: HOSTILE.to_owned(),
        facts: vec![Fact {
            name: "case",
            of: HOSTILE.to_owned(),
            value: Measure::new(70.0, "degC"),
        }],
        panels: vec![panel(kind == Kind::SafeArea), panel(false)],
    };
    let mut summary = run("margins");
    let build = summary
        .outcomes
        .iter_mut()
        .flat_map(|o| &mut o.report.builds)
        .next()
        .unwrap();
    build.curves = Some(kinds.map(picture).to_vec());
    let page = html::margins(&summary);
    assert_eq!(page.matches("class=\"plot\"").count(), kinds.len());
    assert!(!page.contains("<script") && !page.contains("]]>") && !page.contains("NaN"));
    assert!(!page.chars().any(|c| c != '\n' && escape::hidden(c)));
    assert!(page.contains("&lt;script&gt;"));
    // every picture is described, and every id stands once
    for n in 1..=kinds.len() {
        assert_eq!(page.matches(&format!("id=\"p{n}-t\"")).count(), 1);
        assert_eq!(page.matches(&format!("id=\"p{n}-d\"")).count(), 1);
    }
}
