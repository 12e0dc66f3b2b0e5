//! Results as CSV, for a spreadsheet. The columns are said in `--help` of each command.

pub(crate) mod inspect;
pub(crate) mod locate;

mod rows;
