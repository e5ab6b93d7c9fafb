//! The search for the smallest usual parts with which a build passes.
//! Must not know how a choice is written or shown.

use std::collections::BTreeSet;

use super::board::{Board, Use};
use super::choice::{COORDINATES, Choice, Coordinate, Lists, lists, said};
use super::item::{BRIDGES, RESERVOIRS, nearest};
use super::{Left, blocking, collapsed, moved};
use crate::finding::Margin;

/// A change of one thing at a time, so often at most.
const ROUNDS: usize = 6;

/// A choice that passes, or why none does.
pub(super) struct Found {
    pub(super) choice: Choice,
    pub(super) margins: Vec<Margin>,
    pub(super) moved: BTreeSet<String>,
}

/// Where the search begins: generous in everything but the secondary.
fn start(board: &Board<'_>, lists: &Lists, usage: &Use, times: f64) -> Choice {
    let carried = if usage.supply == "channel" {
        1
    } else {
        usage.channels
    };
    let watts = board.claimed.max(10.0) * f64::from(carried);
    // Vs·√2·0.9 = √(2PR) + 4 V, R about 8 ohm
    let secondary = ((2.0 * board.claimed.max(10.0) * 8.0).sqrt() + 4.0) / 1.27;
    let rating = nearest(&lists.rating, times * watts);
    let mut choice = Choice {
        secondary: nearest(&lists.secondary, secondary),
        rating,
        reservoir: nearest(RESERVOIRS, 22_000e-6),
        sink: nearest(&lists.sink, 0.15),
        capacitor_volts: lists.capacitor_volts.len().saturating_sub(1),
        bridge: BRIDGES.len() - 1,
        bridge_volts: 4,
        ripple: lists.ripple.len().saturating_sub(1),
        rail_fuse: nearest(&lists.fuse, 20.0),
        mains_fuse: [0; 4],
    };
    refuse(lists, usage, &mut choice);
    choice
}

/// Mains fuses at twice the rated primary current of each tap: in the middle of their band.
fn refuse(lists: &Lists, usage: &Use, choice: &mut Choice) {
    let rating = lists.rating.get(choice.rating).copied().unwrap_or_default();
    for (fuse, tap) in choice.mains_fuse.iter_mut().zip(&usage.taps) {
        *fuse = nearest(&lists.fuse, 2.0 * rating / tap);
    }
}

/// VA of the transformer that the search begins with, over the power claimed: first as is usual, then
/// as much as it may take. A search that began with the larger would end at a low secondary that only
/// a huge transformer holds up.
const BEGIN: [f64; 2] = [2.0, 5.0];

/// The smallest usual parts with which a use passes, or the margin that stands in the way of all.
pub(super) fn furnish(board: &Board<'_>, usage: &Use) -> Result<Found, Option<Left>> {
    let mut why = None;
    for times in BEGIN {
        match furnish_from(board, usage, times) {
            Ok(found) => return Ok(found),
            Err(more) => why = more,
        }
    }
    Err(why)
}

fn furnish_from(board: &Board<'_>, usage: &Use, times: f64) -> Result<Found, Option<Left>> {
    let lists = lists();
    if usage.taps.is_empty() || usage.taps.len() > 4 {
        return Err(None);
    }
    let mut choice = start(board, &lists, usage, times);
    let mut margins = board.solve(&lists, &choice, usage).ok_or(None)?;
    // what no choice moves is not a matter of size
    let mut other = choice;
    other.secondary = (choice.secondary + 2).min(lists.secondary.len() - 1);
    other.rating = choice.rating.saturating_sub(2);
    other.sink = choice.sink.saturating_sub(8);
    other.reservoir = choice.reservoir.saturating_sub(3);
    for coordinate in COORDINATES.iter().skip(4) {
        let at = (coordinate.of)(&mut other);
        *at = at.saturating_sub(2);
    }
    let others = board.solve(&lists, &other, usage).ok_or(None)?;
    let moved = moved(&[&margins, &others]);
    if usage.unclaimed {
        // no power asks for a high rail: the highest that everything else stands
        return down(board, &lists, usage, choice, moved, None);
    }
    // up to the first secondary that passes; where a higher one is too much for something, down
    let mut first = None;
    let from = choice.secondary.saturating_sub(2);
    let mut passes = false;
    for at in from..lists.secondary.len().min(from + 10) {
        choice.secondary = at;
        margins = board.solve(&lists, &choice, usage).ok_or(None)?;
        let Some(why) = blocking(&margins, &moved) else {
            passes = true;
            break;
        };
        first = Some(Left::of(why));
        if !too_low(why) {
            break;
        }
    }
    if !passes {
        return down(board, &lists, usage, choice, moved, first);
    }
    settle(board, &lists, usage, choice, margins, moved)
}

