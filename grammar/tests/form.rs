//! What the grammar makes of texts, good and bad: the rules of form, one by one.

use ampspec_grammar::{Block, Item, Line, ProblemKind, Token, TokenKind, Tree, parse};

const SAMPLE: &str = include_str!("sample.ampspec");

fn token(tree: &Tree, token: Token) -> String {
    let text = token.text(&tree.text);
    match token.kind {
        TokenKind::Word | TokenKind::Text => text.to_owned(),
        TokenKind::Number => format!("#{text}"),
        TokenKind::Times => format!("x:{text}"),
    }
}

fn tokens(tree: &Tree, list: &[Token]) -> String {
    let texts: Vec<String> = list.iter().map(|t| token(tree, *t)).collect();
    texts.join(" ")
}

fn line(tree: &Tree, line: &Line) -> String {
    let groups: Vec<String> = line
        .groups
        .iter()
        .map(|g| tokens(tree, &g.tokens))
        .collect();
    format!("{}({})", token(tree, line.key), groups.join("; "))
}

fn block(tree: &Tree, block: &Block) -> String {
    let lines: Vec<String> = block.lines.iter().map(|l| line(tree, l)).collect();
    let close = if block.close.is_some() { "}" } else { "" };
    let header = tokens(tree, &block.header);
    format!(
        "{} {header}{{{}{close}",
        token(tree, block.kind),
        lines.join(" ")
    )
}

/// The tree in one line: `kind header{key(group; group) ...}`, numbers marked `#`.
fn show(text: &str) -> String {
    let tree = parse(text);
    let items = tree.items.iter().map(|item| match item {
        Item::Block(b) => block(&tree, b),
        Item::Line(l) => line(&tree, l),
    });
    items.collect::<Vec<_>>().join(" | ")
}

/// Kind and text of every problem.
fn problems(text: &str) -> Vec<(ProblemKind, String)> {
    let tree = parse(text);
    let problems = tree.problems.iter();
    problems
        .map(|p| (p.kind, p.span.slice(&tree.text).to_owned()))
        .collect()
}

/// Asserts the tree and the problems of a text.
#[track_caller]
fn check(text: &str, tree: &str, expected: &[(ProblemKind, &str)]) {
    let expected: Vec<_> = expected
        .iter()
        .map(|(k, s)| (*k, (*s).to_owned()))
        .collect();
    assert_eq!(show(text), tree, "tree of {text:?}");
    assert_eq!(problems(text), expected, "problems of {text:?}");
}

use ProblemKind::{
    AfterBrace, BrokenLine, CurlyQuotes, HeaderWithoutBrace, HiddenCharacter, IndentedHeader,
    LineTooLong, MissingName, NestedBlock, OutsideBlock, StrayBrace, StrayComma, TooMany,
    UnclosedBlock, UnclosedString,
};

#[test]
fn the_sample_has_no_problem() {
    let tree = parse(SAMPLE);
    assert_eq!(tree.problems, []);
    assert_eq!(tree.blocks().count(), 25);
    assert_eq!(tree.items.len(), 27);
    assert!(
        tree.blocks()
            .all(|block| block.close.is_some() && block.name().is_some())
    );
}

#[test]
fn a_token_is_a_run_between_separators() {
    let one_each = "0R22 ±5 +-10 +/-10 −3 .5 2x28VAC 28-0-28 10000uF/63V 0,22 10,000 1/8 4k7";
    for text in one_each.split(' ') {
        check(&format!("k {text}"), &format!("k(#{text})"), &[]);
    }
    for text in "R22 % K/W R21-R24 °C Ω µ load.table ± +- - / $".split(' ') {
        check(&format!("k {text}"), &format!("k({text})"), &[]);
    }
    check("k 1 ohm# c", "k(#1 ohm)", &[]);
    check("k \"a # b\"\"c\"d", "k(\"a # b\" \"c\" d)", &[]);
    check("k\u{A0}8\u{2009}ohm", "k(#8 ohm)", &[]);
}

#[test]
fn x_counts_only_after_a_number() {
    check("k 2 x 28 Vac", "k(#2 x:x #28 Vac)", &[]);
    check("k 2 × 28 Vac", "k(#2 x:× #28 Vac)", &[]);
    check("k n * 2", "k(n x:* #2)", &[]);
    check("k x with x, 2\nx x", "k(x with x; #2) | x(x)", &[]);
}

#[test]
fn a_separator_comma_is_followed_by_space_or_line_end() {
    check("k 1,5 V, 3 A", "k(#1,5 V; #3 A)", &[]);
    check("k \"a\",\"b\"", "k(\"a\"; \"b\")", &[]);
    check("k 1 ,2", "k(#1; #2)", &[(StrayComma, ",")]);
    check("k 1,, 2", "k(#1; #2)", &[(StrayComma, ",")]);
    check("k 1,,2", "k(#1; #2)", &[(StrayComma, ",")]);
    check("k, 1", "k(#1)", &[(StrayComma, ",")]);
    check(", k 1", "k(#1)", &[(StrayComma, ",")]);
    check("k 1,", "k(#1)", &[(StrayComma, ",")]);
    check("k,", "k()", &[(StrayComma, ",")]);
    check(",", "", &[(StrayComma, ",")]);
}

