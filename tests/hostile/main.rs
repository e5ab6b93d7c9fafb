//! Any bytes as a spec: no panic, no hang, and positions that lie inside the text.

#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    reason = "helpers of tests, outside a test function"
)]

use std::path::{Path, PathBuf};
use std::sync::Arc;

use derate::finding::Site;
use derate::source::{Files, normal, text_of};
use proptest::prelude::*;

struct Only(Arc<str>);

impl Files for Only {
    fn read(&self, path: &Path) -> Result<Arc<str>, String> {
        if path == Path::new("/kit.ampspec") {
            Ok(self.0.clone())
        } else {
            Err("there is no such file".to_owned())
        }
    }
    fn resolve(&self, path: &Path) -> PathBuf {
        normal(path)
    }
}

/// Check the text and hold every position, number and id of the report to what must be true of any.
fn check(text: Arc<str>) {
    let options = derate::Options {
        today: "2026-06-01".to_owned(),
        ..derate::Options::default()
    };
    let outcome = derate::check(
        &Only(text.clone()),
        Path::new("/kit.ampspec"),
        "kit.ampspec",
        &options,
    )
    .unwrap();
    let inside = |site: &Site| {
        let span = site.span;
        assert!(
            span.start <= span.end && span.end <= text.len(),
            "{span:?} of {}",
            text.len()
        );
        assert!(
            text.is_char_boundary(span.start) && text.is_char_boundary(span.end),
            "{span:?} splits a character"
        );
    };
    for finding in &outcome.report.findings {
        inside(&finding.site);
        finding.related.iter().for_each(|r| inside(&r.site));
        finding.edits.iter().for_each(|e| inside(&e.site));
        assert!(!finding.message.is_empty());
    }
    for margin in outcome.report.builds.iter().flat_map(|b| &b.margins) {
        inside(&margin.site);
        margin.related.iter().for_each(|r| inside(&r.site));
        for number in [margin.stress, margin.rating, margin.allowance]
            .into_iter()
            .flatten()
        {
            assert!(number.value.is_finite(), "{}: {number:?}", margin.id);
        }
        assert!(
            margin.used_percent.is_none_or(f64::is_finite),
            "{}",
            margin.id
        );
    }
    let _ = derate::tidy::tidy(&text);
}

fn kit() -> String {
    std::fs::read_to_string(
        Path::new(env!("CARGO_MANIFEST_DIR")).join("../tests/kits/tern60.ampspec"),
    )
    .unwrap()
}

/// Numbers and words that a hostile or tired writer might put in place of a good one.
const HOSTILE: &[&str] = &[
    "0",
    "-1",
    "1e308",
    "1e-308",
    "NaN",
    "inf",
    "0 V",
    "0 ohm",
    "1e12 ohm",
    "-5 A",
    "none",
    "999999999999999999999",
    "1/0",
    "{",
    "}",
    "\"",
    ",",
    ", ,",
    "±0 %",
    "±200 %",
    "\u{0}",
    "Ω",
    "𝛀",
    "\u{202e}",
    "0 W",
    "1 pV",
    "1 GV",
    "per 0 channels",
    "x",
    "from n16",
];

proptest! {
    #![proptest_config(ProptestConfig { cases: 192, ..ProptestConfig::default() })]

    #[test]
    fn any_bytes(bytes in proptest::collection::vec(any::<u8>(), 0..2000)) {
        check(text_of(bytes));
    }

    #[test]
    fn any_text(text in "(?s).{0,500}") {
        check(text.into());
    }

    /// A good kit with one token replaced by a hostile one.
    #[test]
    fn one_hostile_token(at in 0usize..4000, which in 0..HOSTILE.len()) {
        let kit = kit();
        let tokens: Vec<(usize, &str)> = kit.split_whitespace().map(|t| (t.as_ptr() as usize - kit.as_ptr() as usize, t)).collect();
        let (start, token) = tokens[at % tokens.len()];
        let text = format!("{}{}{}", &kit[..start], HOSTILE[which], &kit[start + token.len()..]);
        check(text.into());
    }

    /// A good kit cut anywhere, with a piece of it put in anywhere.
    #[test]
    fn cut_and_paste(cut in 0usize..5000, from in 0usize..5000, length in 0usize..400, to in 0usize..5000) {
        let kit = kit();
        let at = |n: usize| (0..=n % (kit.len() + 1)).rev().find(|i| kit.is_char_boundary(*i)).unwrap_or(0);
        let (a, b) = (at(from), at(from + length));
        let piece = kit.get(a.min(b)..a.max(b)).unwrap_or("").to_owned();
        let mut text = kit[..at(cut).max(at(to))].to_owned();
        text.insert_str(at(to).min(text.len()), &piece);
        check(text.into());
    }

    /// Every number of a good kit scaled by a random power: absurd builds, none may panic.
    #[test]
    fn scaled_numbers(which in 0usize..400, exponent in -18i32..18) {
        let kit = kit();
        let numbers: Vec<(usize, &str)> = kit.split_whitespace().filter(|t| t.starts_with(|c: char| c.is_ascii_digit()) && t.parse::<f64>().is_ok())
            .map(|t| (t.as_ptr() as usize - kit.as_ptr() as usize, t)).collect();
        let (start, token) = numbers[which % numbers.len()];
        let text = format!("{}{token}e{exponent}{}", &kit[..start], &kit[start + token.len()..]);
        check(text.into());
    }
}

/// Ten megabytes of anything come to an answer.
#[test]
fn ten_megabytes() {
    let lines = "emitter 0R22 ±5 % 5 W\n".repeat(10_000_000 / 23);
    check(lines.into());
    check("{".repeat(1_000_000).into());
    check("a".repeat(10_000_000).into());
    let blocks: String = (0..40_000)
        .map(|n| format!("device d{n} npn {{\n vceo {n} V\n}}\n"))
        .collect();
    check(blocks.into());
}
