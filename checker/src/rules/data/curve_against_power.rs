//! data.curve-against-power: d.c. safe-area points that allow more than the rated power.

use crate::analysis::case::{solved, stated};
use crate::analysis::reach::data_part;
use crate::analysis::{Case, Margins, Stress};
use crate::build::parts::{Device, SoaLine};
use crate::finding::Verdict;
use crate::physics::unit::{Celsius, Watt};
use crate::rule::Allow;

rule! {
    /// No point of the d.c. curve can be worth more watts than the power on the front of the sheet. One
    /// that is has nearly always been read off the ten or hundred millisecond curve beside it, and a
    /// device judged by that curve looks two or three times as strong as it is.
    "data.curve-against-power",
    compares: "volts times amperes of each d.c. safe-area point with Ptot at 25 degC",
    stress: "",
    rating: "",
    formula: "v·i <= Ptot·(Tj,max - 25)/(Tj,max - T0), 2 % for rounding",
    source: "definition of rated power; 2 % is the rounding of data sheets",
    reads: ["device.soa", "device.power", "device.junction"],
    sense: Fault,
    unit: "",
    allow: Allow::None, "",
    remedies: [],
    example: "tern60", [("3.6 A at 50 V, 0.9 A", "5.0 A at 50 V, 0.9 A")],
}

/// What rounding of a printed point may come to.
const ROUNDING: f64 = 1.02;

/// One margin for each device that states a d.c. curve and its power.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    for device in case.devices() {
        let Some((line, power)) = device
            .soa
            .iter()
            .find(|l| l.pulse.is_none())
            .zip(power_at_25(device))
        else {
            continue;
        };
        let (verdict, stress) = judged(device, line, power);
        out.judge(&RULE, data_part(device, "soa"), line.site, verdict, stress);
    }
}

/// Ptot with the case at 25 degC, along its own derating line where it is stated at another.
fn power_at_25(device: &Device) -> Option<Watt> {
    let (watt, at) = device.power.get().copied()?;
    if (at - Celsius(25.0)).0.abs() < 0.5 {
        return Some(watt);
    }
    let junction = device.junction.get().copied()?;
    let ratio = (junction - Celsius(25.0)) / (junction - at);
    (ratio.is_finite() && ratio > 0.0).then(|| watt * ratio)
}

fn judged(device: &Device, line: &SoaLine, power: Watt) -> (Verdict, Stress) {
    let worst = line
        .points
        .iter()
        .copied()
        .map(|(v, i)| (v * i, v, i))
        .max_by(|a, b| a.0.0.total_cmp(&b.0.0));
    let Some((watts, volts, amps)) = worst else {
        return (Verdict::Ok, Stress::default());
    };
    let over = watts > power * ROUNDING;
    let note = format!(
        "{} A at {} V is {:.0} W, Ptot is {:.0} W: likely a pulse curve under the name of the d.c. one",
        amps.0, volts.0, watts.0, power.0
    );
    let stress = Stress {
        working: vec![
            solved(
                "v·i",
                "the greatest of the curve",
                "",
                watts.0,
                "W",
                "definition of power",
            ),
            stated(
                "Ptot",
                "rated power, case at 25 degC",
                power.0,
                "W",
                device.power.stated_at(),
            ),
        ],
        note: if over { note } else { String::new() },
        ..Stress::default()
    };
    (if over { Verdict::Over } else { Verdict::Ok }, stress)
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    #[test]
    fn two_per_cent_above_the_power_is_rounding() {
        // 180 W·1.02 = 183.6 W = 3.672 A at 50 V
        let at = |text: &str| {
            margin(
                &tern60(&[("3.6 A at 50 V, 0.9 A", text)]),
                "data.curve-against-power",
                "n16",
            )
        };
        assert_eq!(at("3.67 A at 50 V, 0.9 A").verdict, Verdict::Ok);
        let m = at("3.68 A at 50 V, 0.9 A");
        assert_eq!(m.verdict, Verdict::Over);
        assert!(m.note.contains("pulse curve"));
    }

    #[test]
    fn power_stated_warm_is_more_at_25_degrees() {
        // 144 W at 50 degC and 150 degC: 144·125/100 = 180 W at 25 degC
        let kit = tern60(&[("180 W at 25 degC", "144 W at 50 degC")]);
        assert_eq!(
            margin(&kit, "data.curve-against-power", "n16").verdict,
            Verdict::Ok
        );
    }
}
