//! The program under the name that the whole-program tests of this member can find.

use std::process::ExitCode;

fn main() -> ExitCode {
    ExitCode::from(arcstead_cli::run(std::env::args_os(), &mut std::io::stdout(), &mut std::io::stderr()))
}
