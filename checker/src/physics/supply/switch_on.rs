//! Switching a supply on: the charging surge, a soft start, a saturated core.
//! Must not know fuses or ratings; currents are a winding's unless a name says primary.

use super::conduction::{HalfCycle, half_cycle};
use super::rail::Rail;
use super::transformer::Transformer;
use crate::physics::math::{FRAC_PI_2, PI, SQRT_2};
use crate::physics::unit::{Amp, AmpSquaredSecond, Hertz, Joule, Ohm, Second, Volt, Watt};

/// Most half-cycles any switch-on is followed for.
const MOST_HALF_CYCLES: usize = 20_000;

/// Until a rail has come up to this it draws no idle current: no stage is biased yet (a convention
/// of this model). From then on it does, even should it sink below again.
const BIASED: Volt = Volt(10.0);

/// The moment of the mains at which a switch closes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Closing {
    /// At a zero crossing.
    Zero,
    /// At a crest.
    Crest,
}

impl Closing {
    /// The mains angle, radians from a zero crossing.
    fn angle(self) -> f64 {
        match self {
            Self::Zero => 0.0,
            Self::Crest => FRAC_PI_2,
        }
    }
}

/// The current of one winding while its reservoir charges.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Surge {
    /// Peak.
    pub peak: Amp,
    /// I²t over the first half period of the mains after closing.
    pub first: AmpSquaredSecond,
    /// I²t until the reservoir is full.
    pub total: AmpSquaredSecond,
}

impl Surge {
    /// The surge of the primary, `conducting` windings charging at once: currents times n·a, their
    /// squares times (n·a)².
    #[must_use]
    pub fn primary(self, transformer: &Transformer, conducting: u32) -> Self {
        let ratio = f64::from(conducting) * transformer.turns_ratio();
        Self {
            peak: self.peak * ratio,
            first: self.first * (ratio * ratio),
            total: self.total * (ratio * ratio),
        }
    }

    /// Peak and I²t each the greater of two.
    #[must_use]
    pub fn worse(self, other: Self) -> Self {
        Self {
            peak: self.peak.max(other.peak),
            first: self.first.max(other.first),
            total: self.total.max(other.total),
        }
    }
}

/// Charging of a reservoir from `start` volts, nothing drawn, the core not saturated: exact from
/// half-cycle to half-cycle, up to a pulse that adds a millionth: the pulses fall with the fifth power
/// of their number, so I²t is complete to about 1e-4. Core and leakage inductance are left out, so the peak is high.
///
/// The rail's source resistance is to hold winding, leads and mains seen from the winding, and a
/// soft start if there is one. `None` for a start below zero or not finite.
#[must_use]
pub fn switch_on(rail: &Rail, closing: Closing, start: Volt) -> Option<Surge> {
    if !(start.0 >= 0.0 && start.is_finite()) {
        return None;
    }
    let from = closing.angle();
    let closing = half_cycle(rail.x, 0.0, (from, PI), rail.level(start));
    let mut next = half_cycle(rail.x, 0.0, (0.0, PI), closing.level);
    let first = closing.square(PI) + next.square(from);
    let peak = closing.peak().max(next.peak());
    let mut total = closing.square(PI);
    for _ in 0..MOST_HALF_CYCLES {
        let pulse = next.square(PI);
        total += pulse;
        if pulse <= 1e-6 * total {
            break;
        }
        next = half_cycle(rail.x, 0.0, (0.0, PI), next.level);
    }
    Some(Surge {
        peak: rail.amps(peak),
        first: rail.let_through(first),
        total: rail.let_through(total),
    })
}

/// The surge of a primary whose core saturates for the whole half-cycle after closing at the worst
/// moment: Ipk = m·√2·Vtap/(Rpri + Rmains + Rinrush), a half sine at mains frequency, so
/// I²t = Ipk²/(4f). The air-core inductance that remains is left out: an upper bound.
///
/// `voltage`: r.m.s. mains across the tap, m·Vtap; `resistance`: everything in the primary circuit.
/// Gives peak and I²t; `None` unless all are finite and above zero.
#[must_use]
pub fn core_surge(voltage: Volt, resistance: Ohm, mains: Hertz) -> Option<(Amp, AmpSquaredSecond)> {
    if !(voltage.0 > 0.0 && resistance.0 > 0.0 && mains.0 > 0.0) {
        return None;
    }
    let peak = voltage * SQRT_2 / resistance;
    let let_through = AmpSquaredSecond(peak.0 * peak.0 / (4.0 * mains.0));
    (let_through.is_finite() && let_through.0 > 0.0).then_some((peak, let_through))
}

