//! The safe area at work: what a device is allowed at its case temperature, and how much of it each
//! load and the idle point use.
//! Must not know verdicts.

use super::Stress;
use super::case::{Case, Side, solved, stated};
use super::heat::{Heat, at};
use super::loads::{Driven, Spot};
use super::margins::Margins;
use super::rails::Mains;
use crate::build::Needs;
use crate::build::parts::{Device, Flavour, LoadKind, both, three};
use crate::finding::{Related, Step, Witness};
use crate::physics::load::{Band, Impedance};
use crate::physics::math::PI;
use crate::physics::output_stage::Drop;
use crate::physics::safe_area::{
    Allowance, Coverage, Curve, CurveError, PulseAllowance, Rating, Refused, SecondBreakdown,
    Usage, pulse_credit,
};
use crate::physics::sharing::Bank;
use crate::physics::unit::{Amp, Celsius, Hertz, Kelvin, Second, Volt, Watt};
use crate::physics::waveform::{Locus, Point};
use crate::policy;
use crate::rule::{Allow, Rule};

/// Case temperature at which the model wants power stated.
const STATED_AT: Celsius = Celsius(25.0);
/// Angle that is shown beside the verdict where a load states none, degrees.
const SHOWN_ANGLE: f64 = 60.0;

/// What a data sheet says of the current allowed at a voltage.
#[derive(Clone, Debug)]
pub struct SafeArea<'d> {
    device: &'d Device,
    rating: Rating,
    second_breakdown: SecondBreakdown,
    /// The d.c. curve, where one counts.
    curve: Option<Curve>,
    /// What is missing of the curve; `None` where nothing is.
    lacking: Option<Needs>,
}

/// What a curve's points get wrong, in words.
fn wrong(device: &Device, why: CurveError) -> Needs {
    let what = match why {
        CurveError::TooFew => "has fewer than two points".to_owned(),
        CurveError::Value(n) => format!("has a value at point {} that no device has", n + 1),
        CurveError::Order(n) => format!("does not rise in volts at point {}", n + 1),
        CurveError::Rising(n) => format!("allows more current at more volts at point {}", n + 1),
    };
    Needs::because(format!("a safe-area curve of {} {what}", device.owner.name))
}

impl<'d> SafeArea<'d> {
    /// Ratings and d.c. curve of a device. Power stated at another case temperature than 25 degC is
    /// brought there along its own derating line: P25 = P·(Tj,max - 25)/(Tj,max - T).
    ///
    /// # Errors
    /// The ratings that are not stated, or curves that contradict themselves.
    pub fn of(device: &'d Device) -> Result<Self, Needs> {
        let ((current, breakdown), (watt, stated_at), junction) = three(
            both(
                device.current.need().copied(),
                device.breakdown.need().copied(),
            ),
            device.power.need().copied(),
            device.junction.need().copied(),
        )?;
        let span = junction - stated_at;
        if span <= Kelvin::ZERO {
            return Err(Needs::because(format!(
                "the power of {} is stated at its junction limit",
                device.owner.name
            )));
        }
        let rating = Rating {
            current,
            power: watt * ((junction - STATED_AT) / span),
            junction,
            breakdown,
        };
        let second_breakdown = device
            .second_breakdown
            .get()
            .map_or(SecondBreakdown::AsThermal, |r| {
                SecondBreakdown::PerKelvin(*r)
            });
        let (curve, lacking) = dc_curve(device, rating.power)?;
        Ok(Self {
            device,
            rating,
            second_breakdown,
            curve,
            lacking,
        })
    }

    /// What is allowed at a case temperature; `None` where the case leaves nothing.
    ///
    /// # Errors
    /// Ratings that no device has.
    pub fn allowance(&self, case: Celsius) -> Result<Option<Allowance>, Needs> {
        let made = match (&self.curve, &self.lacking) {
            (None, None) => Allowance::power_and_current(self.rating, case),
            (curve, _) => Allowance::dc(self.rating, curve.as_ref(), case, self.second_breakdown),
        };
        self.unless_too_hot(made)
    }

