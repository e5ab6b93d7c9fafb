//! Answers for the editor, on texts whose cursor is written `‸`.

use std::collections::HashMap;
use std::path::{Path, PathBuf};
use std::sync::Arc;

use ampspec_grammar::{Edit, Span, Tree, apply, parse};

use super::complete::complete;
use super::fix::fixes;
use super::hints::{Wanted, hints, lenses};
use super::hover::{hover, needs_check};
use super::moved::{moved, same_words};
use super::names::{Role, of_tree, refused};
use super::signature::signature;
use super::tokens::{Class, tokens};
use super::web::Web;
use super::{Scene, lay, links, outline};
use crate::source::{Files, normal};
use crate::testing::kit;
use crate::{Options, Outcome};

/// Files that are nowhere else.
#[derive(Default)]
struct Shelf(HashMap<PathBuf, Arc<Tree>>);

impl Files for Shelf {
    fn read(&self, path: &Path) -> Result<Arc<str>, String> {
        self.tree(path).map(|t| Arc::clone(&t.text))
    }
    fn tree(&self, path: &Path) -> Result<Arc<Tree>, String> {
        self.0
            .get(path)
            .cloned()
            .ok_or_else(|| "there is no such file".to_owned())
    }
    fn resolve(&self, path: &Path) -> PathBuf {
        normal(path)
    }
}

impl Shelf {
    fn of(files: &[(&str, &str)]) -> Self {
        Self(
            files
                .iter()
                .map(|(name, text)| (PathBuf::from("/kits").join(name), Arc::new(parse(*text))))
                .collect(),
        )
    }

    fn check(&self, name: &str) -> Arc<Outcome> {
        let options = Options {
            today: "2026-06-01".to_owned(),
            ..Options::default()
        };
        Arc::new(crate::check(self, &Path::new("/kits").join(name), name, &options).unwrap())
    }

