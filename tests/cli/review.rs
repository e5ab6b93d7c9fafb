//! `compare`, `parts`, the baseline and `--apply` as a user meets them.
//! Must not know how a margin is computed.
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    reason = "a test may stop where it stands"
)]

use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command as Process;

use assert_cmd::Command;
use serde_json::Value;
use tempfile::TempDir;

fn kits() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("../tests/kits")
}

fn kit(name: &str) -> String {
    fs::read_to_string(kits().join(name)).unwrap()
}

/// A folder with `a.ampspec`, and `b.ampspec` with one text replaced.
fn two(name: &str, old: &str, new: &str) -> TempDir {
    let folder = tempfile::tempdir().unwrap();
    let text = kit(name);
    assert!(text.contains(old), "`{old}` is not in {name}");
    fs::write(folder.path().join("a.ampspec"), &text).unwrap();
    fs::write(folder.path().join("b.ampspec"), text.replace(old, new)).unwrap();
    folder
}

fn told(folder: &Path, arguments: &[&str]) -> (i32, String, String) {
    let mut command = Command::cargo_bin("derate").unwrap();
    let output = command
        .current_dir(folder)
        .args(arguments)
        .output()
        .unwrap();
    let text = |bytes: Vec<u8>| String::from_utf8(bytes).unwrap();
    (
        output.status.code().unwrap(),
        text(output.stdout),
        text(output.stderr),
    )
}

fn json(folder: &Path, arguments: &[&str]) -> Value {
    let (_, out, err) = told(folder, arguments);
    serde_json::from_str(&out).unwrap_or_else(|e| panic!("{e}: {out}{err}"))
}

fn git(folder: &Path, arguments: &[&str]) {
    let output = Process::new("git")
        .current_dir(folder)
        .args([
            "-c",
            "user.name=t",
            "-c",
            "user.email=t@example.org",
            "-c",
            "commit.gpgsign=false",
        ])
        .args(arguments)
        .output()
        .unwrap();
    assert!(
        output.status.success(),
        "{}",
        String::from_utf8_lossy(&output.stderr)
    );
}

#[test]
fn a_kit_with_itself_has_moved_nothing() {
    let folder = two("tern60.ampspec", "muting", "muting");
    let (status, out, err) = told(folder.path(), &["compare", "a.ampspec", "b.ampspec"]);
    assert_eq!((status, err.as_str()), (0, ""));
    assert_eq!(
        out,
        "a.ampspec -> b.ampspec: nothing moved (92 margins alike)\n"
    );
    let report = json(
        folder.path(),
        &["compare", "a.ampspec", "b.ampspec", "--form", "json"],
    );
    for key in ["rows", "figures", "findings"] {
        assert_eq!(report[key], Value::Array(vec![]), "{key}");
    }
    let all = json(
        folder.path(),
        &[
            "compare",
            "a.ampspec",
            "b.ampspec",
            "--form",
            "json",
            "--all",
        ],
    );
    assert_eq!(all["rows"].as_array().unwrap().len(), 92);
}

#[test]
fn one_part_moves_its_own_rows_and_the_level_says_whether_it_fails() {
    let folder = two("tern60.ampspec", "8R2 3 W 82 nF", "8R2 1 W 82 nF");
    let arguments = ["compare", "a.ampspec", "b.ampspec", "--form", "json"];
    let report = json(folder.path(), &arguments);
    let rows = report["rows"].as_array().unwrap();
    assert_eq!(rows.len(), 1);
    assert_eq!(rows[0]["rule"], "protection.zobel");
    assert_eq!(
        (rows[0]["state"].as_str(), rows[0]["course"].as_str()),
        (Some("moved"), Some("worse"))
    );
    // the same watts in a third of the resistor: three times the share
    let used = |side: &str| rows[0][side]["used_percent"].as_f64().unwrap();
    assert!((used("after") / used("before") - 3.0).abs() < 1e-6);
    let status = |level| {
        told(
            folder.path(),
            &["compare", "a.ampspec", "b.ampspec", "--fail-on", level],
        )
        .0
    };
    // thin now: a warning
    assert_eq!(rows[0]["after"]["verdict"], "thin");
    assert_eq!((status("error"), status("warning")), (0, 1));
    // the other way it is better, and better never fails
    let back = [
        "compare",
        "b.ampspec",
        "a.ampspec",
        "--fail-on",
        "unchecked",
    ];
    assert_eq!(told(folder.path(), &back).0, 0);
}