    /// The pulse curves with the die this hot before the pulse. A vertical MOSFET gets none: only a
    /// d.c. curve speaks of its linear mode.
    ///
    /// # Errors
    /// ICM that is not stated, or curves that contradict themselves.
    fn pulses(&self, die: Celsius) -> Result<Vec<PulseAllowance>, Needs> {
        let mut out = Vec::new();
        if self.device.flavour == Flavour::Mosfet {
            return Ok(out);
        }
        for line in &self.device.soa {
            let Some(length) = line.pulse else { continue };
            let peak = self
                .device
                .peak_current
                .get()
                .ok_or_else(|| self.device.peak_current.missing_part("peak"))?;
            let curve = Curve::new(&line.points).map_err(|e| wrong(self.device, e))?;
            let rating = Rating {
                current: *peak,
                ..self.rating
            };
            if let Some(allowance) =
                self.unless_too_hot(Allowance::pulse(rating, &curve, die, self.second_breakdown))?
            {
                out.push(PulseAllowance { length, allowance });
            }
        }
        Ok(out)
    }

    fn unless_too_hot(&self, made: Result<Allowance, Refused>) -> Result<Option<Allowance>, Needs> {
        match made {
            Ok(allowance) => Ok(Some(allowance)),
            Err(Refused::TooHot) => Ok(None),
            Err(Refused::Rating) => Err(Needs::because(format!(
                "the ratings of {} are none that a device has",
                self.device.owner.name
            ))),
        }
    }

    /// What the data leave open of a use, with the figure within them.
    fn open(&self, coverage: Coverage, used: f64) -> Option<Needs> {
        let figure = 100.0 * used;
        let name = &self.device.owner.name;
        match coverage {
            Coverage::Whole | Coverage::AboveBreakdown => None,
            Coverage::EndsAt { volts, fraction } => Some(Needs::because(format!(
                "the soa dc curve of {name} ends at {:.0} V, where {:.0} % of the peak current still flows; within it {figure:.0} % of what is allowed is used",
                volts.0,
                100.0 * fraction
            ))),
            Coverage::NoCurve => {
                let mut needs = self
                    .lacking
                    .clone()
                    .unwrap_or_else(|| self.device.soa_dc.missing_part("dc"));
                let shown =
                    format!("by power and current alone {figure:.0} % of what is allowed is used");
                needs.because = if needs.because.is_empty() {
                    shown
                } else {
                    format!("{}; {shown}", needs.because)
                };
                Some(needs)
            }
        }
    }
}

/// The d.c. curve that counts, and what is missing of it.
fn dc_curve(device: &Device, power: Watt) -> Result<(Option<Curve>, Option<Needs>), Needs> {
    let line = device.soa.iter().find(|l| l.pulse.is_none());
    let mosfet = device.flavour == Flavour::Mosfet;
    if mosfet && *device.structure.need()? == "lateral" {
        return Ok((None, None));
    }
    let missing = || device.soa_dc.missing_part("dc");
    let no_linear_mode = |mut needs: Needs| {
        needs.because = format!(
            "no linear-mode data for the vertical MOSFET {}",
            device.owner.name
        );
        needs
    };
    let curve = match line.map(|l| Curve::new(&l.points)) {
        None => None,
        Some(Err(CurveError::TooFew)) => None,
        Some(Err(e)) => return Err(wrong(device, e)),
        Some(Ok(curve)) => Some(curve),
    };
    Ok(match curve {
        None if mosfet => (None, Some(no_linear_mode(missing()))),
        None => (None, Some(missing())),
        Some(curve) if mosfet && !curve.has_linear_mode_data(power) => {
            (None, Some(no_linear_mode(Needs::default())))
        }
        Some(curve) => (Some(curve), None),
    })
}

/// One side of the output stage on an unsagged rail, at a case temperature, ready to be driven.
#[derive(Debug)]
pub struct Ready<'c> {
    bank: &'c Bank,
    drop: Drop,
    /// The rail.
    pub rail: Volt,
    /// Case of its hottest device.
    pub case: Celsius,
    area: SafeArea<'c>,
    allowance: Option<Allowance>,
    pulses: Vec<PulseAllowance>,
    /// Part of a curve that pulse credit may use.
    aim: f64,
}

