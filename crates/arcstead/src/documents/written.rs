//! Writing a document as JSON and reading it back.

use serde::Serialize;
use serde::de::DeserializeOwned;
use thiserror::Error;

use super::finite::{self, NotFinite};
use super::head::Head;

/// A result document.
///
/// ```
/// use arcstead::documents::{Document, Head, InspectDocument, Inputs, Program};
/// let document = InspectDocument {
///     head: Head {
///         schema: InspectDocument::SCHEMA.into(),
///         program: Program::this(),
///         site: None,
///         inputs: Inputs { files: vec![], count: 0, site_sha256: None },
///         options: Default::default(),
///     },
///     incomplete: false,
///     captures: vec![],
///     rejected: vec![],
/// };
/// assert_eq!(InspectDocument::from_json(&document.to_json()?)?, document);
/// # Ok::<(), arcstead::documents::DocumentError>(())
/// ```
pub trait Document: Serialize + DeserializeOwned {
    /// Name and version of the document.
    const SCHEMA: &'static str;

    /// What the document begins with.
    fn head(&self) -> &Head;

    /// The document as indented JSON, ending in a line feed.
    ///
    /// # Errors
    /// [`DocumentError::NotFinite`] when a number is NaN or infinite, which JSON cannot say;
    /// [`DocumentError::Schema`] when the head names another document.
    fn to_json(&self) -> Result<String, DocumentError> {
        expect_schema(Self::SCHEMA, &self.head().schema)?;
        finite::check(self)?;
        let mut text = serde_json::to_string_pretty(self).map_err(DocumentError::Json)?;
        text.push('\n');
        Ok(text)
    }

    /// Reads a document back. Fields that are not known are passed over: a later version may have added them.
    ///
    /// # Errors
    /// [`DocumentError::Json`] for what is no JSON or lacks a field, [`DocumentError::Schema`] for another document.
    fn from_json(text: &str) -> Result<Self, DocumentError> {
        let document: Self = serde_json::from_str(text).map_err(DocumentError::Json)?;
        expect_schema(Self::SCHEMA, &document.head().schema)?;
        Ok(document)
    }
}

/// Why a document cannot be written or read.
#[derive(Debug, Error)]
#[non_exhaustive]
pub enum DocumentError {
    /// A number in it is NaN or infinite.
    #[error(transparent)]
    NotFinite(#[from] NotFinite),
    /// It is another document, or another version.
    #[error("the document says schema `{found}`; expected `{expected}`")]
    Schema {
        /// What it says.
        found: String,
        /// What was wanted.
        expected: &'static str,
    },
    /// It is no JSON, or a field is missing or of another type.
    #[error("the document is not readable")]
    Json(#[source] serde_json::Error),
}

fn expect_schema(expected: &'static str, found: &str) -> Result<(), DocumentError> {
    if found == expected { Ok(()) } else { Err(DocumentError::Schema { found: found.to_owned(), expected }) }
}
