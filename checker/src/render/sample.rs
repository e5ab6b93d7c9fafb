//! A report made by hand for the tests of the forms: every kind of margin and finding, two builds,
//! an alternate, and names that try to break out of each form. The numbers are invented.

use std::path::PathBuf;
use std::sync::Arc;

use ampspec_grammar::{Span, parse};

use crate::Outcome;
use crate::finding::*;
use crate::render::run::{FailOn, Run};
use crate::rule::{Allow, Example, Rule, Sense, compare};
use crate::source::Sources;

const BASE: Rule = Rule {
    name: "",
    compares: "",
    why: "",
    stress: "",
    rating: "",
    formula: "",
    source: "",
    reads: &[],
    sense: Sense::AtMost,
    unit: "V",
    allow: Allow::Percent(90.0),
    allow_source: "common practice, no source",
    remedies: &[],
    example: Example {
        kit: "",
        edits: &[],
    },
};
static RULES: &[Rule] = &[
    Rule {
        name: "voltage.device",
        compares: "collector-emitter voltage against V(BR)CEO",
        why: "Without load the rails rise, and a device that is off sees both of them. Past V(BR)CEO it breaks down at the first full swing and takes the loudspeaker with it.",
        stress: "rail to rail, no load, high mains",
        rating: "V(BR)CEO",
        formula: "V = V0+ + V0-",
        source: "common practice, no source",
        reads: &["device.vceo"],
        ..BASE
    },
    Rule {
        name: "soa.reactive",
        compares: "load locus against the derated safe area, reactive load",
        why: "A reactive load asks for current while the device still holds most of the rail. That is where devices fail.",
        stress: "through the device",
        rating: "safe area at that voltage",
        unit: "A",
        allow: Allow::Percent(80.0),
        reads: &["device.soa", "load.minimum", "load.angle"],
        formula: "max i(t) / I_SOA(v(t))",
        ..BASE
    },
    Rule {
        name: "thermal.junction",
        compares: "mean junction temperature against Tj,max",
        why: "Every 10 K costs half the life.",
        stress: "junction, mean, at the duty",
        rating: "Tj,max",
        unit: "degC",
        sense: Sense::Temperature,
        allow: Allow::Below(25.0, f64::INFINITY),
        formula: "Tj = Ta + P Rth",
        ..BASE
    },
    Rule {
        name: "thermal.sink",
        compares: "heatsink temperature",
        why: "A hot sink cooks what stands beside it.",
        stress: "sink at the duty",
        rating: "hard limit",
        unit: "degC",
        sense: Sense::Temperature,
        allow: Allow::Fixed(80.0, 100.0),
        ..BASE
    },
    Rule {
        name: "power.rated-power",
        compares: "power delivered against power claimed",
        why: "A claim that the board cannot meet comes back as returns.",
        stress: "delivered at clip",
        rating: "claimed power",
        unit: "W",
        sense: Sense::AtLeast,
        allow: Allow::Percent(100.0),
        ..BASE
    },
    Rule {
        name: "voltage.reservoir",
        compares: "off-load rail against the capacitor's rating",
        why: "An electrolytic past its voltage leaks, heats and vents.",
        stress: "off-load crest, high mains",
        rating: "rated voltage",
        unit: "V",
        ..BASE
    },
    Rule {
        name: "thermal.touch",
        compares: "touchable temperature",
        why: "Skin burns at 60 degC in seconds.",
        stress: "on the sink at 25 degC ambient",
        rating: "hard limit",
        unit: "degC",
        sense: Sense::Temperature,
        allow: Allow::Fixed(60.0, 60.0),
        ..BASE
    },
    Rule {
        name: "bom.quantity",
        compares: "designators with the count worked out",
        why: "Kits are packed wrong.",
        sense: Sense::Fault,
        allow: Allow::None,
        unit: "1",
        ..BASE
    },
    Rule {
        name: "sample.rule",
        compares: "a figure with another, <b>in words</b>",
        why: " Because it says so, over\n two lines. And a second sentence that is long enough to be wrapped where a terminal ends.",
        formula: "a = b·c, *d*",
        source: "common practice, no source",
        reads: &["device.vceo", "load.nominal"],
        rating: "V(BR)CEO",
        ..BASE
    },
    Rule {
        name: "data.missing",
        compares: "what a rule needs against what is stated",
        why: "What is not stated cannot be checked.",
        sense: Sense::Fault,
        allow: Allow::None,
        unit: "",
        ..BASE
    },
    Rule {
        name: "data.unit-suspect",
        compares: "a value against the plausible band",
        why: "A slip of a thousand survives review because it parses.",
        sense: Sense::Fault,
        allow: Allow::None,
        unit: "",
        ..BASE
    },
];