#[test]
fn a_comma_continues_on_a_deeper_line() {
    check(
        "b n {\n  k 1,\n    2,\n   3\n  l 4\n}",
        "b n{k(#1; #2; #3) l(#4)}",
        &[],
    );
    check(
        "b n {\n  k 1, # one\n\n# two\n    2\n}",
        "b n{k(#1; #2)}",
        &[],
    );
    check(
        "b n {\n  k 1,\n  l 2\n}",
        "b n{k(#1) l(#2)}",
        &[(StrayComma, ",")],
    );
    check("b n {\n  k 1,\n}", "b n{k(#1)}", &[(StrayComma, ",")]);
    check("b n {\n\tk 1,\n        2\n}", "b n{k(#1; #2)}", &[]);
    check(
        "b n {\n\tk 1,\n    l 2\n}",
        "b n{k(#1) l(#2)}",
        &[(StrayComma, ",")],
    );
    check("b n { k 1,\n        2 }", "b n{k(#1; #2)}", &[]);
    check(
        "b n { k 1,\n  l 2 }",
        "b n{k(#1) l(#2)}",
        &[(StrayComma, ",")],
    );
    // Without the comma the second line has no key.
    check(
        "b n {\n  k 1\n    2,\n    3\n}",
        "b n{k(#1)}",
        &[(BrokenLine, "2,")],
    );
}

#[test]
fn a_block_may_stand_in_one_line_or_many() {
    check("b n { k 1 }", "b n{k(#1)}", &[]);
    check("b n {}\nb m{}", "b n{} | b m{}", &[]);
    check(
        "b n \"t\" w from o {\nk 1\n}",
        "b n \"t\" w from o{k(#1)}",
        &[],
    );
    check("b n { k 1\n  l 2 }", "b n{k(#1) l(#2)}", &[]);
    check("k 1\r\nb n {\r  l 2\r\n}\r", "k(#1) | b n{l(#2)}", &[]);
    check("\u{FEFF}k 1", "k(#1)", &[]);
}

#[test]
fn a_header_in_column_one_ends_an_open_block() {
    check(
        "b n {\n  k 1\nb m {\n}",
        "b n{k(#1) | b m{}",
        &[(UnclosedBlock, "b n")],
    );
    check("b n {\nk 1", "b n{k(#1)", &[(UnclosedBlock, "b n")]);
    let tree = parse("b n {\nb m {\n}");
    let (note, place) = &tree.problems[0].related[0];
    assert_eq!(
        (note.as_str(), place.slice(&tree.text)),
        ("the next block begins here", "b m")
    );
}

#[test]
fn a_header_is_known_by_what_follows_where_its_brace_is_missing() {
    check(
        "b n\n  k 1\n  l 2\n}",
        "b n{k(#1) l(#2)}",
        &[(HeaderWithoutBrace, "b n")],
    );
    check(
        "b n\n{\n  k 1\n}",
        "b n{k(#1)}",
        &[(HeaderWithoutBrace, "b n")],
    );
    check("b\n  k 1\n}", "b {k(#1)}", &[(HeaderWithoutBrace, "b")]);
    check(
        "ampspec 1\n  k 1\nk 2",
        "ampspec(#1) | k(#2)",
        &[(OutsideBlock, "k 1")],
    );
    check("b n\nb m {}", "b(n) | b m{}", &[]);
}

#[test]
fn a_header_has_a_kind_and_a_name() {
    check("b {\n k 1\n}", "b {k(#1)}", &[(MissingName, "b")]);
    check("b \"t\" {\n}", "b \"t\"{}", &[(MissingName, "\"t\"")]);
    check("b 2n3 {\n}", "b #2n3{}", &[(MissingName, "2n3")]);
    check("2 n {\n}", "#2 n{}", &[(BrokenLine, "2")]);
    check("b n, w {\n}", "b n w{}", &[(StrayComma, ",")]);
    check("  b n {\n k 1\n}", "b n{k(#1)}", &[(IndentedHeader, "b n")]);
}

#[test]
fn blocks_do_not_nest() {
    let nested = [(NestedBlock, "{")];
    check(
        "b n {\n  c {\n    k 1\n  }\n  l 2\n}\nm 3",
        "b n{c() l(#2)} | m(#3)",
        &nested,
    );
    check("b n {\n  c { k 1 }\n  l 2\n}", "b n{c() l(#2)}", &nested);
    check("b n { c { k 1 } }\nl 2", "b n{c()} | l(#2)", &nested);
    // A brace typed by mistake harms no other line.
    check(
        "b n {\n  k 1 {\n  l 2\n}\nm 3",
        "b n{k(#1) l(#2)} | m(#3)",
        &nested,
    );
    check(
        "b n {\n  {\n    k 1\n  }\n  l 2\n}",
        "b n{l(#2)}",
        &[(StrayBrace, "{")],
    );
}

