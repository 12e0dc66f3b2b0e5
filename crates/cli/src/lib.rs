//! The arcstead program: arguments, progress, tables, exit status. No mathematics, no knowledge of file formats.
//!
//! | file | holds |
//! |---|---|
//! | `arguments` | the command line as it was typed |
//! | `stance_argument` | `NAME=CAPTURE`, the stance of a capture |
//! | `command` | the commands, a file each |
//! | `table` | results as a person reads them |
//! | `sheet` | results as CSV |
//! | `rejected` | captures that gave nothing, in lines |
//! | `console`, `output`, `progress`, `interrupt` | the world outside: streams, files, the terminal, Ctrl-C |
//! | `failure`, `status` | what can go wrong, and how the program ends |
//!
//! Results go to stdout or to `--output`, all talk to stderr. The exit statuses stand in [`status`].

mod arguments;
mod command;
mod console;
mod failure;
mod interrupt;
mod output;
mod progress;
mod rejected;
mod sheet;
mod stance_argument;
pub mod status;
mod table;

use std::ffi::OsString;

use anstream::stream::RawStream;
use clap::Parser;

use arguments::{Arguments, Command};
use console::Console;

/// Runs the program: `arguments` begin with its name. Gives the exit status, one of [`status`].
///
/// The first Ctrl-C is caught from here on (by the process, for good) and stops the reading of captures; the second
/// ends the process at once with [`status::INTERRUPTED`].
pub fn run<A, O, E>(arguments: A, stdout: &mut O, stderr: &mut E) -> u8
where
    A: IntoIterator,
    A::Item: Into<OsString> + Clone,
    O: RawStream,
    E: RawStream + Send,
{
    let parsed = match Arguments::try_parse_from(arguments) {
        Ok(parsed) => parsed,
        Err(told) => return console::tell_usage(&told, stdout, stderr),
    };
    interrupt::catch();
    let mut console = Console::new(&parsed.talk, stdout, stderr);
    let done = match &parsed.command {
        Command::Locate(asked) => command::locate::run(asked, &mut console),
        Command::Arrivals(asked) => command::arrivals::run(asked, &mut console),
        Command::Inspect(asked) => command::inspect::run(asked, &mut console),
        Command::Simulate(asked) => command::simulate::run(asked, &mut console),
    };
    match done {
        Ok(status) => status,
        Err(failure) => {
            console.talk.error(&failure);
            failure.status()
        }
    }
}
