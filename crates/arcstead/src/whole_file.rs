//! Files that appear whole or not at all.

use std::io::Write;
use std::path::Path;

use tempfile::NamedTempFile;

/// Writes a file in one step: under a temporary name beside it, then renamed. A file that was there stays whole until
/// then and keeps its permissions; a device or pipe is written as it is, never replaced.
///
/// # Errors
/// When the folder or the file cannot be written; nothing is left behind then.
pub fn write(path: &Path, bytes: &[u8]) -> std::io::Result<()> {
    if std::fs::metadata(path).is_ok_and(|found| !found.is_file()) {
        return std::fs::OpenOptions::new().write(true).open(path)?.write_all(bytes);
    }
    let mut file = temporary_beside(path)?;
    // A file that is replaced stays open to those it was open to.
    if let Ok(replaced) = std::fs::metadata(path) {
        file.as_file().set_permissions(replaced.permissions())?;
    }
    file.write_all(bytes)?;
    file.as_file().sync_all()?;
    file.persist(path).map_err(|error| error.error)?;
    Ok(())
}

/// The folder a path lies in: `.` for a bare name.
#[must_use]
pub fn folder_of(path: &Path) -> &Path {
    path.parent().filter(|parent| !parent.as_os_str().is_empty()).unwrap_or(Path::new("."))
}

/// A file of a temporary name in the folder of `path`, with the permissions of any new file.
pub(crate) fn temporary_beside(path: &Path) -> std::io::Result<NamedTempFile> {
    let mut builder = tempfile::Builder::new();
    builder.prefix(".arcstead-");
    #[cfg(unix)]
    let everybody = std::os::unix::fs::PermissionsExt::from_mode(0o666);
    #[cfg(unix)]
    // Less the process's mask; by default only the owner could read a temporary file.
    builder.permissions(everybody);
    builder.tempfile_in(folder_of(path))
}
