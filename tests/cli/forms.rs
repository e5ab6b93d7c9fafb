//! Every form is read again by somebody else: JSON and SARIF by their schemas, XML, CSV and HTML by
//! other parsers; and hostile text comes out harmless in each. Must not know what is reported.
#![allow(clippy::unwrap_used, reason = "a test may stop where it stands")]

use std::fs;
use std::path::Path;

use assert_cmd::Command;
use html5ever::tendril::TendrilSink;
use markup5ever_rcdom::{Handle, NodeData, RcDom};
use serde_json::Value;
use tempfile::TempDir;

/// Mark-up, a formula, escape codes, the end of a literal section, a link and a mention.
const HOSTILE: &str =
    "<script>alert(1)</script>=cmd|'/c calc'!A1]]>\u{1b}[31m\u{202e}[a](b)@all::error::%0A&amp;";

fn kit(name: &str) -> String {
    let path = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("../tests/kits")
        .join(name);
    fs::read_to_string(path).unwrap()
}

/// A sound kit, a bad one, one with waivers, and one in which every text a writer is free in is
/// hostile, its own name included; with a list as bad.
fn folder() -> TempDir {
    let folder = tempfile::tempdir().unwrap();
    let write = |name: &str, text: &str| fs::write(folder.path().join(name), text).unwrap();
    for name in ["tern60", "tern60-mistakes", "tern60-revisions"] {
        write(&format!("{name}.ampspec"), &kit(&format!("{name}.ampspec")));
    }
    let bad = kit("tern60-mistakes.ampspec")
        .replace("\"Tern 60 board\"", &format!("\"{HOSTILE}\""))
        .replace("\"N16-Y\"", &format!("\"{HOSTILE}\""))
        .replace("\"P16-Y\"", "\"=HYPERLINK(1)\"")
        .replace("\"mica and grease\"", &format!("\"{HOSTILE}\""));
    let bad = format!("{bad}\nwaive thermal.sink because \"{HOSTILE}\" by \"@all\"\n{HOSTILE}\n");
    write("=a]]&'b.ampspec", &bad);
    write(
        "bad.csv",
        &format!("ref,code,value,description\nQ7,\"{HOSTILE}\",x,\"{HOSTILE}\"\n,=1+1,@x,-1\n"),
    );
    folder
}

const SPECS: [&str; 4] = [
    "tern60.ampspec",
    "tern60-mistakes.ampspec",
    "tern60-revisions.ampspec",
    "=a]]&'b.ampspec",
];

fn out(folder: &TempDir, arguments: &[&str]) -> String {
    let mut command = Command::cargo_bin("derate").unwrap();
    let output = command
        .current_dir(folder.path())
        .args(arguments)
        .output()
        .unwrap();
    assert!(
        output.status.code().unwrap() < 2,
        "{arguments:?}: {}",
        String::from_utf8_lossy(&output.stderr)
    );
    let text = String::from_utf8(output.stdout).unwrap();
    assert!(!text.is_empty(), "{arguments:?}");
    text
}

/// Every command that reports, with every form of this name.
fn commands(form: &str) -> Vec<Vec<&str>> {
    let mut all = Vec::new();
    for spec in SPECS {
        if [
            "terminal",
            "json",
            "sarif",
            "markdown",
            "test-xml",
            "annotations",
        ]
        .contains(&form)
        {
            all.push(vec!["check", spec, "--form", form]);
        }
        if ["terminal", "json", "markdown", "html", "csv"].contains(&form) {
            all.push(vec!["margins", spec, "--form", form]);
        }
        if ["terminal", "json", "markdown"].contains(&form) {
            all.push(vec!["compare", "tern60.ampspec", spec, "--form", form]);
        }
        if ["terminal", "json", "markdown", "csv"].contains(&form)
            && spec != "tern60-revisions.ampspec"
        {
            all.push(vec!["parts", spec, "--against", "bad.csv", "--form", form]);
        }
    }
    assert!(!all.is_empty());
    all
}

