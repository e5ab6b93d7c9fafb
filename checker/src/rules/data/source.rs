//! data.source: where the output devices are bought.

use crate::analysis::reach::data_part;
use crate::analysis::{Case, Margins, Stress};
use crate::finding::Verdict;
use crate::rule::Allow;

rule! {
    /// Output transistors are the most counterfeited parts of the trade: a smaller die under a better
    /// name passes every bench test and dies at the first loud evening, with the same second failure
    /// after a full repair. Bought from an authorised seller, or tested when they come in, the data sheet
    /// may be believed; otherwise every margin here is about a part that may not be in the box.
    "data.source",
    compares: "where each output device is bought with an authorised source or an incoming test",
    stress: "",
    rating: "",
    formula: "",
    source: "common practice, no source",
    reads: ["device.source"],
    sense: Fault,
    unit: "",
    allow: Allow::None, "",
    remedies: [],
    example: "tern60", [("part               \"N16-Y\"\n    source             authorised", "part               \"N16-Y\"\n    source             open-market")],
}

/// One margin for each declared output device.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let stage = case.output();
    for side in stage.sides() {
        let device = stage.device(*side);
        if device.owner.kind != "device" || device.source.none {
            continue;
        }
        let (part, site) = (data_part(device, "source"), device.source.site());
        match device.source.need() {
            Err(needs) => out.compare(&RULE, part, site, Err(needs)),
            Ok(&"open-market") => {
                let note = "bought on the open market and not tested: its data sheet may be of another part".to_owned();
                out.judge(
                    &RULE,
                    part,
                    site,
                    Verdict::Thin,
                    Stress {
                        note,
                        ..Stress::default()
                    },
                );
            }
            Ok(_) => out.judge(&RULE, part, site, Verdict::Ok, Stress::default()),
        }
    }
}

#[cfg(test)]
mod tests {
    use crate::finding::{Severity, Verdict};
    use crate::testing::{margin, tern60};

    fn source(text: &str) -> crate::finding::Margin {
        margin(
            &tern60(&[(
                "\"N16-Y\"\n    source             authorised \"franchised distributor\"\n",
                text,
            )]),
            "data.source",
            "n16",
        )
    }

    #[test]
    fn open_market_warns_and_silence_is_advice() {
        assert_eq!(
            source("\"N16-Y\"\n    source authorised \"franchised distributor\"\n").verdict,
            Verdict::Ok
        );
        assert_eq!(
            source("\"N16-Y\"\n    source tested\n").verdict,
            Verdict::Ok
        );
        assert_eq!(
            source("\"N16-Y\"\n    source open-market\n").severity,
            Severity::Warning
        );
        let m = source("\"N16-Y\"\n");
        assert_eq!(
            (m.verdict, m.severity, m.needs),
            (
                Verdict::Unchecked,
                Severity::Information,
                vec!["device n16 source".to_owned()]
            )
        );
    }
}
