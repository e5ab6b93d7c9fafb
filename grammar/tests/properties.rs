//! What holds for every text: nothing is lost, nothing panics, layout keeps the meaning.

use std::io;
use std::path::PathBuf;

use ampspec_grammar::{AsWritten, Item, PieceKind, ProblemKind, Tree, layout, parse};
use proptest::prelude::*;

const SAMPLE: &str = include_str!("sample.ampspec");

const CASES: u32 = 1000;

/// Continuations, comments and blocks of every form.
const FORMS: &str = "\
ampspec 1
use \"parts/a.ampspec\" # why
# a comment
device n16 npn {
    soa dc  16 A at 11 V, # first
            3.6 A at 50 V,
        # between

            0.9 A at 100 V
    vceo 240 V
}
device p16 pnp from n16 { part \"P16-Y\" }
load a { parallel b, c }
load d {
}
load e { }
waive x in y because \"z\",
    w
";

/// Everything that must hold for the tree of any text.
fn check(text: &str) -> Result<Tree, TestCaseError> {
    let tree = parse(text);
    let whole: String = tree.pieces().map(|p| p.span.slice(text)).collect();
    prop_assert_eq!(&whole, text);
    for piece in tree.pieces() {
        prop_assert!(!piece.span.is_empty());
        let blank = piece
            .span
            .slice(text)
            .chars()
            .all(|c| c.is_whitespace() || c == '\u{FEFF}');
        prop_assert!(blank || piece.kind != PieceKind::Blank);
    }
    let lines = tree.line_index();
    let mut seen = std::collections::HashSet::new();
    for problem in &tree.problems {
        prop_assert!(text.get(problem.span.start..problem.span.end).is_some());
        prop_assert!(!problem.message.is_empty() && !problem.hint.is_empty());
        let separate = problem.kind == ProblemKind::UnclosedBlock;
        let line = lines.line_of(problem.span.start);
        prop_assert!(
            seen.insert((separate, line)),
            "two problems in line {}",
            line
        );
        prop_assert!(separate || tree.is_faulty(problem.span));
    }
    check_order(&tree)?;
    Ok(tree)
}

/// Every token of the tree stands behind the one before it.
fn check_order(tree: &Tree) -> Result<(), TestCaseError> {
    let mut spans = Vec::new();
    for item in &tree.items {
        let (header, lines) = match item {
            Item::Block(block) => {
                spans.push(block.kind.span);
                (block.header.as_slice(), block.lines.as_slice())
            }
            Item::Line(line) => (&[][..], std::slice::from_ref(line)),
        };
        spans.extend(header.iter().map(|token| token.span));
        for line in lines {
            spans.push(line.key.span);
            for group in &line.groups {
                prop_assert!(!group.tokens.is_empty());
                spans.extend(group.tokens.iter().map(|token| token.span));
            }
        }
        if let Item::Block(block) = item {
            spans.extend(block.close);
        }
    }
    for pair in spans.windows(2) {
        prop_assert!(pair[0].end <= pair[1].start);
    }
    Ok(())
}

/// The tokens of a text by item, statement and group.
fn meaning(tree: &Tree) -> Vec<Vec<Vec<&str>>> {
    let text = |token: &ampspec_grammar::Token| token.span.slice(&tree.text);
    let mut result = Vec::new();
    for item in &tree.items {
        let mut statements = Vec::new();
        let lines = match item {
            Item::Block(block) => {
                statements.push(vec![text(&block.kind)]);
                statements.push(block.header.iter().map(text).collect());
                block.lines.as_slice()
            }
            Item::Line(line) => std::slice::from_ref(line),
        };
        for line in lines {
            statements.push(vec![text(&line.key)]);
            statements.extend(
                line.groups
                    .iter()
                    .map(|g| g.tokens.iter().map(text).collect()),
            );
        }
        result.push(statements);
    }
    result
}

fn check_layout(tree: &Tree) -> Result<(), TestCaseError> {
    let Some(once) = layout(tree, &AsWritten) else {
        // Only a faulty text may be left alone: a broken line can be read otherwise once its neighbours
        // have moved.
        prop_assert!(!tree.problems.is_empty());
        return Ok(());
    };
    let again = parse(once.as_str());
    prop_assert_eq!(meaning(tree), meaning(&again));
    let kinds = |tree: &Tree| tree.problems.iter().map(|p| p.kind).collect::<Vec<_>>();
    prop_assert_eq!(kinds(tree), kinds(&again));
    let comments = |tree: &Tree| {
        let comments = tree.pieces().filter(|p| p.kind == PieceKind::Comment);
        let texts = comments.map(|p| p.span.slice(&tree.text).trim_end().to_owned());
        texts.collect::<Vec<_>>()
    };
    prop_assert_eq!(comments(tree), comments(&again));
    prop_assert_eq!(layout(&again, &AsWritten), Some(once));
    Ok(())
}

/// A text with some stretches cut, doubled, or replaced.
fn mutated() -> impl Strategy<Value = String> {
    let stretch = (
        any::<prop::sample::Index>(),
        0..12_usize,
        "[ \t\n\r,{}#\"xaΩ1±\u{200B}\0]{0,4}",
    );
    let base = prop_oneof![Just(SAMPLE), Just(FORMS), Just(FORMS)];
    (base, prop::collection::vec(stretch, 1..6)).prop_map(|(base, stretches)| {
        let mut chars: Vec<char> = base.chars().collect();
        for (at, length, replacement) in stretches {
            let start = at.index(chars.len() + 1);
            let end = (start + length).min(chars.len());
            chars.splice(start..end, replacement.chars());
        }
        chars.into_iter().collect()
    })
}

/// Short lines made of what matters to the grammar.
fn hostile() -> impl Strategy<Value = String> {
    let part = prop_oneof![
        8 => prop::sample::select(vec![
            "a", "b n", "1", "x", ",", ", ", " ", "  ", "    ", "\t", "{", "}", "\"", "\"t\"", "#",
            "# c", "\n", "\n", "\n  ", "\r\n", "\r", "“", "”", "\u{200B}", "\u{FEFF}", "b n {\n",
            "}\n", "a 1,\n", "\n   2", "\u{2028}", "\0", "±", "é",
        ]).prop_map(str::to_owned),
        1 => "\\PC{0,3}",
    ];
    prop::collection::vec(part, 0..40).prop_map(|parts| parts.concat())
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(CASES))]

    #[test]
    fn any_text(text in any::<String>()) {
        check_layout(&check(&text)?)?;
    }

    #[test]
    fn hostile_text(text in hostile()) {
        check_layout(&check(&text)?)?;
    }

    #[test]
    fn reparsing_gives_what_parsing_gives(old in hostile(), new in hostile()) {
        prop_assert_eq!(parse(old.as_str()).reparse(new.as_str()), parse(new.as_str()));
    }

    #[test]
    fn reparsing_after_an_edit_gives_what_parsing_gives(
        old in hostile(), from in any::<prop::sample::Index>(), put in "[a\n\r {}\",#]{0,3}",
        cut in 0..4_usize,
    ) {
        let mut chars: Vec<char> = old.chars().collect();
        let start = from.index(chars.len() + 1);
        let end = (start + cut).min(chars.len());
        chars.splice(start..end, put.chars());
        let new: String = chars.into_iter().collect();
        prop_assert_eq!(parse(old.as_str()).reparse(new.as_str()), parse(new.as_str()));
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(CASES / 4))]

    #[test]
    fn mutated_text(text in mutated()) {
        check_layout(&check(&text)?)?;
    }
}