/// One of the invented rules.
pub(crate) fn rule(name: &str) -> Option<&'static Rule> {
    RULES.iter().find(|r| r.name == name)
}

/// A kit with something wrong on most lines.
const KIT: &str = "\
ampspec 1
use \"parts/n16.ampspec\"
stage out {
    devices   n16 p16  ref Q7-Q10
    pairs     2
    emitter   22 ohm  # µΩ, wide characters before a mark
}
load pa-4 { nominal 4 ohm }
supply toroid {
    reservoir 2 x 4700 uF 63 V
}
heatsink fins { resistance 0.9 K/W at 50 K }
build stereo {
    loads     pa-4
}
build six from stereo { channels 6 }
alternate second-source { replace n16 with n16b }
waive thermal.touch because \"inside a <b>locked</b> rack\" by \"workshop\" until 2030-01-01
gain-block oops
";

/// A part file.
const PART: &str = "device n16 npn {\n    vceo 240 V\n    soa dc 16 A at 11 V, 3.6 A at 50 V\n}\n";

/// Names that try to break out of HTML, XML, Markdown, CSV, a workflow command and a terminal.
pub(crate) const HOSTILE: &str =
    "<script>alert(1)</script>=cmd|'/c calc'!A1]]>`x`\u{1b}[31m\u{202e}[a](b)@all::error::%0A";

pub(crate) struct Kit {
    pub(crate) sources: Sources,
    root: FileId,
    part: FileId,
}

impl Kit {
    fn new() -> Self {
        let mut sources = Sources::default();
        let root = sources.add(
            PathBuf::from("/k/kit.ampspec"),
            "kit.ampspec".to_owned(),
            Arc::new(parse(KIT)),
        );
        let part = sources.add(
            PathBuf::from("/k/parts/n16.ampspec"),
            "parts/n16.ampspec".to_owned(),
            Arc::new(parse(PART)),
        );
        sources.note_use(root, part);
        Self {
            sources,
            root,
            part,
        }
    }

    /// Where a text stands first.
    fn at(&self, file: FileId, text: &str) -> Site {
        let start = self.sources.text(file).find(text).unwrap_or_default();
        Site {
            file,
            span: Span::new(start, start + text.len()),
        }
    }

    fn here(&self, text: &str) -> Site {
        self.at(self.root, text)
    }

    fn margin(
        &self,
        rule: &'static str,
        part: Part,
        numbers: Option<(f64, f64)>,
        site: &str,
    ) -> Margin {
        let record = super::rule(rule);
        let compared = record
            .zip(numbers)
            .and_then(|(r, (stress, rating))| compare(r, r.allow, stress, rating, 40.0));
        let verdict = compared.map_or(Verdict::Unchecked, |c| c.verdict);
        Margin {
            id: format!("stereo/-/{}.{}/{rule}", part.block, part.key),
            rule,
            part,
            verdict,
            severity: match verdict {
                Verdict::Over => Severity::Error,
                Verdict::Thin => Severity::Warning,
                Verdict::Ok | Verdict::Unchecked => Severity::Information,
            },
            waiver: None,
            known: false,
            stress: record
                .zip(numbers)
                .filter(|_| compared.is_some())
                .map(|(r, n)| Measure::new(n.0, r.unit)),
            rating: compared.map(|c| c.rating),
            allowance: compared.map(|c| c.allowance),
            used_percent: compared.and_then(|c| c.used_percent),
            needs: Vec::new(),
            note: String::new(),
            witness: Witness::default(),
            working: Vec::new(),
            site: self.here(site),
            related: Vec::new(),
            changes: Vec::new(),
        }
    }
}

fn device(name: &str, polarity: &'static str) -> Part {
    Part {
        name: name.to_owned(),
        block: "out".to_owned(),
        key: "devices",
        polarity: Some(polarity),
        refs: ["Q7", "Q8", "Q9", "Q10", "Q11", "Q12"]
            .map(str::to_owned)
            .to_vec(),
        quantity: Some(4),
        order_code: Some("N16-Y".to_owned()),
    }
}

fn whole(block: &str, key: &'static str) -> Part {
    Part {
        name: format!("{block} {key}"),
        block: block.to_owned(),
        key,
        ..Part::default()
    }
}

