//! The lines and cells of a text file.
//!
//! Written here rather than taken from a library of CSV, because every message must name the right line: the
//! one looked at counts CRLF and blank lines one too low, and hides where a blank line was.

use std::borrow::Cow;
use std::io::{BufRead, Read};

/// Longest line that is read, in bytes.
pub(super) const MAX_LINE_BYTES: u64 = 1 << 28;

/// Reads the next line into `line`, without its end; gives how many bytes it took, 0 at the end of the file.
///
/// A line longer than [`MAX_LINE_BYTES`] is cut there; the count then exceeds that limit.
pub(super) fn next_line(reader: &mut impl BufRead, line: &mut Vec<u8>) -> std::io::Result<u64> {
    line.clear();
    let taken = reader.take(MAX_LINE_BYTES + 1).read_until(b'\n', line)?;
    let end = line.iter().rposition(|byte| !matches!(byte, b'\n' | b'\r')).map_or(0, |last| last + 1);
    line.truncate(end);
    Ok(taken as u64)
}

/// The cells of a line, trimmed, without the quotation marks around a quoted one (marks doubled in it stay
/// double).
pub(super) fn cells(line: &[u8], separator: u8) -> impl Iterator<Item = &[u8]> {
    let mut rest = Some(line);
    std::iter::from_fn(move || {
        let line = rest?;
        // A separator inside quotation marks does not separate, if the marks are the cell's first and last
        // characters.
        let opening = line.iter().position(|&byte| byte != b' ').filter(|&first| line[first] == b'"');
        let closing = opening.and_then(|opening| {
            line[opening + 1..].iter().position(|&byte| byte == b'"').map(|at| opening + 1 + at)
        });
        let from = closing.map_or(0, |closing| closing + 1);
        let cell = match line[from..].iter().position(|&byte| byte == separator) {
            Some(at) => {
                rest = Some(&line[from + at + 1..]);
                &line[..from + at]
            }
            None => {
                rest = None;
                line
            }
        };
        let cell = trim(cell);
        Some(cell.strip_prefix(b"\"").and_then(|cell| cell.strip_suffix(b"\"")).map_or(cell, trim))
    })
}

fn trim(cell: &[u8]) -> &[u8] {
    cell.trim_ascii()
}

/// The text of a cell: UTF-8 if it is, else Latin-1, in which every byte is a letter.
pub(super) fn text(cell: &[u8]) -> Cow<'_, str> {
    match std::str::from_utf8(cell) {
        Ok(text) => Cow::Borrowed(text),
        Err(_) => Cow::Owned(cell.iter().map(|&byte| char::from(byte)).collect()),
    }
}

/// The text of a cell or line for a message: a hostile one may be as long as the file.
pub(super) fn short_text(cell: &[u8]) -> String {
    const MOST: usize = 40;
    let text = text(&cell[..cell.len().min(4 * MOST)]);
    match text.char_indices().nth(MOST) {
        Some((end, _)) => format!("{}...", &text[..end]),
        None => text.into_owned(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn split(line: &str, separator: u8) -> Vec<String> {
        cells(line.as_bytes(), separator).map(|cell| text(cell).into_owned()).collect()
    }

    #[test]
    fn cells_are_trimmed_and_unquoted() {
        assert_eq!(split("a, b ,,c,", b','), ["a", "b", "", "c", ""]);
        assert_eq!(split(r#""CH1, probe", "2" ,3"#, b','), ["CH1, probe", "2", "3"]);
        assert_eq!(split(r#"12",4"#, b','), [r#"12""#, "4"]);
        assert_eq!(split(r#""open,4"#, b','), [r#""open"#, "4"]);
        assert_eq!(split("", b';'), [""]);
        assert_eq!(split("1\t\t2", b'\t'), ["1", "", "2"]);
    }

    #[test]
    fn lines_end_in_every_way_and_are_counted() {
        let mut reader: &[u8] = b"a\r\nb\n\r\nc";
        let mut line = Vec::new();
        let mut found = Vec::new();
        loop {
            let taken = next_line(&mut reader, &mut line).unwrap();
            if taken == 0 {
                break;
            }
            found.push((taken, text(&line).into_owned()));
        }
        assert_eq!(found, [(3, "a".into()), (2, "b".into()), (2, String::new()), (1, "c".into())]);
    }

    #[test]
    fn latin_1_where_it_is_no_utf_8() {
        assert_eq!(text(b"\xb5s"), "µs");
        assert_eq!(text("µs".as_bytes()), "µs");
        assert_eq!(short_text(&[b'*'; 1000]).len(), 43);
    }
}
