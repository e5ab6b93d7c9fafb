//! current.device-share: how unevenly parallel devices carry the peak.

use crate::analysis::case::{Side, solved, stated};
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{both, three};
use crate::finding::{Related, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// Parallel devices carry equal currents only as far as their emitter resistors make them. One with
    /// a lower base-emitter voltage takes more, warms up more than its neighbours, and takes more
    /// still. Builders who halve the resistors for less distortion halve what keeps the devices equal,
    /// and the first device to die takes the others along.
    "current.device-share",
    compares: "share of the most loaded parallel device at peak current, 1 being an even share",
    stress: "share of the most loaded device at peak current",
    rating: "limit",
    formula: "share = I1·N/I with VT·ln(I1/I2) + I1·RE·(1 - tolerance) - I2·RE = ΔVBE, I1 + (N - 1)·I2 = I",
    source: "equal base-emitter loops, VT 25.7 mV; Banwell & Jayakumar, Electronics Letters 36(4) 2000; limits common practice, no source",
    reads: ["stage.pairs", "stage.emitter", "stage.vbe-spread", "device.gate-source", "amplifier.drop", "build.loads"],
    sense: AtMost,
    unit: "1",
    allow: Allow::Fixed(1.25, 1.5), "common practice, no source",
    remedies: [
        Remedy { key: "stage.emitter", slot: "ohm", series: Series::E12, up: true },
    ],
    example: "tern60", [("emitter            0R22 ±5 % 5 W", "emitter            0R01 ±5 % 5 W"), ("vbe-spread         20 mV", "vbe-spread         60 mV")],
}

/// One margin for each declared output device, where several are in parallel: at the peak of the load
/// at which they share least evenly.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let stage = case.output();
    if stage.pairs.get() == Some(&1) {
        return;
    }
    for side in stage.sides() {
        out.compare(
            &RULE,
            case.device_part(stage, *side),
            stage.emitter.site(),
            stress(case, *side),
        );
    }
}

/// The load at whose peak the devices of a side share least evenly: a small peak leaves it to the
/// junctions, a large one to the resistors, and either can be the worse.
fn least_even<'c>(case: &'c Case<'_>, side: Side) -> Result<&'c Driven, Needs> {
    let bank = case.bench()?.bank(side);
    let mut worst: Option<(&Driven, f64)> = None;
    for load in case.loads()? {
        let load = load.as_ref().map_err(Clone::clone)?;
        let share = bank.share(case.greatest_current(Mains::High, load)?.1);
        if worst.is_none_or(|(_, w)| share > w) {
            worst = Some((load, share));
        }
    }
    worst.map(|w| w.0).ok_or_else(|| case.build.loads.missing())
}

fn stress(case: &Case<'_>, side: Side) -> Result<Stress, Needs> {
    let stage = case.output();
    let (bench, load, rail) = three(
        case.bench(),
        least_even(case, side),
        case.unsagged(Mains::High),
    )?;
    let (volts, peak) = case.greatest_current(Mains::High, load)?;
    let bank = bench.bank(side);
    let share = bank.share(peak);
    let mut working = vec![
        solved(
            "Î",
            "peak current of the bank",
            "V(burst)/|Z|min",
            peak.0,
            "A",
            "Ohm's law",
        ),
        stated(
            "N",
            "devices of one polarity",
            f64::from(bank.devices()),
            "1",
            stage.pairs.stated_at(),
        ),
        stated(
            "RE",
            "emitter resistor, nominal",
            bank.emitter().0,
            "ohm",
            stage.emitter.stated_at(),
        ),
        solved(
            "I1",
            "through the most loaded",
            "",
            bank.most_loaded(peak).0,
            "A",
            "equal base-emitter loops",
        ),
        solved(
            "I2",
            "through each other",
            "",
            bank.least_loaded(peak).0,
            "A",
            "equal base-emitter loops",
        ),
        solved("share", "of the most loaded", "I1·N/Î", share, "1", ""),
    ];
    if let Ok(idle) = case.idle() {
        working.push(solved(
            "share(idle)",
            "at the idle current, for information",
            "I1·N/I",
            bank.share(idle * f64::from(bank.devices())),
            "1",
            "equal base-emitter loops",
        ));
    }
    let (spread, _) = both(stage.vbe_spread.need().copied(), Ok(()))?;
    working.push(stated(
        "ΔVBE",
        "spread between the devices",
        spread.0,
        "V",
        stage.vbe_spread.stated_at(),
    ));
    let mut related = vec![Related {
        message: "draws the peak".to_owned(),
        site: load.site,
    }];
    related.extend(stage.vbe_spread.stated_at().map(|site| Related {
        message: "spread between the devices".to_owned(),
        site,
    }));
    Ok(Stress {
        value: share,
        rating: f64::NAN,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            load: Some(load.name.clone()),
            amplitude_v: Some(volts.0),
            rail_v: Some(rail.0),
            device_a: Some(bank.most_loaded(peak).0),
            bank_a: Some(peak.0),
            ..case.witness()
        },
        working,
        related,
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Over, Thin, Unchecked};
    use crate::testing::{margin, report, tern60, verdict};

    /// With no resistor the ratio is exp(ΔV/VT) = exp(20/25.7) = 2.1775 whatever the current, so of two
    /// devices the greater carries 2·2.1775/3.1775 = 1.3706 times its even part: thin. At 28.3 mV it is
    /// 2·3.0079/4.0079 = 1.501: over; at 13 mV 2·1.6584/2.6584 = 1.2477: ok. Hand calculation.
    #[test]
    fn without_resistors_the_junctions_decide() {
        let with = |spread: &str| {
            tern60(&[
                (
                    "emitter            0R22 ±5 % 5 W pulse 20 A ref R21-R24 part \"WW5-0R22J\"",
                    "emitter            none",
                ),
                ("50 mA per device, 11 mV across emitter", "50 mA per device"),
                ("vbe-spread         20 mV", spread),
            ])
        };
        let m = margin(&with("vbe-spread         20 mV"), RULE.name, "n16");
        assert!(
            (m.stress.unwrap().value - 1.3706).abs() < 5e-4,
            "{:?}",
            m.stress
        );
        assert_eq!(m.verdict, Thin);
        assert_eq!(
            verdict(&with("vbe-spread         28.3 mV"), RULE.name, "n16"),
            Over
        );
        assert_eq!(
            verdict(&with("vbe-spread         13 mV"), RULE.name, "n16"),
            Ok
        );
    }

    #[test]
    fn one_pair_has_nothing_to_share() {
        let found = report(&tern60(&[("pairs              2", "pairs              1")]));
        assert!(!found.builds[0].margins.iter().any(|m| m.rule == RULE.name));
    }

    #[test]
    fn an_unstated_resistor_is_named() {
        let m = margin(
            &tern60(&[
                (
                    "emitter            0R22 ±5 % 5 W pulse 20 A ref R21-R24 part \"WW5-0R22J\"",
                    "",
                ),
                ("50 mA per device, 11 mV across emitter", "50 mA per device"),
            ]),
            RULE.name,
            "n16",
        );
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (Unchecked, &["stage out emitter".to_owned()][..])
        );
    }
}
