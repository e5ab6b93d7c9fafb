//! What has been solved before, kept by everything it depended on: builds of one file share a supply, a
//! proposal changes one value, a keystroke often none.
//! Must not know any model: it is told what a result was made from.

use std::any::Any;
use std::collections::HashMap;
use std::fmt::{Debug, Write};
use std::hash::{DefaultHasher, Hasher};
use std::sync::{Mutex, PoisonError};

/// Results kept at most; then all are forgotten. Each takes a few hundred bytes.
const MOST: usize = 8192;

/// 128 bits of what something was made from.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct Identity([u64; 2]);

impl Identity {
    /// Of everything that `value` shows in its `Debug` form, in which a number keeps all its digits.
    #[must_use]
    pub fn of(value: &impl Debug) -> Self {
        let mut both = Both([DefaultHasher::new(), DefaultHasher::new()]);
        both.0[1].write_u8(1); // the second begins elsewhere, so that together they are 128 bits
        // a hasher accepts everything
        let _ = write!(both, "{value:?}");
        Self(both.0.map(|h| h.finish()))
    }
}

struct Both([DefaultHasher; 2]);

impl Write for Both {
    fn write_str(&mut self, text: &str) -> std::fmt::Result {
        for hasher in &mut self.0 {
            hasher.write(text.as_bytes());
        }
        Ok(())
    }
}

/// Results of pure functions by name and identity of their inputs. Shared between threads; what it
/// gives is what the function would have given, so no answer depends on it.
#[derive(Default)]
pub struct Memory(Mutex<Kept>);

type Kept = HashMap<(&'static str, Identity), Box<dyn Any + Send>>;

impl Debug for Memory {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str("Memory")
    }
}

impl Memory {
    /// The result of `solve`, from memory if it was made from the same `inputs` before. They must hold
    /// all that it depends on. Failures are not kept: they may speak of places in a text.
    ///
    /// # Errors
    /// Those of `solve`.
    pub fn recall<T, E>(
        &self,
        what: &'static str,
        inputs: &impl Debug,
        solve: impl FnOnce() -> Result<T, E>,
    ) -> Result<T, E>
    where
        T: Clone + Send + 'static,
    {
        let key = (what, Identity::of(inputs));
        if let Some(known) = self.kept().get(&key).and_then(|k| k.downcast_ref::<T>()) {
            return Ok(known.clone());
        }
        let found = solve()?;
        let mut kept = self.kept();
        if kept.len() >= MOST {
            kept.clear();
        }
        kept.insert(key, Box::new(found.clone()));
        Ok(found)
    }

    fn kept(&self) -> std::sync::MutexGuard<'_, Kept> {
        // a thread that panicked left whole entries behind
        self.0.lock().unwrap_or_else(PoisonError::into_inner)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_result_is_made_once_for_the_same_inputs() {
        let memory = Memory::default();
        let mut made = 0;
        let mut ask = |input: f64| -> f64 {
            let answer = memory.recall("twice", &input, || {
                made += 1;
                Ok::<_, ()>(2.0 * input)
            });
            answer.unwrap()
        };
        assert_eq!(
            (ask(1.0), ask(1.0), ask(1.0_f64.next_up())),
            (2.0, 2.0, 2.0_f64.next_up())
        );
        assert_eq!(made, 2);
    }

    #[test]
    fn one_name_does_not_answer_for_another_and_failures_are_not_kept() {
        let memory = Memory::default();
        assert_eq!(memory.recall("a", &1, || Ok::<_, ()>(1)), Ok(1));
        assert_eq!(memory.recall("b", &1, || Ok::<_, ()>(2)), Ok(2));
        assert_eq!(memory.recall("c", &1, || Err::<u8, _>("no")), Err("no"));
        assert_eq!(memory.recall("c", &1, || Ok::<_, ()>(3)), Ok(3));
    }

    #[test]
    fn it_forgets_before_it_grows_without_end() {
        let memory = Memory::default();
        for n in 0..3 * MOST {
            assert_eq!(memory.recall("n", &n, || Ok::<_, ()>(n)), Ok(n));
        }
        assert!(memory.kept().len() <= MOST);
    }
}
