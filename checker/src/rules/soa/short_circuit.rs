//! soa.short-circuit: a shorted output, with what limits it.

use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::finding::{Site, Verdict};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A loudspeaker plug half pulled out, or a probe that slips, puts the whole rail across the output
    /// devices at whatever current the limiter lets through. The devices must stand that point, and its
    /// heat until the fuse or the cutout acts. Without a limiter the transistors are faster than any
    /// fuse; that is counted, and an error only where the build claims to survive a short.
    "soa.short-circuit",
    compares: "current of the most loaded device with the output shorted with what curve and junction allow",
    stress: "current of the most loaded device, output shorted",
    rating: "current that safe area and junction allow",
    formula: "v = Vu - i·RE on the limit line; P = ½·Vu·i, Tj = Ts + P·(θcs + θjc)",
    source: "Kirchhoff's laws; sine drive holds the limit for half of each period",
    reads: ["protection.limit-line", "protection.limiter", "protection.limiter-break", "protection.cutout", "build.protection", "build.survives-short", "device.soa", "device.junction-case", "stage.insulator", "stage.pairs", "stage.emitter", "heatsink.resistance", "supply.fuse"],
    sense: AtMost,
    unit: "A",
    allow: Allow::Percent(100.0), "the derated data sheet itself",
    remedies: [
        Remedy { key: "protection.limiter", slot: "base", series: Series::E24, up: true },
        Remedy { key: "stage.pairs", slot: "n", series: Series::Count, up: true },
    ],
    example: "tern60", [("3.6 A at 50 V, 1.8 A at 70 V", "6.4 A at 70 V")],
}

/// One margin for each declared output device.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let stage = case.output();
    for side in stage.sides() {
        let part = || case.device_part(stage, *side);
        if let Some((needs, site)) = without(case) {
            if case.build.survives_short {
                let note = format!(
                    "the build claims to survive a short, and {}",
                    case.acts_instead()
                );
                out.judge(
                    &RULE,
                    part(),
                    site,
                    Verdict::Over,
                    Stress {
                        witness: case.witness(),
                        note,
                        ..Stress::default()
                    },
                );
            } else {
                out.compare(&RULE, part(), site, Err(needs));
            }
            continue;
        }
        let site = case.limiter_site();
        for played in case.played() {
            match played.and_then(|(_, heat)| case.short_stresses(&RULE, heat, *side)) {
                Err(needs) => out.compare(&RULE, part(), site, Err(needs)),
                Ok(stresses) => stresses
                    .into_iter()
                    .for_each(|s| out.compare(&RULE, part(), site, Ok(s))),
            }
        }
    }
}

/// What is missing where no limiter is declared, and where that could be said.
fn without(case: &Case<'_>) -> Option<(Needs, Site)> {
    let field = &case.build.protection;
    let acts = Needs::because(case.acts_instead());
    match field.get() {
        Some(p) if p.limiter.get().is_some() || p.limit_line.get().is_some() => None,
        Some(p) if p.limiter.none || p.limit_line.none => Some((acts, p.limiter.site())),
        Some(p) => Some((p.limiter.missing().and(acts), p.limiter.site())),
        None if field.none => Some((acts, field.site())),
        None => Some((field.missing().and(acts), field.site())),
    }
}

#[cfg(test)]
mod tests {
    use super::RULE;
    use crate::finding::Verdict::{Ok, Over, Unchecked};
    use crate::testing::{edited, margin, tern60, verdict};

    const LINE: &str = "    limit-line bank    10 A at 0 V, 10 A at 15 V, 6.4 A at 30 V, 3.6 A at 50 V, 1.8 A at 70 V, 1 A at 95 V\n";

    /// A flat line of 4 A for the device, one pair: v = 45.6068 - 4·0.22 = 44.7268 V. The curve allows
    /// k·3.6·(50/44.7268)^0.98515 = k·4.0177 A, some 2.5 A. Mean heat ½·45.6068·4 = 91.2136 W on a sink at
    /// the cutout's latest, 85 + 5 + 4 = 94 degC: Tj = 94 + 91.2136·(0.35 + 0.69) = 188.862 degC; Tj,max allows
    /// 4·(150 - 94)/(188.862 - 94) = 2.36133 A, the lesser. Hand calculation.
    #[test]
    fn the_mean_heat_decides_by_hand() {
        let text = tern60(&[
            ("pairs              2", "pairs              1"),
            (LINE, "    limit-line device   4 A at 0 V\n"),
            ("cutout             80 degC", "cutout             85 degC"),
        ]);
        let m = margin(&text, RULE.name, "n16");
        assert!((m.stress.unwrap().value - 4.0).abs() < 1e-9);
        assert!(
            (m.rating.unwrap().value - 2.36133).abs() < 1e-4,
            "{:?}",
            m.rating
        );
        assert!((m.witness.device_v.unwrap() - 44.7268).abs() < 1e-3);
        assert_eq!(m.verdict, Over);
        // 2.3 A: Tj = 94 + 52.4478·1.04 = 148.55 degC, and the curve has more
        assert_eq!(
            verdict(
                &text.replace("device   4 A at 0 V", "device   2.3 A at 0 V"),
                RULE.name,
                "n16"
            ),
            Ok
        );
    }

    #[test]
    fn no_limiter_is_counted_and_an_error_only_where_claimed() {
        let bare = tern60(&[(LINE, "")]);
        let m = margin(&bare, RULE.name, "n16");
        assert_eq!(m.verdict, Unchecked);
        assert_eq!(m.needs, ["protection guard limiter"]);
        assert!(m.note.contains("5.000 A rail fuse"), "{}", m.note);
        let claimed = edited(
            &bare,
            &[("duty               1/8", "duty 1/8\n    survives-short yes")],
        );
        assert_eq!(verdict(&claimed, RULE.name, "n16"), Over);
        let none = tern60(&[(
            LINE,
            "    limit-line         none\n    limiter            none\n",
        )]);
        let m = margin(&none, RULE.name, "n16");
        assert_eq!((m.verdict, m.needs.len()), (Unchecked, 0));
    }
}
