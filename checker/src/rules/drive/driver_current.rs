//! drive.driver-current: the driver's peak current against its rating.

use super::output_gain_droop::peak_working;
use crate::analysis::case::{Side, solved, stated};
use crate::analysis::devices::bank;
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Stage, both, three};
use crate::finding::{Related, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// At full output into a low impedance the output devices have lost most of their gain, and the
    /// driver carries what is missing: an ampere is not unusual. A driver chosen for its speed alone
    /// may be rated for little more, loses its own gain there, and when it fails it takes the output
    /// devices with it.
    "drive.driver-current",
    compares: "peak current of a driver, high mains, least impedance, with IC",
    stress: "peak current of the driver",
    rating: "IC",
    formula: "i_d = Î/hFE(Î/N) + VBE/Rbe, Î = V(burst)/|Z|min, over the drivers of one polarity",
    source: "definition of current gain",
    reads: ["device.current", "device.hfe", "device.vbe", "stage.pairs", "stage.base-emitter", "amplifier.driver", "amplifier.drop", "build.loads", "build.mains", "transformer.secondary"],
    sense: AtMost,
    unit: "A",
    allow: Allow::Percent(80.0), "common practice, no source",
    remedies: [
        Remedy { key: "device.current", slot: "A", series: Series::TwoDigits, up: true },
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
    ],
    example: "tern60", [("current            4 A\n", "current            100 mA\n")],
}

/// One margin for each declared device of driver and predriver.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    if out.lacking(&RULE, &case.build.amplifier.driver_field) {
        return;
    }
    for (depth, stage) in case.followers().into_iter().enumerate().skip(1) {
        for side in Side::BOTH {
            let (part, site) = (case.device_part(stage, side), stage.devices.site());
            match case.loads() {
                Err(needs) => out.compare(&RULE, part, site, Err(needs)),
                Ok(loads) => {
                    for load in loads {
                        let stress = load
                            .as_ref()
                            .map_err(Clone::clone)
                            .and_then(|load| stress(case, stage, depth, load, side));
                        out.compare(&RULE, part.clone(), site, stress);
                    }
                }
            }
        }
    }
}

fn stress(
    case: &Case<'_>,
    stage: &Stage,
    depth: usize,
    load: &Driven,
    side: Side,
) -> Result<Stress, Needs> {
    if !case.has_base_current() {
        return Err(Needs::because(
            "the driver charges the gates of MOSFETs, and their charge is not stated",
        ));
    }
    let device = stage.device(side);
    let (peak, rating, sharing) = three(
        case.peak_into(load, Mains::High),
        device.current.need().copied(),
        bank(stage, side),
    )?;
    let links = case.chain(side, peak.amps)?;
    let (before, here) = both(
        depth
            .checked_sub(1)
            .and_then(|d| links.get(d))
            .ok_or_else(|| case.build.amplifier.driver_field.missing()),
        links
            .get(depth)
            .ok_or_else(|| case.build.amplifier.driver_field.missing()),
    )?;
    let most = sharing.most_loaded(here.carries);
    let mut working = peak_working(&peak);
    working.push(solved(
        "id",
        "asked of this stage",
        "i/hFE(i/N) + VBE/Rbe",
        here.carries.0,
        "A",
        "definition of current gain",
    ));
    working.push(solved(
        "i",
        "its most loaded device",
        "share·id/N",
        most.0,
        "A",
        "current sharing",
    ));
    working.push(stated(
        "IC",
        "rated current",
        rating.0,
        "A",
        device.current.stated_at(),
    ));
    Ok(Stress {
        value: most.0,
        rating: rating.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            load: Some(load.name.clone()),
            frequency_hz: Some(peak.frequency.0),
            amplitude_v: Some(peak.volts.0),
            rail_v: Some(peak.rail.0),
            device_a: Some(most.0),
            bank_a: Some(peak.amps.0),
            ..case.witness()
        },
        working,
        related: vec![
            Related {
                message: "draws the current".to_owned(),
                site: load.site,
            },
            Related {
                message: "its base current".to_owned(),
                site: before.stage.devices.site(),
            },
        ],
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    fn bench(edits: &[(&str, &str)]) -> crate::finding::Margin {
        let mut all = vec![
            (
                "loads              hall-8, bench-8",
                "loads              bench-8",
            ),
            (
                "bench-8 { resistive 8 ohm ±5 % }",
                "bench-8 { resistive 8 ohm }",
            ),
        ];
        all.extend_from_slice(edits);
        margin(&tern60(&all), "drive.driver-current", "d3")
    }

    #[test]
    fn the_driver_carries_the_base_current_and_the_resistor() {
        // Vu(hi) = 1.1·√2·28·1.07 - 1.0 = 45.60682 V; V = 43.80682/(1 + 0.2857143/8) = 42.29624 V,
        // Î = 5.287030 A, 2.643515 A each: hFE = 80 - 20·ln(2.643515)/ln(5) = 67.92023
        // id = 77.84176 mA + 6.5 mA = 84.34176 mA
        let m = bench(&[]);
        assert!(
            (m.stress.unwrap().value - 84.341_8e-3).abs() < 1e-6,
            "{:?}",
            m.stress
        );
        assert_eq!(m.verdict, Verdict::Ok);
    }

    #[test]
    fn thin_and_over_meet_at_the_rating() {
        // 84.34/0.8 = 105.4 mA
        let verdict = |ic: &str| bench(&[("current            4 A\n", ic)]).verdict;
        assert_eq!(verdict("current            106 mA\n"), Verdict::Ok);
        assert_eq!(verdict("current            105 mA\n"), Verdict::Thin);
        assert_eq!(verdict("current            84 mA\n"), Verdict::Over);
    }

    #[test]
    fn a_rating_that_is_not_stated_is_unchecked() {
        let m = bench(&[("    current            4 A\n", "")]);
        assert_eq!(
            (m.verdict, m.needs),
            (Verdict::Unchecked, vec!["device d3 current".to_owned()])
        );
    }
}
