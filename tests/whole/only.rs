//! A build that fails in one way only is told by the rules of that way, and by no other: the sound kit
//! with one change each. The same kit without the condition (less angle, lower mains ...) is silent.

#![allow(
    clippy::expect_used,
    reason = "helpers of tests, outside a test function"
)]

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use derate::finding::{Report, Severity, Verdict};
use derate::source::{Files, normal};

const PATH: &str = "/kit/under-test.ampspec";

struct Only<'a>(&'a str);

impl Files for Only<'_> {
    fn read(&self, path: &Path) -> Result<Arc<str>, String> {
        if path == Path::new(PATH) {
            Ok(self.0.into())
        } else {
            Err("there is no such file".to_owned())
        }
    }
    fn resolve(&self, path: &Path) -> PathBuf {
        normal(path)
    }
}

/// The sound kit with pieces of its text replaced and blocks added.
fn kit(edits: &[(&str, &str)], more: &str) -> String {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("../tests/kits/tern60.ampspec");
    let mut text = std::fs::read_to_string(path).expect("the demo kit");
    for (old, new) in edits {
        assert!(text.contains(old), "the kit no longer says `{old}`");
        text = text.replace(old, new);
    }
    text + more
}

fn report(text: &str) -> Report {
    let options = derate::Options {
        today: "2026-06-01".to_owned(),
        ..derate::Options::default()
    };
    derate::check(&Only(text), Path::new(PATH), "under-test.ampspec", &options)
        .expect("the text is there")
        .report
}

/// Rules past their allowance, unchecked margins and findings among them, as `build/alternate rule`.
fn told(text: &str) -> BTreeSet<String> {
    let report = report(text);
    let findings = report.findings.iter().map(|f| f.rule.to_owned());
    let margins = report.builds.iter().flat_map(|b| {
        let open = b.margins.iter().filter(|m| match m.verdict {
            Verdict::Ok => false,
            Verdict::Unchecked => true,
            Verdict::Thin | Verdict::Over => m.severity > Severity::Information,
        });
        open.map(|m| match &b.alternate {
            Some(alternate) => format!("{alternate}: {}", m.rule),
            None => m.rule.to_owned(),
        })
    });
    findings.chain(margins).collect()
}

fn only(text: &str, rules: &[&str]) {
    let expected: BTreeSet<String> = rules.iter().map(|r| (*r).to_owned()).collect();
    assert_eq!(told(text), expected);
}

const CABINET: &str = "load cab { nominal 8 ohm\n minimum 6.4 ohm\n angle 52 deg\n dc 5.9 ohm }\n";
const LOADS: (&str, &str) = ("hall-8, bench-8", "hall-8, bench-8, cab");

#[test]
fn the_kit_as_it_stands() {
    only(&kit(&[], ""), &[]);
}

#[test]
fn only_with_a_reactive_load() {
    let rules = [
        "soa.reactive",
        "soa.low-frequency",
        "soa.limiter-music",
        "thermal.cutout-protects",
    ];
    only(&kit(&[LOADS], CABINET), &rules);
    only(&kit(&[LOADS], &CABINET.replace("52 deg", "20 deg")), &[]);
}

#[test]
fn only_at_high_mains() {
    let capacitors = ("uF ±20 % 63 V", "uF ±20 % 50 V");
    only(&kit(&[capacitors], ""), &["voltage.reservoir"]);
    let steady = ("230 V ±10 % 50 Hz", "230 V +3 % -10 % 50 Hz");
    only(&kit(&[capacitors, steady], ""), &[]);
}

#[test]
fn only_when_hot() {
    let hot = ("10 degC to 40 degC", "10 degC to 48 degC");
    only(
        &kit(&[hot], ""),
        &["soa.limiter-soa", "thermal.cutout-nuisance"],
    );
}

#[test]
fn only_with_more_channels_on_the_supply() {
    let weak = [
        "power.rated-power",
        "power.ripple-headroom",
        "power.low-frequency-sag",
        "current.fuse-rms",
    ];
    only(
        &kit(&[("channels           1\n", "channels           2\n")], ""),
        &weak,
    );
    let six = [
        &weak[..],
        &["current.transformer-duty", "supply.shared-count"],
    ]
    .concat();
    only(
        &kit(&[("channels           1\n", "channels           6\n")], ""),
        &six,
    );
}

#[test]
fn only_bridged() {
    let bridged = ("channels           1\n", "channels           2 bridged\n");
    let rules = [
        "current.transformer-duty",
        "soa.reactive",
        "soa.low-frequency",
        "soa.short-circuit",
        "soa.limiter-soa",
        "soa.limiter-music",
        "thermal.cutout-protects",
        "thermal.cutout-nuisance",
    ];
    only(&kit(&[bridged], ""), &rules);
}

#[test]
fn only_after_a_substitution() {
    let cheaper = "device n17 npn from n16 {
    soa dc 16 A at 11 V, 3.0 A at 50 V, 0.6 A at 100 V, 60 mA at 240 V
    soa 100 ms none
    part \"N17-Z\"
}
device p17 pnp from n17 { part \"P17-Z\" }
alternate cheaper { change out devices n17 p17 }
";
    let rules = [
        "cheaper: soa.short-circuit",
        "cheaper: soa.limiter-soa",
        "cheaper: thermal.cutout-protects",
    ];
    only(&kit(&[], cheaper), &rules);
}

#[test]
fn only_through_the_chain_of_base_currents() {
    let gain = "80 at 1 A, 60 at 5 A, 38 at 8 A, 16 at 16 A";
    let less = (gain, "20 at 1 A, 15 at 5 A, 10 at 8 A, 6 at 16 A");
    only(&kit(&[less], ""), &["drive.output-gain-droop"]);
    // the voltage stage has the current that those gains ask for
    let more = ("output-current     7 mA", "output-current     14 mA");
    only(&kit(&[less, more], ""), &[]);
}