#[test]
fn stray_braces_and_lines_are_one_problem_each() {
    check("}\nk 1", "k(#1)", &[(StrayBrace, "}")]);
    check("b n { k 1 } }", "b n{k(#1)}", &[(AfterBrace, "}")]);
    check(
        "b n { k 1 } b m {\nl 2\n}",
        "b n{k(#1)} | b m{l(#2)}",
        &[(AfterBrace, "b m")],
    );
    check(
        "b n {}\n  k 1\n  l 2\n}\nm 3",
        "b n{} | m(#3)",
        &[(OutsideBlock, "k 1")],
    );
    check("{\n  k 1\n}\nm 3", "m(#3)", &[(StrayBrace, "{")]);
    check(
        "1 V\n\"a\"",
        "",
        &[(BrokenLine, "1 V"), (BrokenLine, "\"a\"")],
    );
}

#[test]
fn a_string_ends_at_the_line_end() {
    check(
        "k \"a b\nl 1",
        "k(\"a b) | l(#1)",
        &[(UnclosedString, "\"a b")],
    );
    check("k \"", "k(\")", &[(UnclosedString, "\"")]);
    check("k “a b” 1", "k(“a b” #1)", &[(CurlyQuotes, "“a b”")]);
    let tree = parse("k \"a b\" \"c");
    let Item::Line(line) = &tree.items[0] else {
        panic!("a line")
    };
    let contents = line.groups[0].tokens.iter().map(|t| t.content(&tree.text));
    assert_eq!(contents.collect::<Vec<_>>(), ["a b", "c"]);
}

#[test]
fn hidden_characters_are_not_guessed_at() {
    check(
        "k 1 V 4\u{200B}7 ohm, 2 A",
        "k(#1 V; #2 A)",
        &[(HiddenCharacter, "\u{200B}")],
    );
    check("k\0ey 1", "", &[(HiddenCharacter, "\0")]);
    check("k 1 # \u{202E}", "k(#1)", &[(HiddenCharacter, "\u{202E}")]);
    check(
        "k \"\u{1B}[0m\"",
        "k(\"\u{1B}[0m\")",
        &[(HiddenCharacter, "\u{1B}")],
    );
    // Joiners are part of several scripts.
    check("k \"a\u{200D}b\" # \u{200D}", "k(\"a\u{200D}b\")", &[]);
}

#[test]
fn comments_belong_to_the_token_before_them() {
    let tree = parse("k 1 # one\nb n { # two\n  l 2, # three\n    3 # four\n} # five\n# six");
    let comment = |line: &Line| line.comment.map(|c| c.slice(&tree.text).to_owned());
    let found = tree.items.iter().map(|item| match item {
        Item::Line(line) => comment(line),
        Item::Block(block) => comment(&block.lines[0]),
    });
    assert_eq!(
        found.collect::<Vec<_>>(),
        [Some("# one".into()), Some("# four".into())]
    );
}

#[test]
fn spans_cover_what_they_name() {
    let text = "b n \"t\" { # c\n  k 1,\n    2 V # d\n}\n";
    let tree = parse(text);
    let block = tree.blocks().next().unwrap();
    assert_eq!(block.span.slice(text), text.trim_end());
    assert_eq!(block.header_span.slice(text), "b n \"t\"");
    assert_eq!(block.open.slice(text), "{");
    assert_eq!(block.lines[0].span.slice(text), "k 1,\n    2 V");
    assert_eq!(block.lines[0].groups[1].span.slice(text), "2 V");
    assert!(!tree.is_faulty(block.span));
}

#[test]
fn only_the_lines_with_a_problem_are_faulty() {
    let tree = parse("b n {\n  k 1 ,2\n  l 3\n");
    let block = tree.blocks().next().unwrap();
    assert!(tree.is_faulty(block.lines[0].span));
    assert!(!tree.is_faulty(block.lines[1].span));
    assert!(!tree.is_faulty(block.header_span)); // not closed, but read in full
}

#[test]
fn hostile_texts_are_read_to_the_end() {
    let long = "a 1 ".repeat(2_500_000);
    assert_eq!(problems(&long), [(LineTooLong, String::new())]);
    for text in ["{", "}", "\"", ",", "#", "\0", "a {", "} {", "a {}"] {
        assert!(parse(text.repeat(20_000)).problems.len() <= 2);
    }
    for text in [
        "\n", "\r", "{\n", "}\n", "a {\n", " a {\n", "a,\n", " 1,\n", "\"\n", "a 1\n",
    ] {
        let tree = parse(text.repeat(5_000));
        assert!(tree.problems.len() <= ampspec_grammar::MAX_PROBLEMS + 1);
    }
    let last = |text: &str| parse(text.repeat(2_000)).problems.last().map(|p| p.kind);
    assert_eq!(last("}\n"), Some(TooMany));
}

#[test]
fn a_million_lines_are_read() {
    let text = "\n".repeat(1_000_000) + &"a 1\n".repeat(50_000);
    assert_eq!(parse(text).items.len(), 50_000);
}
