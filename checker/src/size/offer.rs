//! What was found for a build that states no supply, as rows and as text to paste.
//! Must not know how it was found.

use super::board::{Board, Use};
use super::choice::{COORDINATES, Coordinate, Lists, lists, said};
use super::search::{Found, furnish};
use super::{Left, Row, Sized, blocking, fails, left, moved};
use crate::finding::Measure;
use crate::quantity::format_exact;

/// The use that a build itself states.
pub(super) fn own(board: &Board<'_>) -> Use {
    Use {
        cell: false,
        channels: board.channels,
        loads: String::new(),
        mains: String::new(),
        supply: "build",
        unclaimed: false,
        taps: board.taps.clone(),
    }
}

/// One row for every part of the supply and the sink, and the text to paste.
pub(super) fn rows(board: &Board<'_>, sized: &mut Sized) {
    let usage = own(board);
    let lists = lists();
    let found = match furnish(board, &usage) {
        Ok(found) => found,
        Err(why) => {
            sized.rows.push(Row {
                build: board.build.clone(),
                item: "supply",
                needed: None,
                offered: None,
                stated: String::new(),
                statements: Vec::new(),
                margins: Vec::new(),
                limited: why.map(|left| ("any usual supply".to_owned(), left)),
            });
            return;
        }
    };
    let pasted = board.blocks(&lists, &found.choice, &usage);
    for coordinate in COORDINATES {
        sized
            .rows
            .extend(row(board, &lists, &usage, &found, coordinate));
    }
    let lines = board.lines(&usage);
    sized.pasted.push((
        board.build.clone(),
        format!("{pasted}\nbuild {}:\n{lines}", board.build),
    ));
    let open = found
        .margins
        .iter()
        .filter(|m| fails(m) && !found.moved.contains(&m.id));
    sized
        .elsewhere
        .extend(open.map(|m| (board.build.clone(), Left::of(m))));
}

fn row(
    board: &Board<'_>,
    lists: &Lists,
    usage: &Use,
    found: &Found,
    coordinate: &Coordinate,
) -> Option<Row> {
    let name = coordinate.name;
    let at = *(coordinate.of)(&mut found.choice.clone());
    let (value, dimension, unit, line) = said(lists, name, at)?;
    // a tap that is not there has no fuse
    let tap = COORDINATES
        .iter()
        .filter(|c| c.name.starts_with("mains fuse"))
        .position(|c| c.name == name);
    if tap.is_some_and(|k| k >= usage.taps.len())
        || (name == "heatsink" && board.sink_stated && !usage.cell)
    {
        return None;
    }
    // the next smaller, or, where there is none, the next greater shows what the choice moves
    let beside = if at > 0 { at - 1 } else { at + 1 };
    let mut next = found.choice;
    *(coordinate.of)(&mut next) = beside;
    let solved = board.solve(lists, &next, usage)?;
    let why = blocking(&solved, &found.moved)
        .filter(|_| at > 0)
        .map(Left::of);
    let text = |at: usize| said(lists, name, at).map(|s| format_exact(s.0, s.1));
    let only = moved(&[&found.margins, &solved]);
    Some(Row {
        build: board.build.clone(),
        item: name,
        needed: Some(Measure::new(value, unit)),
        offered: Some(format_exact(value, dimension)),
        stated: String::new(),
        statements: vec![format!("{line} {}", format_exact(value, dimension))],
        margins: left(&found.margins, &only),
        limited: text(beside).zip(why),
    })
}

/// What a choice comes to in a few words: `2 x 25 Vac 160 VA, 10000 uF a rail, sinks of 0.47 K/W`.
pub(super) fn brief(found: &Found) -> String {
    let lists = lists();
    let c = &found.choice;
    let say = |name: &str, at: usize| {
        said(&lists, name, at)
            .map(|s| format_exact(s.0, s.1))
            .unwrap_or_default()
    };
    format!(
        "2 x {}ac {}, {} a rail, sinks of {}",
        say("transformer secondary", c.secondary),
        say("transformer rating", c.rating),
        say("reservoir", c.reservoir),
        say("heatsink", c.sink)
    )
}