#[test]
fn a_revision_stands_for_a_file_and_brings_what_it_uses() {
    let folder = tempfile::tempdir().unwrap();
    let here = folder.path();
    let write = |name: &str, text: &str| {
        let path = here.join(name);
        fs::create_dir_all(path.parent().unwrap()).unwrap();
        fs::write(path, text).unwrap();
    };
    for name in [
        "tern-family.ampspec",
        "parts/outputs.ampspec",
        "parts/power.ampspec",
    ] {
        write(&format!("kits/{name}"), &kit(name));
    }
    git(here, &["init", "-q"]);
    git(here, &["add", "."]);
    git(here, &["commit", "-q", "-m", "one"]);
    // the part file changes, the spec does not
    let outputs = kit("parts/outputs.ampspec");
    write(
        "kits/parts/outputs.ampspec",
        &outputs.replacen("180 W", "150 W", 1),
    );
    assert_ne!(
        fs::read_to_string(here.join("kits/parts/outputs.ampspec")).unwrap(),
        outputs
    );
    let moved = |old: &str, new: &str, at: &Path| {
        let report = json(
            at,
            &["compare", old, new, "--form", "json", "--build", "mono"],
        );
        report["rows"].as_array().unwrap().len()
    };
    let spec = "kits/tern-family.ampspec";
    assert!(moved("HEAD:kits/tern-family.ampspec", spec, here) > 0);
    assert_eq!(
        moved(
            "HEAD:kits/tern-family.ampspec",
            "HEAD:kits/tern-family.ampspec",
            here
        ),
        0
    );
    // from the folder itself, as git has it and as one would guess
    let inside = here.join("kits");
    for old in [
        "HEAD:./tern-family.ampspec",
        "HEAD:tern-family.ampspec",
        "HEAD:kits/tern-family.ampspec",
    ] {
        assert!(moved(old, "tern-family.ampspec", &inside) > 0, "{old}");
    }
    for (name, why) in [
        ("HEAD:absent.ampspec", "no such file"),
        ("nowhere:kits/tern-family.ampspec", "no revision nowhere"),
        ("--output=x:kits/tern-family.ampspec", ""),
        ("HEAD:../../etc/passwd", "no such file"),
    ] {
        let (status, _, err) = told(here, &["compare", "--", name, spec]);
        assert_eq!(status, 2, "{name}");
        assert!(err.contains(why), "{name}: {err}");
    }
    assert!(!here.join("x").exists());
}

#[test]
fn a_template_agrees_with_its_spec() {
    let folder = tempfile::tempdir().unwrap();
    let here = folder.path();
    for (name, build) in [
        ("tern60.ampspec", "mono"),
        ("tern60-mistakes.ampspec", "mono"),
        ("heron80-mosfet.ampspec", ""),
        ("tern100-limiter.ampspec", ""),
    ] {
        fs::write(here.join("kit.ampspec"), kit(name)).unwrap();
        let only: &[&str] = if build.is_empty() {
            &[]
        } else {
            &["--build", build]
        };
        for per in ["build", "board"] {
            let with = |rest: &[&'static str]| {
                [&["parts", "kit.ampspec", "--per", per], rest, only].concat()
            };
            let (status, _, err) = told(here, &with(&["--template", "--out", "bom.csv"]));
            assert_eq!((status, err.as_str()), (0, ""), "{name}");
            let report = json(here, &with(&["--against", "bom.csv", "--form", "json"]));
            assert_eq!(report["summary"]["error"], 0, "{name}: {}", report["rows"]);
            assert_eq!(report["summary"]["warning"], 0, "{name}");
            assert_eq!(
                report["summary"]["found"], report["summary"]["wanted"],
                "{name}"
            );
        }
    }
}

