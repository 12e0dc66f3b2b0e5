//! A regular file, read at positions.

use std::fs::{File, Metadata};
use std::io::{BufReader, Read, Seek, SeekFrom};
use std::path::{Path, PathBuf};

use super::error::FormatError;

/// A regular file and how long it was when it was found.
///
/// It is opened anew for each read: a visit may hold more files than a process may hold open, and every
/// thread then has a position of its own, with no more than the standard library and on every system alike.
#[derive(Debug, Clone)]
pub(super) struct RegularFile {
    path: PathBuf,
    len: u64,
}

impl RegularFile {
    /// Looks at `path` without opening it. A symbolic link to a file is followed.
    pub(super) fn find(path: &Path) -> Result<Self, FormatError> {
        let metadata = std::fs::metadata(path).map_err(|source| io_error(path, source))?;
        Self::of(path, &metadata)
    }

    fn of(path: &Path, metadata: &Metadata) -> Result<Self, FormatError> {
        // Opening a pipe would wait for a writer, reading a device might never end.
        if metadata.is_file() {
            Ok(Self { path: path.to_owned(), len: metadata.len() })
        } else {
            Err(FormatError::NotAFile { path: path.to_owned() })
        }
    }

    pub(super) fn path(&self) -> &Path {
        &self.path
    }

    /// Bytes in it when it was found.
    pub(super) fn len(&self) -> u64 {
        self.len
    }

    /// Opened for reading from byte `start` on.
    pub(super) fn open_at(&self, start: u64) -> Result<FileReader, FormatError> {
        let open = || {
            let mut file = File::open(&self.path)?;
            if start != 0 {
                file.seek(SeekFrom::Start(start))?;
            }
            Ok(file)
        };
        let file = open().map_err(|source| io_error(&self.path, source))?;
        Ok(FileReader { path: self.path.clone(), inner: BufReader::with_capacity(1 << 16, file) })
    }

    /// The first bytes of the file, `most` at most.
    pub(super) fn first_bytes(&self, most: usize) -> Result<Vec<u8>, FormatError> {
        let mut bytes = Vec::new();
        let reader = self.open_at(0)?;
        reader
            .inner
            .take(most as u64)
            .read_to_end(&mut bytes)
            .map_err(|source| io_error(&self.path, source))?;
        Ok(bytes)
    }
}

/// A [`RegularFile`] being read.
#[derive(Debug)]
pub(super) struct FileReader {
    path: PathBuf,
    pub(super) inner: BufReader<File>,
}

impl FileReader {
    /// Fills `buffer`; a file that ends before is an error.
    pub(super) fn fill(&mut self, buffer: &mut [u8]) -> Result<(), FormatError> {
        self.inner.read_exact(buffer).map_err(|source| io_error(&self.path, source))
    }
}

/// An error of the system at `path`.
pub(super) fn io_error(path: &Path, source: std::io::Error) -> FormatError {
    FormatError::Io { path: path.to_owned(), source }
}

/// The last part of the path, as text.
pub(super) fn file_name(path: &Path) -> String {
    path.file_name().map_or_else(|| path.display().to_string(), |name| name.to_string_lossy().into_owned())
}
