//! voltage.gate: the gate of a MOSFET output stage.

use crate::analysis::case::{solved, stated};
use crate::analysis::rails::Mains;
use crate::analysis::{Case, Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Device, Flavour, Stage, both};
use crate::finding::Witness;
use crate::physics::unit::Volt;
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// With its output shorted to ground, a source follower is still driven to the rail: the whole
    /// driver supply then stands between gate and source. A gate is punctured in microseconds and
    /// never heals. A zener diode from gate to source holds the voltage down and costs pennies.
    "voltage.gate",
    compares: "gate-source voltage of an output MOSFET, output shorted, with its gate limit",
    stress: "gate-source voltage with the output shorted, high mains",
    rating: "gate-source limit",
    formula: "VGS = V0 + Vdr, or the zener's voltage if that is less; Vdr = stated driver rail x V0(high)/V0(nominal)",
    source: "node voltages",
    reads: ["device.vgs", "stage.gate-zener", "stage.driver-rail", "transformer.secondary", "transformer.regulation", "build.mains", "build.rails"],
    sense: AtMost,
    unit: "V",
    allow: Allow::Percent(90.0), "common practice, no source",
    remedies: [
        Remedy { key: "stage.gate-zener", slot: "V", series: Series::E24, up: false },
    ],
    example: "heron80-mosfet", [("gate-zener          12 V", "gate-zener          none")],
}

/// One margin for each declared MOSFET of the output stage.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let stage = case.output();
    for side in stage.sides() {
        let device = stage.device(*side);
        if device.flavour == Flavour::Mosfet {
            let site = stage.gate_zener.stated_at().unwrap_or(stage.devices.site());
            out.compare(
                &RULE,
                case.device_part(stage, *side),
                site,
                stress(case, stage, device),
            );
        }
    }
}

fn stress(case: &Case<'_>, stage: &Stage, device: &Device) -> Result<Stress, Needs> {
    let (limit, rail) = both(device.gate_limit.need().copied(), case.driver_supply())?;
    let zener = stage.gate_zener.get().copied();
    let gate = zener.map_or(rail, |z: Volt| z.min(rail));
    let mut working = vec![solved(
        "Vdrive",
        "driver rail, high mains",
        "V0 + Vdr",
        rail.0,
        "V",
        "node voltages",
    )];
    working
        .extend(zener.map(|z| stated("VZ", "gate zener", z.0, "V", stage.gate_zener.stated_at())));
    working.push(stated(
        "VGSS",
        "gate limit",
        limit.0,
        "V",
        device.gate_limit.stated_at(),
    ));
    Ok(Stress {
        value: gate.0,
        rating: limit.0,
        witness: Witness {
            mains_v: case.mains_volts(Mains::High),
            rail_v: Some(rail.0),
            channels_driven: None,
            ..case.witness()
        },
        working,
        related: case.rail_sites(
            device
                .gate_limit
                .stated_at()
                .map(|site| ("the limit", site)),
        ),
        note: if zener.is_none() {
            "nothing clamps the gate".to_owned()
        } else {
            String::new()
        },
        ..Stress::default()
    })
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{edited, kit, margin, report, tern60};

    fn fet(edits: &[(&str, &str)]) -> String {
        edited(&kit("heron80-mosfet"), edits)
    }

    /// 12 V across a 14 V gate is 95 % of 12.6 V; 13 V is past 12.6 V; 15 V past the limit. By hand.
    #[test]
    fn the_zener_holds_it() {
        let at = |zener: &str| {
            margin(
                &fet(&[(
                    "gate-zener          12 V",
                    &format!("gate-zener          {zener} V"),
                )]),
                super::RULE.name,
                "ln16",
            )
        };
        assert!((at("12").used_percent.unwrap() - 95.238).abs() < 1e-3);
        assert_eq!(at("13").verdict, Verdict::Thin);
        assert_eq!(at("15").verdict, Verdict::Over);
    }

    /// No zener: the whole rail, 253/230·√2·32·1.06 = 52.7671 V. By hand.
    #[test]
    fn without_a_zener_the_rail_stands_on_the_gate() {
        let m = margin(
            &fet(&[("gate-zener          12 V", "gate-zener          none")]),
            super::RULE.name,
            "ln16",
        );
        assert!((m.stress.unwrap().value - 52.7671).abs() < 1e-3);
        assert_eq!(m.verdict, Verdict::Over);
    }

    #[test]
    fn says_what_is_missing_and_leaves_bipolar_stages_alone() {
        let m = margin(
            &fet(&[("    vgs                14 V\n", "")]),
            super::RULE.name,
            "ln16",
        );
        assert_eq!(m.needs, ["device ln16 vgs"]);
        assert!(
            report(&tern60(&[])).builds[0]
                .margins
                .iter()
                .all(|m| m.rule != super::RULE.name)
        );
    }
}