#[test]
fn a_list_is_held_against_the_spec() {
    let folder = tempfile::tempdir().unwrap();
    let here = folder.path();
    fs::write(here.join("kit.ampspec"), kit("tern60.ampspec")).unwrap();
    fs::write(here.join("bom.csv"), kit("tern60-bom.csv")).unwrap();
    let report = json(
        here,
        &[
            "parts",
            "kit.ampspec",
            "--against",
            "bom.csv",
            "--form",
            "json",
        ],
    );
    assert_eq!(
        (report["exit_status"].as_u64(), report["bom"].as_str()),
        (Some(1), Some("bom.csv"))
    );
    let row = |rule: &str, part: &str| {
        let rows = report["rows"].as_array().unwrap();
        rows.iter()
            .find(|r| r["rule"] == rule && r["part"] == part)
            .unwrap_or(&Value::Null)
            .clone()
    };
    // three of four resistors
    let short = row("bom.quantity", "out emitter");
    assert_eq!(
        (short["row"].as_u64(), short["severity"].as_str()),
        (Some(4), Some("error"))
    );
    assert_eq!(short["span"]["start"]["line"], 22);
    assert_eq!(
        row("bom.missing", "out emitter")["message"],
        "R24 is not in the list"
    );
    // 4700u/50V where the spec was checked with 63 V
    let volts = row("bom.rating", "toroid reservoir");
    assert_eq!(
        volts["message"],
        "the list says 50 V; the spec was checked with 63 V"
    );
    assert_eq!(
        (
            volts["row"].as_u64(),
            volts["span"]["start"]["line"].as_u64()
        ),
        (Some(5), Some(107))
    );
    // the drivers are as they should be
    assert_eq!(row("bom.quantity", "drv upper"), Value::Null);
    // a substitute that nobody has checked
    assert!(
        row("bom.extra", "out upper")["message"]
            .as_str()
            .unwrap()
            .contains("`N17-B`")
    );
    assert_eq!(row("bom.missing", "net coil")["verdict"], "unchecked");
    // the board is not the spec's business
    let board = report["rows"]
        .as_array()
        .unwrap()
        .iter()
        .find(|r| r["row"] == 12)
        .unwrap();
    assert_eq!(
        (board["rule"].as_str(), board["severity"].as_str()),
        (Some("bom.extra"), Some("information"))
    );
    for form in ["terminal", "markdown", "csv"] {
        let (status, out, err) = told(
            here,
            &[
                "parts",
                "kit.ampspec",
                "--against",
                "bom.csv",
                "--form",
                form,
            ],
        );
        assert_eq!((status, err.as_str()), (1, ""), "{form}");
        assert!(out.contains("R24 is not in the list"), "{form}");
    }
}

#[test]
fn alternates_of_the_spec_may_be_listed() {
    let folder = tempfile::tempdir().unwrap();
    let here = folder.path();
    for name in ["tern60.ampspec", "tern60-revisions.ampspec"] {
        fs::write(here.join(name), kit(name)).unwrap();
    }
    let list = "ref,qty,mpn,value,alternates\n\
                \"Q7,Q8\",2,N16-Y,,N17-B\n\
                \"Q9,Q10\",2,P17-B,,\n\
                C1-C4,4,,4700u/80V,\n";
    fs::write(here.join("bom.csv"), list).unwrap();
    let spec = "tern60-revisions.ampspec";
    let report = json(
        here,
        &[
            "parts",
            spec,
            "--build",
            "rev-c",
            "--against",
            "bom.csv",
            "--form",
            "json",
        ],
    );
    let rows: Vec<&Value> = report["rows"]
        .as_array()
        .unwrap()
        .iter()
        .filter(|r| r["row"].is_u64())
        .collect();
    assert!(
        rows.iter().all(|r| r["severity"] == "information"),
        "{rows:#?}"
    );
    assert!(rows.iter().any(|r| {
        r["message"]
            .as_str()
            .unwrap()
            .contains("alternate `second-source`")
    }));
    // which build is meant has to be said
    let (status, _, err) = told(here, &["parts", spec, "--against", "bom.csv"]);
    assert_eq!(status, 2);
    assert!(
        err.contains("--build: rev-c, mono") || err.contains("--build: mono, rev-c"),
        "{err}"
    );
}