fn hidden(text: &str) -> Option<char> {
    let plain = |c: &char| matches!(c, '\n' | '\r' | '\t');
    text.chars()
        .find(|c| !plain(c) && (c.is_control() || *c == '\u{202e}'))
}

#[test]
fn json_fits_the_schema_that_is_printed() {
    let folder = folder();
    let schema: Value = serde_json::from_str(&out(&folder, &["schema"])).unwrap();
    let validator = jsonschema::draft202012::new(&schema).unwrap();
    for command in commands("json") {
        let report: Value = serde_json::from_str(&out(&folder, &command)).unwrap();
        let errors: Vec<String> = validator
            .iter_errors(&report)
            .map(|e| e.to_string())
            .collect();
        assert!(errors.is_empty(), "{command:?}: {:.400}", errors.join("\n"));
        assert_eq!(report["command"], *command.first().unwrap());
    }
}

/// The official schema, as the crate serde-sarif 0.8.0 carries it. Its pattern for languages has a
/// bracket too many, which some engines refuse, and it bears on nothing that is written here.
#[test]
fn sarif_fits_the_official_schema() {
    let text = include_str!("sarif-schema-2.1.0.json").replace(
        "^[a-zA-Z]{2}|^[a-zA-Z]{2}-[a-zA-Z]{2}]?$",
        "^[a-zA-Z]{2}(-[a-zA-Z]{2})?$",
    );
    let schema: Value = serde_json::from_str(&text).unwrap();
    let validator = jsonschema::draft7::new(&schema).unwrap();
    let folder = folder();
    out(
        &folder,
        &[
            "check",
            "tern60-mistakes.ampspec",
            "--write-baseline",
            "base.json",
        ],
    );
    let mended = kit("tern60-mistakes.ampspec").replace("8R2 1 W", "8R2 5 W");
    fs::write(folder.path().join("tern60-mistakes.ampspec"), mended).unwrap();
    let mut all = commands("sarif");
    all.push(vec![
        "check",
        "tern60-mistakes.ampspec",
        "--baseline",
        "base.json",
        "--form",
        "sarif",
    ]);
    let mut fixes = 0;
    let mut states = Vec::new();
    for command in all {
        let log: Value = serde_json::from_str(&out(&folder, &command)).unwrap();
        let errors: Vec<String> = validator
            .iter_errors(&log)
            .map(|e| format!("{e} at {}", e.instance_path))
            .collect();
        assert!(errors.is_empty(), "{command:?}: {:.800}", errors.join("\n"));
        for result in log["runs"][0]["results"].as_array().unwrap() {
            fixes += usize::from(result["fixes"].is_array());
            states.extend(result["baselineState"].as_str().map(str::to_owned));
            assert!(result["partialFingerprints"]["derate/v1"].is_string());
            assert!(result["locations"].is_array());
        }
    }
    assert!(fixes > 10, "proposed changes are fixes");
    assert!(states.iter().any(|s| s == "unchanged") && states.iter().any(|s| s == "absent"));
    // it also refuses
    let mut damaged: Value = serde_json::from_str(&out(
        &folder,
        &["check", "tern60-mistakes.ampspec", "--form", "sarif"],
    ))
    .unwrap();
    damaged["runs"][0]["results"][0]["level"] = "loud".into();
    assert!(!validator.is_valid(&damaged));
}

#[test]
fn the_test_report_is_read_by_another_parser() {
    let folder = folder();
    for command in commands("test-xml") {
        let text = out(&folder, &command);
        let document = roxmltree::Document::parse(&text).unwrap();
        let count = |node: roxmltree::Node<'_, '_>, name: &str| {
            node.descendants()
                .filter(|n| n.has_tag_name(name))
                .count()
                .to_string()
        };
        let suites = document
            .descendants()
            .filter(|n| n.has_tag_name("testsuite") || n.has_tag_name("testsuites"));
        for suite in suites {
            assert_eq!(
                suite.attribute("tests"),
                Some(count(suite, "testcase").as_str())
            );
            assert_eq!(
                suite.attribute("failures"),
                Some(count(suite, "failure").as_str())
            );
            assert_eq!(
                suite.attribute("skipped"),
                Some(count(suite, "skipped").as_str())
            );
        }
        let names = ["testsuites", "testsuite", "testcase", "failure", "skipped"];
        let known = |n: roxmltree::Node<'_, '_>| {
            !n.is_element() || names.iter().any(|name| n.has_tag_name(*name))
        };
        assert!(document.root().descendants().all(known), "{command:?}");
    }
}

