//! V-I limiters: the line of greatest current a device may carry against its collector voltage.
//! Must not know which loci or safe-area curves the line is compared with.
//!
//! All voltages are of the upper device: v is its collector-emitter voltage, i its current, `RE` its
//! emitter resistor, and `X = v + i·RE` the rail less the output node. The lower half is the mirror
//! image. The sense transistor has its emitter on the output node and its base on node B; its base
//! current and the current that R1 takes from `RE` are neglected.
//!
//! Source of the node method: D. Self, Audio Power Amplifier Design, and R. Cordell, Designing Audio
//! Power Amplifiers, protection chapters (from memory); the networks are drawn out below.

use super::unit::{Amp, Celsius, Kelvin, Ohm, Volt, VoltPerKelvin, Watt};

/// Drift of a silicon base-emitter turn-on voltage, -2 mV/K.
///
/// Source: the band-gap relation of P. R. Gray and R. G. Meyer, Analysis and Design of Analog
/// Integrated Circuits (from memory): -1.8 to -2.5 mV/K between 0.55 V and 0.75 V.
pub const TURN_ON_DRIFT: VoltPerKelvin = VoltPerKelvin(-0.002);

/// Turn-on voltage of the sense transistor at a temperature: `Von = Von(25 °C) + drift·(T - 25 °C)`.
///
/// `None` if the result is not a positive voltage. Straight-line drift holds from -40 to 150 °C.
#[must_use]
pub fn turn_on(at_25: Volt, drift: VoltPerKelvin, temperature: Celsius) -> Option<Volt> {
    let rise: Kelvin = temperature - Celsius(25.0);
    let volts = at_25 + drift * rise;
    (volts.is_finite() && volts.0 > 0.0).then_some(volts)
}

/// The resistors round one sense transistor.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Network {
    /// `RE`, the emitter resistor whose drop is sensed.
    pub emitter: Ohm,
    /// R1, from the emitter to node B.
    pub sense_base: Ohm,
    /// R2, from node B to the output; `None` where not fitted.
    pub base_output: Option<Ohm>,
    /// R3, from node B to the rail; `None` where not fitted: the line is then flat unless a clamp is fitted.
    pub rail_base: Option<Ohm>,
    /// The branch that makes the second slope; `None` where not fitted.
    pub clamp: Option<Clamp>,
}

/// A second path from the rail to node B whose middle a zener holds: the line falls steeply until
/// the zener conducts and at the slope of R3 alone beyond.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Clamp {
    /// Ra, from the rail to the zener.
    pub rail_node: Ohm,
    /// Rb, from the zener to node B.
    pub node_base: Ohm,
    /// Vz, zener from its node to the output.
    pub zener: Volt,
}

/// Half-widths of the parts of a [`Network`] as fractions of their nominal value.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Tolerance {
    /// Of R1, R2, R3, Ra and Rb, each on its own.
    pub resistors: f64,
    /// Of the emitter resistor.
    pub emitter: f64,
    /// Of the zener.
    pub zener: f64,
}

/// Which way the part tolerances are taken.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Extreme {
    /// The corner that lets the most current through: does the limiter protect?
    Most,
    /// The corner that lets the least current through: does it stay clear of music?
    Least,
}

