//! Tells Zed where the language server is. Must not know anything else.

use zed_extension_api::{self as zed, Command, LanguageServerId, Worktree};

struct Ampspec;

impl zed::Extension for Ampspec {
    fn new() -> Self {
        Self
    }

    fn language_server_command(
        &mut self,
        _: &LanguageServerId,
        worktree: &Worktree,
    ) -> zed::Result<Command> {
        let command = worktree.which("derate-lsp").ok_or(
            "`derate-lsp` is not in the path: `cargo install --path lsp` in derate's repository",
        )?;
        Ok(Command {
            command,
            args: Vec::new(),
            env: Vec::new(),
        })
    }
}

zed::register_extension!(Ampspec);
