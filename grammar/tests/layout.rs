//! The canonical layout: what it moves, and what it leaves alone.

use ampspec_grammar::{AsWritten, Block, Line, Spelling, Tree, layout, parse};

const SAMPLE: &str = include_str!("sample.ampspec");

#[track_caller]
fn check(text: &str, expected: &str) {
    let laid_out = layout(&parse(text), &AsWritten);
    assert_eq!(laid_out.as_deref(), Some(expected), "layout of {text:?}");
    assert_eq!(
        layout(&parse(expected), &AsWritten).as_deref(),
        Some(expected)
    );
}

/// The keys with a selector, and the ones that keep out of the columns.
struct Selectors;

impl Spelling for Selectors {
    fn selector(&self, tree: &Tree, _: &Block, line: &Line) -> Option<usize> {
        match line.key.text(&tree.text) {
            "soa" if line.groups[0].tokens[0].text(&tree.text) == "dc" => Some(1),
            "soa" => Some(2),
            "hfe" | "fuse" => Some(1),
            "change" | "allow" | "severity" => None,
            _ => Some(0),
        }
    }

    fn group(&self, tree: &Tree, _: Option<&Block>, line: &Line, n: usize) -> Option<Vec<String>> {
        let tokens = &line.groups[n].tokens;
        let texts = tokens.iter().map(|token| token.text(&tree.text));
        let respelled = texts.flat_map(|text| match text {
            "63V" => vec!["63".into(), "V".into()],
            "bad" => vec!["one token?".into()],
            _ => vec![text.to_owned()],
        });
        Some(respelled.collect())
    }
}

#[test]
fn the_sample_is_laid_out_but_for_its_wider_gaps() {
    let narrowed = SAMPLE
        .replace("±5 %  5 W  ref R21-R24  part", "±5 % 5 W ref R21-R24 part")
        .replace("n16 p16  ref", "n16 p16 ref")
        .replace("16 A  peak", "16 A peak")
        .replace("per rail  ref", "per rail ref")
        .replace("7 A        #", "7 A  #");
    let laid_out = layout(&parse(SAMPLE), &Selectors).unwrap();
    assert_eq!(laid_out, narrowed);
}

#[test]
fn keys_stand_in_one_column() {
    check(
        "b  n   \"t\"{\n k 1   V ,  2 A#c\n\tchannels-per-board-x  1\n}",
        "b n \"t\" {\n    k                    1 V, 2 A  #c\n    channels-per-board-x 1\n}\n",
    );
}

#[test]
fn blank_lines_are_one_at_most_and_none_at_the_edges() {
    check(
        "\n\n\na 1\n\n\n\nb n {\n\n\nk 1\n\n\nl 1\n\n}\n\n\n",
        "a 1\n\nb n {\n    k                  1\n\n    l                  1\n}\n",
    );
    check("", "");
    check("\n \n", "");
}

#[test]
fn a_block_in_one_line_stays_so_while_it_fits() {
    check("b n{k  1}", "b n { k 1 }\n");
    check("b n {}", "b n { }\n");
    check("b n {\n}", "b n {\n}\n");
    let long = "v".repeat(95);
    check(
        &format!("b n {{ k {long} }} # c"),
        &format!("b n {{\n    k                  {long}\n}}  # c\n"),
    );
    check(
        "b n { k 1 # c\n} # d",
        "b n {\n    k                  1  # c\n}  # d\n",
    );
    check(
        "b n {\n k 1 } # d",
        "b n {\n    k                  1\n}  # d\n",
    );
}

#[test]
fn line_breaks_between_groups_are_the_authors() {
    check(
        "b n {\n k 1, 2, # c\n  3,\n\n#d\n  # e\n  4\n}",
        concat!(
            "b n {\n    k                  1, 2,  # c\n                       3,\n#d\n",
            "                       # e\n                       4\n}\n",
        ),
    );
    check("w a  b,\n  c", "w a b,\n    c\n");
}

#[test]
fn comments_keep_their_place() {
    check(
        "  # a\nb n { # b\n# c\n  # d  \n k 1\n  #e\n}",
        "# a\nb n {  # b\n# c\n    # d\n    k                  1\n    #e\n}\n",
    );
}

#[test]
fn line_ends_are_those_of_most_lines() {
    check("a 1\r\nb 2\r\nc 3\n", "a 1\r\nb 2\r\nc 3\r\n");
    check("a 1\rb 2\n", "a 1\nb 2\n");
    check("\u{FEFF}a  1", "\u{FEFF}a 1\n");
}

#[test]
fn what_has_a_problem_stays_byte_for_byte() {
    check(
        "a  1\nb  \"x\nb n {\n  k   1 ,2 \n\n\n}\n   l  3 \n",
        "a 1\nb  \"x\nb n {\n  k   1 ,2 \n\n\n}\n   l  3 \n",
    );
    check(
        "b  n {\n k  1\nb  m {\n k  1\n}",
        "b  n {\n k  1\nb m {\n    k                  1\n}\n",
    );
    check(
        "b n {} b  m {\n k   1\n}\nc  2",
        "b n {} b  m {\n k   1\n}\nc 2\n",
    );
}

#[test]
fn respelled_tokens_are_read_as_they_were_meant() {
    let tree = parse("b n {\nk 10000uF 63V, 63V\n}");
    let laid_out = layout(&tree, &Selectors);
    assert_eq!(
        laid_out.as_deref(),
        Some("b n {\n    k                  10000uF 63 V, 63 V\n}\n")
    );
    assert_eq!(layout(&parse("a bad"), &Selectors), None);
}