impl Network {
    /// The limit line at one turn-on voltage.
    ///
    /// Kirchhoff's current law at node B, which stands at `Von` above the output when the sense
    /// transistor turns on, with `G = 1/R`:
    ///
    /// `(i·RE - Von)·G1 + (X - Von)·G3 + J = Von·G2`
    ///
    /// where J, the current of the clamped branch, is the lesser of `(X - Von)/(Ra + Rb)` and
    /// `(Vz - Von)/Rb`. Solved for i it is a straight line in v, or two that meet where the zener
    /// begins to conduct, at `X = Von + (Vz - Von)(Ra + Rb)/Rb`:
    ///
    /// `i = [Von(G1 + G2 + g) - v·g] / [RE(G1 + g)]`, `g = G3 + 1/(Ra + Rb)`, below the break;
    /// `i = [Von(G1 + G2) - (Vz - Von)/Rb - (v - Von)·G3] / [RE(G1 + G3)]` above it.
    ///
    /// `None` if a value is not positive and finite, or the zener is below the turn-on voltage.
    #[must_use]
    pub fn line(&self, turn_on: Volt) -> Option<LimitLine> {
        let von = positive(turn_on.0)?;
        let re = positive(self.emitter.0)?;
        let g1 = conductance(Some(self.sense_base))?;
        let g2 = conductance(self.base_output)?;
        let g3 = conductance(self.rail_base)?;
        let Some(clamp) = self.clamp else {
            return LimitLine::of(vec![slanted(von, re, g1, g2, g3)]);
        };
        let ra = positive(clamp.rail_node.0)?;
        let rb = positive(clamp.node_base.0)?;
        let over = positive(clamp.zener.0 - von)?;
        let g = g3 + 1.0 / (ra + rb);
        let steep = slanted(von, re, g1, g2, g);
        let break_x = von + over * (ra + rb) / rb;
        let break_v = (break_x * (g1 + g) - von * (g1 + g2 + g)) / g1;
        let shallow = Segment {
            start: break_v,
            volts: break_v,
            amps: steep.at(break_v),
            slope: -g3 / (re * (g1 + g3)),
        };
        LimitLine::of(vec![steep, shallow])
    }

    /// The two lines between which the extreme over all part tolerances lies: at every voltage the
    /// extreme current is the greater (`Most`) or the lesser (`Least`) of the two, so a check that
    /// must hold for the extreme is made on both.
    ///
    /// Wherever the line allows a positive current, more of it passes with R2 low, R3, Ra and Rb high,
    /// Vz low and `RE` low. Only R1 changes sides: `di/dG1` has the sign of `Von - i·RE`, because R1
    /// feeds node B while the drop across `RE` exceeds the turn-on voltage and loads it otherwise.
    /// Hence one line with R1 high and one with R1 low.
    ///
    /// `None` as for [`Network::line`], or if a tolerance is negative, 1 or more, or not a number.
    #[must_use]
    pub fn extremes(
        &self,
        turn_on: Volt,
        tolerance: Tolerance,
        extreme: Extreme,
    ) -> Option<[LimitLine; 2]> {
        let Tolerance {
            resistors,
            emitter,
            zener,
        } = tolerance;
        if ![resistors, emitter, zener]
            .iter()
            .all(|t| (0.0..1.0).contains(t))
        {
            return None;
        }
        let toward = match extreme {
            Extreme::Most => 1.0,
            Extreme::Least => -1.0,
        };
        let raises = 1.0 + toward * resistors;
        let lowers = 1.0 - toward * resistors;
        let with_sense_base = |factor: f64| Self {
            emitter: self.emitter * (1.0 - toward * emitter),
            sense_base: self.sense_base * factor,
            base_output: self.base_output.map(|r| r * lowers),
            rail_base: self.rail_base.map(|r| r * raises),
            clamp: self.clamp.map(|c| Clamp {
                rail_node: c.rail_node * raises,
                node_base: c.node_base * raises,
                zener: c.zener * (1.0 - toward * zener),
            }),
        };
        Some([
            with_sense_base(1.0 + resistors).line(turn_on)?,
            with_sense_base(1.0 - resistors).line(turn_on)?,
        ])
    }
}

/// The straight line of a network whose path to the rail has conductance `g`.
fn slanted(von: f64, re: f64, g1: f64, g2: f64, g: f64) -> Segment {
    Segment {
        start: f64::NEG_INFINITY,
        volts: 0.0,
        amps: von * (g1 + g2 + g) / (re * (g1 + g)),
        slope: -g / (re * (g1 + g)),
    }
}

/// `value` if it is a positive, finite number.
fn positive(value: f64) -> Option<f64> {
    (value.is_finite() && value > 0.0).then_some(value)
}

/// Siemens of a resistor; zero where none is fitted.
fn conductance(resistor: Option<Ohm>) -> Option<f64> {
    match resistor {
        None => Some(0.0),
        Some(r) => positive(1.0 / positive(r.0)?),
    }
}

/// One straight piece, from `start` volts to the start of the next piece, through (`volts`, `amps`).
#[derive(Clone, Copy, Debug, PartialEq)]
struct Segment {
    start: f64,
    volts: f64,
    amps: f64,
    slope: f64,
}

impl Segment {
    fn at(&self, volts: f64) -> f64 {
        self.amps + self.slope * (volts - self.volts)
    }
}

