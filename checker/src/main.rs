//! The `derate` command. Must not know anything but where the command line is read.

mod cli;

fn main() -> std::process::ExitCode {
    cli::run()
}