/// The worst point of a reactive load.
fn witness() -> Witness {
    Witness {
        mains_v: Some(230.0),
        mains_hz: Some(50.0),
        tolerance: vec![("reservoir".to_owned(), "low")],
        channels_driven: Some(2),
        load: Some("pa-4".to_owned()),
        frequency_hz: Some(61.3),
        amplitude_v: Some(31.42),
        angle_deg: Some(118.4),
        duty: Some("1/8".to_owned()),
        ambient_c: Some(40.0),
        sink_c: Some(71.2),
        case_c: Some(83.6),
        device_v: Some(58.27),
        device_a: Some(2.913),
        bank_a: Some(5.826),
        curve: Some("dc".to_owned()),
        also_at: vec!["lagging 45 degrees".to_owned()],
        ..Witness::default()
    }
}

fn pairs(kit: &Kit) -> Change {
    Change {
        title: "3 pairs instead of 2".to_owned(),
        statements: vec!["change out pairs 3".to_owned()],
        edits: vec![TextEdit {
            site: Site {
                span: Span::new(
                    kit.here("pairs     2").span.end - 1,
                    kit.here("pairs     2").span.end,
                ),
                ..kit.here("pairs")
            },
            text: "3".to_owned(),
        }],
        used_after: 91.4,
        also_moves: vec![AlsoMoves {
            id: "stereo/-/out.devices/thermal.junction".to_owned(),
            used_before: 102.1,
            used_after: 88.0,
        }],
    }
}

fn margins(kit: &Kit) -> Vec<Margin> {
    let related = |file, text: &str, message: &str| Related {
        message: message.to_owned(),
        site: kit.at(file, text),
    };
    let over = Margin {
        witness: witness(),
        related: vec![
            related(kit.part, "3.6 A at 50 V", "the curve of n16"),
            related(kit.root, "loads     pa-4", "this load"),
        ],
        changes: vec![pairs(kit)],
        working: vec![Step {
            symbol: "k",
            meaning: "derating at the case",
            expression: "(Tj,max - Tc) / (Tj,max - 25)",
            value: 0.531_2,
            unit: "1",
            source: "common practice, no source",
            from: vec![kit.at(kit.part, "vceo 240 V")],
        }],
        ..kit.margin(
            "soa.reactive",
            device("n16", "upper"),
            Some((2.913, 2.71)),
            "devices   n16 p16",
        )
    };
    let thin = Margin {
        witness: Witness {
            ambient_c: Some(40.0),
            sink_c: Some(71.2),
            junction_c: Some(126.8),
            ..Witness::default()
        },
        changes: vec![pairs(kit)],
        ..kit.margin(
            "thermal.junction",
            device("n16", "upper"),
            Some((126.8, 150.0)),
            "pairs     2",
        )
    };
    let touch = Margin {
        waiver: Some(0),
        ..kit.margin(
            "thermal.touch",
            whole("fins", "resistance"),
            Some((62.1, 60.0)),
            "resistance 0.9 K/W at 50 K",
        )
    };
    let waits = |rule, name: &str| Margin {
        needs: vec!["load pa-4 endurance".to_owned()],
        ..kit.margin(rule, device(name, "upper"), None, "devices   n16 p16")
    };
    let ends = Margin {
        note: "the curve of p16 ends at 50 V, the locus reaches 58.3 V".to_owned(),
        ..kit.margin(
            "soa.reactive",
            device("p16", "lower"),
            None,
            "devices   n16 p16",
        )
    };
    let count = Margin {
        verdict: Verdict::Over,
        severity: Severity::Error,
        note: "the line names 6; 4 are needed (2 x pairs)".to_owned(),
        ..kit.margin(
            "bom.quantity",
            whole("out", "emitter"),
            None,
            "emitter   22 ohm",
        )
    };
    let no_rating = Margin {
        note: "the case is at Tj,max".to_owned(),
        ..kit.margin(
            "soa.reactive",
            device(HOSTILE, "lower"),
            Some((1.0, 0.0)),
            "emitter   22 ohm",
        )
    };
    vec![
        kit.margin(
            "voltage.device",
            device("n16", "upper"),
            Some((84.8, 240.0)),
            "devices   n16 p16",
        ),
        over,
        thin,
        kit.margin(
            "voltage.reservoir",
            whole("toroid", "reservoir"),
            Some((56.71, 63.0)),
            "reservoir 2 x 4700 uF 63 V",
        ),
        kit.margin(
            "power.rated-power",
            whole("tern60", "rated"),
            Some((57.2, 60.0)),
            "loads     pa-4",
        ),
        touch,
        waits("thermal.junction", "p16"),
        waits("voltage.device", "p16"),
        ends,
        no_rating,
        count,
    ]
}

