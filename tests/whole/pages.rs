//! Generated pages are as the code says. `UPDATE_PAGES=1 cargo test --test pages` writes them anew.

#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    reason = "helpers of tests, outside a test function"
)]

use std::path::Path;

use derate::render::{explain, json, language};
use derate::rules;

fn page(name: &str, text: &str) {
    let path = Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("docs")
        .join(name);
    if std::env::var_os("UPDATE_PAGES").is_some() {
        std::fs::write(&path, text).unwrap();
    }
    let kept = std::fs::read_to_string(&path).unwrap_or_default();
    assert!(
        kept == text,
        "{} is not what the code says; UPDATE_PAGES=1 cargo test --test pages writes it anew",
        path.display()
    );
}

#[test]
fn the_language_reference() {
    page("language.md", &language::markdown());
}

#[test]
fn the_rule_reference() {
    let mut text = String::from("# Rules\n\n");
    for rule in rules::all() {
        text.push_str(&explain::markdown(rule));
        text.push('\n');
    }
    page("rules.md", &text);
}

#[test]
fn the_report_schema() {
    page("report.schema.json", &json::schema());
}
