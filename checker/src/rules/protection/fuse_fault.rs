//! protection.fuse-fault: a fuse that stands alone between a rail and the loudspeaker.

use crate::analysis::case::{Case, line_part, solved, stated};
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Margins, Stress};
use crate::build::Needs;
use crate::finding::{Part, Related, Site, Verdict, Witness};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A fuse is made to protect wiring. At twice its rating it may take minutes, and a rail into a voice
    /// coil is often little more than twice: the coil is charcoal before the fuse notices. A fuse that is
    /// quick enough for the coil is too quick for the music.
    "protection.fuse-fault",
    compares: "latest clearing time of a fuse that is the only d.c. protection, nominal mains, with what a loudspeaker stands",
    stress: "latest time at which the fuse has melted",
    rating: "",
    formula: "I = Vu/(Re + RE/N); time from the gates at 2.1, 2.75, 4 and 10 times the rating",
    source: "IEC 60127-2 pre-arcing gates; 50 ms is common practice",
    reads: ["supply.fuse", "protection.detector", "build.protection", "load.voice-coil", "load.dc", "stage.emitter", "stage.pairs", "build.loads", "build.ambient", "build.mains", "transformer.secondary"],
    sense: AtMost,
    unit: "s",
    allow: Allow::Fixed(0.05, 0.2), "common practice, no source",
    remedies: [Remedy { key: "supply.fuse", slot: "A", series: Series::R10, up: false }],
    example: "tern60", [("detector           1.5 V 22k 22 uF watches output", "detector           none")],
}

/// One margin for the fuse, where nothing else ends a d.c. fault.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    if !matches!(case.detector(), Ok(None)) {
        return;
    }
    let Ok(loads) = case.loads() else { return };
    for load in loads.iter().flatten() {
        match stress(case, load) {
            Ok(None) => {}
            Ok(Some((part, site, verdict, stress))) => match verdict {
                Some(verdict) => out.judge(&RULE, part, site, verdict, stress),
                None => out.compare(&RULE, part, site, Ok(stress)),
            },
            Err(needs) => {
                let field = &case.build.protection;
                out.compare(&RULE, line_part(field), field.site(), Err(needs));
            }
        }
    }
}

type Judged = (Part, Site, Option<Verdict>, Stress);

fn stress(case: &Case<'_>, load: &Driven) -> Result<Option<Judged>, Needs> {
    let fault = case.fault(load, case.unsagged(Mains::Nominal)?)?;
    let amps = fault.model.amps();
    let Some(alone) = case.fuse_alone(amps)? else {
        return Ok(None);
    };
    let name = case.supply()?.owner.name.clone();
    let part = Part {
        name: format!("{name} fuse {}", alone.fuse.place),
        block: name,
        key: "fuse",
        ..Part::default()
    };
    let multiple = amps / alone.fuse.rating;
    let mut stress = Stress {
        rating: f64::NAN,
        witness: Witness {
            mains_v: case.mains_volts(Mains::Nominal),
            load: Some(load.name.clone()),
            rail_v: Some(fault.rail.0),
            device_a: Some(amps.0),
            ..case.witness()
        },
        working: vec![
            solved(
                "Vu",
                "unsagged rail",
                "V0 - Vd",
                fault.rail.0,
                "V",
                "definition of the unsagged rail",
            ),
            solved(
                "I",
                "fault current",
                "Vu/(Re + RE/N)",
                amps.0,
                "A",
                "Ohm's law",
            ),
            stated(
                "In",
                "rating of the fuse",
                alone.fuse.rating.0,
                "A",
                [alone.fuse.site],
            ),
            solved("I/In", "times its rating", "", multiple, "1", ""),
        ],
        related: vec![Related {
            message: "the load of the fault".to_owned(),
            site: load.site,
        }],
        ..Stress::default()
    };
    let verdict = match alone.melted {
        Some(time) => {
            stress.value = time.0;
            stress.working.push(solved(
                "t",
                "melted at the latest",
                "next gate below I/In",
                time.0,
                "s",
                "IEC 60127-2",
            ));
            stress.note =
                "a miniature fuse may not even break the arc of direct current".to_owned();
            None
        }
        None => {
            stress.note =
                format!("at {multiple:.2} times its rating nothing is promised: it may never melt");
            Some(Verdict::Over)
        }
    };
    Ok(Some((part, alone.fuse.site, verdict, stress)))
}

#[cfg(test)]
#[allow(
    clippy::disallowed_methods,
    reason = "the twin must not share the functions under test"
)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, report, tern60};

    fn fuse(rating: &str) -> crate::finding::Margin {
        let kit = tern60(&[
            (
                "detector           1.5 V 22k 22 uF watches output",
                "detector           none",
            ),
            ("fuse rail          5 A fast", rating),
            (
                "loads              hall-8, bench-8",
                "loads              hall-8",
            ),
        ]);
        margin(&kit, "protection.fuse-fault", "toroid fuse rail")
    }

    #[test]
    fn gates_of_the_standard() {
        // 41.36984/5.7744 = 7.164353 A: 1.43 times 5 A, promises nothing
        assert_eq!(fuse("fuse rail          5 A fast").verdict, Verdict::Over);
        // 3.58 times 2 A quick: melted by 2 s (glass and ceramic, 2.75 times)
        let m = fuse("fuse rail          2 A fast");
        assert!((m.stress.unwrap().value - 2.0).abs() < 1e-12);
        // 14.3 times 0.5 A: 20 ms at 10 times, less above: 20·(10/14.33)^2 = 9.74 ms
        let m = fuse("fuse rail          500 mA fast");
        assert!(
            (m.stress.unwrap().value - 0.02 * 100.0 / (7.164_353_f64 / 0.5).powi(2)).abs() < 1e-6
        );
        assert_eq!(m.verdict, Verdict::Ok);
    }

    #[test]
    fn a_detector_leaves_the_fuse_out() {
        assert!(
            report(&tern60(&[])).builds[0]
                .margins
                .iter()
                .all(|m| m.rule != "protection.fuse-fault")
        );
    }
}