/// What the most loaded device uses of what it is allowed.
#[derive(Clone, Copy, Debug)]
pub struct Use {
    /// i/I_allowed; a thousand million where nothing is allowed.
    pub used: f64,
    /// Where.
    pub point: Point,
    /// What is allowed there; zero where nothing is.
    pub allowed: Amp,
    /// What the data cover.
    pub coverage: Coverage,
    /// The pulse curve that counts; `None` for the d.c. curve.
    pub pulse: Option<Second>,
    /// Peak output.
    pub amplitude: Volt,
    /// Peak current of the bank.
    pub peak: Amp,
}

/// Used where nothing is allowed: finite, and beyond any figure.
const NOTHING_ALLOWED: f64 = 1e9;

impl Ready<'_> {
    /// What is allowed; `None` where the case leaves nothing.
    #[must_use]
    pub fn allowance(&self) -> Option<&Allowance> {
        self.allowance.as_ref()
    }

    /// The d.c. curve, and the pulse curve of a length where that one counts.
    pub fn allowances(
        &self,
        pulse: Option<Second>,
    ) -> impl Iterator<Item = (&Allowance, Option<Second>)> {
        let credited = self.pulses.iter().filter(move |p| Some(p.length) == pulse);
        let credited = credited.map(|p| (&p.allowance, Some(p.length)));
        self.allowance.iter().map(|a| (a, None)).chain(credited)
    }

    /// The path of this side under a sine.
    #[must_use]
    pub fn locus(&self, amplitude: Volt, z: Impedance) -> Option<Locus<'_>> {
        Locus::new(self.bank, self.rail, amplitude, z)
    }

    /// Peak output into an impedance, V = Vu - drop.
    fn burst(&self, z: Impedance) -> Option<Volt> {
        self.drop.burst(self.rail, z.modulus())
    }

    /// The worst use at full drive: no smaller sine is worse, see [`Allowance::usage`].
    #[must_use]
    pub fn driven(&self, frequency: Hertz, z: Impedance) -> Option<Use> {
        let amplitude = self.burst(z)?;
        let locus = Locus::new(self.bank, self.rail, amplitude, z)?;
        let peak = locus.peak_current();
        let Some(allowance) = &self.allowance else {
            let (point, coverage) = (locus.peak_dissipation(), Coverage::Whole);
            return Some(Use {
                used: NOTHING_ALLOWED,
                point,
                allowed: Amp::ZERO,
                coverage,
                pulse: None,
                amplitude,
                peak,
            });
        };
        let (usage, pulse) = if self.pulses.is_empty() {
            (allowance.usage(&locus), None)
        } else {
            let credited =
                pulse_credit(&locus, frequency, allowance, &self.pulses, self.aim, false);
            (credited.usage, credited.length)
        };
        let allowed = allowed(&usage, allowance);
        Some(Use {
            used: usage.used,
            point: usage.at,
            allowed,
            coverage: usage.coverage,
            pulse,
            amplitude,
            peak,
        })
    }

    /// The longest unbroken time in one period above the derated d.c. curve, at full drive.
    #[must_use]
    pub fn dwell(&self, frequency: Hertz, z: Impedance) -> Option<Second> {
        let locus = Locus::new(self.bank, self.rail, self.burst(z)?, z)?;
        match &self.allowance {
            Some(allowance) => Some(allowance.dwell(&locus, frequency, 1.0)),
            None => Some(Second(0.5 / frequency.0)),
        }
    }
}

/// The current allowed at a point of use.
fn allowed(usage: &Usage, allowance: &Allowance) -> Amp {
    if usage.coverage == Coverage::AboveBreakdown {
        return Amp::ZERO;
    }
    if usage.used > 0.0 {
        usage.at.amps / usage.used
    } else {
        allowance.allowed(usage.at.volts)
    }
}

/// At which angle a load is taken.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Angle {
    /// As a resistor of its least modulus.
    Zero,
    /// As it is, over the band.
    Own,
    /// As it is, at the bottom of the band.
    OwnAtBottom,
}

/// The part of a rating that a policy allows.
#[must_use]
pub fn aim(case: &Case<'_>, rule: &Rule) -> f64 {
    match case.policy.entry(rule).allow {
        Allow::Percent(p) => p / 100.0,
        _ => 1.0,
    }
}

