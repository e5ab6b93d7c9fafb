//! Quantities out of the value and rating text of a list, `10000u/50V`.
//! Must not know what they are compared with.

use crate::quantity::{
    Dimension, Fault, FaultKind, FuseSpeed, Quantity, Reading, fuse, read_one_of, windings,
};

/// What a text says of some dimensions, and what in it has two readings. Words are passed over.
pub(super) fn quantities(text: &str, wants: &[Dimension]) -> (Vec<Quantity>, Vec<Fault>) {
    let tokens = tokens(text);
    let tokens: Vec<&str> = tokens.iter().map(String::as_str).collect();
    let (mut found, mut faults) = (Vec::new(), Vec::new());
    let mut rest = tokens.as_slice();
    while let [first, ..] = rest {
        let used = match one(rest, wants) {
            Some(Ok(quantity)) => {
                let used = quantity.used;
                found.push(quantity);
                used
            }
            Some(Err(fault)) => {
                let used = fault.used;
                faults.push(fault);
                used
            }
            None => 1,
        };
        debug_assert!(!first.is_empty());
        rest = rest.get(used.max(1)..).unwrap_or_default();
    }
    (found, faults)
}

/// `slow` or `fast`, where the text of a fuse says which.
pub(super) fn speed(text: &str) -> Option<&'static str> {
    const SLOW: [&str; 7] = [
        "slow",
        "t",
        "tt",
        "time-lag",
        "timelag",
        "delay",
        "slow-blow",
    ];
    const FAST: [&str; 6] = ["fast", "f", "ff", "quick", "quick-acting", "fast-blow"];
    tokens(text).iter().find_map(|token| {
        let word = token.to_lowercase();
        match fuse(token).map(|f| f.speed) {
            Some(FuseSpeed::Slow) => Some("slow"),
            Some(FuseSpeed::Fast) => Some("fast"),
            None if SLOW.contains(&word.as_str()) => Some("slow"),
            None if FAST.contains(&word.as_str()) => Some("fast"),
            None => None,
        }
    })
}

fn one(tokens: &[&str], wants: &[Dimension]) -> Option<Result<Quantity, Fault>> {
    if wants.contains(&Dimension::Current)
        && let Some(fuse) = tokens.first().and_then(|t| fuse(t))
    {
        return Some(Ok(Quantity {
            used: 1,
            ..fuse.current
        }));
    }
    if wants.contains(&Dimension::Voltage)
        && let Some(Ok(windings)) = windings(tokens)
    {
        return Some(Ok(windings.each));
    }
    match read_one_of(tokens, wants) {
        Reading::Read { quantity, .. } => Some(Ok(quantity)),
        Reading::Wrong(fault) if fault.kind == FaultKind::Ambiguous => Some(Err(fault)),
        Reading::Wrong(_) | Reading::Not => None,
    }
}

/// Words between blanks, commas before blanks, slashes between ratings, counts taken off.
fn tokens(text: &str) -> Vec<String> {
    let mut out = Vec::new();
    for word in text.split_whitespace() {
        let word = word.trim_matches([',', ';', '(', ')', '[', ']']);
        for piece in ratings(word) {
            let piece = match crate::quantity::split_count(piece) {
                Some((_, of)) => of,
                None => piece,
            };
            if !piece.is_empty() && !matches!(piece, "x" | "X" | "×" | "*") {
                out.push(piece.to_owned());
            }
        }
    }
    out
}

/// `10000u/50V` into its ratings; neither a fraction, `1/8`, nor a unit, `0.5K/W`, is split.
fn ratings(word: &str) -> Vec<&str> {
    let mut out = Vec::new();
    let mut from = 0;
    for (at, _) in word.match_indices('/') {
        let (left, right) = (&word[from..at], &word[at + 1..]);
        let unit = matches!(right.split(['/', ',']).next(), Some("W" | "K" | "w" | "us"));
        if left.contains(char::is_alphabetic) && !unit {
            out.push(left);
            from = at + 1;
        }
    }
    out.push(&word[from..]);
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    fn values(text: &str, wants: &[Dimension]) -> Vec<f64> {
        quantities(text, wants).0.iter().map(|q| q.value).collect()
    }

    #[test]
    fn the_trade_writes_lists_so() {
        use Dimension::{ApparentPower, Capacitance, Current, Power, Resistance, Voltage};
        let can = [Capacitance, Voltage];
        for text in [
            "10000u/50V",
            "10000uF 50 V",
            "Elko 10mF/50V 105C",
            "10000uF, 50V",
        ] {
            let read = values(text, &can);
            assert_eq!(read.len(), 2, "{text}: {read:?}");
            assert!(
                (read[0] / 0.01 - 1.0).abs() < 1e-12 && (read[1] - 50.0).abs() < 1e-9,
                "{text}"
            );
        }
        let resistor = [Resistance, Power];
        for text in ["0R22 5W", "R22/5W", "0.22 ohm 5 W 5%", "220m 5W"] {
            let read = values(text, &resistor);
            assert_eq!(read.len(), 2, "{text}: {read:?}");
            assert!((read[0] - 0.22).abs() < 1e-12, "{text}");
        }
        assert_eq!(values("T2.5A", &[Current]), [2.5]);
        assert_eq!(values("2.5 A slow", &[Current]), [2.5]);
        assert_eq!(
            values("300VA 2x28V", &[Voltage, ApparentPower]),
            [300.0, 28.0]
        );
        assert_eq!(
            values("bridge KBPC25 400V 25A", &[Voltage, Current]),
            [400.0, 25.0]
        );
        assert!(values("see drawing", &can).is_empty());
    }

    #[test]
    fn fuses_are_slow_or_fast() {
        // the letters T and F are those of IEC 60127-1
        for (text, wanted) in [
            ("T2.5A", Some("slow")),
            ("2.5 A time-lag", Some("slow")),
            ("F 5A", Some("fast")),
            ("5 A", None),
        ] {
            assert_eq!(speed(text), wanted, "{text}");
        }
    }

    #[test]
    fn two_readings_are_said() {
        let (_, faults) = quantities("10.000 uF 50 V", &[Dimension::Capacitance]);
        assert_eq!(faults.len(), 1);
    }
}