#[test]
fn columns_can_be_named_and_a_bad_list_says_why() {
    let folder = tempfile::tempdir().unwrap();
    let here = folder.path();
    fs::write(here.join("kit.ampspec"), kit("tern60.ampspec")).unwrap();
    fs::write(here.join("bom.csv"), "Platz;Stk\nR21-R24;4\n").unwrap();
    let plain = ["parts", "kit.ampspec", "--against", "bom.csv"];
    let (status, _, err) = told(here, &plain);
    assert_eq!(status, 2);
    assert!(err.contains("Platz, Stk"), "{err}");
    let named = [
        &plain[..],
        &[
            "--column",
            "refs=Platz",
            "--column",
            "quantity=Stk",
            "--form",
            "json",
        ],
    ]
    .concat();
    let report = json(here, &named);
    let emitter = |r: &&Value| r["part"] == "out emitter" && r["severity"] == "error";
    assert_eq!(
        report["rows"]
            .as_array()
            .unwrap()
            .iter()
            .filter(emitter)
            .count(),
        0
    );
    for (text, why) in [
        ("ref,qty\nR1\n", "line 2"),
        ("", "no column"),
        ("\u{0}\u{1}", "no column"),
    ] {
        fs::write(here.join("bom.csv"), text).unwrap();
        let (status, _, err) = told(here, &plain);
        assert_eq!(status, 2, "{text:?}");
        assert!(err.contains(why), "{text:?}: {err}");
    }
}

#[test]
fn waivers_speak_of_lists_too() {
    let folder = tempfile::tempdir().unwrap();
    let here = folder.path();
    let waiver = "waive bom.rating of \"toroid reservoir\" because \"old stock, 50 V only in the prototype\"\n";
    let waiver = waiver.replace("\"toroid reservoir\"", "toroid");
    let text = kit("tern60.ampspec").replacen('\n', &format!("\n{waiver}"), 1);
    fs::write(here.join("kit.ampspec"), text).unwrap();
    fs::write(here.join("bom.csv"), "ref,value\nC1-C4,4700u/50V\n").unwrap();
    let report = json(
        here,
        &[
            "parts",
            "kit.ampspec",
            "--against",
            "bom.csv",
            "--form",
            "json",
        ],
    );
    let rows = report["rows"].as_array().unwrap();
    let volts = rows
        .iter()
        .find(|r| r["rule"] == "bom.rating" && r["part"] == "toroid reservoir")
        .unwrap();
    assert!(
        volts["waiver"]["reason"]
            .as_str()
            .unwrap()
            .starts_with("old stock")
    );
    // and without a list there is nothing to say of it
    let (status, out, _) = told(here, &["check", "kit.ampspec", "--fail-on", "warning"]);
    assert_eq!(status, 0, "{out}");
}

#[test]
fn a_baseline_lets_old_findings_be() {
    let folder = two("tern60-mistakes.ampspec", "8R2 1 W", "8R2 5 W");
    let here = folder.path();
    let run = |rest: &[&str]| told(here, &[&["check", "a.ampspec"], rest].concat());
    assert_eq!(run(&[]).0, 1);
    let (status, out, err) = run(&["--write-baseline", "base.json"]);
    assert_eq!((status, err.as_str()), (0, ""));
    assert!(
        out.contains("0 errors, 0 warnings") && out.contains(" known"),
        "{out}"
    );
    let base = fs::read_to_string(here.join("base.json")).unwrap();
    // comments and blank lines change nothing
    let text = fs::read_to_string(here.join("a.ampspec")).unwrap();
    fs::write(here.join("a.ampspec"), format!("# one\n\n# two\n{text}")).unwrap();
    for form in [
        "terminal",
        "json",
        "sarif",
        "markdown",
        "test-xml",
        "annotations",
    ] {
        let arguments = [
            "--baseline",
            "base.json",
            "--fail-on",
            "unchecked",
            "--form",
            form,
        ];
        assert_eq!(run(&arguments).0, 0, "{form}");
    }
    run(&["--write-baseline", "again.json"]);
    assert_eq!(fs::read_to_string(here.join("again.json")).unwrap(), base);
    // what is mended is stale, what gets worse is new
    let mended = text.replace("8R2 1 W", "8R2 5 W");
    fs::write(here.join("a.ampspec"), &mended).unwrap();
    let (status, out, _) = run(&["--baseline", "base.json"]);
    assert_eq!(status, 0);
    assert!(
        out.contains("stale in the baseline: a.ampspec protection.zobel"),
        "{out}"
    );
    fs::write(
        here.join("a.ampspec"),
        mended.replace("±20 % 50 V", "±20 % 35 V"),
    )
    .unwrap();
    let (status, out, _) = run(&["--baseline", "base.json"]);
    assert_eq!(status, 1);
    assert!(out.contains("voltage.reservoir"), "{out}");
    assert!(
        !out.contains("soa.reactive\n"),
        "old findings are not shown: {out}"
    );
    // a baseline that is none
    fs::write(here.join("base.json"), "[]").unwrap();
    assert_eq!(run(&["--baseline", "base.json"]).0, 2);
    assert_eq!(run(&["--baseline", "absent.json"]).0, 2);
}

