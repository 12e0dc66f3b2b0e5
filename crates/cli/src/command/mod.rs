//! The commands, a file each.
//!
//! | file | command |
//! |---|---|
//! | `locate` | `arcstead locate SITE CAPTURE...` |
//! | `arrivals` | `arcstead arrivals SITE CAPTURE...` |
//! | `inspect` | `arcstead inspect CAPTURE...` |
//! | `simulate` | `arcstead simulate SITE --source X,Y,Z` |
//! | `read_visit` | what `locate` and `arrivals` begin with |

pub(crate) mod arrivals;
pub(crate) mod inspect;
pub(crate) mod locate;
mod read_visit;
pub(crate) mod simulate;
