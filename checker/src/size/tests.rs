//! What is offered passes, and the next smaller usual value does not: tried on whole texts.

use rayon::prelude::*;

use super::board::Board;
use super::choice::{COORDINATES, lists};
use super::offer::own;
use super::search::furnish;
use super::{Answer, Sized, seller, size};
use crate::Options;
use crate::finding::{Margin, Severity};
use crate::solver::Solver;
use crate::testing::{beside, edited, report, tern60};

fn options() -> Options {
    Options {
        today: "2026-06-01".to_owned(),
        ..Options::default()
    }
}

fn sized(text: &str) -> Sized {
    beside(text, |files, path| {
        size(files, path, "under-test.ampspec", &options())
    })
    .unwrap()
}

/// Margins that fail a check at its usual level, and findings of the text.
fn errors(text: &str) -> Vec<String> {
    let report = report(text);
    let of = |m: &&Margin| m.severity == Severity::Error && m.waiver.is_none();
    let margins = report
        .builds
        .iter()
        .flat_map(|b| &b.margins)
        .filter(of)
        .map(|m| m.id.clone());
    let findings = report
        .findings
        .iter()
        .filter(|f| f.severity == Severity::Error);
    margins.chain(findings.map(|f| f.message.clone())).collect()
}

/// Margins that are past an allowance.
fn warnings(text: &str) -> Vec<String> {
    let report = report(text);
    let of = |m: &&Margin| m.severity >= Severity::Warning && m.waiver.is_none();
    report
        .builds
        .iter()
        .flat_map(|b| &b.margins)
        .filter(of)
        .map(|m| m.id.clone())
        .collect()
}

/// The sound kit: every value offered passes as a `change` of the build, and the value named beside
/// it leaves the margin named beside it past its allowance.
#[test]
fn what_is_offered_in_place_passes() {
    let text = tern60(&[]);
    let found = sized(&text);
    assert_eq!(found.elsewhere, []);
    assert!(found.rows.len() >= 10, "{:#?}", found.rows);
    for row in &found.rows {
        let statement = row.statements.first().expect("something passes");
        let with = |statement: &str| {
            edited(
                &text,
                &[(
                    "    duty               1/8\n",
                    &format!("    duty 1/8\n    {statement}\n"),
                )],
            )
        };
        assert_eq!(
            warnings(&with(statement)),
            Vec::<String>::new(),
            "{}: {statement}",
            row.item
        );
        if let Some((value, why)) = &row.limited {
            let smaller = statement.replace(row.offered.as_ref().unwrap(), value);
            assert_ne!(smaller, *statement, "{}", row.item);
            assert!(
                warnings(&with(&smaller)).contains(&why.id),
                "{}: {smaller}",
                row.item
            );
        }
    }
    let row = |item: &str| found.rows.iter().find(|r| r.item == item).unwrap();
    // by hand: 46.61 V off load over 90 % is 51.8 V, and 63 V is the next usual rating
    assert_eq!(row("reservoir volts").offered.as_deref(), Some("63 V"));
    assert!((row("reservoir volts").needed.unwrap().value - 46.61 / 0.9).abs() < 0.01);
}

/// Nothing that does not pass is offered: one device against a short that two stand.
#[test]
fn what_cannot_pass_is_not_offered() {
    let text = tern60(&[(
        "resistance         0.45 K/W at 50 K",
        "resistance         3 K/W at 50 K",
    )]);
    let found = sized(&text);
    let row = |item: &str| found.rows.iter().find(|r| r.item == item).unwrap();
    assert_eq!(row("bridge amperes").statements.len(), 1);
    assert_eq!(row("transformer secondary").offered, None);
    assert!(row("transformer secondary").limited.is_some());
    assert!(row("heatsink").offered.is_some());
}

/// A board that states no supply and no sink; the numbers vary it.
fn board(n: u64) -> String {
    let mut state = n.wrapping_mul(0x9e37_79b9_7f4a_7c15) ^ 0x1234_5678;
    let mut pick = |from: f64, to: f64| {
        state ^= state << 13;
        state ^= state >> 7;
        state ^= state << 17;
        from + (to - from) * ((state >> 11) as f64 / (1_u64 << 53) as f64)
    };
    let ohm = [6.0, 8.0, 8.0, 16.0][pick(0.0, 4.0) as usize];
    let watts = (pick(15.0, 70.0) * 8.0 / ohm).round();
    let pairs = pick(2.0, 5.0) as u32;
    let mains =
        ["230 V ±10 %", "120 V range 108 V to 126 V", "240 V ±6 %"][pick(0.0, 3.0) as usize];
    let hertz = if mains.starts_with("120") { 60 } else { 50 };
    let (hot, drop) = (pick(25.0, 45.0).round(), pick(1.2, 3.0));
    let (channels, duty) = (
        [1, 1, 2, 3][pick(0.0, 4.0) as usize],
        ["1/8", "1/8", "1/3"][pick(0.0, 3.0) as usize],
    );
    tern60(&[
        ("    supply             toroid per build\n", ""),
        ("    heatsink           fins per channel\n", ""),
        (
            "60 W into 8 ohm all-channels nominal-mains, 100 W into 4 ohm all-channels nominal-mains",
            &format!("{watts} W into {ohm} ohm all-channels nominal-mains"),
        ),
        ("resistive 8 ohm ±5 %", &format!("resistive {ohm} ohm ±5 %")),
        (
            "loads              hall-8, bench-8",
            "loads              bench-8",
        ),
        (
            "pairs              2",
            &format!("pairs              {pairs}"),
        ),
        ("ref Q7-Q10", ""),
        ("ref R21-R24", ""),
        (
            "drop               1.8 V at 0 A, 3.8 V at 7 A",
            &format!(
                "drop               {drop:.2} V at 0 A, {:.2} V at 7 A",
                drop + 2.0
            ),
        ),
        (
            "    limit-line bank    10 A at 0 V, 10 A at 15 V, 6.4 A at 30 V, 3.6 A at 50 V, 1.8 A at 70 V, 1 A at 95 V\n",
            "",
        ),
        (
            "channels           1\n",
            &format!("channels           {channels}\n"),
        ),
        (
            "230 V ±10 % 50 Hz loop 0.3 ohm tap 230 V",
            &format!("{mains} {hertz} Hz loop 0.3 ohm"),
        ),
        ("10 degC to 40 degC", &format!("10 degC to {hot} degC")),
        (
            "duty               1/8",
            &format!("duty               {duty}"),
        ),
    ])
}

