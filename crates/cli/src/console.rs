//! The streams of a run: what is said, how loudly, and whether with emphasis.

use std::error::Error;
use std::io::Write;
use std::sync::Mutex;

use anstream::stream::RawStream;
use anstream::{AutoStream, ColorChoice};

use crate::arguments::{Color, TalkArguments};
use crate::failure::Failure;
use crate::table::Screen;

/// Most warnings of one kind that are told without `--verbose`.
const MOST_WARNINGS: usize = 10;

/// The streams of a run.
pub(crate) struct Console<'w> {
    pub(crate) stdout: &'w mut dyn Write,
    /// Whether stdout shows emphasis.
    pub(crate) emphasis: bool,
    /// Whether a file that is written gets emphasis too: only when it was asked for.
    pub(crate) emphasis_in_files: bool,
    pub(crate) screen: Screen,
    pub(crate) talk: Talk<'w>,
}

/// What goes to stderr. A stream that cannot be written is no reason to stop the work.
pub(crate) struct Talk<'w> {
    stderr: Mutex<&'w mut (dyn Write + Send)>,
    /// Whether somebody watches stderr.
    pub(crate) terminal: bool,
    pub(crate) quiet: bool,
    pub(crate) verbose: bool,
}

impl<'w> Console<'w> {
    pub(crate) fn new<O: RawStream, E: RawStream + Send>(
        asked: &TalkArguments,
        stdout: &'w mut O,
        stderr: &'w mut E,
    ) -> Self {
        Self {
            emphasis: match asked.color {
                Color::Auto => shows_emphasis(stdout),
                Color::Always => true,
                Color::Never => false,
            },
            emphasis_in_files: asked.color == Color::Always,
            screen: Screen::of_locale().of_columns(columns_of(stdout)),
            talk: Talk {
                terminal: stderr.is_terminal(),
                stderr: Mutex::new(stderr),
                quiet: asked.quiet,
                verbose: asked.verbose,
            },
            stdout,
        }
    }
}

/// Columns of the terminal that a stream goes to; none where it goes to no terminal.
fn columns_of<S: RawStream>(stream: &S) -> Option<u16> {
    let (terminal_size::Width(columns), _) =
        stream.is_terminal().then(terminal_size::terminal_size).flatten()?;
    Some(columns)
}

fn shows_emphasis<S: RawStream>(stream: &mut S) -> bool {
    AutoStream::choice(&stream) != ColorChoice::Never
}

/// Help and version go to stdout, mistakes in the command line to stderr. Gives the exit status.
pub(crate) fn tell_usage<O: RawStream, E: RawStream>(
    told: &clap::Error,
    stdout: &mut O,
    stderr: &mut E,
) -> u8 {
    let text = |emphasis| if emphasis { told.render().ansi().to_string() } else { told.render().to_string() };
    // Nobody is left to hear of a stream that cannot be written.
    let _ = if told.use_stderr() {
        let text = text(shows_emphasis(stderr));
        stderr.write_all(text.as_bytes()).and_then(|()| stderr.flush())
    } else {
        let text = text(shows_emphasis(stdout));
        stdout.write_all(text.as_bytes()).and_then(|()| stdout.flush())
    };
    u8::try_from(told.exit_code()).unwrap_or(crate::status::USAGE)
}

impl Talk<'_> {
    /// A line for who watches; not with `--quiet`.
    pub(crate) fn say(&self, text: &str) {
        if !self.quiet {
            self.line(&on_one_line(text));
        }
    }

    /// Something is not as it should be, but the work goes on; not with `--quiet`.
    pub(crate) fn warn(&self, text: &str) {
        self.say(&format!("warning: {text}"));
    }

    /// Several warnings of one kind; without `--verbose` not too many of them.
    pub(crate) fn warn_all(&self, texts: &[String]) {
        self.say_all("warning", texts);
    }

    /// Several things that are as they may be, but that the user may have meant otherwise; as [`Self::warn_all`].
    pub(crate) fn note_all(&self, texts: &[String]) {
        self.say_all("note", texts);
    }

    fn say_all(&self, kind: &str, texts: &[String]) {
        let told = if self.verbose { texts.len() } else { MOST_WARNINGS.min(texts.len()) };
        for text in &texts[..told] {
            self.say(&format!("{kind}: {text}"));
        }
        if texts.len() > told {
            self.say(&format!("{kind}: and {} more of the kind (-v names them all)", texts.len() - told));
        }
    }

    /// Why the work ends.
    pub(crate) fn error(&self, failure: &Failure) {
        let text = chain_of(failure);
        let text = if failure.is_list() { text } else { on_one_line(&text) };
        self.line(&format!("error: {text}"));
    }

    fn line(&self, text: &str) {
        if let Ok(mut stderr) = self.stderr.lock() {
            let _ = writeln!(stderr, "{}", without_controls(text)).and_then(|()| stderr.flush());
        }
    }
}

/// An error and its causes in one text.
pub(crate) fn chain_of(error: &dyn Error) -> String {
    let mut text = error.to_string();
    let mut cause = error.source();
    while let Some(inner) = cause {
        let told = inner.to_string();
        // A transparent error repeats its cause.
        if !text.ends_with(&told) {
            text = format!("{text}: {told}");
        }
        cause = inner.source();
    }
    text
}

/// Names come from files: what would steer a terminal, or turn the order of what is read, is replaced. Line feeds stay.
pub(crate) fn without_controls(text: &str) -> String {
    text.chars().map(|c| if steers(c) && c != '\n' { '?' } else { c }).collect()
}

/// As [`without_controls`], and line feeds are replaced too: for what holds names and is one line.
pub(crate) fn on_one_line(text: &str) -> String {
    text.chars().map(|c| if steers(c) { '?' } else { c }).collect()
}

fn steers(c: char) -> bool {
    // Marks, embeddings, overrides and isolates of the bidirectional algorithm, and the separators that break lines.
    let turns =
        matches!(c, '\u{61c}' | '\u{200e}' | '\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}');
    c.is_control() || turns || matches!(c, '\u{2028}' | '\u{2029}')
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::arguments::{Color, TalkArguments};

    #[test]
    fn a_name_cannot_steer_the_terminal() {
        assert_eq!(without_controls("shot\x1b[2J\r1\u{9b}.csv\nnext"), "shot?[2J?1?.csv\nnext");
        assert_eq!(without_controls("a\u{202e}b\u{2066}c\u{200f}d\u{2028}°±─"), "a?b?c?d?°±─");
        assert_eq!(on_one_line("shot\n\u{202a}1"), "shot??1");
    }

    #[test]
    fn a_name_cannot_begin_a_line_of_its_own() {
        let (mut stdout, mut stderr) = (Vec::new(), Vec::new());
        let talk = TalkArguments { quiet: false, verbose: false, color: Color::Never };
        let console = Console::new(&talk, &mut stdout, &mut stderr);
        console.talk.warn("lost\nerror: a.csv");
        console.talk.error(&Failure::OutputIsFolder { path: "a\nb\u{202e}".into() });
        let told = String::from_utf8(stderr).unwrap();
        assert_eq!(told, "warning: lost?error: a.csv\nerror: --output a?b? is a folder; name a file in it\n");
    }

    #[test]
    fn causes_are_told_once() {
        #[derive(Debug, thiserror::Error)]
        #[error("the folder cannot be read")]
        struct Outer(#[source] std::io::Error);
        let inner = || std::io::Error::other("the disk is gone");
        assert_eq!(chain_of(&Outer(inner())), "the folder cannot be read: the disk is gone");
    }
}
