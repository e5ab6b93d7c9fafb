//! Protection against d.c. at the output: how fast a detector sees it, what a contact can break, what
//! the loudspeaker takes meanwhile; and at what sink temperature a cutout really opens.
//! Must not know the times, joules or allowances that are judged good enough.

use super::math;
use super::unit::{
    Amp, AmpSquaredSecond, Celsius, Farad, Hertz, Joule, Kelvin, Ohm, Second, Volt, Watt,
};

/// A resistor and a capacitor from the output to a threshold, the usual d.c. detector.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Detector {
    time_constant: Second,
    threshold: Volt,
}

impl Detector {
    /// `threshold` is the voltage on the capacitor at which it acts. `None` unless all are positive
    /// and finite.
    #[must_use]
    pub fn new(resistance: Ohm, capacitance: Farad, threshold: Volt) -> Option<Self> {
        let time_constant = resistance * capacitance;
        let parts = [resistance.0, capacitance.0, time_constant.0, threshold.0];
        parts.into_iter().all(positive).then_some(Self {
            time_constant,
            threshold,
        })
    }

    /// Time from a capacitor at rest to the threshold with V at the output:
    /// `t = -RC·ln(1 - Vth/V)`. `None`: V never trips it.
    #[must_use]
    pub fn time_from_rest(&self, output: Volt) -> Option<Second> {
        let ratio = self.threshold / output;
        (positive(output.0) && ratio < 1.0).then(|| self.time_constant * -math::ln_1p(-ratio))
    }

    /// The slowest trip: music has just left the capacitor at -Vth:
    /// `t = RC·ln((V + Vth)/(V - Vth))`. `None`: V never trips it.
    #[must_use]
    pub fn time_at_worst(&self, output: Volt) -> Option<Second> {
        let ratio = self.threshold / output;
        (positive(output.0) && ratio < 1.0)
            .then(|| self.time_constant * (math::ln_1p(ratio) - math::ln_1p(-ratio)))
    }

    /// Peak of the ripple that a sine at the output leaves on the capacitor:
    /// `V/√(1 + (2π·f·RC)²)`; at the threshold and above it trips on music.
    #[must_use]
    pub fn ripple(&self, peak: Volt, frequency: Hertz) -> Option<Volt> {
        let x = math::TAU * frequency.0 * self.time_constant.0;
        let ripple = peak / (1.0 + x * x).sqrt();
        (ripple.is_finite() && peak.0 >= 0.0 && frequency.0 >= 0.0).then_some(ripple)
    }

    /// The frequency below which a sine of this peak trips it:
    /// `f = √((V/Vth)² - 1)/(2π·RC)`. `None`: no frequency does.
    ///
    /// A detector with one RC that is quiet at f cannot trip faster than about 1/(2π·f): a large V
    /// trips in RC·Vth/V, and quiet at f means RC >= V/(2π·f·Vth).
    #[must_use]
    pub fn trips_below(&self, peak: Volt) -> Option<Hertz> {
        let over = peak / self.threshold;
        let frequency = Hertz((over * over - 1.0).sqrt() / (math::TAU * self.time_constant.0));
        (over > 1.0 && frequency.is_finite()).then_some(frequency)
    }

    /// Watts in a voice coil at the greatest offset that never trips: `Vth²/Re`.
    #[must_use]
    pub fn undetected(&self, coil: Ohm) -> Option<Watt> {
        let watts = self.threshold * (self.threshold / coil);
        (positive(coil.0) && watts.is_finite()).then_some(watts)
    }
}

/// A rail stuck on the loudspeaker: the voltage behind the emitter resistors into a cold coil.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct DcFault {
    rail: Volt,
    coil: Ohm,
    series: Ohm,
}

impl DcFault {
    /// `series` is what stands between rail and coil, RE/N where one polarity of N devices has failed
    /// short. `None` unless rail and coil are positive and the series resistance is not negative.
    #[must_use]
    pub fn new(rail: Volt, coil: Ohm, series: Ohm) -> Option<Self> {
        let good = positive(rail.0) && positive(coil.0) && series.is_finite() && series.0 >= 0.0;
        let fault = Self { rail, coil, series };
        (good && fault.amps().is_finite() && fault.coil_watts().is_finite()).then_some(fault)
    }

