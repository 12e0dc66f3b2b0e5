//! Results as a person reads them, 80 columns wide or as narrow as the terminal.
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
//! | `screen` | width of the terminal, and signs that not every one has |
//! | `layout` | columns and wrapped text |

pub(crate) mod arrivals;
mod detail;
mod each;
pub(crate) mod figures;
pub(crate) mod inspect;
mod layout;
pub(crate) mod locate;
mod place;
mod screen;
mod verdict;
pub(crate) mod words;

pub(crate) use screen::Screen;

#[cfg(test)]
mod tests;