/// A point on a limit line.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Point {
    /// Collector-emitter voltage.
    pub volts: Volt,
    /// Device current.
    pub amps: Amp,
}

impl Point {
    /// What the device dissipates there.
    #[must_use]
    pub fn watts(self) -> Watt {
        self.volts * self.amps
    }
}

/// The greatest current allowed at each collector voltage: straight pieces, joined.
#[derive(Clone, Debug, PartialEq)]
pub struct LimitLine {
    /// In ascending order of `start`; never empty; the first starts at minus infinity.
    segments: Vec<Segment>,
}

impl LimitLine {
    /// The line through stated points, in any order: straight between them, flat outside the first
    /// and the last.
    ///
    /// `None` without a point, for a negative or non-finite value, or for two points at one voltage.
    #[must_use]
    pub fn through(points: &[(Volt, Amp)]) -> Option<Self> {
        let good = |q: f64| q.is_finite() && q >= 0.0;
        if !points.iter().all(|(v, i)| good(v.0) && good(i.0)) {
            return None;
        }
        let mut sorted = points.to_vec();
        sorted.sort_by(|a, b| a.0.0.total_cmp(&b.0.0));
        let first = sorted.first()?;
        let mut segments = vec![Segment {
            start: f64::NEG_INFINITY,
            volts: first.0.0,
            amps: first.1.0,
            slope: 0.0,
        }];
        for pair in sorted.windows(2) {
            let [(v0, i0), (v1, i1)] = pair else { continue };
            let width = positive((*v1 - *v0).0)?;
            segments.push(Segment {
                start: v0.0,
                volts: v0.0,
                amps: i0.0,
                slope: (*i1 - *i0).0 / width,
            });
        }
        let last = sorted.last()?;
        segments.push(Segment {
            start: last.0.0,
            volts: last.0.0,
            amps: last.1.0,
            slope: 0.0,
        });
        Self::of(segments)
    }

    fn of(segments: Vec<Segment>) -> Option<Self> {
        segments
            .iter()
            .all(|s| s.volts.is_finite() && s.amps.is_finite() && s.slope.is_finite())
            .then_some(Self { segments })
    }

    /// The current allowed at a collector voltage. At zero or below the limiter fires with no load
    /// current. `None` only if the voltage or the result is not finite.
    #[must_use]
    pub fn current(&self, volts: Volt) -> Option<Amp> {
        let piece = self.segments.iter().rev().find(|s| s.start <= volts.0)?;
        let amps = Amp(piece.at(volts.0));
        amps.is_finite().then_some(amps)
    }