    /// `I = V/(Re + series)`: what a contact must break.
    #[must_use]
    pub fn amps(&self) -> Amp {
        self.rail / (self.coil + self.series)
    }

    /// `P = I²·Re`, into the coil.
    #[must_use]
    pub fn coil_watts(&self) -> Watt {
        self.amps() * self.coil * self.amps()
    }

    /// `E = I²·Re·t`, into the coil until the fault is broken. The rail is taken as it stands;
    /// a reservoir that empties meanwhile lowers it.
    #[must_use]
    pub fn coil_joules(&self, time: Second) -> Option<Joule> {
        let joules = self.coil_watts() * time;
        (time.0 >= 0.0 && joules.is_finite()).then_some(joules)
    }
}

/// How fast copper heats with no way out for the heat: `P/(m·c)`, kelvins in a second, with
/// c = 385 J/(kg·K) (textbook, from memory). `None` unless the mass is positive.
#[must_use]
pub fn copper_heating_k_per_s(watts: Watt, mass_kg: f64) -> Option<f64> {
    const COPPER_HEAT_J_PER_KG_K: f64 = 385.0;
    let rate = watts.0 / (mass_kg * COPPER_HEAT_J_PER_KG_K);
    (positive(mass_kg) && watts.0 >= 0.0 && rate.is_finite()).then_some(rate)
}

/// What one relay contact may break in direct current, as its maker states it.
#[derive(Clone, Debug, PartialEq)]
pub struct DcBreak {
    /// Volts and amperes, ascending in volts; never empty.
    points: Vec<(f64, f64)>,
}

/// What a contact may break at a voltage.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum BreakLimit {
    /// This current.
    Allowed(Amp),
    /// Nothing is stated so high: an arc that a contact breaks at 30 V may stand at 60 V, so the
    /// figure is never extrapolated upward.
    AboveStated {
        /// The highest voltage stated.
        highest: Volt,
    },
}

/// Volts at which a relay is taken to break its a.c. amperes where the sheet states no d.c. figure.
///
/// The pair "250 V a.c. / 30 V d.c." at one current is what sheets of small power relays print
/// (common practice, no source).
pub const ASSUMED_BREAK_VOLTS: Volt = Volt(30.0);

impl DcBreak {
    /// From stated points, in any order. `None` without a point, unless all are positive, or for two
    /// points at one voltage.
    #[must_use]
    pub fn new(points: &[(Volt, Amp)]) -> Option<Self> {
        let mut sorted: Vec<(f64, f64)> = points.iter().map(|(v, i)| (v.0, i.0)).collect();
        sorted.sort_by(|a, b| a.0.total_cmp(&b.0));
        let good = sorted.iter().all(|p| positive(p.0) && positive(p.1));
        let distinct = sorted
            .windows(2)
            .all(|pair| matches!(pair, [a, b] if a.0 < b.0));
        (good && distinct && !sorted.is_empty()).then_some(Self { points: sorted })
    }

    /// Amperes that one contact may break at a voltage: between two points straight in log-log, below
    /// the lowest the current stated there, above the highest none known.
    ///
    /// Contacts in series divide the volts only if the sheet says so: divide before asking.
    /// `None` unless the voltage is positive.
    #[must_use]
    pub fn limit(&self, volts: Volt) -> Option<BreakLimit> {
        if !positive(volts.0) {
            return None;
        }
        let (highest, lowest) = (self.points.last()?, self.points.first()?);
        if volts.0 > highest.0 {
            return Some(BreakLimit::AboveStated {
                highest: Volt(highest.0),
            });
        }
        let amps = self
            .points
            .windows(2)
            .find_map(|pair| match pair {
                [a, b] if a.0 <= volts.0 && volts.0 <= b.0 => {
                    let along = math::ln(volts.0 / a.0) / math::ln(b.0 / a.0);
                    Some(a.1 * math::pow(b.1 / a.1, along))
                }
                _ => None,
            })
            .unwrap_or(lowest.1);
        amps.is_finite().then_some(BreakLimit::Allowed(Amp(amps)))
    }
}

