//! One rail in its periodic steady state: a rectified sine behind a resistance, a reservoir with its
//! ESR, and a constant current drawn.
//! Must not know why the current is drawn, nor how the source came about.

use super::conduction::{Conduction, bracketed_root, steady_angles};
use crate::physics::math::{FRAC_PI_2, PI, TAU, cos, sin_cos};
use crate::physics::unit::{Amp, Farad, Hertz, Ohm, Second, Volt};

/// What makes one rail.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RailParts {
    /// Crest of the unloaded winding, V0 = m·√2·Vs·(1 + ρ).
    pub no_load_crest: Volt,
    /// Diode drop Vd of the whole charging path.
    pub diode_drop: Volt,
    /// Everything in series with the charging current outside the reservoir: winding, leads, what
    /// of the mains and of a soft start is seen through the transformer.
    pub source: Ohm,
    /// Reservoir capacitance.
    pub reservoir: Farad,
    /// Its equivalent series resistance; 0 if it is to be left out.
    pub esr: Ohm,
    /// Mains frequency.
    pub mains: Hertz,
}

/// One rail of a supply, as a positive voltage. Holds only parts that make sense.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Rail {
    /// Crest E of the source, volts.
    pub(super) crest: f64,
    /// Vd/E.
    pub(super) floor: f64,
    /// R = source resistance + ESR, ohms.
    pub(super) resistance: f64,
    /// ESR/R.
    pub(super) esr_share: f64,
    /// Reservoir, farads.
    pub(super) reservoir: f64,
    /// ω = 2π·mains frequency, per second.
    pub(super) omega: f64,
    /// x = ω·R·C.
    pub(super) x: f64,
}

impl Rail {
    /// A rail of these parts; `None` unless all are finite, voltages, source resistance, reservoir
    /// and frequency above zero, the ESR and the drop not below, and the crest above the drop.
    #[must_use]
    pub fn new(parts: RailParts) -> Option<Self> {
        let (crest, drop) = (parts.no_load_crest.0, parts.diode_drop.0);
        let (source, esr) = (parts.source.0, parts.esr.0);
        let omega = TAU * parts.mains.0;
        let resistance = source + esr;
        let x = omega * resistance * parts.reservoir.0;
        let sound = source > 0.0
            && esr >= 0.0
            && parts.reservoir.0 > 0.0
            && omega > 0.0
            && drop >= 0.0
            && crest > drop
            && [crest, resistance, omega, parts.reservoir.0]
                .iter()
                .all(|q| q.is_finite())
            && (1e-6..1e9).contains(&x);
        sound.then_some(Self {
            crest,
            floor: drop / crest,
            resistance,
            esr_share: esr / resistance,
            reservoir: parts.reservoir.0,
            omega,
            x,
        })
    }

    /// The same rail with `extra` ohms more in series with the charging current.
    #[must_use]
    pub fn with_series(&self, extra: Ohm) -> Option<Self> {
        Self::new(RailParts {
            no_load_crest: Volt(self.crest),
            diode_drop: Volt(self.crest * self.floor),
            source: Ohm(self.resistance * (1.0 - self.esr_share) + extra.0),
            reservoir: Farad(self.reservoir),
            esr: Ohm(self.resistance * self.esr_share),
            mains: Hertz(self.omega / TAU),
        })
    }

    /// The rail with no current drawn: V0 - Vd.
    #[must_use]
    pub fn unloaded(&self) -> Volt {
        Volt(self.crest * (1.0 - self.floor))
    }

