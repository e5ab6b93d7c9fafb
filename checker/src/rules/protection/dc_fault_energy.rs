//! protection.dc-fault-energy: what the voice coil takes until a d.c. fault is off.

use crate::analysis::case::{line_part, solved, stated};
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::both;
use crate::finding::{Related, Verdict, Witness};
use crate::physics::unit::{Joule, Second};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// What a coil stands in a d.c. fault is energy: the watts of the rail in the cold copper times the
    /// time until something opens. Where the maker of the loudspeaker, or a sacrificed one, has given the
    /// joules, they say more than any rule of thumb about milliseconds.
    "protection.dc-fault-energy",
    compares: "energy into a cold voice coil until a d.c. fault is off, high mains, with its endurance",
    stress: "energy into the coil",
    rating: "endurance",
    formula: "E = (Vu/(Re + RE/N))²·Re·t",
    source: "Ohm's law; time as in protection.dc-fault-time, or the clearing time of a fuse that stands alone, IEC 60127-2 gates",
    reads: ["load.endurance", "load.voice-coil", "load.dc", "protection.detector", "protection.contacts", "stage.emitter", "stage.pairs", "build.ambient", "build.mains", "supply.fuse"],
    sense: AtMost,
    unit: "J",
    allow: Allow::Percent(100.0), "common practice, no source",
    remedies: [
        Remedy { key: "protection.detector", slot: "F", series: Series::E12, up: false },
        Remedy { key: "protection.detector", slot: "ohm", series: Series::E12, up: false },
    ],
    example: "tern60", [("endurance          60 J", "endurance          5 J")],
}

/// One margin for each load that states joules; the others are left to the time.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let Ok(loads) = case.loads() else { return };
    for load in loads.iter().flatten() {
        let Some(joules) = load.stated.endurance.get().and_then(|e| e.0) else {
            continue;
        };
        let (part, site) = (line_part(&load.stated.endurance), blamed(case));
        match energy(case, load, joules) {
            Ok(None) => {}
            Ok(Some((verdict, stress))) => match verdict {
                Some(verdict) => out.judge(&RULE, part, site, verdict, stress),
                None => out.compare(&RULE, part, site, Ok(stress)),
            },
            Err(needs) => out.compare(&RULE, part, site, Err(needs)),
        }
    }
}

fn blamed(case: &Case<'_>) -> crate::finding::Site {
    let detector = case
        .build
        .protection
        .get()
        .and_then(|p| p.detector.stated_at());
    detector.unwrap_or_else(|| case.build.protection.site())
}

/// The energy, or a verdict where it has no end; `None` where nothing ends a fault: that is
/// `protection.absent`.
fn energy(
    case: &Case<'_>,
    load: &Driven,
    endurance: Joule,
) -> Result<Option<(Option<Verdict>, Stress)>, Needs> {
    let rail = case.unsagged(Mains::High)?;
    let (fault, off) = both(case.fault(load, rail), case.off(Mains::High))?;
    let (time, by): (Option<Second>, _) = match off {
        Some(off) => (off.time(), "the detector and what it opens"),
        None => match case.fuse_alone(fault.model.amps())? {
            Some(alone) => (alone.melted, "a fuse alone"),
            None => return Ok(None),
        },
    };
    let mut stress = Stress {
        rating: endurance.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            load: Some(load.name.clone()),
            rail_v: Some(rail.0),
            device_a: Some(fault.model.amps().0),
            power_w: Some(fault.model.coil_watts().0),
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
                "Re",
                "cold coil",
                "Re·(1 + 0.0039·(Tmin - 20))",
                fault.coil.0,
                "ohm",
                "temperature coefficient of copper",
            ),
            solved(
                "I",
                "fault current",
                "Vu/(Re + RE/N)",
                fault.model.amps().0,
                "A",
                "Ohm's law",
            ),
            solved(
                "P",
                "into the coil",
                "I²·Re",
                fault.model.coil_watts().0,
                "W",
                "Ohm's law",
            ),
            stated(
                "Emax",
                "endurance",
                endurance.0,
                "J",
                load.stated.endurance.stated_at(),
            ),
        ],
        related: vec![Related {
            message: "what the coil stands".to_owned(),
            site: load.stated.endurance.site(),
        }],
        ..Stress::default()
    };
    let Some((time, joules)) = time.and_then(|t| Some((t, fault.model.coil_joules(t)?))) else {
        stress.note = format!("{by} is not sure ever to end it");
        return Ok(Some((Some(Verdict::Over), stress)));
    };
    stress.value = joules.0;
    stress.working.push(solved("t", by, "", time.0, "s", ""));
    stress.working.push(solved(
        "E",
        "energy into the coil",
        "P·t",
        joules.0,
        "J",
        "definition of energy",
    ));
    Ok(Some((None, stress)))
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, report, tern60};

    #[test]
    fn watts_in_the_cold_coil_until_it_is_off() {
        // Vu(hi) = 45.60682 V; Re at 10 degC = 5.9·(1 - 0.039) = 5.6699 ohm, RE/N = 0.22·0.95/2 = 0.1045
        // I = 7.898105 A, P = 353.6861 W; t = -0.484·ln(1 - 1.5/45.60682) + 0.012 = 28.18638 ms
        // E = 9.96913 J
        let m = margin(
            &tern60(&[]),
            "protection.dc-fault-energy",
            "hall-8 endurance",
        );
        assert!(
            (m.stress.unwrap().value - 9.969_1).abs() < 2e-3,
            "{:?}",
            m.stress
        );
        assert_eq!(m.verdict, Verdict::Ok);
    }

    #[test]
    fn a_fuse_below_twice_its_rating_promises_nothing() {
        // 7.9 A through 5 A is 1.58 times
        let kit = tern60(&[(
            "detector           1.5 V 22k 22 uF watches output",
            "detector           none",
        )]);
        let m = margin(&kit, "protection.dc-fault-energy", "hall-8 endurance");
        assert_eq!(m.verdict, Verdict::Over);
        assert!(m.note.contains("a fuse alone"));
    }

    #[test]
    fn a_load_without_endurance_is_left_to_the_time() {
        let kit = tern60(&[("    endurance          60 J\n", "")]);
        assert!(
            report(&kit).builds[0]
                .margins
                .iter()
                .all(|m| m.rule != "protection.dc-fault-energy")
        );
    }
}
