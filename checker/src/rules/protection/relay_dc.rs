//! protection.relay-dc: whether what opens can break the rail on a loudspeaker.

use crate::analysis::case::{Case, line_part, solved, stated};
use crate::analysis::fault::Fault;
use crate::analysis::loads::Driven;
use crate::analysis::rails::Mains;
use crate::analysis::{Margins, Stress};
use crate::build::Needs;
use crate::build::parts::{Protection, both};
use crate::finding::{Measure, Part, Related, Site, Verdict, Witness};
use crate::physics::protection::{ASSUMED_BREAK_VOLTS, BreakLimit, DcBreak};
use crate::physics::unit::{Amp, Volt};
use crate::rule::{Allow, Remedy, Series};

rule! {
    /// A relay breaks alternating current easily, because it is zero a hundred times a second. Direct
    /// current from a rail keeps an arc alive between the open contacts: the relay clicks, the arc carries
    /// on, and the loudspeaker burns behind a protection that looks as if it had worked. A figure of
    /// 250 V a.c. says nothing about 50 V d.c.; the same relay is often good for 30 V.
    "protection.relay-dc",
    compares: "fault current, high mains, cold coil, with what a contact breaks in direct current at the rail's voltage",
    stress: "fault current",
    rating: "direct current that the contact breaks at this voltage",
    formula: "I = V0/(Re + RE/N) at V0; between two stated points log-log, never extended to more volts",
    source: "Ohm's law; d.c. break figures of relay makers, from memory",
    reads: ["protection.relay", "protection.switch", "build.protection", "load.voice-coil", "load.dc", "stage.emitter", "stage.pairs", "build.loads", "build.ambient", "build.mains", "transformer.secondary", "transformer.regulation"],
    sense: AtMost,
    unit: "A",
    allow: Allow::Percent(100.0), "the maker's own figure; a solid-state switch also 80 % of its volts, common practice, no source",
    remedies: [Remedy { key: "protection.relay", slot: "A", series: Series::TwoDigits, up: true }, Remedy { key: "protection.relay", slot: "V", series: Series::TwoDigits, up: true }],
    example: "tern60", [("relay              10 A at 60 Vdc, 16 A at 250 Vac", "relay              16 A at 250 Vac")],
}

/// Part of its rated volts that a solid-state switch may see.
const SWITCH_VOLTS: f64 = 0.8;

/// One margin for the relay or switch: the load with the greatest fault current.
pub fn check(case: &Case<'_>, out: &mut Margins<'_>) {
    let build = &case.build.protection;
    let Some(protection) = build.get() else {
        if !build.none {
            out.compare(&RULE, line_part(build), build.site(), Err(build.missing()));
        }
        return;
    };
    let switched = protection.switch.get().is_some();
    if protection.relay.get().is_none()
        && (protection.relay.none || protection.crowbar.get().is_some())
        && !switched
    {
        return;
    }
    let loads = match case.loads() {
        Ok(loads) => loads,
        Err(needs) => {
            return out.compare(
                &RULE,
                line_part(&protection.relay),
                protection.relay.site(),
                Err(needs),
            );
        }
    };
    for load in loads {
        let fault = case.no_load(Mains::High).and_then(|v0| {
            let load = load.as_ref().map_err(Clone::clone)?;
            Ok((load, case.fault(load, v0)?))
        });
        if switched {
            let opened = Opened {
                case,
                protection,
                part: line_part(&protection.switch),
                site: protection.switch.site(),
            };
            opened.switch(&fault, out);
        }
        if protection.relay.get().is_some() || !switched {
            let opened = Opened {
                case,
                protection,
                part: line_part(&protection.relay),
                site: protection.relay.site(),
            };
            opened.relay(&fault, out);
        }
    }
}

struct Opened<'c> {
    case: &'c Case<'c>,
    protection: &'c Protection,
    part: Part,
    site: Site,
}

type AtLoad<'l> = Result<(&'l Driven, Fault), Needs>;