    /// The periodic steady state with a constant current drawn.
    ///
    /// Solved exactly, from turn-on to turn-off to turn-on, by the two equations of the module
    /// `conduction`. `None` for a current below zero, or one at which the rail would touch zero:
    /// there a constant current is no amplifier any more. Sources: charge balance and Kirchhoff's
    /// laws; against the charts of O. H. Schade, Proc. IRE 31 (1943) 341, through the reference
    /// tests.
    #[must_use]
    pub fn loaded(&self, current: Amp) -> Option<Cycle> {
        let j = self.resistance * current.0 / self.crest;
        if current.0 == 0.0 {
            return Some(Cycle::idle(self));
        }
        if !(j > 0.0 && j.is_finite()) {
            return None;
        }
        let (alpha, beta) = steady_angles(self.x, j, self.floor)?;
        let conduction = Conduction::new(self.x, j, alpha, 0.0);
        let cycle = Cycle {
            rail: *self,
            conduction,
            summit: conduction.greatest(beta),
            current: current.0,
            j,
            alpha,
            beta,
            trough: 0.0,
        };
        let trough = cycle.terminal(cycle.trough_angle());
        (trough > 0.0).then_some(Cycle { trough, ..cycle })
    }

    /// In volts: the rail terminal for a level (without conduction), crest ratio in.
    pub(super) fn volts(&self, level: f64) -> f64 {
        self.crest * (level - self.floor)
    }
}

/// One moment of a rail's waveform.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sample {
    /// Since a zero crossing of the mains.
    pub time: Second,
    /// Voltage at the rail terminal.
    pub rail: Volt,
    /// Charging current.
    pub charging: Amp,
}

/// The periodic steady state of a rail at one constant current.
///
/// A query is a closed form or a few Newton steps; nothing is kept but the angles and the
/// trough. The waveform repeats every half-cycle of the mains.
#[derive(Clone, Copy, Debug)]
pub struct Cycle {
    rail: Rail,
    conduction: Conduction,
    current: f64,
    j: f64,
    alpha: f64,
    beta: f64,
    /// Angle of the greatest charging current.
    summit: f64,
    trough: f64,
}

impl Cycle {
    fn idle(rail: &Rail) -> Self {
        Self {
            rail: *rail,
            conduction: Conduction::new(rail.x, 0.0, FRAC_PI_2, 0.0),
            current: 0.0,
            j: 0.0,
            alpha: FRAC_PI_2,
            beta: FRAC_PI_2,
            summit: FRAC_PI_2,
            trough: rail.unloaded().0,
        }
    }

    /// The constant current drawn.
    #[must_use]
    pub fn current(&self) -> Amp {
        Amp(self.current)
    }

    /// Angle of the mains over which the rectifier conducts in each half-cycle, β - α in radians.
    #[must_use]
    pub fn conduction_rad(&self) -> f64 {
        self.beta - self.alpha
    }

    /// Mean of the rail terminal over a half-cycle.
    ///
    /// While conducting the level is sin θ - s, and ∫s is known from the charge; elsewhere it falls
    /// straight from sin β to sin α: with the ESR's mean r·(mean charging - I) = 0,
    /// mean = E/π·(cos α - cos β - πj + (sin α + sin β)(π + α - β)/2) - Vd + r·I.
    #[must_use]
    pub fn mean(&self) -> Volt {
        let ((sin_a, cos_a), (sin_b, cos_b)) = (sin_cos(self.alpha), sin_cos(self.beta));
        let rest = PI + self.alpha - self.beta;
        let level = (cos_a - cos_b + 0.5 * (sin_a + sin_b) * rest) / PI - self.j;
        Volt(self.rail.volts(level + self.rail.esr_share * self.j))
    }

    /// Lowest voltage of the rail terminal, at or shortly after turn-on.
    #[must_use]
    pub fn trough(&self) -> Volt {
        Volt(self.trough)
    }

    /// Highest voltage of the rail terminal, before turn-off.
    #[must_use]
    pub fn crest(&self) -> Volt {
        if self.j <= 0.0 {
            return Volt(self.trough);
        }
        let rise = |angle| self.terminal_slope(angle);
        Volt(self.terminal(bracketed_root(rise, self.summit, self.beta, self.beta)))
    }

    /// R.m.s. of the charging current, which is the winding's where each winding feeds one rail
    /// and where two equal rails share a centre-tapped one.
    #[must_use]
    pub fn charging_rms(&self) -> Amp {
        let rms = (self.conduction.square(self.beta) / PI).sqrt();
        Amp(rms * self.rail.crest / self.rail.resistance)
    }