/// At most one problem for the line being typed, and one for a block that is not closed yet.
fn check_typing(tree: &Tree) {
    let unclosed = |kind| kind == ProblemKind::UnclosedBlock;
    let count = tree.problems.iter().filter(|p| unclosed(p.kind)).count();
    let others = tree.problems.len() - count;
    assert!(
        count <= 1 && others <= 1,
        "{:?}\n{}",
        tree.problems,
        tree.text
    );
}

#[test]
fn typing_a_text_shows_one_problem_at_a_time() {
    for text in [SAMPLE, FORMS] {
        let mut tree = parse("");
        for (end, _) in text.char_indices() {
            tree = tree.reparse(&text[..end]);
            check_typing(&tree);
        }
    }
}

#[test]
fn typing_a_line_anew_shows_one_problem_at_a_time() {
    for text in [SAMPLE, FORMS] {
        let whole = parse(text);
        let lines = whole.line_index();
        for number in 0..lines.line_count() {
            let span = lines.line_span(number);
            let (before, line, after) = (
                &text[..span.start],
                lines.line_text(number),
                &text[span.end..],
            );
            for (end, _) in line.char_indices() {
                check_typing(&whole.reparse(format!("{before}{}{after}", &line[..end])));
            }
        }
    }
}

/// The demonstration kits, which users read as examples.
fn kits() -> io::Result<Vec<(PathBuf, String)>> {
    let mut folders = vec![PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("../tests/kits")];
    let mut kits = Vec::new();
    while let Some(folder) = folders.pop() {
        for entry in std::fs::read_dir(folder)? {
            let path = entry?.path();
            if path.is_dir() {
                folders.push(path);
            } else if path.extension().is_some_and(|e| e == "ampspec") {
                let text = std::fs::read_to_string(&path)?;
                kits.push((path, text));
            }
        }
    }
    Ok(kits)
}

#[test]
fn the_kits_are_well_formed() {
    for (path, text) in kits().unwrap() {
        assert_eq!(parse(text).problems, [], "{}", path.display());
    }
}

#[test]
fn typing_a_kit_shows_one_problem_at_a_time() {
    for (_, text) in kits().unwrap() {
        let mut tree = parse("");
        for (end, _) in text.char_indices() {
            tree = tree.reparse(&text[..end]);
            check_typing(&tree);
        }
    }
}

/// A broken line may be read otherwise once the lines of the block before it have moved.
#[test]
fn a_faulty_text_may_be_left_alone() {
    let tree = parse("b n {\n±}\n } \u{200b}a 1,\n\n   2 a");
    assert!(!tree.problems.is_empty());
    assert_eq!(layout(&tree, &AsWritten), None);
}
