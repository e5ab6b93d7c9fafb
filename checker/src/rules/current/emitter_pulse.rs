//! current.emitter-pulse: peak current of an emitter resistor against its stated pulse current.

use crate::analysis::case::{Side, line_part, solved, stated};
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{both, three};
use crate::finding::{Related, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// Wattage is what people argue about, but an emitter resistor fails by pulses: a bass note at
    /// full drive puts many times its mean power into a short piece of wire or film, half-cycle after
    /// half-cycle. Film types crack where wirewound ones stand it. A resistor that opens leaves its
    /// device out and the rest overloaded; both opening puts d.c. on the loudspeaker.
    "current.emitter-pulse",
    compares: "peak current of the most loaded emitter resistor with its stated pulse current",
    stress: "peak current of the most loaded device",
    rating: "pulse current of the emitter resistor",
    formula: "i = share·Î/N, Î = V(burst)/|Z|min at high mains",
    source: "Ohm's law and current sharing; the rating is the maker's own",
    reads: ["stage.emitter", "stage.pairs", "stage.vbe-spread", "amplifier.drop", "build.loads", "build.mains"],
    sense: AtMost,
    unit: "A",
    allow: Allow::Percent(100.0), "the maker's figure itself, no source for a lower one",
    remedies: [
        Remedy { key: "stage.emitter", slot: "pulse", series: Series::TwoDigits, up: true },
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
    ],
    example: "tern60", [("pulse 20 A", "pulse 2 A")],
}

/// One margin for the build's emitter resistors.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let field = &case.output().emitter;
    if field.none {
        return;
    }
    let loads = match case.loads() {
        Ok(loads) => loads,
        Err(needs) => return out.compare(&RULE, line_part(field), field.site(), Err(needs)),
    };
    for load in loads {
        for side in case.unlike_banks() {
            let found = load.as_ref().map_err(Clone::clone);
            if let Some(open) = found.as_ref().ok().and_then(|l| case.unknown_part(l)) {
                out.compare(&RULE, line_part(field), field.site(), Err(open));
            }
            out.compare(
                &RULE,
                line_part(field),
                field.site(),
                found.and_then(|l| stress(case, l, *side)),
            );
        }
    }
}

fn stress(case: &Case<'_>, load: &Driven, side: Side) -> Result<Stress, Needs> {
    let field = &case.output().emitter;
    let (pulse, (volts, peak), (bench, rail)) = three(
        field.part("pulse", |r| r.pulse),
        case.greatest_current(Mains::High, load),
        both(case.bench(), case.unsagged(Mains::High)),
    )?;
    let bank = bench.bank(side);
    let most = bank.most_loaded(peak);
    Ok(Stress {
        value: most.0,
        rating: pulse.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            load: Some(load.name.clone()),
            amplitude_v: Some(volts.0),
            rail_v: Some(rail.0),
            device_a: Some(most.0),
            bank_a: Some(peak.0),
            ..case.witness()
        },
        working: vec![
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
                case.output().pairs.stated_at(),
            ),
            solved(
                "share",
                "of the most loaded device",
                "I1·N/I",
                bank.share(peak),
                "1",
                "junction voltage and emitter resistor in balance",
            ),
            solved("i", "through its resistor", "share·Î/N", most.0, "A", ""),
            stated("Ipulse", "pulse current", pulse.0, "A", field.stated_at()),
        ],
        related: vec![Related {
            message: "its least impedance".to_owned(),
            site: load.site,
        }],
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Over, Unchecked};
    use crate::testing::{margin, tern60, verdict};

    /// 5.55521 A as worked out by hand for one pair into 7.6 ohm in current.device-peak.
    #[test]
    fn the_peak_against_the_stated_pulse() {
        let with = |pulse: &str| {
            tern60(&[
                ("pairs              2", "pairs              1"),
                (
                    "loads              hall-8, bench-8",
                    "loads              bench-8",
                ),
                ("pulse 20 A", pulse),
            ])
        };
        let m = margin(&with("pulse 20 A"), RULE.name, "out emitter");
        assert!((m.stress.unwrap().value - 5.55521).abs() < 1e-4);
        assert_eq!(verdict(&with("pulse 5.56 A"), RULE.name, "out emitter"), Ok);
        assert_eq!(
            verdict(&with("pulse 5.55 A"), RULE.name, "out emitter"),
            Over
        );
    }

    #[test]
    fn an_unstated_pulse_is_named() {
        let m = margin(&tern60(&[(" pulse 20 A", "")]), RULE.name, "out emitter");
        assert_eq!(
            (m.verdict, m.needs.as_slice()),
            (Unchecked, &["stage out emitter pulse".to_owned()][..])
        );
    }
}