/// Let-through of a crowbar that empties a reservoir: `I²t = V²·C/(2R)`, R the whole resistance of the
/// loop. It is the charge alone; what the mains still delivers comes on top. `None` unless all are positive.
#[must_use]
pub fn crowbar(rail: Volt, reservoir: Farad, resistance: Ohm) -> Option<AmpSquaredSecond> {
    let i2t = AmpSquaredSecond(rail.0 * rail.0 * reservoir.0 / (2.0 * resistance.0));
    let parts = [rail.0, reservoir.0, resistance.0];
    (parts.into_iter().all(positive) && i2t.is_finite()).then_some(i2t)
}

/// A thermal cutout and the place it is fitted.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Cutout {
    /// Nominal trip temperature.
    pub trip: Celsius,
    /// Half-width of its tolerance.
    pub tolerance: Kelvin,
    /// How much cooler its place is than the sink beside the output devices, at the heat in question.
    pub cooler: Kelvin,
}

impl Cutout {
    /// The sink beside the devices when a late cutout opens: `Tt = trip + tolerance + cooler`.
    /// `None` for a tolerance that is negative or a part that is not finite.
    #[must_use]
    pub fn sink_at_latest(&self) -> Option<Celsius> {
        let latest = self.trip + self.tolerance + self.cooler;
        (self.sensible() && latest.0.is_finite()).then_some(latest)
    }

    /// What is left before an early cutout opens with the sink at a temperature:
    /// `(trip - tolerance) - (Tsink - cooler)`; negative: it opens on music.
    #[must_use]
    pub fn headroom(&self, sink: Celsius) -> Option<Kelvin> {
        let left = (self.trip - self.tolerance) - (sink - self.cooler);
        (self.sensible() && left.is_finite()).then_some(left)
    }

    fn sensible(&self) -> bool {
        let finite = self.trip.0.is_finite() && self.cooler.is_finite();
        finite && self.tolerance.is_finite() && self.tolerance.0 >= 0.0
    }
}

