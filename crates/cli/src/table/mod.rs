//! Results as a person reads them, 80 columns wide.
//!
//! | file | holds |
//! |---|---|
//! | `locate` | the sources found |
//! | `each` | captures solved one by one |
//! | `verdict` | what is stated about the asset, in a line |
//! | `place` | position, bearing, other places |
//! | `detail` | what `--verbose` adds |
//! | `arrivals`, `inspect` | the tables of those commands |
//! | `words` | flags and counts in plain words |
//! | `figures` | numbers as they are printed |
//! | `glyphs` | signs that not every terminal has |
//! | `layout` | columns and wrapped text |

pub(crate) mod arrivals;
mod detail;
mod each;
pub(crate) mod figures;
mod glyphs;
pub(crate) mod inspect;
mod layout;
pub(crate) mod locate;
mod place;
mod verdict;
pub(crate) mod words;

pub(crate) use glyphs::Glyphs;

#[cfg(test)]
mod tests;
