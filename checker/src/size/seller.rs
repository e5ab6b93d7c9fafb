//! The table that a seller publishes: channels by load by mains, each use allowed, allowed on a
//! condition, or not. Must not know how a use is furnished.

use super::board::{Board, Use};
use super::offer::brief;
use super::search::furnish;
use super::{Answer, Cell, Left};

/// Channels of the table beside those that the build states: one, two, many.
const CHANNELS: [u32; 3] = [1, 2, 6];

/// Every cell.
pub(super) fn table(board: &Board<'_>) -> Vec<Cell> {
    let mut channels = CHANNELS.to_vec();
    if !channels.contains(&board.channels) {
        channels.push(board.channels);
        channels.sort_unstable();
    }
    let mut cells = Vec::new();
    for (mains, tap) in board.regions() {
        for load in &board.loads {
            for count in &channels {
                let usage = Use {
                    cell: true,
                    channels: *count,
                    loads: load.clone(),
                    mains: mains.clone(),
                    supply: "build",
                    unclaimed: false,
                    taps: vec![tap],
                };
                cells.push(cell(board, &usage));
            }
        }
    }
    cells
}

/// As it is; else with a supply for each channel; else without the claimed power.
fn cell(board: &Board<'_>, usage: &Use) -> Cell {
    let made = |answer, words| Cell {
        channels: usage.channels,
        load: usage.loads.clone(),
        mains: usage.mains.clone(),
        answer,
        words,
    };
    let first = match furnish(board, usage) {
        Ok(found) => return made(Answer::Allowed, brief(&found)),
        Err(why) => why,
    };
    let each = Use {
        supply: "channel",
        ..usage.clone()
    };
    if usage.channels > 1
        && let Ok(found) = furnish(board, &each)
    {
        let words = format!("with a supply for each channel: {}", brief(&found));
        return made(Answer::Condition, words);
    }
    let modest = Use {
        unclaimed: true,
        ..usage.clone()
    };
    if let Ok(found) = furnish(board, &modest) {
        let words = format!(
            "not to the power claimed{}: {}",
            because(first.as_ref()),
            brief(&found)
        );
        return made(Answer::Condition, words);
    }
    made(
        Answer::Not,
        because(first.as_ref()).trim_start_matches(", ").to_owned(),
    )
}

/// `, soa.reactive of n16 118 % used`.
fn because(why: Option<&Left>) -> String {
    match why {
        None => ", it cannot be solved".to_owned(),
        Some(left) => match left.used {
            Some(used) => format!(", {} of {} {used:.0} % used", left.rule, left.part),
            None => format!(", {} of {} has no rating left", left.rule, left.part),
        },
    }
}
