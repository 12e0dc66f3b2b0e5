//! CSV as general-purpose recorders export it: read.
//!
//! There is no standard; what is read was collected from public manuals:
//!
//! - a row of names, a row of units, the samples; or any lines of keys and values before them;
//! - keys and values in the first columns of the very rows that carry samples in later columns;
//! - a time column; or an index column, or none, with a sample interval or sample rate among the keys
//!   (`Sample Interval,2e-10`, `XINCR;0,2;ns`, `# sample rate = 5 GS/s`, or a column head with its value in
//!   the row below);
//! - `Segments,N,SegmentSize,M` and M rows for each of N triggers: N captures;
//! - bare numbers, one column a channel; or a single row, one channel. They need the site's sample rate.
//!
//! Cells are separated by `,` `;` or tab; decimals by a point or, with `;` or tab, a comma. Both are decided
//! once per file, from the lines of numbers in its first 64 KiB, and a cell that does not fit later is an
//! error. Where only commas separate, decimal commas show by integers that no program writes (`-0,2`,
//! `0,043`), and the file is refused; a few lines without any such are read as two columns of integers. Text
//! is UTF-8, with or without byte order mark, or Latin-1. Lines end in LF or CRLF; a trailing separator and
//! blank lines after the last row are allowed, gaps in the table are not.
//!
//! # Time
//! The sample interval is the one a key states, else (last - first) / (rows - 1) of the time column;
//! neighbouring rows say nothing, because times are often printed with too few digits. Every row must lie on
//! the even grid within what its digits resolve. Where all lie on it exactly the interval is taken as exact;
//! else, when the digits leave the interval open by more than 0.1 %, the site's rate is taken where it
//! agrees, else the file is refused. A stated interval or rate that disagrees with the time column by more
//! than 0.1 %, as after thinning on export, is an error. So are time values that come in pairs (envelope
//! data). [`super::Recorded::time`] is a cell of the header that is RFC 3339 with a zone; recorders mostly
//! write local time without, which is no moment.
//!
//! # Samples
//! Columns with a unit of mV, uV or kV are turned into volts; other units leave the numbers as they are. Raw
//! integers are not scaled by keys of the header. A cell that is no finite number (`nan`, `****`, `>1.2`) is
//! an error of the capture.

mod dialect;
mod error;
mod header;
mod layout;
mod lines;
mod number;
mod quantity;
mod table;
mod time_axis;
#[cfg(test)]
mod variants;

pub use error::CsvError;
pub use table::Csv;
