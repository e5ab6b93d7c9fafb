//! The recipes of the README are run, not only written: every command of the CI files and scripts,
//! and the hook, in a repository made for it. Must not know what the recipes are for.
#![cfg(unix)]
#![allow(
    clippy::unwrap_used,
    clippy::panic,
    reason = "a test may stop where it stands"
)]

use std::fs;
use std::os::unix::fs::PermissionsExt;
use std::path::Path;
use std::process::{Command, Output};

use tempfile::TempDir;

fn read(path: &str) -> String {
    fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join("..").join(path)).unwrap()
}

/// The fenced blocks in this language under "In CI".
fn blocks(language: &str) -> Vec<String> {
    let readme = read("README.md");
    let section = readme
        .split("\n## In CI\n")
        .nth(1)
        .unwrap()
        .split("\n## ")
        .next()
        .unwrap()
        .to_owned();
    let opened = format!("```{language}\n");
    section
        .split(&opened)
        .skip(1)
        .map(|b| b.split("```").next().unwrap().to_owned())
        .collect()
}

/// Run in a folder, with derate on the path as the recipes want it.
fn run(folder: &Path, program: &str, arguments: &[&str]) -> Output {
    let own = assert_cmd::cargo::cargo_bin("derate");
    let path = format!(
        "{}:{}",
        own.parent().unwrap().display(),
        std::env::var("PATH").unwrap()
    );
    Command::new(program)
        .current_dir(folder)
        .args(arguments)
        .env("PATH", path)
        .env("GIT_CONFIG_GLOBAL", "/dev/null")
        .envs([
            ("GIT_AUTHOR_NAME", "t"),
            ("GIT_AUTHOR_EMAIL", "t@example.org"),
        ])
        .envs([
            ("GIT_COMMITTER_NAME", "t"),
            ("GIT_COMMITTER_EMAIL", "t@example.org"),
        ])
        .output()
        .unwrap()
}

fn well(output: &Output) -> bool {
    assert_ne!(
        output.status.code(),
        Some(2),
        "{}",
        String::from_utf8_lossy(&output.stderr)
    );
    output.status.success()
}

/// A repository with a sound kit in two revisions.
fn repository() -> TempDir {
    let folder = tempfile::tempdir().unwrap();
    let here = folder.path();
    fs::create_dir(here.join("kits")).unwrap();
    let kit = read("tests/kits/tern60.ampspec");
    assert!(well(&run(here, "git", &["init", "-q"])));
    for muting in ["3 s", "2 s"] {
        let text = kit.replace(
            "muting             3 s",
            &format!("muting             {muting}"),
        );
        fs::write(here.join("kits/tern60.ampspec"), text).unwrap();
        assert!(well(&run(here, "git", &["add", "."])));
        assert!(well(&run(here, "git", &["commit", "-q", "-m", "kit"])));
    }
    folder
}

#[test]
fn the_commands_of_the_ci_files_run() {
    let folder = repository();
    let mut ran = 0;
    for block in blocks("yaml") {
        for line in block.lines() {
            let line = line
                .trim_start()
                .trim_start_matches("- ")
                .trim_start_matches("run: ");
            if line.starts_with("derate ") {
                let output = run(folder.path(), "sh", &["-e", "-c", line]);
                assert!(
                    well(&output),
                    "{line}: {}",
                    String::from_utf8_lossy(&output.stdout)
                );
                ran += 1;
            }
        }
    }
    assert!(ran >= 4, "{ran}");
    for written in ["derate.sarif", "margins.xml"] {
        assert!(folder.path().join(written).exists(), "{written}");
    }
}

#[test]
fn the_scripts_run_and_the_hook_says_no() {
    let folder = repository();
    let here = folder.path();
    let scripts = blocks("sh");
    let (hooks, plain): (Vec<_>, Vec<_>) = scripts.iter().partition(|s| s.starts_with("#!"));
    assert!(!plain.is_empty());
    for script in plain {
        let output = run(here, "sh", &["-e", "-c", script]);
        assert!(
            well(&output),
            "{script}: {}",
            String::from_utf8_lossy(&output.stderr)
        );
    }
    let [hook] = hooks.as_slice() else {
        panic!("one hook")
    };
    let path = here.join(".git/hooks/pre-commit");
    fs::create_dir_all(path.parent().unwrap()).unwrap();
    fs::write(&path, hook).unwrap();
    fs::set_permissions(&path, fs::Permissions::from_mode(0o755)).unwrap();
    let commit = |text: &str| {
        fs::write(here.join("kits/tern60.ampspec"), text).unwrap();
        run(here, "git", &["add", "kits"]);
        run(here, "git", &["commit", "-q", "-m", "more"])
    };
    let kit = read("tests/kits/tern60.ampspec");
    assert!(well(&commit(&format!("{kit}# sound\n"))));
    let refused = commit(&read("tests/kits/tern60-mistakes.ampspec"));
    assert!(!refused.status.success(), "the hook lets a bad kit through");
    // nothing to check is no reason to refuse
    run(here, "git", &["checkout", "-q", "HEAD", "--", "kits"]);
    fs::write(here.join("notes.txt"), "x").unwrap();
    run(here, "git", &["add", "notes.txt"]);
    assert!(well(&run(here, "git", &["commit", "-q", "-m", "notes"])));
}