    /// Ask something of the file `name`, checked.
    fn ask<T>(&self, name: &str, question: impl FnOnce(&Scene<'_>) -> T) -> T {
        let path = Path::new("/kits").join(name);
        let web = Web::load(self, self.0.keys().cloned());
        let outcomes = [self.check(name)];
        question(&Scene {
            path: &path,
            tree: &self.0[&path],
            web: &web,
            outcomes: &outcomes,
        })
    }
}

/// The text without its cursor, and where that stands.
fn cursor(text: &str) -> (String, usize) {
    let at = text.find('‸').expect("a cursor");
    (text.replacen('‸', "", 1), at)
}

fn at<T>(text: &str, question: impl FnOnce(&Scene<'_>, usize) -> T) -> T {
    let (text, offset) = cursor(text);
    Shelf::of(&[("a.ampspec", &text)]).ask("a.ampspec", |scene| question(scene, offset))
}

fn offered(text: &str) -> Vec<String> {
    at(text, |scene, offset| {
        complete(scene, offset)
            .into_iter()
            .map(|o| o.label)
            .collect()
    })
}

#[test]
fn what_may_follow_is_offered() {
    let head = "ampspec 1\ndevice n16 npn { vceo 80 V }\ndevice q npn { vceo 80 V }\nstage out {\n    devices n16 q\n}\n";
    for (typed, wanted, unwanted) in [
        ("sta‸", "stage", "vceo"),
        ("stage x {\n    ‸\n}\n", "emitter", "vceo"),
        ("stage x {\n    emi‸\n}\n", "emitter", "n16"),
        ("stage x {\n    pairs 2\n    ‸\n}\n", "devices", "pairs"),
        ("stage x {\n    devices ‸\n}\n", "n16", "out"),
        ("stage x {\n    devices n16 ‸\n}\n", "q", "out"),
        ("stage x {\n    emitter 0.22 ‸\n}\n", "ohm", "emitter"),
        ("stage x {\n    emitter 0.22 ohm ‸\n}\n", "pulse", "ohm"),
        ("stage x {\n    emitter 0R22 ref R1 ‸\n}\n", "part", "ref"),
        ("stage x {\n    idle 50 mA per ‸\n}\n", "device", "emitter"),
        ("stage x {\n    sensor ‸\n}\n", "on", "sink"),
        ("stage x {\n    sensor on ‸\n}\n", "sink", "on"),
        ("device r npn { soa ‸ }\n", "dc", "A"),
        ("device r npn { ‸ }\n", "soa", "emitter"),
        ("device r ‸ {\n}\n", "pnp", "vceo"),
        ("device r npn from ‸ {\n}\n", "n16", "out"),
        ("build b {\n    change ‸\n}\n", "out", "pairs"),
        ("build b {\n    change out ‸\n}\n", "pairs", "vceo"),
        ("build b {\n    change out devices ‸\n}\n", "n16", "out"),
        ("build b {\n    supply t per ‸\n}\n", "channel", "rail"),
        ("build b {\n    policy ‸\n}\n", "strict", "n16"),
        ("policy p from ‸ {\n}\n", "bench", "n16"),
        (
            "policy p from bench {\n    allow ‸\n}\n",
            "thermal.sink",
            "error",
        ),
        (
            "policy p from bench {\n    severity thermal.sink ‸\n}\n",
            "warning",
            "thermal.sink",
        ),
        ("waive ‸", "thermal.sink", "of"),
        ("waive thermal.sink ‸", "because", "in the"),
        ("waive thermal.sink of ‸", "n16", "because"),
    ] {
        let found = offered(&format!("{head}{typed}"));
        assert!(
            found.iter().any(|l| l == wanted),
            "{typed}: no {wanted} in {found:?}"
        );
        assert!(
            !found.iter().any(|l| l == unwanted),
            "{typed}: {unwanted} in {found:?}"
        );
    }
    assert!(offered("ampspec 1 # sta‸").is_empty());
    assert!(offered("use \"sta‸\"").is_empty());
}

#[test]
fn the_next_item_of_a_key_is_pointed_out() {
    let head = "ampspec 1\nstage x {\n    ";
    for (typed, active) in [
        ("emitter ‸", Some("ohm")),
        ("emitter 0R22 ‸", Some("[W]")),
        ("idle 50 mA per ‸", Some("[V]")),
        (
            "connection ‸",
            Some("emitter-follower|compound-pair|source-follower|common-emitter"),
        ),
        ("connection emitter-follower ‸", None),
    ] {
        let found = at(&format!("{head}{typed}\n}}\n"), signature).unwrap();
        let item = found
            .active
            .and_then(|a| found.items.get(a))
            .map(|i| &found.label[i.0..i.1]);
        assert_eq!(item, active, "{typed}: {found:?}");
    }
    assert_eq!(at("ampspec 1\nsta‸", signature), None);
}

#[test]
fn names_are_found_wherever_they_stand() {
    let text = "device n16 npn {\n vceo 9 V\n}\ndevice p from n16 {\n}\nstage out {\n devices n16 p ref Q7\n}\nload a { parallel a, b }\nbuild b {\n supply t per 2 channels\n change out devices n16 n16\n loads a, b\n}\nalternate e { replace n16 with p }\nwaive x.y of n16 in b with e because \"n16\"\n";
    let tree = parse(text);
    let kinds = Web::load(
        &Shelf::of(&[("a.ampspec", text)]),
        [PathBuf::from("/kits/a.ampspec")],
    )
    .kinds(Path::new("/kits/a.ampspec"));
    let all = of_tree(&tree, &kinds);
    let of = |name: &str| all.iter().filter(|n| n.span.slice(text) == name).count();
    assert_eq!(
        (
            of("n16"),
            of("p"),
            of("out"),
            of("t"),
            of("e"),
            of("channels"),
            of("Q7")
        ),
        (7, 3, 2, 1, 2, 0, 0),
        "{all:?}"
    );
    assert_eq!(all.iter().filter(|n| n.role == Role::Declared).count(), 6);
    assert_eq!(refused("q9-b"), None);
    for bad in [
        "", "9q", "ohm", "with", "a b", "a{", "per", "none", "\"x\"", "#", "from",
    ] {
        assert!(refused(bad).is_some(), "{bad}");
    }
}

#[test]
fn names_of_other_files_count_only_where_they_reach() {
    let shelf = Shelf::of(&[
        (
            "kit.ampspec",
            "ampspec 1\nuse \"parts.ampspec\"\nstage out { devices n16 }\n",
        ),
        ("parts.ampspec", "ampspec 1\ndevice n16 npn { vceo 9 V }\n"),
        (
            "other.ampspec",
            "ampspec 1\ndevice n16 npn { vceo 9 V }\nstage out { devices n16 }\n",
        ),
    ]);
    shelf.ask("kit.ampspec", |scene| {
        let found = scene.web.occurrences(scene.path, "n16");
        let files: Vec<_> = found
            .iter()
            .map(|(s, _)| s.path.file_name().unwrap().to_str().unwrap())
            .collect();
        assert_eq!(files, ["kit.ampspec", "parts.ampspec"]);
        assert_eq!(
            links::links(scene.path, scene.tree)[0].1,
            Path::new("/kits/parts.ampspec")
        );
    });
}

fn tern60() -> String {
    kit("tern60")
}

#[test]
fn hover_tells_meaning_numbers_and_margins() {
    let text = tern60();
    let with =
        |wanted: &str| text.replacen(wanted, &format!("{}‸{}", &wanted[..1], &wanted[1..]), 1);
    let said = |wanted: &str| {
        at(&with(wanted), hover)
            .unwrap_or_else(|| panic!("nothing of {wanted}"))
            .markdown
    };
    assert!(said("vceo 240").contains("V(BR)CEO"));
    assert!(said("stage out").contains("one stage of the board"));
    assert!(said("n16 p16 ref").contains("device n16"));
    assert!(said("n16 p16 ref").contains("voltage.device"));
    assert!(said("0.45 K/W").contains("thermal.sink"));
    assert!(said("28 Vac").contains("rail-idle"));
    assert!(
        at("ampspec 1\nwaive thermal.s‸ink because \"x\"\n", hover)
            .unwrap()
            .markdown
            .contains("thermal.sink")
    );
    // text of the spec cannot become mark-up
    let hostile = at(
        "ampspec 1\ndevice n‸ \"<b>[x](y)\" npn { vceo 9 V }\n",
        hover,
    )
    .unwrap()
    .markdown;
    assert!(hostile.contains("&lt;b&gt;\\[x\\](y)"), "{hostile}");
    let tree = parse(&*text);
    assert!(!needs_check(&tree, text.find("vceo").unwrap()));
    assert!(needs_check(&tree, text.find("240 V").unwrap()));
}

#[test]
fn numbers_stand_at_the_ends_of_their_lines() {
    let text = tern60();
    Shelf::of(&[("a.ampspec", &text)]).ask("a.ampspec", |scene| {
        let all = Span::new(0, text.len());
        let found = hints(scene, all, &Wanted::default());
        let secondary = found
            .iter()
            .find(|h| text[..h.offset].ends_with("secondary 2 x 28 Vac"))
            .unwrap();
        assert!(secondary.label.starts_with("rail idle "), "{secondary:?}");
        assert!(found.iter().any(|h| h.label.contains("% used")));
        let none = Wanted {
            derived: false,
            used: false,
            names: Vec::new(),
        };
        assert!(hints(scene, all, &none).is_empty());
        let one = Wanted {
            derived: true,
            used: false,
            names: vec!["sink".to_owned()],
        };
        assert!(
            hints(scene, all, &one)
                .iter()
                .all(|h| h.label.starts_with("sink "))
        );
        let over = lenses(scene);
        assert!(
            over.iter()
                .any(|l| l.span.slice(&text).starts_with("build mono")
                    && l.label.contains("governed by")),
            "{over:?}"
        );
        assert!(
            over.iter()
                .any(|l| l.span.slice(&text).starts_with("stage out")),
            "{over:?}"
        );
    });
}

/// The text after one of the fixes for the finding on a line.
fn fixed(text: &str, line: &str, title: &str) -> String {
    Shelf::of(&[("a.ampspec", text)]).ask("a.ampspec", |scene| {
        let start = text.find(line).unwrap();
        let all = fixes(scene, Span::new(start, start + line.len()));
        let found = all
            .iter()
            .find(|f| f.title.starts_with(title))
            .unwrap_or_else(|| panic!("no {title} in {all:#?}"));
        let edits: Vec<Edit> = found
            .edits
            .iter()
            .map(|(spot, text)| Edit {
                span: spot.span,
                text: text.clone(),
            })
            .collect();
        apply(text, &edits).unwrap()
    })
}

#[test]
fn fixes_write_what_they_say() {
    let text = tern60();
    let misspelt = text.replace("insulator 0.35", "isulator 0.35");
    assert_eq!(fixed(&misspelt, "isulator", "write `insulator`"), text);
    let lacking = text.replace(
        "    junction 150 degC\n    junction-case",
        "    junction-case",
    );
    let added = fixed(&lacking, "device n16 npn", "add `junction` to device n16");
    assert!(
        added.contains("    source authorised \"franchised distributor\"\n    junction \n}"),
        "{added}"
    );
    let hot = text.replace("0.45 K/W at 50 K", "2 K/W at 50 K");
    let waived = fixed(&hot, "resistance 2 K/W at 50 K", "waive thermal.sink");
    assert!(
        waived.ends_with("in mono because \"\" by \"\"\n"),
        "{waived}"
    );
    // a waiver that is not filled in accepts nothing
    let report = crate::testing::report(&waived);
    assert!(report.builds[0].margins.iter().all(|m| m.waiver.is_none()));
    let short = fixed(
        "ampspec 1\ntransformer t { rating 300 VA }\n",
        "transformer t",
        "add `primary`",
    );
    assert!(
        short.contains("{\n    rating 300 VA\n    primary \n    secondary \n}"),
        "{short}"
    );
}

#[test]
fn shape_and_layout() {
    let text =
        "ampspec 1\n# one\n# two\nload a {\n  nominal    8 ohm\n}\nload b { resistive 8 ohm }\n";
    let tree = parse(text);
    let shown: Vec<_> = outline::outline(&tree)
        .into_iter()
        .map(|e| (e.name, e.children.len()))
        .collect();
    assert_eq!(
        shown,
        [
            ("ampspec".to_owned(), 0),
            ("a".to_owned(), 1),
            ("b".to_owned(), 1)
        ]
    );
    let folded: Vec<_> = outline::folds(&tree)
        .iter()
        .map(|f| (f.span.slice(text).len(), f.comment))
        .collect();
    assert_eq!(folded, [(11, true), (29, false)]);
    let grown: Vec<_> = outline::growing(&tree, text.find("ohm").unwrap())
        .iter()
        .map(|s| s.slice(text).len())
        .collect();
    assert_eq!(grown, [3, 5, 16, 29, text.len()]);
    let edits: Vec<Edit> = lay::edits(&tree)
        .into_iter()
        .map(|(span, text)| Edit { span, text })
        .collect();
    assert_eq!(
        apply(text, &edits).unwrap(),
        crate::tidy::tidy(text).unwrap()
    );
    assert!(edits.iter().all(|e| e.span.len() < 30), "{edits:?}");
    // a line that is not read is left alone
    let broken = parse("load a {\n  nominal    \"8\n}\n");
    assert!(lay::edits_behind(&broken, broken.text.find('}').unwrap(), "\n").is_empty());
}

#[test]
fn every_word_has_a_colour() {
    let text = "load a { resistive 8 ohm ±5 % } # c\n";
    let kinds = std::collections::HashMap::new();
    let all: Vec<_> = tokens(&parse(text), &kinds)
        .iter()
        .map(|t| (t.span.slice(text), t.class))
        .collect();
    let want = [
        ("load", Class::Keyword),
        ("a", Class::Name),
        ("resistive", Class::Key),
        ("8", Class::Number),
        ("ohm", Class::Unit),
        ("±5", Class::Number),
        ("%", Class::Unit),
        ("# c", Class::Comment),
    ];
    assert_eq!(all, want);
}

/// What is carried over is what a check of the new text finds.
#[test]
fn comments_and_layout_carry_findings_over() {
    let text = tern60().replace("0.45 K/W at 50 K", "2 K/W at 50 K");
    let before = Shelf::of(&[("a.ampspec", &text)]).check("a.ampspec");
    let relaid = format!(
        "# Ω\n{}",
        text.replace(" at ", "   at  ")
            .replace("stage out {", "stage out { # the last one")
    );
    let shelf = Shelf::of(&[("a.ampspec", &relaid)]);
    let after = shelf.check("a.ampspec");
    let (file, _) = before.sources.iter().next().unwrap();
    let tree = Arc::clone(&shelf.0[Path::new("/kits/a.ampspec")]);
    let carried = moved(&before, &[(file, tree)]).unwrap();
    assert_eq!(carried.report, after.report);
    let other = parse(relaid.replace("2 K/W", "3 K/W"));
    assert!(!same_words(&parse(&*relaid), &other));
}