#[test]
fn comma_separated_values_are_read_by_another_reader() {
    let folder = folder();
    for command in commands("csv") {
        let text = out(&folder, &command);
        let mut reader = csv::Reader::from_reader(text.as_bytes());
        let width = reader.headers().unwrap().len();
        for record in reader.records() {
            let record = record.unwrap();
            assert_eq!(record.len(), width);
            for cell in &record {
                let formula = cell
                    .trim_start()
                    .starts_with(['=', '+', '-', '@', '|', '%']);
                assert!(
                    !formula || cell.parse::<f64>().is_ok(),
                    "{command:?}: {cell}"
                );
                assert_eq!(hidden(cell), None);
            }
        }
        // every line ends as RFC 4180 has it
        assert_eq!(text.matches('\n').count(), text.matches("\r\n").count());
    }
}

#[test]
fn html_parses_without_an_error() {
    let folder = folder();
    for command in commands("html") {
        let text = out(&folder, &command);
        let dom = html5ever::parse_document(RcDom::default(), html5ever::ParseOpts::default())
            .one(text.as_str());
        assert_eq!(
            *dom.errors.borrow(),
            Vec::<std::borrow::Cow<'_, str>>::new(),
            "{command:?}"
        );
        harmless(&dom.document);
        assert_eq!(hidden(&text), None);
    }
}

/// No script, no handler, nothing fetched.
fn harmless(node: &Handle) {
    if let NodeData::Element { name, attrs, .. } = &node.data {
        let tag: &str = &name.local;
        assert!(
            ![
                "script", "iframe", "object", "embed", "link", "base", "form"
            ]
            .contains(&tag),
            "<{tag}>"
        );
        for attribute in attrs.borrow().iter() {
            let key: &str = &attribute.name.local;
            let fetches = matches!(key, "src" | "srcset" | "background")
                || (key == "href" && !attribute.value.starts_with('#'));
            assert!(
                !key.starts_with("on") && !fetches,
                "<{tag} {key}={}>",
                attribute.value
            );
        }
    }
    node.children.borrow().iter().for_each(harmless);
}

/// Without the characters that a backslash makes plain.
fn unescaped(text: &str) -> String {
    let mut out = String::new();
    let mut rest = text.chars();
    while let Some(c) = rest.next() {
        if c == '\\' {
            rest.next();
        } else {
            out.push(c);
        }
    }
    out
}

#[test]
fn hostile_text_is_harmless_to_people_and_services() {
    let folder = folder();
    for command in commands("terminal") {
        assert_eq!(hidden(&out(&folder, &command)), None, "{command:?}");
    }
    for command in commands("markdown") {
        let text = out(&folder, &command);
        assert_eq!(hidden(&text), None, "{command:?}");
        // outside code spans nothing is HTML, a link or a mention but what the form itself writes
        let prose: String = unescaped(&text).split('`').step_by(2).collect();
        let prose = [
            "<details>",
            "<details open>",
            "</details>",
            "<summary>",
            "</summary>",
        ]
        .iter()
        .fold(prose, |text, own| text.replace(own, ""));
        for mark in ["<script", "](", "@all", "]]>", "<"] {
            assert!(!prose.contains(mark), "{command:?}: {mark}");
        }
    }
    for command in commands("annotations") {
        let text = out(&folder, &command);
        assert_eq!(hidden(&text), None);
        for line in text.lines() {
            let own = line.starts_with("::") || line.starts_with("derate: ");
            assert!(
                own && line.matches("::error").count() <= 2,
                "{command:?}: {line}"
            );
        }
    }
}