#[test]
fn a_change_is_written_and_what_it_moves_is_printed() {
    let folder = two("tern60-mistakes.ampspec", "muting", "muting");
    let here = folder.path();
    let apply = |rest: &[&str]| told(here, &[&["check", "a.ampspec", "--apply"], rest].concat());
    let (status, out, err) = apply(&["protection.zobel"]);
    assert_eq!((status, err.as_str()), (0, ""));
    assert!(
        out.starts_with("a.ampspec:125: `5 W` instead of `1 W`\n"),
        "{out}"
    );
    assert!(out.contains("protection.zobel"), "{out}");
    let text = fs::read_to_string(here.join("a.ampspec")).unwrap();
    assert_eq!(
        text,
        kit("tern60-mistakes.ampspec").replace("8R2 1 W", "8R2 5 W")
    );
    // again: nothing is left to do, and nothing is written
    let (status, _, err) = apply(&["protection.zobel"]);
    assert_eq!(status, 1);
    assert!(err.contains("not past any allowance"), "{err}");
    // no change clears it
    let (status, _, err) = apply(&["power.ripple-headroom"]);
    assert_eq!(status, 1, "{err}");
    // the order code of the old part goes with it
    let (status, out, _) = apply(&["bias.stability"]);
    assert_eq!(status, 0);
    assert!(out.contains("`part \"WW2-0R22J\"` taken out"), "{out}");
    for wrong in [
        &["no.rule"][..],
        &["protection.zobel", "b.ampspec"],
        &["protection.zobel", "--form", "json"],
    ] {
        assert_eq!(apply(wrong).0, 2, "{wrong:?}");
    }
    let (status, _, _) = told(here, &["check", "-", "--apply", "protection.zobel"]);
    assert_eq!(status, 2);
}

#[test]
fn several_changes_are_not_chosen_among() {
    // two supplies with a capacitor each that is too low
    let folder = tempfile::tempdir().unwrap();
    let here = folder.path();
    let text = kit("tern60.ampspec").replace("±20 % 63 V", "±20 % 50 V");
    let second = "supply other from toroid {\n    reservoir          2 x 4700 uF ±20 % 50 V esr 35 mohm ripple 4 A life 5000 h life-at 105 degC per rail ref C1-C4\n}\n\
                  build twin from mono {\n    supply             other per build\n}\n";
    fs::write(here.join("a.ampspec"), format!("{text}{second}")).unwrap();
    let (status, _, err) = told(
        here,
        &["check", "a.ampspec", "--apply", "voltage.reservoir"],
    );
    assert_eq!(status, 1);
    assert!(
        err.contains("pick one with --of PART or --build NAME"),
        "{err}"
    );
    let (status, out, err) = told(
        here,
        &[
            "check",
            "a.ampspec",
            "--apply",
            "voltage.reservoir",
            "--of",
            "other",
        ],
    );
    assert_eq!(status, 0, "{err}");
    assert!(out.contains("`63 V` instead of `50 V`"), "{out}");
}

#[test]
fn a_file_that_cannot_be_read_whole_is_not_written() {
    let folder = tempfile::tempdir().unwrap();
    let text = format!("{}\n\"not a statement\n", kit("tern60-mistakes.ampspec"));
    fs::write(folder.path().join("a.ampspec"), &text).unwrap();
    let (status, _, err) = told(
        folder.path(),
        &["check", "a.ampspec", "--apply", "protection.zobel"],
    );
    assert_eq!(status, 1);
    assert!(err.contains("left as it is"), "{err}");
    assert_eq!(
        fs::read_to_string(folder.path().join("a.ampspec")).unwrap(),
        text
    );
}
