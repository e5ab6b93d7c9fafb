//! The `derate` command as a user meets it: streams, exit statuses, files, forms.
//! Must not know what the rules find in a sound spec.
#![allow(clippy::unwrap_used)] // a test may stop where it stands

use std::fs;
use std::io::Write;
use std::path::Path;
use std::process::{Command as Process, Stdio};

use assert_cmd::Command;
use tempfile::TempDir;

/// A spec with a line that cannot be read.
const BROKEN: &str = "ampspec 1\n\"not a statement\n";
/// A spec that says nothing, and nothing wrong.
const EMPTY: &str = "ampspec 1\n";

fn derate(folder: &Path, arguments: &[&str]) -> Command {
    let mut command = Command::cargo_bin("derate").unwrap();
    command
        .current_dir(folder)
        .args(arguments)
        .env_remove("NO_COLOR");
    command
}

fn folder(files: &[(&str, &str)]) -> TempDir {
    let folder = tempfile::tempdir().unwrap();
    for (name, text) in files {
        let path = folder.path().join(name);
        fs::create_dir_all(path.parent().unwrap()).unwrap();
        fs::write(path, text).unwrap();
    }
    folder
}

/// Exit status, standard output, standard error.
fn told(folder: &Path, arguments: &[&str]) -> (i32, String, String) {
    let output = derate(folder, arguments).output().unwrap();
    let text = |bytes: Vec<u8>| String::from_utf8(bytes).unwrap();
    (
        output.status.code().unwrap(),
        text(output.stdout),
        text(output.stderr),
    )
}

#[test]
fn nothing_wrong_is_0() {
    let folder = folder(&[("a.ampspec", EMPTY)]);
    let (status, out, err) = told(folder.path(), &["check", "a.ampspec"]);
    assert_eq!((status, err.as_str()), (0, ""));
    assert!(
        out.lines()
            .last()
            .unwrap()
            .starts_with("a.ampspec: 0 errors, 0 warnings, 0 unchecked, 0 assumed, 0 waived")
    );
}

#[test]
fn an_error_is_1_and_goes_to_standard_output() {
    let folder = folder(&[("a.ampspec", BROKEN)]);
    for form in [
        "terminal",
        "json",
        "sarif",
        "markdown",
        "test-xml",
        "annotations",
    ] {
        let (status, out, err) = told(folder.path(), &["check", "a.ampspec", "--form", form]);
        assert_eq!((status, err.as_str()), (1, ""), "{form}");
        assert!(out.contains("a.ampspec"), "{form}");
    }
}

#[test]
fn what_cannot_be_read_is_2_and_the_rest_is_checked() {
    let folder = folder(&[("a.ampspec", BROKEN)]);
    let (status, out, err) = told(folder.path(), &["check", "a.ampspec", "absent.ampspec"]);
    assert_eq!(status, 2);
    assert!(out.contains("a.ampspec:2"));
    assert_eq!(
        err,
        "derate: cannot read absent.ampspec: there is no such file\n"
    );
}

#[test]
fn a_wrong_command_line_is_2() {
    let folder = folder(&[("a.ampspec", EMPTY)]);
    for arguments in [
        &["check", "--form", "html", "a.ampspec"][..],
        &["check", "--fail-on", "never"],
        &["margins"],
        &["weigh"],
        &["explain", "soa.reaktive"],
        &["check", "a.ampspec", "--build", "nobody"],
    ] {
        let (status, _, err) = told(folder.path(), arguments);
        assert_eq!(status, 2, "{arguments:?}");
        assert!(!err.is_empty(), "{arguments:?}");
    }
}

#[test]
fn a_folder_without_a_spec_is_2() {
    let folder = folder(&[("notes.txt", "")]);
    let (status, _, err) = told(folder.path(), &["check"]);
    assert_eq!(status, 2);
    assert!(err.contains("no .ampspec file below"));
}

#[test]
fn a_folder_is_walked_in_order_and_ignored_files_are_not() {
    let folder = folder(&[
        ("b/z.ampspec", BROKEN),
        ("b/a.ampspec", BROKEN),
        ("a.ampspec", BROKEN),
        ("c/skip.ampspec", BROKEN),
        ("c/notes.txt", "x"),
        (".ignore", "skip.ampspec\n"),
    ]);
    let places = |arguments: &[&str]| {
        let (_, out, _) = told(folder.path(), arguments);
        let report: serde_json::Value = serde_json::from_str(&out).unwrap();
        let files = report
            .get("files")
            .and_then(|f| f.as_array())
            .cloned()
            .unwrap_or_default();
        files
            .iter()
            .map(|f| f.get("path").unwrap().as_str().unwrap().to_owned())
            .collect::<Vec<_>>()
    };
    let found = places(&["check", "--form", "json"]);
    assert_eq!(found, ["a.ampspec", "b/a.ampspec", "b/z.ampspec"]);
    let bytes = |threads| told(folder.path(), &["check", "--threads", threads, "."]).1;
    assert_eq!(bytes("1"), bytes("4"));
}