impl Opened<'_> {
    fn relay(&self, fault: &AtLoad<'_>, out: &mut Margins<'_>) {
        match both(fault.clone(), self.breaks()) {
            Err(needs) => out.compare(&RULE, self.part.clone(), self.site, Err(needs)),
            Ok(((load, fault), (curve, assumed))) => match curve.limit(fault.rail) {
                Some(BreakLimit::Allowed(amps)) => out.compare(
                    &RULE,
                    self.part.clone(),
                    self.site,
                    Ok(self.stress(load, &fault, amps)),
                ),
                Some(BreakLimit::AboveStated { highest }) => {
                    let mut stress = self.stress(load, &fault, Amp::ZERO);
                    let why = if assumed {
                        "no d.c. figure is stated, and such contacts break their amperes only up to"
                    } else {
                        "the contact is stated for d.c. only up to"
                    };
                    stress.note = format!(
                        "{:.1} V stand across it when it opens; {why} {:.0} V",
                        fault.rail.0, highest.0
                    );
                    out.judge(&RULE, self.part.clone(), self.site, Verdict::Over, stress);
                }
                None => out.compare(
                    &RULE,
                    self.part.clone(),
                    self.site,
                    Err(Needs::because("the fault has no voltage")),
                ),
            },
        }
    }

    /// The d.c. figures of the contact; those that a sheet without any is taken to mean, and that it
    /// is so.
    fn breaks(&self) -> Result<(DcBreak, bool), Needs> {
        let relay = &self.protection.relay;
        let groups = relay.need()?;
        let mut points: Vec<(Volt, Amp)> =
            groups.iter().filter(|g| g.2).map(|g| (g.1, g.0)).collect();
        let assumed = points.is_empty();
        if assumed {
            let amps = groups
                .iter()
                .map(|g| g.0)
                .reduce(Amp::min)
                .ok_or_else(|| relay.missing())?;
            points.push((ASSUMED_BREAK_VOLTS, amps));
            let key = format!("protection {} relay d.c.", self.protection.owner.name);
            self.case.assume(
                key,
                Measure::new(ASSUMED_BREAK_VOLTS.0, "V"),
                "usual where a sheet states alternating current only",
                relay.site(),
            );
        }
        let curve = DcBreak::new(&points).ok_or_else(|| {
            Needs::because(format!(
                "the relay figures of protection {} contradict each other",
                self.protection.owner.name
            ))
        })?;
        Ok((curve, assumed))
    }

    fn switch(&self, fault: &AtLoad<'_>, out: &mut Margins<'_>) {
        match both(fault.clone(), self.protection.switch.need().copied()) {
            Err(needs) => out.compare(&RULE, self.part.clone(), self.site, Err(needs)),
            Ok(((load, fault), (volts, amps, ..))) => {
                let mut stress = self.stress(load, &fault, amps);
                let part = fault.rail / volts;
                if part <= SWITCH_VOLTS {
                    return out.compare(&RULE, self.part.clone(), self.site, Ok(stress));
                }
                stress.note = format!(
                    "{:.1} V stand across the open switch: {:.0} % of its {:.0} V, 80 % is allowed",
                    fault.rail.0,
                    100.0 * part,
                    volts.0
                );
                let verdict = if part > 1.0 || fault.model.amps() > amps {
                    Verdict::Over
                } else {
                    Verdict::Thin
                };
                out.judge(&RULE, self.part.clone(), self.site, verdict, stress);
            }
        }
    }

    fn stress(&self, load: &Driven, fault: &Fault, amps: Amp) -> Stress {
        let case = self.case;
        let mut working = vec![
            solved(
                "V0",
                "rail, no load, high mains",
                "m·√2·Vs·(1 + ρ)",
                fault.rail.0,
                "V",
                "definition of regulation",
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
                "V0/(Re + RE/N)",
                fault.model.amps().0,
                "A",
                "Ohm's law",
            ),
        ];
        if amps > Amp::ZERO {
            working.push(stated(
                "Ibreak",
                "may be broken at this voltage",
                amps.0,
                "A",
                [self.site],
            ));
        }
        let mut related = case.rail_sites(None);
        related.push(Related {
            message: "the load of the fault".to_owned(),
            site: load.site,
        });
        Stress {
            value: fault.model.amps().0,
            rating: amps.0,
            witness: Witness {
                mains_v: case.mains_volts(Mains::High),
                load: Some(load.name.clone()),
                rail_v: Some(fault.rail.0),
                device_v: Some(fault.rail.0),
                device_a: Some(fault.model.amps().0),
                ..case.witness()
            },
            working,
            related,
            ..Stress::default()
        }
    }
}