/// Texts, each with the name of what is smaller in it.
type Named = Vec<(&'static str, String)>;

/// The values furnished for a board, with every text in which one of them is the next smaller.
fn furnished(text: &str) -> Result<(String, Named), String> {
    beside(text, |files, path| {
        let options = options();
        let solver = Solver::read(files, path, "under-test.ampspec", &options)?;
        let build = solver.builds().next().ok_or("no build")?;
        let board = Board::of(&solver, build, files, path, "under-test.ampspec", &options);
        let usage = own(&board);
        let found = furnish(&board, &usage).map_err(|why| format!("{why:?}"))?;
        let pasted = board.pasted(&lists(), &found.choice, &usage);
        let mut smaller = Vec::new();
        for coordinate in COORDINATES.iter().filter(|c| !c.name.contains("tap")) {
            let mut next = found.choice;
            let at = (coordinate.of)(&mut next);
            if *at > 0 {
                *at -= 1;
                smaller.push((coordinate.name, board.pasted(&lists(), &next, &usage)));
            }
        }
        Ok((pasted, smaller))
    })
}

/// A hundred boards: what is offered, pasted, passes the check without an error or a warning; the
/// next smaller usual value leaves at least a warning, four things of each board in turn. Where nothing
/// is offered, something is said.
#[test]
fn what_is_pasted_passes_and_the_next_smaller_fails() {
    let found: Vec<Result<(), String>> = (0..100_u64)
        .into_par_iter()
        .map(|n| {
            let text = board(n);
            let (pasted, smaller) = match furnished(&text) {
                Ok(found) => found,
                Err(why) => {
                    assert_ne!(why, "None", "board {n}");
                    return Err(format!("board {n}: {why}"));
                }
            };
            assert_eq!(
                errors(&pasted),
                Vec::<String>::new(),
                "board {n}:\n{pasted}"
            );
            assert_eq!(
                warnings(&pasted),
                Vec::<String>::new(),
                "board {n}:\n{pasted}"
            );
            let turn = smaller.len().max(1);
            for (name, text) in smaller.into_iter().cycle().skip(n as usize % turn).take(4) {
                assert_ne!(
                    warnings(&text),
                    Vec::<String>::new(),
                    "board {n}, {name}:\n{text}"
                );
            }
            Ok(())
        })
        .collect();
    let refused: Vec<&String> = found.iter().filter_map(|f| f.as_ref().err()).collect();
    assert!(refused.len() <= 30, "{refused:#?}");
}

/// Two ohms on a board for eight is refused with a reason; eight is allowed, and six channels take a
/// larger transformer than one.
#[test]
fn the_table_of_a_seller() {
    let text = edited(&board(1), &[]);
    let text = text.replace("loads bench-8", "loads bench-8, bench-1");
    let text = format!("{text}\nload bench-1 {{ resistive 1 ohm }}\n");
    let cells = beside(&text, |files, path| {
        let options = options();
        let solver = Solver::read(files, path, "under-test.ampspec", &options).unwrap();
        let build = solver.builds().next().unwrap();
        let board = Board::of(&solver, build, files, path, "under-test.ampspec", &options);
        seller::table(&board)
    });
    let of = |load: &str| cells.iter().filter(|c| c.load == load).collect::<Vec<_>>();
    assert!(
        of("bench-8").iter().all(|c| c.answer == Answer::Allowed),
        "{cells:#?}"
    );
    assert!(
        of("bench-1")
            .iter()
            .all(|c| c.answer != Answer::Allowed && !c.words.is_empty()),
        "{cells:#?}"
    );
    let va = |c: &super::Cell| {
        let words: Vec<&str> = c.words.split(' ').collect();
        let at = words.iter().position(|w| w.starts_with("VA")).unwrap();
        words[at - 1].parse::<f64>().unwrap()
    };
    let eight = of("bench-8");
    assert!(va(eight.last().unwrap()) > va(eight[0]), "{cells:#?}");
}