fn build(kit: &Kit, name: &str, alternate: Option<&str>, margins: Vec<Margin>) -> BuildReport {
    BuildReport {
        name: name.to_owned(),
        alternate: alternate.map(str::to_owned),
        policy: "bench".to_owned(),
        duty: "1/8".to_owned(),
        site: kit.here("build stereo"),
        settled: name != "six",
        assumed: vec![Assumed {
            key: "load pa-4 minimum".to_owned(),
            value: Some(Measure::new(3.2, "ohm")),
            why: "80 % of nominal",
            site: kit.here("load pa-4"),
        }],
        derived: vec![Derived {
            name: "rail-idle",
            of: String::new(),
            corner: Corner {
                mains: "high",
                ambient: "low",
                channels_driven: 2,
                drive: "idle",
            },
            value: Measure::new(42.412_345_678_9, "V"),
            site: kit.here("supply toroid"),
        }],
        margins,
        curves: None,
    }
}

fn findings(kit: &Kit) -> Vec<Finding> {
    let finding = |rule, severity, message: &str, site| Finding {
        rule,
        severity,
        message: message.to_owned(),
        hint: String::new(),
        readings: Vec::new(),
        site,
        related: Vec::new(),
        edits: Vec::new(),
        waiver: None,
        known: false,
        build: None,
    };
    let emitter = kit.here("22 ohm");
    vec![
        Finding {
            hint: "an emitter resistor is 0.05 ohm to 2 ohm".to_owned(),
            readings: vec![
                ("0R22".to_owned(), "0.22 ohm, 42 mA idle".to_owned()),
                ("22R".to_owned(), "22 ohm, 0.4 mA idle".to_owned()),
            ],
            edits: vec![TextEdit {
                site: emitter,
                text: "0R22".to_owned(),
            }],
            related: vec![Related {
                message: "it carries this stage's current".to_owned(),
                site: kit.here("stage out"),
            }],
            ..finding(
                "data.unit-suspect",
                Severity::Error,
                "22 ohm is a hundred times what an emitter resistor is",
                emitter,
            )
        },
        Finding {
            hint: "a block ends its header with {".to_owned(),
            ..finding(
                "syntax.broken-line",
                Severity::Error,
                "this line is no statement",
                kit.here("gain-block oops"),
            )
        },
        finding(
            "data.unused",
            Severity::Information,
            &format!("{HOSTILE} is not used"),
            kit.at(kit.part, "device n16"),
        ),
    ]
}

/// The report.
pub(crate) fn outcome() -> Outcome {
    let kit = Kit::new();
    let six = margins(&kit)
        .into_iter()
        .map(|mut m| {
            m.id = m.id.replacen("stereo", "six", 1);
            m.used_percent = m.used_percent.map(|u| u * 1.05);
            m.changes.clear();
            m
        })
        .collect();
    let second = vec![kit.margin(
        "voltage.reservoir",
        whole("toroid", "reservoir"),
        Some((57.9, 63.0)),
        "reservoir 2 x 4700 uF 63 V",
    )];
    let report = Report {
        findings: findings(&kit),
        builds: vec![
            build(&kit, "stereo", None, margins(&kit)),
            build(&kit, "six", None, six),
            build(&kit, "stereo", Some("second-source"), second),
        ],
        policies: vec![PolicyReport {
            name: "bench".to_owned(),
            from: None,
            entries: vec![PolicyEntry {
                rule: "voltage.device",
                allowance: Measure::new(90.0, "%"),
                severity: Severity::Error,
                source: "common practice, no source",
                site: None,
            }],
        }],
        waivers: vec![Waiver {
            rule: "thermal.touch".to_owned(),
            part: None,
            build: None,
            alternate: None,
            reason: "inside a <b>locked</b> rack".to_owned(),
            by: Some("workshop".to_owned()),
            until: Some("2030-01-01".to_owned()),
            state: WaiverState::Honoured,
            site: kit.here("waive thermal.touch"),
        }],
    };
    Outcome {
        sources: kit.sources,
        report,
    }
}

/// A run over that report.
pub(crate) fn run(command: &'static str) -> Run {
    Run::new(command, FailOn::Error, vec![outcome()])
}