#[cfg(test)]
mod tests {
    use crate::finding::Verdict;
    use crate::testing::{margin, tern60};

    const RELAY: &str = "relay              10 A at 60 Vdc, 16 A at 250 Vac";

    fn relay(text: &str) -> crate::finding::Margin {
        margin(
            &tern60(&[(RELAY, text)]),
            "protection.relay-dc",
            "guard relay",
        )
    }

    #[test]
    fn the_cold_coil_on_the_unloaded_rail() {
        // V0(hi) = 46.60682 V; 5.9·0.961 + 0.22·0.95/2 = 5.6699 + 0.1045 = 5.7744 ohm: 8.071284 A
        let m = relay(RELAY);
        assert!(
            (m.stress.unwrap().value - 8.071_28).abs() < 1e-5,
            "{:?}",
            m.stress
        );
        assert!((m.rating.unwrap().value - 10.0).abs() < 1e-12);
        assert_eq!(m.verdict, Verdict::Ok);
    }

    #[test]
    fn between_two_points_and_never_above_the_highest() {
        // 20 A at 24 V and 6 A at 60 V: slope ln(0.3)/ln(2.5) = -1.313954, at 46.60682 V
        // 20·(46.60682/24)^-1.313954 = 8.3612 A
        let m = relay("relay 20 A at 24 Vdc, 6 A at 60 Vdc");
        assert!(
            (m.rating.unwrap().value - 8.361).abs() < 2e-3,
            "{:?}",
            m.rating
        );
        let m = relay("relay 30 A at 46 Vdc");
        assert_eq!(m.verdict, Verdict::Over);
        assert!(m.note.contains("46.6 V"), "{}", m.note);
    }

    #[test]
    fn alternating_current_alone_is_thirty_volts() {
        let m = relay("relay 16 A at 250 Vac");
        assert_eq!(m.verdict, Verdict::Over);
        assert!(m.note.contains("30 V"), "{}", m.note);
    }

    #[test]
    fn contacts_in_series_do_not_divide_the_volts() {
        assert_eq!(relay("relay 30 A at 30 Vdc").verdict, Verdict::Over);
    }

    #[test]
    fn a_switch_may_see_four_fifths_of_its_volts() {
        let switch = |text: &str| {
            margin(
                &tern60(&[(RELAY, text)]),
                "protection.relay-dc",
                "guard switch",
            )
            .verdict
        };
        // 46.60682/0.8 = 58.26 V
        assert_eq!(
            switch("switch 60 V 20 A 2 x 5 mohm release 1 ms"),
            Verdict::Ok
        );
        assert_eq!(
            switch("switch 55 V 20 A 2 x 5 mohm release 1 ms"),
            Verdict::Thin
        );
        assert_eq!(
            switch("switch 40 V 20 A 2 x 5 mohm release 1 ms"),
            Verdict::Over
        );
        assert_eq!(
            switch("switch 60 V 8 A 2 x 5 mohm release 1 ms"),
            Verdict::Over
        );
    }

    #[test]
    fn a_relay_that_is_not_stated_is_unchecked() {
        let m = margin(
            &tern60(&[(
                "    relay              10 A at 60 Vdc, 16 A at 250 Vac\n",
                "",
            )]),
            "protection.relay-dc",
            "guard relay",
        );
        assert_eq!(
            (m.verdict, m.needs),
            (
                Verdict::Unchecked,
                vec!["protection guard relay".to_owned()]
            )
        );
    }
}