    /// Peak of the charging current, which is the peak of one diode.
    #[must_use]
    pub fn charging_peak(&self) -> Amp {
        let (s, _) = self.conduction.current(self.summit);
        Amp(s.max(0.0) * self.rail.crest / self.rail.resistance)
    }

    /// Mean current of one diode: half the rail current in either arrangement, as two diodes or
    /// pairs take turns.
    #[must_use]
    pub fn diode_mean(&self) -> Amp {
        Amp(0.5 * self.current)
    }

    /// R.m.s. ripple current of the reservoir from charging alone: √(Irms² - I²).
    #[must_use]
    pub fn reservoir_rms(&self) -> Amp {
        let rms = self.charging_rms().0;
        Amp((rms * rms - self.current * self.current).max(0.0).sqrt())
    }

    /// The waveform at an angle of the mains, in radians from a zero crossing.
    #[must_use]
    pub fn at(&self, angle_rad: f64) -> Sample {
        let angle = angle_rad.rem_euclid(PI);
        let charging = if angle > self.alpha && angle < self.beta {
            self.conduction.current(angle).0.max(0.0)
        } else {
            0.0
        };
        let level = if charging > 0.0 {
            sin_cos(angle).0 - charging * (1.0 - self.rail.esr_share)
        } else {
            let since = if angle < self.beta {
                angle + PI - self.beta
            } else {
                angle - self.beta
            };
            sin_cos(self.beta).0 - self.j / self.rail.x * since
        };
        Sample {
            time: Second(angle_rad / self.rail.omega),
            rail: Volt(self.rail.volts(level)),
            charging: Amp(charging * self.rail.crest / self.rail.resistance),
        }
    }

    /// `count` samples over one half-cycle, evenly spaced, the first at the zero crossing.
    pub fn samples(&self, count: usize) -> impl Iterator<Item = Sample> + '_ {
        (0..count).map(move |n| self.at(PI * n as f64 / count as f64))
    }

    /// Rail terminal at an angle of conduction, volts: E·(sin θ - (1 - r/R)·s) - Vd.
    fn terminal(&self, angle: f64) -> f64 {
        let (s, _) = self.conduction.current(angle);
        self.rail
            .volts(sin_cos(angle).0 - (1.0 - self.rail.esr_share) * s)
    }

    /// Slope of the terminal while conducting, in crest units, and its own slope:
    /// h = (1 - r/R)(s - j)/x + (r/R)·cos θ.
    fn terminal_slope(&self, angle: f64) -> (f64, f64) {
        let (s, slope) = self.conduction.current(angle);
        let (sin, cos) = sin_cos(angle);
        let share = self.rail.esr_share;
        let inner = (1.0 - share) / self.rail.x;
        (
            inner * (s - self.j) + share * cos,
            inner * slope - share * sin,
        )
    }

    /// Where the terminal is lowest. Up to the greatest charging current h is concave, so it is
    /// either not below zero at turn-on, which is then the trough, or rises through zero once.
    fn trough_angle(&self) -> f64 {
        let share = self.rail.esr_share;
        if share * cos(self.alpha) >= (1.0 - share) * self.j / self.rail.x {
            return self.alpha;
        }
        let rise = |angle| self.terminal_slope(angle);
        bracketed_root(rise, self.summit, self.alpha, self.alpha)
    }
}

#[cfg(test)]
pub(super) mod tests {
    use super::*;
    use crate::physics::supply::twin::Twin;
    use proptest::prelude::*;

    pub(crate) fn parts() -> RailParts {
        RailParts {
            no_load_crest: Volt(52.467),
            diode_drop: Volt(0.9),
            source: Ohm(0.49),
            reservoir: Farad(0.01),
            esr: Ohm(0.03),
            mains: Hertz(50.0),
        }
    }

    pub(crate) fn twin(p: RailParts) -> Twin {
        Twin {
            crest: p.no_load_crest.0,
            drop: p.diode_drop.0,
            source: p.source.0,
            esr: p.esr.0,
            reservoir: p.reservoir.0,
            omega: TAU * p.mains.0,
        }
    }

