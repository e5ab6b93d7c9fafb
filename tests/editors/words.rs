//! The words that editors colour are those of the vocabulary. `UPDATE=1 cargo test -p derate-lsp --test
//! editor_words` writes them anew.

#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    clippy::panic,
    reason = "a test that cannot go on fails"
)]

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};

use derate::vocabulary::{BLOCKS, STATEMENTS, Selector, Takes};
use serde_json::json;

struct Words {
    kinds: Vec<&'static str>,
    keys: Vec<&'static str>,
    words: Vec<&'static str>,
}

/// Every word of the vocabulary, each once, sorted.
fn words() -> Words {
    let kinds: BTreeSet<&str> = BLOCKS
        .iter()
        .map(|b| b.kind)
        .chain(STATEMENTS.iter().map(|s| s.name))
        .collect();
    let keys: BTreeSet<&str> = BLOCKS.iter().flat_map(|b| b.keys).map(|k| k.name).collect();
    let mut words: BTreeSet<&str> = [
        "from", "none", "per", "ref", "part", "qty", "because", "by", "until",
    ]
    .into();
    words.extend(BLOCKS.iter().flat_map(|b| b.flavours));
    for shape in BLOCKS
        .iter()
        .flat_map(|b| b.keys)
        .map(derate::vocabulary::Key::shape)
    {
        if let Some(Selector::Words(list, _)) = &shape.selector {
            words.extend(list);
        }
        for item in &shape.items {
            words.extend(item.label);
            match &item.takes {
                Takes::Choice(list) => words.extend(list),
                Takes::Per(list) => words.extend(list.iter().filter(|w| **w != "N")),
                _ => {}
            }
        }
    }
    Words {
        kinds: kinds.into_iter().collect(),
        keys: keys.into_iter().collect(),
        words: words.into_iter().collect(),
    }
}

fn path(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("../editors")
        .join(name)
}

/// The file holds this text; with `UPDATE` set it is made to.
fn holds(name: &str, text: &str) {
    let path = path(name);
    if std::env::var_os("UPDATE").is_some() {
        std::fs::write(&path, text).unwrap();
    }
    let found = std::fs::read_to_string(&path).unwrap_or_default();
    assert!(
        found == text,
        "editors/{name} does not hold the words of the vocabulary: run this test with UPDATE=1"
    );
}

/// The lines between the two marks are these.
fn between(name: &str, lines: &str) {
    let text = std::fs::read_to_string(path(name)).unwrap();
    let begin = text
        .find("BEGIN WORDS")
        .and_then(|at| text[at..].find('\n').map(|n| at + n + 1))
        .unwrap();
    let end = text
        .find("END WORDS")
        .and_then(|at| text[..at].rfind('\n').map(|n| n + 1))
        .unwrap();
    holds(name, &format!("{}{lines}{}", &text[..begin], &text[end..]));
}

#[test]
fn vim() {
    let Words { kinds, keys, words } = words();
    // of one place, the syntax item defined last wins: kinds after keys after words
    let one =
        |group: &str, list: &[&str]| format!("syntax keyword ampspec{group} {}\n", list.join(" "));
    between(
        "vim/syntax/ampspec.vim",
        &(one("Word", &words) + &one("Key", &keys) + &one("Kind", &kinds)),
    );
}

#[test]
fn emacs() {
    let Words { kinds, keys, words } = words();
    let one = |name: &str, what: &str, list: &[&str]| {
        let quoted: Vec<String> = list.iter().map(|w| format!("\"{w}\"")).collect();
        format!(
            "(defconst ampspec-{name}\n  '({})\n  \"{what}.\")\n",
            quoted.join(" ")
        )
    };
    between(
        "emacs/ampspec-mode.el",
        &(one("kinds", "Kinds of block and statements", &kinds)
            + &one("keys", "Keys", &keys)
            + &one("words", "Words after keys", &words)),
    );
}

#[test]
fn kakoune() {
    let Words { kinds, keys, words } = words();
    let one = |before: &str, list: &[&str], face: &str| {
        format!(
            "add-highlighter shared/ampspec/code/ regex '{before}({})(?![\\w-])' 1:{face}\n",
            list.join("|")
        )
    };
    between(
        "kakoune/ampspec.kak",
        &(one("(?<![\\w-])", &words, "attribute")
            + &one("(?:^|\\{)\\h*", &keys, "variable")
            + &one("^", &kinds, "keyword")),
    );
}

#[test]
fn kate() {
    let Words { kinds, keys, words } = words();
    let one = |name: &str, list: &[&str]| {
        let items: String = list.iter().map(|w| format!("<item>{w}</item>")).collect();
        format!("    <list name=\"{name}\">{items}</list>\n")
    };
    between(
        "kate/ampspec.xml",
        &(one("kinds", &kinds) + &one("keys", &keys) + &one("words", &words)),
    );
}

#[test]
fn text_mate() {
    let Words { kinds, keys, words } = words();
    let one_of = |list: &[&str]| format!("({})(?![\\w-])", list.join("|"));
    let grammar = json!({
        "name": "ampspec",
        "scopeName": "source.ampspec",
        "patterns": [
            {"name": "comment.line.number-sign.ampspec", "match": "#.*$"},
            {"name": "string.quoted.double.ampspec", "match": "\"[^\"]*\"?"},
            {"match": format!("^{}", one_of(&kinds)), "captures": {"1": {"name": "keyword.other.ampspec"}}},
            {"match": format!("(?:^|\\{{)\\s*{}", one_of(&keys)), "captures": {"1": {"name": "variable.other.property.ampspec"}}},
            {"name": "constant.numeric.ampspec", "match": "(?<![\\w-])[±+-]*\\.?\\d[^\\s,{}\"#]*"},
            {"match": format!("(?<![\\w-]){}", one_of(&words)), "captures": {"1": {"name": "constant.language.ampspec"}}},
        ],
    });
    holds(
        "vscode/syntaxes/ampspec.tmLanguage.json",
        &format!("{}\n", serde_json::to_string_pretty(&grammar).unwrap()),
    );
}