/// What a soft start does.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SoftStart {
    /// The rail when the bypass closes: the lower of closing at zero and at crest.
    pub reached: Volt,
    /// Energy the resistor takes until then: the greater of closing at zero and at crest.
    pub energy: Joule,
}

/// A resistor in the primary, bypassed `bypass` seconds after switch-on, while the rail draws `idle`
/// from the moment at which it has come up to 10 V.
///
/// Exact from event to event. `rail` is the rail without the resistor; `referred` is the
/// resistor seen from one of `conducting` windings, n·a²·R ([`Transformer::referred`]), in which
/// the n windings' currents i lose n·(n·a²·R)·i² together.
/// `None` for values below zero or not finite, or a bypass later than 20 000 half-cycles.
#[must_use]
pub fn soft_start(
    rail: &Rail,
    referred: Ohm,
    conducting: u32,
    idle: Amp,
    bypass: Second,
) -> Option<SoftStart> {
    let slow = rail.with_series(referred)?;
    let turn = bypass.0 * rail.omega;
    let sound = (0.0..=MOST_HALF_CYCLES as f64 * PI).contains(&turn)
        && referred.0 >= 0.0
        && idle.0 >= 0.0
        && idle.is_finite();
    if !sound {
        return None;
    }
    let zero = Charging::until(&slow, idle, Closing::Zero.angle(), turn);
    let crest = Charging::until(&slow, idle, Closing::Crest.angle(), turn);
    let all = referred * f64::from(conducting);
    Some(SoftStart {
        reached: zero.terminal().min(crest.terminal()),
        energy: Joule(all.0 * slow.let_through(zero.square.max(crest.square)).0),
    })
}

/// The two surges of a soft start: through the resistor until the bypass, nothing else drawn, and from
/// the rail `reached` when the bypass closes. Each is the worse of closing at zero and at crest.
///
/// Arguments and refusals as in [`soft_start`].
#[must_use]
pub fn soft_surges(
    rail: &Rail,
    referred: Ohm,
    bypass: Second,
    reached: Volt,
) -> Option<(Surge, Surge)> {
    let slow = rail.with_series(referred)?;
    let turn = bypass.0 * rail.omega;
    if !(0.0..=MOST_HALF_CYCLES as f64 * PI).contains(&turn) {
        return None;
    }
    let surge = |rail: &Rail, start| {
        Some(switch_on(rail, Closing::Zero, start)?.worse(switch_on(rail, Closing::Crest, start)?))
    };
    let alone = |closing: Closing| {
        let charging = Charging::until(&slow, Amp::ZERO, closing.angle(), turn);
        slow.let_through(charging.square)
    };
    let first = Surge {
        total: alone(Closing::Zero).max(alone(Closing::Crest)),
        ..surge(&slow, Volt::ZERO)?
    };
    Some((first, surge(rail, reached.max(Volt::ZERO))?))
}

/// A rail on its way up.
struct Charging<'a> {
    rail: &'a Rail,
    /// R·I/E of the idle current once it flows, 0 before.
    drawn: f64,
    /// Level of the capacitor itself, (u + Vd)/E.
    inside: f64,
    /// Charging current.
    current: f64,
    /// Integral of its square over the mains angle.
    square: f64,
}

impl<'a> Charging<'a> {
    /// From an empty reservoir at mains angle `from`, over `turn` radians of the mains.
    fn until(rail: &'a Rail, idle: Amp, from: f64, turn: f64) -> Self {
        let mut charging = Self {
            rail,
            drawn: 0.0,
            inside: rail.floor,
            current: 0.0,
            square: 0.0,
        };
        let j = rail.resistance * idle.0 / rail.crest;
        let (mut angle, mut left) = (from, turn);
        // a bypass at the end of a half-cycle, in decimals, must not leave a sliver of the next
        while left > 1e-9 {
            let to = (angle + left).min(PI);
            charging.stretch(angle, to, j);
            left -= to - angle;
            angle = 0.0;
        }
        charging
    }

    /// Within one half-cycle. Where the rail comes up to its bias the idle current sets in.
    fn stretch(&mut self, from: f64, to: f64, idle: f64) {
        let next = self.carried(from, to);
        let biased = self.rail.level(BIASED);
        match next.rises_to(biased).filter(|_| self.drawn <= 0.0) {
            Some(at) => {
                self.square += next.square(at);
                (self.inside, self.drawn) = (biased, idle);
                let rest = self.carried(at, to);
                self.take(rest);
            }
            None => self.take(next),
        }
    }