#[test]
fn standard_input_is_a_file() {
    let folder = folder(&[]);
    let output = derate(folder.path(), &["check", "-"])
        .write_stdin(BROKEN)
        .output()
        .unwrap();
    assert_eq!(output.status.code(), Some(1));
    assert!(String::from_utf8_lossy(&output.stdout).contains("<stdin>:2"));
}

#[test]
fn out_writes_the_same_bytes_to_a_file() {
    let folder = folder(&[("a.ampspec", BROKEN)]);
    let (_, out, _) = told(folder.path(), &["check", "a.ampspec", "--form", "json"]);
    let (status, nothing, _) = told(
        folder.path(),
        &["check", "a.ampspec", "--form", "json", "--out", "r.json"],
    );
    assert_eq!((status, nothing.as_str()), (1, ""));
    assert_eq!(
        fs::read_to_string(folder.path().join("r.json")).unwrap(),
        out
    );
    assert_eq!(fs::read_dir(folder.path()).unwrap().count(), 2); // nothing half-written is left
    let (status, _, err) = told(
        folder.path(),
        &["check", "a.ampspec", "--out", "absent/r.txt"],
    );
    assert_eq!(status, 2);
    assert!(err.contains("cannot write"));
}

#[test]
fn colour_only_where_it_is_asked_for() {
    let folder = folder(&[("a.ampspec", BROKEN)]);
    let coloured = |arguments: &[&str]| told(folder.path(), arguments).1.contains('\u{1b}');
    assert!(!coloured(&["check", "a.ampspec"]));
    assert!(coloured(&["check", "a.ampspec", "--colour", "always"]));
    assert!(coloured(&["check", "a.ampspec", "--color", "always"]));
    assert!(!coloured(&["check", "a.ampspec", "--colour", "never"]));
}

#[test]
fn a_reader_that_leaves_is_no_fault() {
    let many: String = (0..2000).map(|_| "\"not a statement\n").collect();
    let folder = folder(&[("a.ampspec", &many)]);
    let mut child = Process::new(assert_cmd::cargo::cargo_bin("derate"))
        .current_dir(folder.path())
        .args(["check", "a.ampspec"])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    assert_eq!(String::from_utf8_lossy(&output.stderr), "");
    assert_eq!(output.status.code(), Some(1));
}

#[test]
fn the_reports_fit_the_schema_that_is_printed() {
    let folder = folder(&[("a.ampspec", BROKEN)]);
    let schema: serde_json::Value =
        serde_json::from_str(&told(folder.path(), &["schema"]).1).unwrap();
    let validator = jsonschema::draft202012::new(&schema).unwrap();
    for command in ["check", "margins"] {
        let (_, out, _) = told(folder.path(), &[command, "a.ampspec", "--form", "json"]);
        let report: serde_json::Value = serde_json::from_str(&out).unwrap();
        assert!(validator.is_valid(&report), "{command}");
    }
}

#[test]
fn the_margin_forms_are_written() {
    let folder = folder(&[("a.ampspec", EMPTY)]);
    for (form, first) in [
        ("markdown", "### derate"),
        ("html", "<!DOCTYPE html>"),
        ("csv", "file,build"),
        ("terminal", "Caution"),
    ] {
        let (status, out, _) = told(folder.path(), &["margins", "a.ampspec", "--form", form]);
        assert_eq!(status, 0, "{form}");
        assert!(out.starts_with(first), "{form}: {out}");
    }
}

#[test]
fn every_shell_has_completions() {
    let folder = folder(&[]);
    for shell in ["bash", "zsh", "fish", "elvish", "powershell"] {
        let (status, out, _) = told(folder.path(), &["completions", shell]);
        assert_eq!(status, 0, "{shell}");
        assert!(out.contains("margins"), "{shell}");
    }
}

#[test]
fn tidy_writes_only_what_it_changes() {
    let folder = folder(&[("a.ampspec", EMPTY)]);
    let path = folder.path().join("a.ampspec");
    let before = fs::metadata(&path).unwrap().modified().unwrap();
    let (status, out, err) = told(folder.path(), &["tidy", "a.ampspec"]);
    assert_eq!((status, out.as_str(), err.as_str()), (0, "", ""));
    assert_eq!(fs::metadata(&path).unwrap().modified().unwrap(), before);
    // what is no text is not written back as something else
    fs::File::create(&path)
        .unwrap()
        .write_all(b"ampspec 1 \xff\n")
        .unwrap();
    let (status, _, err) = told(folder.path(), &["tidy", "a.ampspec"]);
    assert_eq!(status, 2);
    assert!(err.contains("cannot read"));
    assert_eq!(fs::read(&path).unwrap(), b"ampspec 1 \xff\n");
}
