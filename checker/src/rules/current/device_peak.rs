//! current.device-peak: the most loaded output device against its continuous current.

use crate::analysis::case::{solved, stated};
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress, case::Side};
use crate::build::Needs;
use crate::build::parts::{both, three};
use crate::finding::{Related, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A burst at full drive into the least impedance of a load, at high mains, is the most current
    /// the devices ever carry, and parallel devices never share it quite evenly. Beyond IC the gain
    /// has gone and the bond wires age with every peak; the peak rating ICM is for short pulses, not
    /// for music. The device that takes the most fails first and usually short.
    "current.device-peak",
    compares: "peak current of the most loaded output device, high mains, least impedance, with IC or ID",
    stress: "peak current of the most loaded device",
    rating: "continuous current",
    formula: "i = share·Î/N, Î = V(burst)/|Z|min, V(burst) = Vu - drop(Î)",
    source: "Ohm's law and current sharing: junction voltage and emitter resistor in balance; allowance common practice",
    reads: ["device.current", "stage.pairs", "stage.emitter", "stage.vbe-spread", "amplifier.drop", "build.loads", "build.mains", "build.rails", "transformer.secondary", "transformer.regulation", "device.gate-source"],
    sense: AtMost,
    unit: "A",
    allow: Allow::Percent(80.0), "common practice, no source",
    remedies: [
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
        Remedy { key: "device.current", slot: "A", series: Series::TwoDigits, up: true },
        Remedy { key: "transformer.secondary", slot: "V", series: Series::SecondaryVolts, up: false },
    ],
    example: "tern60", [("pairs              2", "pairs              1"), ("resistive 8 ohm", "resistive 3 ohm")],
}

/// One margin for each declared output device: the load that draws most.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let stage = case.output();
    for side in stage.sides() {
        let (part, site) = (|| case.device_part(stage, *side), stage.pairs.site());
        let loads = match case.loads() {
            Ok(loads) => loads,
            Err(needs) => {
                out.compare(&RULE, part(), site, Err(needs));
                continue;
            }
        };
        for load in loads {
            let found = load.as_ref().map_err(Clone::clone);
            if let Some(open) = found.as_ref().ok().and_then(|l| case.unknown_part(l)) {
                out.compare(&RULE, part(), site, Err(open));
            }
            out.compare(
                &RULE,
                part(),
                site,
                found.and_then(|l| stress(case, l, *side)),
            );
        }
    }
}

