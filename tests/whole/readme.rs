//! Every command that the README shows prints what the README shows.

#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    reason = "helpers of tests, outside a test function"
)]

use std::path::{Path, PathBuf};

use assert_cmd::Command;

fn root() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("..")
}

/// Command, exit status if stated, and the lines under it, of every ```console block.
fn sessions(readme: &str) -> Vec<(String, String)> {
    let mut out: Vec<(String, String)> = Vec::new();
    for block in readme.split("```console\n").skip(1) {
        let block = block.split("```").next().unwrap();
        for line in block.lines() {
            match line.strip_prefix("$ ") {
                Some(command) => out.push((command.to_owned(), String::new())),
                None => {
                    let last = out.last_mut().expect("a block begins with a command");
                    last.1.push_str(line);
                    last.1.push('\n');
                }
            }
        }
    }
    out
}

/// `UPDATE_PAGES=1` writes the output of every command into the README; look at it before committing.
#[test]
fn every_command_prints_what_is_shown() {
    let path = root().join("README.md");
    let mut readme = std::fs::read_to_string(&path).unwrap();
    let sessions = sessions(&readme);
    assert!(
        sessions.len() >= 5,
        "the README shows its commands in console blocks"
    );
    for (command, shown) in sessions {
        let Some(arguments) = command.strip_prefix("derate ") else {
            // the two set-up commands build this very program; the gate runs them as they stand
            let gate = std::fs::read_to_string(root().join(".ci/run")).unwrap();
            let bare = command.replace(" --locked", "");
            assert!(
                gate.replace(" --locked", "").contains(&bare),
                ".ci/run does not run `{command}`"
            );
            continue;
        };
        let arguments: Vec<&str> = arguments.split_whitespace().collect();
        let output = Command::cargo_bin("derate")
            .unwrap()
            .args(&arguments)
            .env("NO_COLOR", "1")
            .env("COLUMNS", "100")
            .current_dir(root())
            .output()
            .unwrap();
        let printed = String::from_utf8(output.stdout).unwrap();
        // a long output may be cut with a line of its own
        let agrees = match shown.split_once("[...]\n") {
            None => printed == shown,
            Some((head, tail)) => printed.starts_with(head) && printed.ends_with(tail),
        };
        if !agrees && std::env::var_os("UPDATE_PAGES").is_some() {
            readme = readme.replace(
                &format!("$ {command}\n{shown}"),
                &format!("$ {command}\n{printed}"),
            );
            std::fs::write(&path, &readme).unwrap();
            continue;
        }
        assert!(
            agrees,
            "`{command}` prints\n{printed}\nthe README shows\n{shown}"
        );
    }
}
