//! data.thermal-against-power: the stated thermal resistance against power and Tj,max.

use crate::analysis::case::{solved, stated};
use crate::analysis::reach::data_part;
use crate::analysis::{Case, Margins, Stress};
use crate::build::parts::Device;
use crate::finding::Verdict;
use crate::physics::heat::junction_case;
use crate::rule::Allow;

rule! {
    /// A sheet's power, its Tj,max and its thermal resistance are one statement made three times. When
    /// they disagree, one of them belongs to another package or another maker, or K/W was read as W/K,
    /// and the junction temperature that follows is wrong by as much.
    "data.thermal-against-power",
    compares: "stated Rth(j-c) with (Tj,max - T0)/Ptot",
    stress: "",
    rating: "",
    formula: "Rth(j-c) = (Tj,max - T0)/Ptot, 5 % for rounding",
    source: "definition of rated power; makers round by 2 to 5 %",
    reads: ["device.junction-case", "device.power", "device.junction"],
    sense: Fault,
    unit: "",
    allow: Allow::None, "",
    remedies: [],
    example: "tern60", [("junction-case      0.69 K/W", "junction-case      0.45 K/W")],
}

/// Difference that rounding explains.
const ROUNDING: f64 = 0.05;
/// Above this one of the figures is of something else.
const ANOTHER: f64 = 0.5;

/// One margin for each device that states all three.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    for device in case
        .devices()
        .into_iter()
        .filter(|d| !d.junction_case.assumed)
    {
        if let Some((verdict, stress)) = judged(device) {
            out.judge(
                &RULE,
                data_part(device, "junction-case"),
                device.junction_case.site(),
                verdict,
                stress,
            );
        }
    }
}

fn judged(device: &Device) -> Option<(Verdict, Stress)> {
    let (own, (power, at), junction) = (
        *device.junction_case.get()?,
        *device.power.get()?,
        *device.junction.get()?,
    );
    let implied = junction_case(power, at, junction)?;
    let apart = own / implied - 1.0;
    let verdict = match apart.abs() {
        d if d <= ROUNDING => Verdict::Ok,
        d if d <= ANOTHER => Verdict::Thin,
        _ => Verdict::Over,
    };
    let direction = if apart < 0.0 { "cooler" } else { "hotter" };
    let note = format!(
        "{:.0} W and {:.0} degC make it {:.3} K/W; {:.3} K/W shows junctions {direction} than that",
        power.0, junction.0, implied.0, own.0
    );
    let stress = Stress {
        working: vec![
            stated(
                "Rth(j-c)",
                "as stated",
                own.0,
                "K/W",
                device.junction_case.stated_at(),
            ),
            solved(
                "Rimplied",
                "from power and Tj,max",
                "(Tj,max - T0)/Ptot",
                implied.0,
                "K/W",
                "definition of rated power",
            ),
        ],
        note: if verdict == Verdict::Ok {
            String::new()
        } else {
            note
        },
        ..Stress::default()
    };
    Some((verdict, stress))
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, report, tern60};

    #[test]
    fn makers_round_and_packages_differ() {
        // (150 - 25)/180 = 0.69444 K/W; 5 % is 0.6597 to 0.7292, half is 0.3472 to 1.0417
        let with = |text: &str| {
            margin(
                &tern60(&[("junction-case      0.69 K/W", text)]),
                "data.thermal-against-power",
                "n16",
            )
            .verdict
        };
        assert_eq!(with("junction-case 0.66 K/W"), Verdict::Ok);
        assert_eq!(with("junction-case 0.72 K/W"), Verdict::Ok);
        assert_eq!(with("junction-case 0.65 K/W"), Verdict::Thin);
        assert_eq!(with("junction-case 1.44 K/W"), Verdict::Over);
    }

    #[test]
    fn a_figure_worked_out_from_the_power_agrees_with_itself() {
        let kit = tern60(&[("    junction-case      0.69 K/W\n", "")]);
        assert!(
            report(&kit).builds[0]
                .margins
                .iter()
                .all(|m| m.rule != "data.thermal-against-power")
        );
    }
}