    fn carried(&self, from: f64, to: f64) -> HalfCycle {
        let drop = self.rail.esr_share * self.drawn;
        half_cycle(self.rail.x, self.drawn, (from, to), self.inside - drop)
    }

    fn take(&mut self, next: HalfCycle) {
        self.square += next.square(PI);
        // an empty rail gives no current
        self.inside = (next.level + self.rail.esr_share * self.drawn).max(self.rail.floor);
        self.current = next.current;
    }

    /// The rail: the capacitor, and its ESR with what flows into it.
    fn terminal(&self) -> Volt {
        let into = self.current - self.drawn;
        Volt(self.rail.volts(self.inside + self.rail.esr_share * into))
    }
}

/// Dissipation of a soft-start resistor whose bypass never closes, in the steady state with
/// `current` drawn from each rail: n·(n·a²·R)·Irms². `None` where the rail collapses.
#[must_use]
pub fn stuck_soft_start(rail: &Rail, referred: Ohm, conducting: u32, current: Amp) -> Option<Watt> {
    let rms = rail.with_series(referred)?.loaded(current)?.charging_rms();
    Some(rms * (referred * f64::from(conducting)) * rms)
}

impl Rail {
    /// The level of a rail terminal voltage without current.
    fn level(&self, voltage: Volt) -> f64 {
        voltage.0 / self.crest + self.floor
    }

    fn amps(&self, s: f64) -> Amp {
        Amp(s * self.crest / self.resistance)
    }