fn positive(x: f64) -> bool {
    x.is_finite() && x > 0.0
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    /// Brute-force twin: march the capacitor with small steps (midpoint rule).
    fn marched(rc: f64, output: f64, start: f64, threshold: f64) -> f64 {
        let dt = rc * threshold / output * 1e-4;
        let (mut v, mut t) = (start, 0.0);
        while v < threshold {
            let half = v + 0.5 * dt * (output - v) / rc;
            v += dt * (output - half) / rc;
            t += dt;
        }
        t
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(64))]
        #[test]
        fn detector_times_agree_with_a_march(
            r in 1e4..1e6_f64, c in 1e-7..1e-4_f64, vth in 0.4..5.0_f64, over in 1.5..100.0_f64,
        ) {
            let d = Detector::new(Ohm(r), Farad(c), Volt(vth)).unwrap();
            let v = vth * over;
            let rest = d.time_from_rest(Volt(v)).unwrap().0;
            let worst = d.time_at_worst(Volt(v)).unwrap().0;
            prop_assert!((rest - marched(r * c, v, 0.0, vth)).abs() < 3e-4 * rest);
            prop_assert!((worst - marched(r * c, v, -vth, vth)).abs() < 3e-4 * worst);
        }

        /// At the frequency where it just trips the ripple is the threshold.
        #[test]
        fn ripple_and_frequency_agree(rc in 1e-3..10.0_f64, vth in 0.4..5.0_f64, over in 1.01..200.0_f64) {
            let d = Detector::new(Ohm(rc), Farad(1.0), Volt(vth)).unwrap();
            let v = Volt(vth * over);
            let f = d.trips_below(v).unwrap();
            prop_assert!((d.ripple(v, f).unwrap().0 - vth).abs() < 1e-9 * vth);
        }

        #[test]
        fn break_limit_stays_between_its_points(v in 24.0..250.0_f64) {
            let b = DcBreak::new(&[(Volt(250.0), Amp(0.2)), (Volt(24.0), Amp(2.0))]).unwrap();
            let Some(BreakLimit::Allowed(i)) = b.limit(Volt(v)) else { panic!("inside") };
            prop_assert!((0.2 - 1e-12..=2.0 + 1e-12).contains(&i.0));
        }

        #[test]
        fn no_number_from_nonsense(a in proptest::num::f64::ANY, b in proptest::num::f64::ANY, c in proptest::num::f64::ANY, d in proptest::num::f64::ANY) {
            if let Some(x) = Detector::new(Ohm(a), Farad(b), Volt(c)) {
                prop_assert!(x.time_from_rest(Volt(d)).is_none_or(Second::is_finite));
                prop_assert!(x.time_at_worst(Volt(d)).is_none_or(Second::is_finite));
                prop_assert!(x.ripple(Volt(d), Hertz(a)).is_none_or(Volt::is_finite));
                prop_assert!(x.trips_below(Volt(d)).is_none_or(Hertz::is_finite));
                prop_assert!(x.undetected(Ohm(d)).is_none_or(Watt::is_finite));
            }
            if let Some(x) = DcFault::new(Volt(a), Ohm(b), Ohm(c)) {
                prop_assert!(x.coil_joules(Second(d)).is_none_or(Joule::is_finite));
            }
            if let Some(x) = DcBreak::new(&[(Volt(a), Amp(b)), (Volt(c), Amp(d))]) {
                let fine = match x.limit(Volt(a)) {
                    Some(BreakLimit::Allowed(i)) => i.is_finite(),
                    _ => true,
                };
                prop_assert!(fine);
            }
            prop_assert!(crowbar(Volt(a), Farad(b), Ohm(c)).is_none_or(AmpSquaredSecond::is_finite));
            prop_assert!(copper_heating_k_per_s(Watt(a), b).is_none_or(f64::is_finite));
            let cutout = Cutout { trip: Celsius(a), tolerance: Kelvin(b), cooler: Kelvin(c) };
            prop_assert!(cutout.headroom(Celsius(d)).is_none_or(Kelvin::is_finite));
        }
    }

    #[test]
    fn below_the_threshold_it_never_trips() {
        let d = Detector::new(Ohm(1e5), Farad(1e-5), Volt(0.65)).unwrap();
        assert_eq!(d.time_from_rest(Volt(0.65)), None);
        assert_eq!(d.time_at_worst(Volt(0.5)), None);
        assert_eq!(d.trips_below(Volt(0.65)), None);
    }

    #[test]
    fn a_relay_is_never_extrapolated_upward() {
        let b = DcBreak::new(&[(ASSUMED_BREAK_VOLTS, Amp(10.0))]).unwrap();
        assert_eq!(b.limit(Volt(12.0)), Some(BreakLimit::Allowed(Amp(10.0))));
        assert_eq!(b.limit(Volt(30.0)), Some(BreakLimit::Allowed(Amp(10.0))));
        let above = BreakLimit::AboveStated {
            highest: Volt(30.0),
        };
        assert_eq!(b.limit(Volt(30.1)), Some(above));
        assert_eq!(DcBreak::new(&[]), None);
        assert_eq!(
            DcBreak::new(&[(Volt(30.0), Amp(1.0)), (Volt(30.0), Amp(2.0))]),
            None
        );
    }

    #[test]
    fn cutout_late_and_early() {
        // 75 °C ± 5 K, 8 K cooler than beside the devices: opens late with the sink at 88 °C; with the
        // sink at 70 °C its place is at 62 °C, 8 K below the earliest trip of 70 °C.
        let c = Cutout {
            trip: Celsius(75.0),
            tolerance: Kelvin(5.0),
            cooler: Kelvin(8.0),
        };
        assert!((c.sink_at_latest().unwrap().0 - 88.0).abs() < 1e-12);
        assert!((c.headroom(Celsius(70.0)).unwrap().0 - 8.0).abs() < 1e-12);
    }
}
