//! What every result document begins with.

use serde::{Deserialize, Serialize};

/// What every result document begins with.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Head {
    /// Which document this is, and its version, such as `arcstead/locate/1`.
    pub schema: String,
    /// The program that wrote it.
    pub program: Program,
    /// Name of the site; none for a document that needs no site file.
    pub site: Option<String>,
    /// What was read.
    pub inputs: Inputs,
    /// Every option that has an effect on the result, defaults filled in, under its name on the command line without
    /// the dashes.
    pub options: serde_json::Map<String, serde_json::Value>,
}

/// The program that wrote a document.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Program {
    /// Its name.
    pub name: String,
    /// Its version.
    pub version: String,
}

impl Program {
    /// This program, in this version.
    #[must_use]
    pub fn this() -> Self {
        Self { name: "arcstead".into(), version: env!("CARGO_PKG_VERSION").into() }
    }
}

/// What was read to make a document.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct Inputs {
    /// The capture files or arrivals tables, as they were named.
    pub files: Vec<String>,
    /// Number of captures in them.
    pub count: usize,
    /// SHA-256 of the site file in hexadecimal; none where no site file was read.
    pub site_sha256: Option<String>,
}