/// Whether a margin asks for more volts: a power not reached, a supply that gives out.
fn too_low(why: &Margin) -> bool {
    why.rule.starts_with("power.") || collapsed(why)
}

/// Lower secondaries, where a higher one is too much for something.
fn down(
    board: &Board<'_>,
    lists: &Lists,
    usage: &Use,
    mut choice: Choice,
    moved: BTreeSet<String>,
    first: Option<Left>,
) -> Result<Found, Option<Left>> {
    while choice.secondary > 0 {
        choice.secondary -= 1;
        let margins = board.solve(lists, &choice, usage).ok_or(None)?;
        match blocking(&margins, &moved) {
            None => return settle(board, lists, usage, choice, margins, moved),
            // neither too high nor too low, but never right
            Some(why) if too_low(why) => break,
            Some(_) => {}
        }
    }
    Err(first)
}

/// Every part down to the smallest that passes, one at a time, until none can go down.
fn settle(
    board: &Board<'_>,
    lists: &Lists,
    usage: &Use,
    choice: Choice,
    margins: Vec<Margin>,
    moved: BTreeSet<String>,
) -> Result<Found, Option<Left>> {
    let mut found = Found {
        choice,
        margins,
        moved,
    };
    for _ in 0..ROUNDS {
        let before = found.choice;
        // without a claim the secondary is the highest, not the lowest
        for coordinate in COORDINATES.iter().skip(usize::from(usage.unclaimed)) {
            lower(board, lists, usage, coordinate, &mut found);
        }
        if found.choice == before {
            break;
        }
    }
    Ok(found)
}

/// One part down to the smallest that passes: straight to what its rating needs where a rule rates just
/// this, else in growing steps, then halving. What passes lies above what fails; the value before the
/// one that stands has been seen to fail.
fn lower(
    board: &Board<'_>,
    lists: &Lists,
    usage: &Use,
    coordinate: &Coordinate,
    found: &mut Found,
) {
    let mut passes = *(coordinate.of)(&mut found.choice.clone());
    let mut fails: Option<usize> = None;
    let mut step = 1;
    let mut guess = leap(coordinate, lists, found);
    while passes > fails.map_or(0, |f| f + 1) {
        let low = fails.map_or(0, |f| f + 1);
        let at = match (guess.take(), fails) {
            (Some(at), _) if at >= low && at < passes => at,
            (_, None) => passes.saturating_sub(step),
            (_, Some(f)) => usize::midpoint(f, passes).clamp(low, passes - 1),
        };
        let mut next = found.choice;
        *(coordinate.of)(&mut next) = at;
        let mut solved = passing(board, lists, usage, &next, &found.moved);
        if solved.is_none() && coordinate.name == "transformer rating" {
            // a smaller transformer may want a smaller fuse
            refuse(lists, usage, &mut next);
            solved = passing(board, lists, usage, &next, &found.moved);
        }
        match solved {
            Some(margins) => {
                (found.choice, found.margins, passes) = (next, margins, at);
                step *= 2;
            }
            None => fails = Some(at),
        }
    }
}

/// The margins of a choice, where it passes.
fn passing(
    board: &Board<'_>,
    lists: &Lists,
    usage: &Use,
    choice: &Choice,
    moved: &BTreeSet<String>,
) -> Option<Vec<Margin>> {
    let solved = board.solve(lists, choice, usage)?;
    blocking(&solved, moved).is_none().then_some(solved)
}

/// The position that a rating needs at least, of what its margin uses of the one that it has.
fn leap(coordinate: &Coordinate, lists: &Lists, found: &Found) -> Option<usize> {
    let (rule, part) = coordinate.rated?;
    let of = |m: &&Margin| m.rule == rule && m.part.name.ends_with(part);
    let used = found
        .margins
        .iter()
        .filter(of)
        .filter_map(|m| m.used_percent)
        .reduce(f64::max)?;
    let now = *(coordinate.of)(&mut found.choice.clone());
    let needed = said(lists, coordinate.name, now)?.0 * used / 100.0;
    (0..now).find(|at| said(lists, coordinate.name, *at).is_some_and(|s| s.0 >= needed))
}