    /// I²t from the integral of s² over the mains angle.
    fn let_through(&self, square: f64) -> AmpSquaredSecond {
        let unit = self.crest / self.resistance;
        AmpSquaredSecond(square * unit * unit / self.omega)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::physics::supply::rail::RailParts;
    use crate::physics::supply::rail::tests::{any_parts, parts, twin};
    use proptest::prelude::*;

    #[test]
    fn a_full_reservoir_draws_no_surge() {
        let rail = Rail::new(parts()).unwrap();
        let surge = switch_on(&rail, Closing::Crest, rail.unloaded()).unwrap();
        assert!(surge.peak.0 < 1e-6 && surge.total.0 < 1e-9, "{surge:?}");
        for bad in [-1.0, f64::NAN, f64::INFINITY] {
            assert!(switch_on(&rail, Closing::Zero, Volt(bad)).is_none());
        }
    }

    #[test]
    fn primary_surge_follows_the_turns() {
        // By hand: two windings of a = 35·1.06/230 = 0.1613 carry 2·0.1613 = 0.3226 of the current.
        let t = Transformer::new(Volt(230.0), Volt(35.0), 2, 300.0, 0.06).unwrap();
        let one = AmpSquaredSecond(1.0);
        let surge = Surge {
            peak: Amp(1.0),
            first: one,
            total: one,
        }
        .primary(&t, 2);
        let ratio = 2.0 * 35.0 * 1.06 / 230.0;
        assert!((surge.peak.0 - ratio).abs() < 1e-12);
        assert!((surge.total.0 - ratio * ratio).abs() < 1e-12);
    }

    #[test]
    fn nonsense_is_refused() {
        let rail = Rail::new(parts()).unwrap();
        let soft = |r, i, t| soft_start(&rail, Ohm(r), 2, Amp(i), Second(t));
        for bad in [-1.0, f64::NAN, f64::INFINITY] {
            assert!(soft(bad, 0.1, 1.0).is_none());
            assert!(soft(1.0, bad, 1.0).is_none());
            assert!(soft(1.0, 0.1, bad).is_none());
            assert!(core_surge(Volt(bad), Ohm(1.0), Hertz(50.0)).is_none());
            assert!(core_surge(Volt(230.0), Ohm(bad), Hertz(50.0)).is_none());
        }
        assert!(soft(1.0, 0.1, 1e9).is_none());
        assert!(core_surge(Volt(230.0), Ohm(0.0), Hertz(50.0)).is_none());
    }

    #[test]
    fn a_soft_start_of_no_time_is_none() {
        let rail = Rail::new(parts()).unwrap();
        let found = soft_start(&rail, Ohm(2.0), 2, Amp(0.1), Second(0.0)).unwrap();
        assert_eq!((found.reached, found.energy), (Volt(0.0), Joule(0.0)));
        let direct = switch_on(&rail, Closing::Crest, Volt(0.0)).unwrap();
        let (_, second) = soft_surges(&rail, Ohm(2.0), Second(0.0), found.reached).unwrap();
        assert_eq!(second.peak, direct.peak);
    }

    #[test]
    fn stuck_resistor_takes_what_the_steady_state_says() {
        let rail = Rail::new(parts()).unwrap();
        let watts = stuck_soft_start(&rail, Ohm(2.0), 2, Amp(0.2)).unwrap();
        let rms = rail
            .with_series(Ohm(2.0))
            .unwrap()
            .loaded(Amp(0.2))
            .unwrap()
            .charging_rms();
        assert!((watts.0 - 4.0 * rms.0 * rms.0).abs() < 1e-12);
        assert!(stuck_soft_start(&rail, Ohm(2.0), 2, Amp(1e3)).is_none());
    }

    proptest! {
        #![proptest_config(ProptestConfig::with_cases(200))]

        /// Peak and I²t of the charging surge equal small steps, closing at either moment.
        #[test]
        fn surge_equals_small_steps(parts in any_parts(), crest in any::<bool>(), start in 0.0f64..0.9) {
            let rail = Rail::new(parts).unwrap();
            prop_assume!(rail.x > 0.1 && rail.x < 8.0);
            let twin = twin(parts);
            let (closing, from) = if crest { (Closing::Crest, 0.5 * PI) } else { (Closing::Zero, 0.0) };
            let volts = start * rail.unloaded().0;
            let found = switch_on(&rail, closing, Volt(volts)).unwrap();
            let h = PI / twin.omega / 2000.0;
            let (mut peak, mut first, mut total) = (0.0f64, 0.0, 0.0);
            let begin = from / twin.omega;
            let mut n = 0;
            twin.march(&|_| 0.0, (begin, volts), h, 2000 * (30 + (30.0 * rail.x) as usize), |_, _, i| {
                peak = peak.max(i);
                total += i * i * h;
                if n < 2000 {
                    first += i * i * h;
                }
                n += 1;
            });
            // The sum of rectangles misses half a step of the jump when closing at a crest.
            let edge = 0.5 * h * peak * peak * if crest { 1.0 } else { 0.0 };
            let near = |a: f64, b: f64| (a - b).abs() < 2e-3 * total + edge;
            prop_assert!((found.peak.0 - peak).abs() < 1e-3 * peak, "{found:?} {peak}");
            prop_assert!(near(found.first.0, first), "{found:?} {first}");
            prop_assert!(near(found.total.0, total), "{found:?} {total}");
        }

        /// A soft start equals small steps, closing at either moment.
        #[test]
        fn soft_start_equals_small_steps(
            parts in any_parts(), extra in 0.1f64..20.0, idle in 0.0f64..0.5, half_cycles in 0.2f64..60.0,
        ) {
            let rail = Rail::new(parts).unwrap();
            // a rail that creeps up to its bias without end has no moment at which it gets there
            prop_assume!(!(9.5..15.0).contains(&rail.unloaded().0));
            let bypass = half_cycles * PI / rail.omega;
            let found = soft_start(&rail, Ohm(extra), 2, Amp(idle), Second(bypass)).unwrap();
            let slow = twin(RailParts { source: Ohm(parts.source.0 + extra), ..parts });
            let biased = std::cell::Cell::new(false);
            let march = |from: f64| {
                let count = (half_cycles * 4000.0).ceil() as usize;
                let (h, mut square, mut last) = (bypass / count as f64, 0.0, 0.0);
                let (mut inside, mut end) = (0.0, 0.0);
                biased.set(false);
                for n in 0..count {
                    let drawn = if biased.get() { idle } else { 0.0 };
                    let start = from / slow.omega + h * n as f64;
                    inside = slow
                        .march(&|_| drawn, (start, inside), h, 1, |_, _, i| {
                            square += i * i * h;
                            last = i;
                        })
                        .max(0.0);
                    biased.set(biased.get() || inside >= 10.0);
                    end = inside + parts.esr.0 * (last - drawn);
                }
                (end, 2.0 * extra * square)
            };
            let (zero, crest) = (march(0.0), march(0.5 * PI));
            let (reached, joules) = (zero.0.min(crest.0), zero.1.max(crest.1));
            // Rectangles: half a step of the jump at a crest, and of the step at which idle sets in.
            let jump = parts.no_load_crest.0 / (slow.source + slow.esr);
            let edge = extra * jump * jump / 4000.0 * PI / rail.omega;
            prop_assert!((found.reached.0 - reached).abs() < 2e-3 * parts.no_load_crest.0, "{found:?} {reached}");
            prop_assert!((found.energy.0 - joules).abs() < 3e-3 * joules + edge, "{found:?} {joules}");
        }
    }
}
