//! Real editors, one test each, where they are installed: `.ci/editors` installs them and runs them all.
//! `cargo test -p derate-lsp --test editors -- --ignored` runs those that are there. Must not know any editor.

#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    reason = "a test that cannot go on fails"
)]

use std::path::Path;
use std::process::Command;

fn drive(name: &str) {
    let home = Path::new(env!("CARGO_MANIFEST_DIR")).join("../tests/editors");
    let server = Path::new(env!("CARGO_BIN_EXE_derate-lsp"));
    let tools = server.parent().unwrap().join("../editors");
    let artefacts = Path::new(env!("CARGO_TARGET_TMPDIR")).join("editors");
    let ran = Command::new("python3")
        .arg(home.join("run"))
        .args([server, artefacts.as_path()])
        .args(["--require-all", "--only", name, "--tools"])
        .arg(tools)
        .status()
        .expect("python3 runs");
    assert!(ran.success(), "{name} failed: {ran}");
}

#[test]
#[ignore = "skipped: needs Neovim 0.11 and python3, see .ci/editors"]
fn neovim() {
    drive("neovim");
}

#[test]
#[ignore = "skipped: needs Emacs with eglot and python3, see .ci/editors"]
fn emacs() {
    drive("emacs");
}

#[test]
#[ignore = "skipped: needs Vim with ALE and python3, see .ci/editors"]
fn vim() {
    drive("vim");
}

#[test]
#[ignore = "skipped: needs a host of the Visual Studio Code family, Chromium and python3, see .ci/editors"]
fn code() {
    drive("code");
}