impl Case<'_> {
    /// The mains level of the safe-area verdict.
    #[must_use]
    pub fn safe_area_mains(&self) -> Mains {
        if self.policy.soa_at_high_mains {
            Mains::High
        } else {
            Mains::Nominal
        }
    }

    /// The sides whose devices share differently: one where both are alike.
    #[must_use]
    pub fn unlike_banks(&self) -> &'static [Side] {
        match self.bench() {
            Ok(bench) if bench.bank(Side::Upper) != bench.bank(Side::Lower) => &Side::BOTH,
            _ => &Side::BOTH[..1],
        }
    }

    /// The longest time above the derated d.c. curve in one period, over the band, and where.
    ///
    /// # Errors
    /// When it cannot be worked out.
    pub fn longest_dwell(&self, ready: &Ready<'_>, load: &Driven) -> Result<(Spot, Second), Needs> {
        let spot = load.worst(self.band()?, |f, z| {
            ready.dwell(f, z).map_or(f64::NAN, |s| s.0)
        });
        let spot = spot.ok_or_else(|| {
            Needs::because(format!(
                "load {} cannot be driven on the {:.1} V rail",
                load.name, ready.rail.0
            ))
        })?;
        Ok((spot, Second(spot.value)))
    }

    /// One side ready to be driven, its hottest case at a temperature, `watts` its mean heat.
    ///
    /// # Errors
    /// What stage, devices or supply do not state.
    pub fn ready(
        &self,
        side: Side,
        mains: Mains,
        case: Celsius,
        watts: Watt,
        aim: f64,
    ) -> Result<Ready<'_>, Needs> {
        let device = self.output().device(side);
        let (area, bench, (rail, drop)) = three(
            SafeArea::of(device),
            self.bench(),
            both(self.unsagged(mains), self.drop()),
        )?;
        let allowance = area.allowance(case)?;
        let pulses = match self.policy.curve {
            policy::Curve::Dc => Vec::new(),
            policy::Curve::Pulse => area.pulses(case + watts * *device.junction_case.need()?)?,
        };
        Ok(Ready {
            bank: bench.bank(side),
            drop,
            rail,
            case,
            area,
            allowance,
            pulses,
            aim,
        })
    }

    /// The same with the case as hot as the duty in a load makes it.
    ///
    /// # Errors
    /// As [`Case::ready`], and what the heat of the duty lacks.
    pub fn ready_at_duty(
        &self,
        heat: &Heat,
        side: Side,
        mains: Mains,
        aim: f64,
    ) -> Result<Ready<'_>, Needs> {
        self.ready(
            side,
            mains,
            self.case_temperature(heat, side)?,
            heat.device[at(side)],
            aim,
        )
    }

    /// Where a load is worst for the safe area, and the use there.
    ///
    /// # Errors
    /// When it cannot be worked out.
    pub fn worst_use(
        &self,
        ready: &Ready<'_>,
        load: &Driven,
        angle: Angle,
    ) -> Result<(Spot, Use), Needs> {
        if angle != Angle::Own {
            return self.search_use(ready, load, angle);
        }
        let inputs = (
            load.identity,
            (ready.rail, &ready.drop),
            ready.bank,
            &ready.allowance,
            &ready.pulses,
            ready.aim,
            self.band()?,
        );
        self.memory.recall("use of the safe area", &inputs, || {
            self.search_use(ready, load, angle)
        })
    }

    fn search_use(
        &self,
        ready: &Ready<'_>,
        load: &Driven,
        angle: Angle,
    ) -> Result<(Spot, Use), Needs> {
        let nothing = || {
            Needs::because(format!(
                "load {} cannot be driven on the {:.1} V rail",
                load.name, ready.rail.0
            ))
        };
        let band = self.band()?;
        let spot = match angle {
            Angle::Zero => {
                let least = load.minimum_seen();
                Spot {
                    seen: Impedance::resistive(least.seen.modulus()),
                    ..least
                }
            }
            Angle::Own | Angle::OwnAtBottom => {
                let searched = if angle == Angle::Own {
                    Some(band)
                } else {
                    Band::new(band.bottom(), band.bottom())
                };
                let found = searched.and_then(|b| {
                    load.worst(b, |f, z| ready.driven(f, z).map_or(f64::NAN, |u| u.used))
                });
                found.ok_or_else(nothing)?
            }
        };
        let used = ready
            .driven(spot.frequency, spot.seen)
            .ok_or_else(nothing)?;
        Ok((spot, used))
    }

    /// One margin for each declared output device: the locus of every load at an angle with the safe
    /// area. A part of the band in which a load is not known counts where the band is searched: at its
    /// bottom alone the load itself says what it lacks.
    pub fn compare_loci(&self, rule: &'static Rule, out: &mut Margins<'_>, angle: Angle) {
        let stage = self.output();
        let site = stage.pairs.site();
        for side in stage.sides() {
            for played in self.played() {
                let open = played
                    .as_ref()
                    .ok()
                    .filter(|_| angle != Angle::OwnAtBottom)
                    .and_then(|(load, _)| self.unknown_part(load));
                if let Some(open) = open {
                    out.compare(rule, self.device_part(stage, *side), site, Err(open));
                }
                let stress = played
                    .and_then(|(load, heat)| self.locus_stress(rule, load, heat, *side, angle));
                out.compare(rule, self.device_part(stage, *side), site, stress);
            }
        }
    }

    /// What the most loaded device of a side carries at the worst point of a load, with what it is
    /// allowed there.
    ///
    /// # Errors
    /// What is missing, or where the data end before the stress while what they cover is within the
    /// allowance.
    pub fn locus_stress(
        &self,
        rule: &Rule,
        load: &Driven,
        heat: &Heat,
        side: Side,
        angle: Angle,
    ) -> Result<Stress, Needs> {
        let mains = self.safe_area_mains();
        let aim = aim(self, rule);
        let ready = self.ready_at_duty(heat, side, mains, aim)?;
        let (spot, found) = self.worst_use(&ready, load, angle)?;
        self.settled(&ready, &found, aim)?;
        let device = self.output().device(side);
        let mut working = vec![
            solved(
                "Vu",
                "unsagged rail",
                "V0 - Vd",
                ready.rail.0,
                "V",
                "definition of the unsagged rail",
            ),
            solved(
                "|Z|",
                "impedance that one channel sees",
                "",
                spot.seen.modulus().0,
                "ohm",
                "",
            ),
            solved(
                "φ",
                "its angle",
                "",
                spot.seen.angle_rad() * 180.0 / PI,
                "deg",
                "",
            ),
            solved(
                "V̂",
                "peak output",
                "Vu - drop(V̂/|Z|)",
                found.amplitude.0,
                "V",
                "drop as stated",
            ),
            solved(
                "Tcase",
                "case of the hottest device at the duty",
                "Tsink + P·θcs",
                ready.case.0,
                "degC",
                "energy balance",
            ),
            solved(
                "k",
                "derating with case temperature",
                "(Tj,max - Tcase)/(Tj,max - 25)",
                derating(&ready.area.rating, ready.case),
                "1",
                "straight-line derating of the data sheet",
            ),
            solved(
                "v",
                "across the device at the worst instant",
                "Vu - v_out - (i/N)·RE",
                found.point.volts.0,
                "V",
                "node voltages",
            ),
            solved(
                "i",
                "through the most loaded device then",
                "share·|i|/N",
                found.point.amps.0,
                "A",
                "current sharing",
            ),
            solved(
                "Iallowed",
                "allowed at that voltage",
                "min(IC, k·P/v, kseg·C(v))",
                found.allowed.0,
                "A",
                "log-log curve of the data sheet, derated",
            ),
        ];
        working.extend(device.soa.iter().find(|l| l.pulse.is_none()).map(|l| {
            stated(
                "C",
                "points of the d.c. curve",
                f64::from(u32::try_from(l.points.len()).unwrap_or(0)),
                "1",
                [l.site],
            )
        }));
        working.extend(self.beside_the_verdict(load, &ready, heat, side, &spot));
        let curve = found
            .pulse
            .map_or_else(|| "dc".to_owned(), |s| format!("{:.3} ms", 1e3 * s.0));
        Ok(Stress {
            value: found.point.amps.0,
            rating: found.allowed.0,
            witness: Witness {
                mains_v: self.mains_volts(mains),
                load: Some(load.name.clone()),
                frequency_hz: (angle != Angle::Zero && !load.load.is_flat())
                    .then_some(spot.frequency.0),
                amplitude_v: Some(found.amplitude.0),
                angle_deg: Some(found.point.angle_rad * 180.0 / PI),
                duty: Some(self.duty().shown.clone()),
                ambient_c: self.hottest().ok().map(|t| t.0),
                sink_c: Some(heat.hot_spot.0),
                case_c: Some(ready.case.0),
                rail_v: Some(ready.rail.0),
                device_v: Some(found.point.volts.0),
                device_a: Some(found.point.amps.0),
                bank_a: Some(bank_current(&found, spot.seen).0),
                curve: Some(curve),
                ..self.witness()
            },
            working,
            related: self.safe_area_sites(side, Some(load)),
            note: self.beyond_breakdown(&found, side),
            ..Stress::default()
        })
    }

    /// Data that end before the stress pass nothing: an error unless what they cover already says
    /// more than the allowance.
    ///
    /// # Errors
    /// Where the curve ends, with the figure within it.
    pub fn settled(&self, ready: &Ready<'_>, found: &Use, aim: f64) -> Result<(), Needs> {
        settled(&ready.area, found.coverage, found.used, aim)
    }

    /// Why nothing is allowed, where the device is beyond its breakdown voltage.
    fn beyond_breakdown(&self, found: &Use, side: Side) -> String {
        match found.coverage {
            Coverage::AboveBreakdown => format!(
                "current flows above the breakdown voltage of {}",
                self.output().device(side).owner.name
            ),
            _ => String::new(),
        }
    }

    /// Other mains and 60 degrees, for information: at the worst spot, not searched again.
    fn beside_the_verdict(
        &self,
        load: &Driven,
        ready: &Ready<'_>,
        heat: &Heat,
        side: Side,
        spot: &Spot,
    ) -> Vec<Step> {
        let used = |ready: &Ready<'_>, z: Impedance| {
            ready
                .driven(spot.frequency, z)
                .filter(|u| u.allowed > Amp::ZERO)
                .map(|u| 100.0 * u.used)
        };
        let other = |mains: Mains| {
            self.ready_at_duty(heat, side, mains, ready.aim)
                .ok()
                .and_then(|r| used(&r, spot.seen))
        };
        let mut steps = Vec::new();
        if let Some(high) = other(Mains::High) {
            steps.push(solved(
                "used(hi)",
                "of what is allowed, at high mains, for information",
                "i/Iallowed",
                high,
                "%",
                "",
            ));
        }
        if self.safe_area_mains() == Mains::High
            && let Some(nominal) = other(Mains::Nominal)
        {
            steps.push(solved(
                "used(nom)",
                "of what is allowed, at nominal mains, for information",
                "i/Iallowed",
                nominal,
                "%",
                "",
            ));
        }
        if let LoadKind::Nominal(_, _, angle) = &load.stated.kind
            && angle.get().is_none()
            && spot.seen.angle_rad() != 0.0
            && let Some(steep) = used(
                ready,
                Impedance::polar(spot.seen.modulus(), SHOWN_ANGLE * PI / 180.0),
            )
        {
            steps.push(solved(
                "used(60)",
                "of what is allowed, at 60 degrees, for information",
                "i/Iallowed",
                steep,
                "%",
                "",
            ));
        }
        steps
    }

    /// The lines that take part in a safe-area verdict.
    #[must_use]
    pub fn safe_area_sites(&self, side: Side, load: Option<&Driven>) -> Vec<Related> {
        let (stage, mut related) = (self.output(), Vec::new());
        let mut add = |message: &str, site| {
            related.push(Related {
                message: message.to_owned(),
                site,
            })
        };
        if let Some(load) = load {
            add("into this load", load.site);
        }
        let device = stage.device(side);
        if let Some(line) = device.soa.iter().find(|l| l.pulse.is_none()) {
            add("the d.c. curve", line.site);
        }
        if let Some(site) = device.power.stated_at() {
            add("the power, derated", site);
        }
        if let Some(site) = self.build.amplifier.drop.stated_at() {
            add("what is lost of the rail", site);
        }
        if let Ok((sink, _)) = self.heatsink() {
            add("sets the case temperature", sink.resistance.site());
        }
        related.extend(self.rail_sites(None));
        related
    }

    /// The idle point: the unsagged rail at high mains and the idle current of the most loaded device.
    ///
    /// # Errors
    /// As [`Case::locus_stress`].
    pub fn idle_stress(&self, rule: &Rule, side: Side) -> Result<Stress, Needs> {
        let loads = self.loads()?;
        // at no signal every load is alike; one is needed to name the nominal resistance
        let load = loads
            .iter()
            .find_map(|l| l.as_ref().ok())
            .ok_or_else(|| self.build.loads.missing())?;
        let heat = self.heat_at(load, 0.0, Mains::High)?;
        let device = self.output().device(side);
        let (area, (bench, idle), rail) = three(
            SafeArea::of(device),
            both(self.bench(), self.idle()),
            self.unsagged(Mains::High),
        )?;
        let case = self.case_temperature(&heat, side)?;
        let bank = bench.bank(side);
        let share = bank.share(idle * f64::from(bank.devices()));
        let current = idle * share;
        let (allowed, coverage, used) = match area.allowance(case)? {
            None => (Amp::ZERO, Coverage::Whole, NOTHING_ALLOWED),
            Some(allowance) => {
                let usage = allowance
                    .point_usage(rail, current)
                    .ok_or_else(|| Needs::because("the idle point is no point"))?;
                (allowed(&usage, &allowance), usage.coverage, usage.used)
            }
        };
        settled(&area, coverage, used, aim(self, rule))?;
        let mut related = self.safe_area_sites(side, None);
        related.insert(
            0,
            Related {
                message: "sets the case temperature together with the sink".to_owned(),
                site: self.output().insulator.site(),
            },
        );
        Ok(Stress {
            value: current.0,
            rating: allowed.0,
            witness: Witness {
                mains_v: self.mains_volts(Mains::High),
                ambient_c: self.hottest().ok().map(|t| t.0),
                sink_c: Some(heat.hot_spot.0),
                case_c: Some(case.0),
                rail_v: Some(rail.0),
                device_v: Some(rail.0),
                device_a: Some(current.0),
                curve: Some("dc".to_owned()),
                ..self.witness()
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
                stated(
                    "Iq",
                    "idle current of one device",
                    idle.0,
                    "A",
                    self.output().idle.stated_at(),
                ),
                solved(
                    "share",
                    "of the most loaded device at idle",
                    "I1·N/I",
                    share,
                    "1",
                    "junction voltage and emitter resistor in balance",
                ),
                solved(
                    "Tcase",
                    "case at idle, hottest room",
                    "Tsink + P·θcs",
                    case.0,
                    "degC",
                    "energy balance",
                ),
                solved(
                    "k",
                    "derating with case temperature",
                    "(Tj,max - Tcase)/(Tj,max - 25)",
                    derating(&area.rating, case),
                    "1",
                    "straight-line derating of the data sheet",
                ),
                solved(
                    "Iallowed",
                    "allowed at that voltage",
                    "min(IC, k·P/v, kseg·C(v))",
                    allowed.0,
                    "A",
                    "log-log curve of the data sheet, derated",
                ),
            ],
            related,
            ..Stress::default()
        })
    }
}

/// k, never above 1; below zero where the case is hotter than the junction may be.
fn derating(rating: &Rating, case: Celsius) -> f64 {
    (rating.junction - case.max(STATED_AT)) / (rating.junction - STATED_AT)
}

/// Data that end before the stress pass nothing, see [`Case::settled`].
///
/// # Errors
/// Where the curve ends, with the figure within it.
pub fn settled(area: &SafeArea<'_>, coverage: Coverage, used: f64, aim: f64) -> Result<(), Needs> {
    // without a curve the hyperbola can only condemn
    let enough = if coverage == Coverage::NoCurve {
        1.0
    } else {
        aim
    };
    match area.open(coverage, used) {
        Some(open) if used <= enough => Err(open),
        _ => Ok(()),
    }
}

/// Current of the bank at the worst instant: Î·sin(θ - φ).
fn bank_current(found: &Use, z: Impedance) -> Amp {
    found.peak * crate::physics::math::sin(found.point.angle_rad - z.angle_rad()).abs()
}