    prop_compose! {
        /// Any supply a power amplifier might have, and many it would not.
        pub(crate) fn any_parts()(
            crest in 10.0f64..150.0, drop in 0.0f64..2.5, source in -4.0f64..1.5,
            reservoir in -7.5f64..-2.0, esr in 0.0f64..0.3, sixty in any::<bool>(),
        ) -> RailParts {
            RailParts {
                no_load_crest: Volt(crest),
                diode_drop: Volt(drop),
                source: Ohm(crate::physics::math::exp(source)),
                reservoir: Farad(crate::physics::math::exp(reservoir)),
                esr: Ohm(esr),
                mains: Hertz(if sixty { 60.0 } else { 50.0 }),
            }
        }
    }

    #[test]
    fn no_current_leaves_the_crest_less_the_drop() {
        let cycle = Rail::new(parts()).unwrap().loaded(Amp(0.0)).unwrap();
        for v in [cycle.mean(), cycle.trough(), cycle.crest()] {
            assert!((v.0 - 51.567).abs() < 1e-12, "{v:?}"); // 52.467 - 0.9
        }
        assert_eq!(cycle.charging_rms(), Amp(0.0));
        assert_eq!(cycle.charging_peak(), Amp(0.0));
        let tiny = Rail::new(parts()).unwrap().loaded(Amp(1e-9)).unwrap();
        assert!((tiny.mean() - cycle.mean()).abs() < Volt(1e-4));
    }