fn stress(case: &Case<'_>, load: &Driven, side: Side) -> Result<Stress, Needs> {
    let stage = case.output();
    let device = stage.device(side);
    let (rating, (volts, bank), (parallel, rail)) = three(
        device.current.need().copied(),
        case.greatest_current(Mains::High, load),
        both(case.bench(), case.unsagged(Mains::High)),
    )?;
    let parallel = parallel.bank(side);
    let most = parallel.most_loaded(bank);
    let spot = load.minimum_seen();
    let mut related = vec![Related {
        message: "its least impedance".to_owned(),
        site: load.site,
    }];
    related.extend(device.current.stated_at().map(|site| Related {
        message: "the rating".to_owned(),
        site,
    }));
    related.extend(case.build.amplifier.drop.stated_at().map(|site| Related {
        message: "what is lost of the rail".to_owned(),
        site,
    }));
    related.extend(case.rail_sites(None));
    Ok(Stress {
        value: most.0,
        rating: rating.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            load: Some(load.name.clone()),
            frequency_hz: (!load.load.is_flat()).then_some(spot.frequency.0),
            amplitude_v: Some(volts.0),
            rail_v: Some(rail.0),
            device_a: Some(most.0),
            bank_a: Some(bank.0),
            ..case.witness()
        },
        working: vec![
            solved(
                "Vu",
                "unsagged rail, high mains",
                "V0 - Vd",
                rail.0,
                "V",
                "definition of the unsagged rail",
            ),
            solved(
                "|Z|min",
                "least impedance that one channel sees, cold coil",
                "",
                spot.value,
                "ohm",
                "",
            ),
            solved(
                "V(burst)",
                "peak output",
                "Vu - drop(V(burst)/|Z|min)",
                volts.0,
                "V",
                "drop as stated",
            ),
            solved(
                "Î",
                "peak current of the bank",
                "V(burst)/|Z|min",
                bank.0,
                "A",
                "Ohm's law",
            ),
            stated(
                "N",
                "devices of one polarity",
                f64::from(parallel.devices()),
                "1",
                stage.pairs.stated_at(),
            ),
            solved(
                "share",
                "of the most loaded device",
                "I1·N/I",
                parallel.share(bank),
                "1",
                "junction voltage and emitter resistor in balance",
            ),
            solved("i", "through it", "share·Î/N", most.0, "A", ""),
            stated(
                "IC",
                "continuous current",
                rating.0,
                "A",
                device.current.stated_at(),
            ),
        ],
        related,
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Over, Thin, Unchecked};
    use crate::testing::{margin, tern60, verdict};

    /// One pair, no sharing to solve. V0 = 253/230·√2·28·1.07 = 46.6068 V, Vu = V0 - 1.0 = 45.6068 V.
    /// bench-8 at -5 %: 7.6 ohm; drop 1.8 V + (2/7) ohm·Î: Î = (45.6068 - 1.8)/(7.6 + 0.285714) =
    /// 43.8068/7.885714 = 5.55521 A. Hand calculation.
    #[test]
    fn one_pair_carries_the_whole_peak() {
        let text = tern60(&[
            ("pairs              2", "pairs              1"),
            (
                "loads              hall-8, bench-8",
                "loads              bench-8",
            ),
        ]);
        let m = margin(&text, RULE.name, "n16");
        assert!(
            (m.stress.unwrap().value - 5.55521).abs() < 1e-4,
            "{:?}",
            m.stress
        );
        assert!((m.allowance.unwrap().value - 12.8).abs() < 1e-12);
    }

    /// The same 5.55521 A against ratings set round it: 80 % of 6.95 A is 5.560 A, of 6.94 A 5.552 A;
    /// 5.555 A is below the stress.
    #[test]
    fn thin_and_over_meet_at_the_limits() {
        let with = |amps: &str| {
            tern60(&[
                ("pairs              2", "pairs              1"),
                (
                    "loads              hall-8, bench-8",
                    "loads              bench-8",
                ),
                ("current            16 A peak 28 A", amps),
            ])
        };
        let at = |amps: &str| verdict(&with(amps), RULE.name, "n16");
        assert_eq!(
            at("current            6.95 A peak 28 A"),
            crate::finding::Verdict::Ok
        );
        assert_eq!(at("current            6.94 A peak 28 A"), Thin);
        assert_eq!(at("current            5.56 A peak 28 A"), Thin);
        assert_eq!(at("current            5.55 A peak 28 A"), Over);
    }

    #[test]
    fn two_pairs_share_with_a_surplus() {
        let m = margin(&tern60(&[]), RULE.name, "n16");
        let (one, bank) = (m.witness.device_a.unwrap(), m.witness.bank_a.unwrap());
        // 20 mV and 5 % of 0.22 ohm: more than half, by less than a tenth
        assert!(one > bank / 2.0 && one < 1.1 * bank / 2.0, "{one} {bank}");
        assert_eq!(m.witness.load.as_deref(), Some("hall-8"));
    }

    /// Each half of a bridge sees half of the load, so its peak nearly doubles: with no drop it would
    /// double, with 2/7 ohm of it (3.8 + 0.286)/(7.6 + 0.286)... 43.8068/(3.8 + 0.285714) = 10.7220 A.
    #[test]
    fn bridged_sees_half_the_load() {
        let text = tern60(&[
            ("pairs              2", "pairs              1"),
            (
                "loads              hall-8, bench-8",
                "loads              bench-8",
            ),
            ("channels           1", "channels           2 bridged"),
        ]);
        let m = margin(&text, RULE.name, "n16");
        assert!(
            (m.stress.unwrap().value - 10.7220).abs() < 1e-3,
            "{:?}",
            m.stress
        );
    }

    #[test]
    fn what_is_missing_is_named() {
        let m = margin(
            &tern60(&[("    current            16 A peak 28 A\n", "")]),
            RULE.name,
            "n16",
        );
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (Unchecked, &["device n16 current".to_owned()][..])
        );
        let m = margin(
            &tern60(&[(
                "    drop               1.8 V at 0 A, 3.8 V at 7 A  # loaded rail to peak output\n",
                "",
            )]),
            RULE.name,
            "n16",
        );
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (Unchecked, &["amplifier tern60 drop".to_owned()][..])
        );
    }
}
