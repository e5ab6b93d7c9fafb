//! Which lines carry a tolerance, and how a kit is drawn from them.
//! Must not know what a kit comes to.
//!
//! A value is drawn evenly over its tolerance: no sheet states more than the two ends. All parts of
//! one line are one draw, except where it is the difference between devices in parallel that counts:
//! there every resistor, or every device, of every bank of the build is drawn, and the worst bank
//! stands.

use std::sync::Arc;

use crate::build::statement::{Declared, Statement, Value, bounds};
use crate::quantity::{Amount, Quantity, Tolerance};
use crate::solver::Solver;

/// Usual tolerance of an electrolytic that states none, as every check takes it.
const RESERVOIR: f64 = 0.2;

/// What is drawn of a line.
#[derive(Clone, Copy, Debug, PartialEq)]
enum What {
    /// The value, from its low to its high end.
    Value(f64, f64),
    /// The same of a test load: what it is called does not change, and the duty goes by that.
    Load(f64, f64),
    /// How far the lowest of `n` resistors lies below the mean of the others, over the tolerance, in
    /// the worst of `banks`.
    Lowest { n: u32, banks: u32 },
    /// How far the lowest of `n` junction voltages lies below the mean of the others, over the stated
    /// spread, in the worst of `banks`.
    Between { n: u32, banks: u32 },
}

/// A line that is drawn.
#[derive(Clone, Debug)]
pub(super) struct Input {
    /// `out emitter`.
    pub(super) name: String,
    block: String,
    line: Arc<Statement>,
    group: usize,
    slot: usize,
    what: What,
}

/// Every line of a build that carries a tolerance. The mains is a range of use, not a tolerance.
pub(super) fn inputs(solver: &Solver, build: &Declared) -> Vec<Input> {
    let blocks = solver.blocks(build);
    let whole = |n: Option<f64>| n.map_or(1, |n| n.clamp(1.0, 64.0) as u32);
    let channels = blocks
        .first()
        .and_then(|b| b.group("channels")?.number("n"));
    let banks = 2 * whole(channels);
    let mut out = Vec::new();
    for seen in &blocks {
        let pairs = whole(seen.group("pairs").and_then(|g| g.number("n")));
        let drawn = |l: &&Arc<Statement>| l.change.is_none() && !l.none && l.key.name != "mains";
        for line in seen.lines.iter().filter(drawn) {
            of_line(&seen.declared.name, line, (pairs, banks), &mut out);
        }
    }
    out
}

fn of_line(block: &str, line: &Arc<Statement>, (n, banks): (u32, u32), out: &mut Vec<Input>) {
    for (group, values) in line.groups.iter().enumerate() {
        for (slot, found) in values.slots.iter().enumerate() {
            let Value::Quantity(q) = &found.value else {
                continue;
            };
            let capacitor = line.key.name.ends_with("reservoir") && found.slot == "F";
            let what = match line.key.name {
                "vbe-spread" if n > 1 && q.value > 0.0 => What::Between { n, banks },
                "emitter" if n > 1 && q.tolerance.is_some() => What::Lowest { n, banks },
                _ => {
                    let (low, high) = match q.tolerance {
                        None if capacitor => {
                            (q.value * (1.0 - RESERVOIR), q.value * (1.0 + RESERVOIR))
                        }
                        _ => bounds(q),
                    };
                    if low >= high {
                        continue;
                    }
                    if line.key.name == "resistive" {
                        What::Load(low, high)
                    } else {
                        What::Value(low, high)
                    }
                }
            };
            let several = line.groups.len() > 1;
            let which = if several {
                format!(" {}", group + 1)
            } else {
                String::new()
            };
            out.push(Input {
                name: format!("{block} {}{which}", line.key.name),
                block: block.to_owned(),
                line: line.clone(),
                group,
                slot,
                what,
            });
        }
    }
}

