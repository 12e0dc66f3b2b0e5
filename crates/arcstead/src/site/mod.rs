//! The site file: what stands where, and how well it is known.
//!
//! [`Site::read`] turns a `site.toml` into the geometry the solver works on and what the rest of the program must
//! know beside it. All mistakes of a file are told at once ([`SiteError::Mistakes`]), each with its line and column.
//!
//! | file | holds |
//! |---|---|
//! | `contents` | what a site file says: [`Site`] and its parts |
//! | `read` | the way from text to [`Site`] |
//! | `chapters`, `antennas`, `assets`, `areas`, `stances`, `tapes` | one or a few tables of the file each |
//! | `section` | a table being read: typed values out of it, mistakes on the side |
//! | `quantity` | what each kind of number can be, and the slips of unit that are made with it |
//! | `footprint` | outlines on the ground |
//! | `ready` | what `locate` asks of a site beyond a file without mistakes |
//! | `mistake` | every mistake there is, and its words |
//! | `nearest_name` | what was meant by a name that is not known |

mod antennas;
mod areas;
mod assets;
mod chapters;
mod contents;
mod footprint;
mod mistake;
pub(crate) mod nearest_name;
mod quantity;
mod read;
mod ready;
mod section;
mod stances;
mod tapes;

pub use contents::{
    Chain, KeepOut, MAIN_STANCE, Mark, Origin, Planning, Recorder, Site, Stance, StandArea, Tape, TapeEnd,
};
pub use mistake::{Mistake, MistakeKind, SiteError, UnitSlip};

#[cfg(test)]
mod tests;