    #[test]
    fn senseless_parts_and_currents_are_refused() {
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY] {
            assert_eq!(
                Rail::new(RailParts {
                    no_load_crest: Volt(bad),
                    ..parts()
                }),
                None
            );
            assert_eq!(
                Rail::new(RailParts {
                    source: Ohm(bad),
                    ..parts()
                }),
                None
            );
            assert_eq!(
                Rail::new(RailParts {
                    reservoir: Farad(bad),
                    ..parts()
                }),
                None
            );
            assert_eq!(
                Rail::new(RailParts {
                    mains: Hertz(bad),
                    ..parts()
                }),
                None
            );
        }
        for bad in [-1.0, f64::NAN, f64::INFINITY, 1e12, 1e300] {
            assert!(
                Rail::new(parts()).unwrap().loaded(Amp(bad)).is_none(),
                "{bad}"
            );
        }
        assert_eq!(
            Rail::new(RailParts {
                diode_drop: Volt(60.0),
                ..parts()
            }),
            None
        );
    }

    #[test]
    fn an_endless_reservoir_has_no_ripple_and_one_form_factor() {
        // C without end: I = (2E/πR)(sin φ - φ·cos φ), V = E·cos φ - Vd, Irms² by quadrature of the
        // closed form (2E²/π·R²)[φ/2 - 3/2·sin φ·cos φ + φ·cos² φ]; all by hand.
        let rail = Rail::new(RailParts {
            reservoir: Farad(1e4),
            esr: Ohm(0.0),
            ..parts()
        })
        .unwrap();
        let (e, r) = (52.467, 0.49);
        for phi in [0.1, 0.3, 0.6, 1.0] {
            let (sin, cos) = sin_cos(phi);
            let current = 2.0 * e / (PI * r) * (sin - phi * cos);
            let square =
                2.0 * e * e / (PI * r * r) * (0.5 * phi - 1.5 * sin * cos + phi * cos * cos);
            let cycle = rail.loaded(Amp(current)).unwrap();
            assert!((cycle.mean().0 - (e * cos - 0.9)).abs() < 1e-6);
            assert!(cycle.crest() - cycle.trough() < Volt(1e-4));
            assert!((cycle.charging_rms().0 / square.sqrt() - 1.0).abs() < 1e-6);
            assert!((cycle.conduction_rad() - 2.0 * phi).abs() < 1e-6);
            assert!((cycle.charging_peak().0 - e * (1.0 - cos) / r).abs() < 1e-5);
        }
    }

    #[test]
    fn samples_are_the_waveform() {
        let cycle = Rail::new(parts()).unwrap().loaded(Amp(2.0)).unwrap();
        let samples: Vec<_> = cycle.samples(20_000).collect();
        let mean = samples.iter().map(|s| s.rail.0).sum::<f64>() / 20_000.0;
        let charge = samples.iter().map(|s| s.charging.0).sum::<f64>() / 20_000.0;
        let low = samples
            .iter()
            .map(|s| s.rail.0)
            .fold(f64::INFINITY, f64::min);
        assert!(
            (mean - cycle.mean().0).abs() < 1e-7,
            "{mean} {:?}",
            cycle.mean()
        );
        assert!((charge - 2.0).abs() < 1e-6);
        assert!((low - cycle.trough().0).abs() < 1e-4);
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(1500))]

        /// One half-cycle of small steps from the solved start comes back to it, and measures the
        /// same mean, trough, crest, peak and r.m.s.
        #[test]
        fn steady_state_repeats_under_small_steps(parts in any_parts(), lj in -9.0f64..-0.5) {
            let rail = Rail::new(parts).unwrap();
            let current = crate::physics::math::exp(lj) * parts.no_load_crest.0 / rail.resistance;
            let twin = twin(parts);
            let Some(cycle) = rail.loaded(Amp(current)) else {
                // Refused: then a long march must indeed end at or below zero volts.
                let h = PI / twin.omega / 200.0;
                let half_cycles = 50 + (20.0 * rail.x) as usize;
                let mut low = f64::INFINITY;
                let start = (0.0, 0.2 * parts.no_load_crest.0);
                twin.march(&|_| current, start, h, 200 * half_cycles, |_, v, _| {
                    low = low.min(v);
                });
                prop_assert!(low < 1e-2 * parts.no_load_crest.0, "refused at {low} V");
                return Ok(());
            };
            let count = 2000;
            let h = PI / twin.omega / count as f64;
            let start = cycle.alpha / twin.omega;
            let inside = rail.volts(sin_cos(cycle.alpha).0) + parts.esr.0 * current;
            let (mut mean, mut square, mut peak) = (0.0, 0.0, 0.0f64);
            let (mut low, mut high) = (f64::INFINITY, f64::NEG_INFINITY);
            let end = twin.march(&|_| current, (start, inside), h, count, |_, v, i| {
                mean += v / count as f64;
                square += i * i / count as f64;
                peak = peak.max(i);
                low = low.min(v);
                high = high.max(v);
            });
            let scale = parts.no_load_crest.0;
            let unit = scale / rail.resistance;
            prop_assert!((end - inside).abs() < 1e-5 * scale, "{end} {inside}");
            prop_assert!((mean - cycle.mean().0).abs() < 1e-5 * scale, "mean {mean} {:?}", cycle.mean());
            prop_assert!((low - cycle.trough().0).abs() < 3e-3 * scale && low >= cycle.trough().0 - 1e-5 * scale);
            prop_assert!((high - cycle.crest().0).abs() < 3e-3 * scale && high <= cycle.crest().0 + 1e-5 * scale);
            prop_assert!((square.sqrt() - cycle.charging_rms().0).abs() < 1e-4 * unit);
            prop_assert!((peak - cycle.charging_peak().0).abs() < 2e-3 * unit && peak <= cycle.charging_peak().0 + 1e-5 * unit);
        }

        /// More current: a lower rail, a longer conduction, never a number that is none.
        #[test]
        fn more_current_lowers_the_rail(parts in any_parts(), lj in -12.0f64..-0.5, more in 1.01f64..3.0) {
            let rail = Rail::new(parts).unwrap();
            let current = crate::physics::math::exp(lj) * parts.no_load_crest.0 / rail.resistance;
            if let (Some(a), Some(b)) = (rail.loaded(Amp(current)), rail.loaded(Amp(current * more))) {
                prop_assert!(b.mean() < a.mean() && b.trough() < a.trough());
                prop_assert!(b.conduction_rad() > a.conduction_rad());
                prop_assert!(b.charging_rms() > a.charging_rms() && a.charging_rms().0 > current);
                prop_assert!(a.trough() < a.mean() && a.mean() < a.crest() && a.crest() <= rail.unloaded());
            }
        }
    }
}