    /// The corners of the line, in ascending voltage: where a comparison with a straight or a
    /// curved line has to look besides its own corners.
    pub fn corners(&self) -> impl Iterator<Item = Point> + '_ {
        self.segments
            .iter()
            .filter(|s| s.start.is_finite())
            .map(|s| Point {
                volts: Volt(s.start),
                amps: Amp(s.at(s.start)),
            })
    }

    /// The collector voltage, zero or more, at which the falling line first reaches no current at
    /// all: a swing beyond it fires the limiter with no load. `None` if it never does.
    #[must_use]
    pub fn holds_off_at(&self) -> Option<Volt> {
        if self.current(Volt(0.0))?.0 <= 0.0 {
            return Some(Volt(0.0));
        }
        self.pieces()
            .filter(|(s, _)| s.slope < 0.0)
            .map(|(s, end)| (s.volts - s.amps / s.slope, s.start, end))
            .find(|(v, start, end)| v.is_finite() && *v >= 0.0 && v >= start && v <= end)
            .map(|(v, _, _)| Volt(v))
    }

    /// Where a short circuit settles: the point of greatest current common to this line and to
    /// `v = rail - i·series`, the series resistance being the emitter resistor for a short at the
    /// output node.
    ///
    /// A limiter line is less steep than that (`R1/(RE(R1 + R3)) < 1/RE`) and meets it once; stated
    /// lines may meet it more often and the worst is taken. The current is zero where the line holds
    /// the device off. `None` if the line is above the load line throughout: nothing is limited.
    #[must_use]
    pub fn short_circuit(&self, rail: Volt, series: Ohm) -> Option<Point> {
        self.meetings(rail, series)
            .max_by(|a, b| a.amps.0.total_cmp(&b.amps.0))
    }

    /// Where the limiter first acts as the current into a resistive load rises: the point of least
    /// current common to this line and to `v = rail - i·series`. For N devices in parallel, each
    /// carrying i, `series = RE + N·R(load)`, and the output stands at `N·i·R(load)`.
    ///
    /// `None` if the load never draws what the line allows.
    #[must_use]
    pub fn first_limited(&self, rail: Volt, series: Ohm) -> Option<Point> {
        self.meetings(rail, series)
            .min_by(|a, b| a.amps.0.total_cmp(&b.amps.0))
    }

    fn meetings(&self, rail: Volt, series: Ohm) -> impl Iterator<Item = Point> + '_ {
        let (vu, r) = (rail.0, series.0);
        let sensible = vu.is_finite() && vu > 0.0 && r.is_finite() && r >= 0.0;
        let held_off = self
            .current(rail)
            .filter(|i| sensible && i.0 <= 0.0)
            .map(|_| Point {
                volts: rail,
                amps: Amp::ZERO,
            });
        self.pieces()
            .filter_map(move |(s, end)| {
                let i = s.at(vu) / (1.0 + s.slope * r);
                let v = vu - i * r;
                let on_piece = v >= s.start && v <= end;
                (sensible && i.is_finite() && i >= 0.0 && v >= 0.0 && on_piece).then_some(Point {
                    volts: Volt(v),
                    amps: Amp(i),
                })
            })
            .chain(held_off)
    }

    /// The point of the line with the greatest dissipation between 0 and `highest` volts. On a
    /// straight line from `I0` at zero volts to zero current at `V0` it is `I0·V0/4`, at `V0/2`.
    ///
    /// `None` if the line allows no current in that range.
    #[must_use]
    pub fn hottest(&self, highest: Volt) -> Option<Point> {
        let top = positive(highest.0)?;
        self.pieces()
            .filter_map(|(s, end)| {
                let (lo, hi) = (s.start.max(0.0), end.min(top));
                let summit = 0.5 * (s.volts - s.amps / s.slope);
                let v = if s.slope < 0.0 {
                    summit.max(lo).min(hi)
                } else {
                    hi
                };
                (lo <= hi).then_some(Point {
                    volts: Volt(v),
                    amps: Amp(s.at(v)),
                })
            })
            .filter(|p| p.amps.0 > 0.0 && p.watts().is_finite())
            .max_by(|a, b| a.watts().0.total_cmp(&b.watts().0))
    }

    /// Each piece with the voltage at which it ends.
    fn pieces(&self) -> impl Iterator<Item = (&Segment, f64)> {
        let ends = self
            .segments
            .iter()
            .skip(1)
            .map(|s| s.start)
            .chain([f64::INFINITY]);
        self.segments.iter().zip(ends)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::physics::math;
    use proptest::prelude::*;

    fn dual() -> Network {
        Network {
            emitter: Ohm(0.22),
            sense_base: Ohm(220.0),
            base_output: Some(Ohm(150.0)),
            rail_base: Some(Ohm(47e3)),
            clamp: Some(Clamp {
                rail_node: Ohm(6800.0),
                node_base: Ohm(3300.0),
                zener: Volt(15.0),
            }),
        }
    }

    /// Brute-force twin: the node equation itself, solved by bracketing, with the zener written as
    /// what it does (it holds its node no higher than Vz above the output).
    fn by_node_equation(n: &Network, von: f64, v: f64) -> f64 {
        let balance = |i: f64| {
            let x = v + i * n.emitter.0;
            let from_rail = n.rail_base.map_or(0.0, |r| (x - von) / r.0);
            let from_clamp = n.clamp.map_or(0.0, |c| {
                let (ra, rb) = (c.rail_node.0, c.node_base.0);
                let open = von + (x - von) * rb / (ra + rb);
                (open.min(c.zener.0) - von) / rb
            });
            let to_output = n.base_output.map_or(0.0, |r| von / r.0);
            (i * n.emitter.0 - von) / n.sense_base.0 + from_rail + from_clamp - to_output
        };
        math::root(balance, -1e6, 1e6, 1e-12).unwrap()
    }

    fn any_network() -> impl Strategy<Value = Network> {
        (
            0.05..1.0_f64,
            47.0..2e3_f64,
            proptest::option::of(47.0..2e3_f64),
            proptest::option::of(1e3..1e5_f64),
            proptest::option::of((1e3..3e4_f64, 1e3..3e4_f64, 3.0..40.0_f64)),
        )
            .prop_map(|(re, r1, r2, r3, clamp)| Network {
                emitter: Ohm(re),
                sense_base: Ohm(r1),
                base_output: r2.map(Ohm),
                rail_base: r3.map(Ohm),
                clamp: clamp.map(|(ra, rb, vz)| Clamp {
                    rail_node: Ohm(ra),
                    node_base: Ohm(rb),
                    zener: Volt(vz),
                }),
            })
    }

    proptest! {
        #[test]
        fn line_solves_the_node_equation(n in any_network(), von in 0.4..0.8_f64, v in 0.0..200.0_f64) {
            let line = n.line(Volt(von)).unwrap();
            let closed = line.current(Volt(v)).unwrap().0;
            let brute = by_node_equation(&n, von, v);
            prop_assert!((closed - brute).abs() <= 1e-8 * (1.0 + brute.abs()), "{closed} {brute}");
        }

        /// Every one of the 2^7 corners of the tolerance box lies between the two extremes.
        #[test]
        fn extremes_hold_every_corner(n in any_network(), v in 0.0..150.0_f64, t in 0.0..0.2_f64) {
            let tol = Tolerance { resistors: t, emitter: 0.5 * t, zener: 0.3 * t };
            let at = |lines: [LimitLine; 2], pick: fn(f64, f64) -> f64| {
                let [a, b] = lines.map(|l| l.current(Volt(v)).unwrap().0);
                pick(a, b)
            };
            let von = Volt(0.6);
            let most = at(n.extremes(von, tol, Extreme::Most).unwrap(), f64::max);
            let least = at(n.extremes(von, tol, Extreme::Least).unwrap(), f64::min);
            let (mut high, mut low) = (f64::NEG_INFINITY, f64::INFINITY);
            for corner in 0..128_u32 {
                let f = |bit: u32, t: f64| if corner >> bit & 1 == 1 { 1.0 + t } else { 1.0 - t };
                let c = Network {
                    emitter: n.emitter * f(0, tol.emitter),
                    sense_base: n.sense_base * f(1, t),
                    base_output: n.base_output.map(|r| r * f(2, t)),
                    rail_base: n.rail_base.map(|r| r * f(3, t)),
                    clamp: n.clamp.map(|c| Clamp {
                        rail_node: c.rail_node * f(4, t),
                        node_base: c.node_base * f(5, t),
                        zener: c.zener * f(6, tol.zener),
                    }),
                };
                let i = c.line(von).unwrap().current(Volt(v)).unwrap().0;
                (high, low) = (high.max(i), low.min(i));
            }
            // A negative current is scaled the other way by RE; the limiter then already fires
            // without load, whatever the corner.
            if low > 0.0 {
                prop_assert!((most - high).abs() <= 1e-9 * high, "{most} {high}");
                prop_assert!((least - low).abs() <= 1e-9 * high, "{least} {low}");
            }
        }

        #[test]
        fn short_circuit_is_on_the_line_and_on_the_load_line(n in any_network(), vu in 20.0..120.0_f64) {
            let line = n.line(Volt(0.6)).unwrap();
            if let Some(p) = line.short_circuit(Volt(vu), n.emitter) {
                prop_assert!((p.volts.0 + p.amps.0 * n.emitter.0 - vu).abs() < 1e-9 * vu);
                let allowed = line.current(p.volts).unwrap().0;
                prop_assert!((p.amps.0 - allowed.max(0.0)).abs() < 1e-8 * (1.0 + p.amps.0));
            }
        }

        #[test]
        fn hottest_beats_every_sample(n in any_network(), top in 10.0..200.0_f64) {
            let line = n.line(Volt(0.6)).unwrap();
            let best = line.hottest(Volt(top)).map_or(0.0, |p| p.watts().0);
            for k in 0..=400 {
                let v = top * f64::from(k) / 400.0;
                let watts = v * line.current(Volt(v)).unwrap().0;
                prop_assert!(watts <= best * (1.0 + 1e-9) + 1e-9, "{v}: {watts} > {best}");
            }
        }

        #[test]
        fn nothing_makes_it_panic_or_lie(
            re in proptest::num::f64::ANY, r1 in proptest::num::f64::ANY, r2 in proptest::num::f64::ANY, r3 in proptest::num::f64::ANY,
            von in proptest::num::f64::ANY, v in proptest::num::f64::ANY,
        ) {
            let n = Network {
                emitter: Ohm(re), sense_base: Ohm(r1), base_output: Some(Ohm(r2)),
                rail_base: Some(Ohm(r3)), clamp: None,
            };
            if let Some(line) = n.line(Volt(von)) {
                prop_assert!(line.current(Volt(v)).is_none_or(|i| i.is_finite()));
                let _ = (line.short_circuit(Volt(v), Ohm(re)), line.hottest(Volt(v)), line.holds_off_at());
            }
        }
    }

    #[test]
    fn the_two_slopes_meet() {
        let line = dual().line(Volt(0.65)).unwrap();
        let knee = line.corners().next().unwrap();
        let just_above = by_node_equation(&dual(), 0.65, knee.volts.0 + 1e-9);
        assert!((knee.amps.0 - just_above).abs() < 1e-7); // J is continuous at the break
    }

    #[test]
    fn stated_points_are_joined_and_flat_outside() {
        let points = [(Volt(60.0), Amp(2.0)), (Volt(20.0), Amp(8.0))];
        let line = LimitLine::through(&points).unwrap();
        for (v, i) in [
            (0.0, 8.0),
            (20.0, 8.0),
            (40.0, 5.0),
            (60.0, 2.0),
            (200.0, 2.0),
        ] {
            assert!((line.current(Volt(v)).unwrap().0 - i).abs() < 1e-12, "{v}"); // by inspection
        }
        assert_eq!(line.holds_off_at(), None);
        assert_eq!(LimitLine::through(&[]), None);
        assert_eq!(
            LimitLine::through(&[(Volt(1.0), Amp(1.0)), (Volt(1.0), Amp(2.0))]),
            None
        );
        assert_eq!(LimitLine::through(&[(Volt(f64::NAN), Amp(1.0))]), None);
    }

    #[test]
    fn a_stated_cliff_shorts_at_its_worst_meeting() {
        // Load line v = 40 - 4i against a cliff from (20 V, 8 A) to (22 V, 1 A): it meets the flat
        // top at i = 8, v = 8 (on the piece left of 20 V), the cliff at
        // i = 8 - 3.5(v - 20) with v = 40 - 4i: i = 62/13 = 4.769, v = 20.92; and the flat tail at
        // i = 1, v = 36.
        let line = LimitLine::through(&[(Volt(20.0), Amp(8.0)), (Volt(22.0), Amp(1.0))]).unwrap();
        let worst = line.short_circuit(Volt(40.0), Ohm(4.0)).unwrap();
        let first = line.first_limited(Volt(40.0), Ohm(4.0)).unwrap();
        assert!((worst.amps.0 - 8.0).abs() < 1e-12 && (worst.volts.0 - 8.0).abs() < 1e-12);
        assert!((first.amps.0 - 1.0).abs() < 1e-12 && (first.volts.0 - 36.0).abs() < 1e-12);
    }

    #[test]
    fn a_line_that_holds_the_device_off_shorts_at_no_current() {
        let n = Network {
            rail_base: Some(Ohm(2200.0)),
            clamp: None,
            ..dual()
        };
        let line = n.line(Volt(0.55)).unwrap();
        let off = line.holds_off_at().unwrap();
        let p = line.short_circuit(off + Volt(10.0), n.emitter).unwrap();
        assert_eq!(p.amps, Amp::ZERO);
    }

    #[test]
    fn turn_on_falls_two_millivolts_a_kelvin() {
        let hot = turn_on(Volt(0.65), TURN_ON_DRIFT, Celsius(75.0)).unwrap();
        assert!((hot.0 - 0.55).abs() < 1e-12); // 0.65 - 50 x 0.002
        assert_eq!(turn_on(Volt(0.6), TURN_ON_DRIFT, Celsius(400.0)), None);
        assert_eq!(turn_on(Volt(0.6), TURN_ON_DRIFT, Celsius(f64::NAN)), None);
    }
}
