//! The arcstead program: see the library of this package.

use std::process::ExitCode;

fn main() -> ExitCode {
    let (mut stdout, mut stderr) = (std::io::stdout().lock(), std::io::stderr());
    ExitCode::from(arcstead_cli::run(std::env::args_os(), &mut stdout, &mut stderr))
}