/// The lines of a kit at a place in the box: every input from 0 to 1.
pub(super) fn changes(inputs: &[Input], at: &[f64]) -> Vec<(String, Arc<Statement>)> {
    let mut out: Vec<(&Input, Statement)> = Vec::new();
    for (input, x) in inputs.iter().zip(at) {
        let known = out
            .iter()
            .position(|(i, _)| i.block == input.block && Arc::ptr_eq(&i.line, &input.line));
        let index = known.unwrap_or_else(|| {
            out.push((input, (*input.line).clone()));
            out.len() - 1
        });
        let slot = out
            .get_mut(index)
            .and_then(|(_, line)| line.groups.get_mut(input.group)?.slots.get_mut(input.slot));
        if let Some(slot) = slot
            && let Value::Quantity(q) = &mut slot.value
        {
            input.set(q, *x);
        }
    }
    out.into_iter()
        .map(|(input, line)| (input.block.clone(), Arc::new(line)))
        .collect()
}

impl Input {
    fn set(&self, q: &mut Quantity, x: f64) {
        let none = Amount::Relative(0.0);
        match self.what {
            What::Value(low, high) => {
                q.value = low + x * (high - low);
                q.tolerance = Some(Tolerance {
                    plus: none,
                    minus: none,
                });
            }
            What::Load(low, high) => {
                let above = low + x * (high - low) - q.value;
                q.tolerance = Some(Tolerance {
                    plus: Amount::Absolute(above),
                    minus: Amount::Absolute(-above),
                });
            }
            What::Between { .. } => q.value *= x,
            What::Lowest { .. } => {
                let (low, high) = bounds(q);
                q.tolerance = Some(Tolerance {
                    plus: none,
                    minus: Amount::Absolute(x * (high - low) / 2.0),
                });
            }
        }
    }

    /// A place on this input, 0 to 1.
    fn draw(&self, random: &mut Random) -> f64 {
        match self.what {
            What::Value(..) | What::Load(..) => random.next(),
            // of resistors the lowest lies up to the whole tolerance width below the mean; the model
            // takes it up to half of that, as the file states it
            What::Lowest { n, banks } => (2.0 * lowest(n, banks, random)).min(1.0),
            What::Between { n, banks } => lowest(n, banks, random),
        }
    }
}

/// How far the lowest of `n` even draws lies below the mean of the others, worst of several banks.
fn lowest(n: u32, banks: u32, random: &mut Random) -> f64 {
    let mut worst: f64 = 0.0;
    for _ in 0..banks {
        let (mut least, mut sum) = (1.0_f64, 0.0);
        for _ in 0..n {
            let x = random.next();
            least = least.min(x);
            sum += x;
        }
        worst = worst.max((sum - least) / f64::from(n.max(2) - 1) - least);
    }
    worst
}

/// The place of a kit in the box: a matter of seed and number alone, so that any number of threads
/// draws the same kits.
pub(super) fn kit(inputs: &[Input], seed: u64, number: u64) -> Vec<f64> {
    let mut random = Random(mixed(seed ^ mixed(number)));
    inputs.iter().map(|input| input.draw(&mut random)).collect()
}

/// SplitMix64: Steele, Lea and Flood, Fast splittable pseudorandom number generators, OOPSLA 2014
/// (constants from memory).
struct Random(u64);

impl Random {
    /// From 0 up to 1, 53 bits.
    fn next(&mut self) -> f64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        (mixed(self.0) >> 11) as f64 / (1_u64 << 53) as f64
    }
}

fn mixed(state: u64) -> u64 {
    let mut z = state;
    z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
    z ^ (z >> 31)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Of even draws the mean is 1/2 and the variance 1/12; of two, the distance of the lower from the
    /// other has the mean 1/3 (order statistics of the even distribution).
    #[test]
    fn draws_are_even() {
        let mut random = Random(7);
        let draws: Vec<f64> = (0..40_000).map(|_| random.next()).collect();
        let mean = draws.iter().sum::<f64>() / 40_000.0;
        let variance = draws.iter().map(|x| (x - mean) * (x - mean)).sum::<f64>() / 40_000.0;
        assert!((mean - 0.5).abs() < 0.01 && (variance - 1.0 / 12.0).abs() < 0.002);
        let apart = (0..40_000).map(|_| lowest(2, 1, &mut random)).sum::<f64>() / 40_000.0;
        assert!((apart - 1.0 / 3.0).abs() < 0.01, "{apart}");
        assert!(draws.iter().all(|x| (0.0..1.0).contains(x)));
    }
}
