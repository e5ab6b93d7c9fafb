//! data.curve-order: whether safe-area points can be a curve.

use crate::analysis::reach::data_part;
use crate::analysis::{Case, Margins, Stress};
use crate::build::parts::SoaLine;
use crate::finding::Verdict;
use crate::physics::safe_area::{Curve, CurveError};
use crate::rule::Allow;

rule! {
    /// A safe-area curve only falls: no device stands more current at more volts. Points out of order are
    /// nearly always one digit read off a logarithmic chart wrongly, or volts and amperes swapped, and
    /// every margin of that device rests on them.
    "data.curve-order",
    compares: "safe-area points with a curve that falls",
    stress: "",
    rating: "",
    formula: "volts rise from point to point, amperes do not",
    source: "definition of a safe operating area",
    reads: ["device.soa"],
    sense: Fault,
    unit: "",
    allow: Allow::None, "",
    remedies: [],
    example: "tern60", [("16 A at 11 V, 3.6 A at 50 V", "16 A at 11 V, 36 A at 50 V")],
}

/// One margin for each device that states a curve.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    for device in case.devices() {
        for line in &device.soa {
            let note = disorder(line).unwrap_or_default();
            let verdict = if note.is_empty() {
                Verdict::Ok
            } else {
                Verdict::Over
            };
            out.judge(
                &RULE,
                data_part(device, "soa"),
                line.site,
                verdict,
                Stress {
                    note,
                    ..Stress::default()
                },
            );
        }
    }
}

/// What makes the points no curve.
fn disorder(line: &SoaLine) -> Option<String> {
    let at = |n: usize| {
        line.points
            .get(n)
            .map_or_else(String::new, |(v, i)| format!("{} A at {} V", i.0, v.0))
    };
    match Curve::new(&line.points).err()? {
        CurveError::TooFew => None,
        CurveError::Value(n) => Some(format!("{} is no point of a device", at(n))),
        CurveError::Order(n) => Some(format!(
            "{} follows {}: the volts do not rise",
            at(n),
            at(n.saturating_sub(1))
        )),
        CurveError::Rising(n) => Some(format!(
            "{} follows {}: more current at more volts",
            at(n),
            at(n.saturating_sub(1))
        )),
    }
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    #[test]
    fn points_out_of_order_are_named() {
        let m = |text: &str| {
            margin(
                &tern60(&[("16 A at 11 V, 3.6 A at 50 V", text)]),
                "data.curve-order",
                "n16",
            )
        };
        assert_eq!(m("16 A at 11 V, 3.6 A at 50 V").verdict, Verdict::Ok);
        let rising = m("16 A at 11 V, 36 A at 50 V");
        assert_eq!(rising.verdict, Verdict::Over);
        assert!(
            rising.note.contains("36 A at 50 V follows 16 A at 11 V"),
            "{}",
            rising.note
        );
        assert_eq!(m("3.6 A at 50 V, 3.6 A at 11 V").verdict, Verdict::Over);
        // a flat top is a curve
        assert_eq!(
            m("16 A at 5 V, 16 A at 11 V, 3.6 A at 50 V").verdict,
            Verdict::Ok
        );
    }
}
