//! The capture files that arguments name.

use std::collections::HashSet;
use std::path::{Path, PathBuf};

use super::capture_file::{format_of, has_ending};
use super::error::FormatError;
use super::natural_order::natural_order;
use super::regular_file::{RegularFile, io_error};
use super::sigmf::DATA_ENDING;

/// What [`find_captures`] found.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct FoundCaptures {
    /// Capture files: in the order of the arguments, inside a folder in natural order.
    pub files: Vec<PathBuf>,
    /// What was passed over, to be told to the user.
    pub skipped: Vec<Skipped>,
}

/// Something that was passed over.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Skipped {
    /// What.
    pub path: PathBuf,
    /// Why.
    pub reason: SkipReason,
}

/// Why something was passed over.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[non_exhaustive]
pub enum SkipReason {
    /// Its name begins with a full stop.
    Hidden,
    /// A folder inside a folder; name it by itself if it holds captures.
    Folder,
    /// A pipe, a device, a socket, a link to a folder or a link to nothing.
    NotAFile,
    /// No known format.
    UnknownFormat,
    /// The same file was named before.
    Repeated,
}

/// Finds the capture files that `arguments`, files or folders, name.
///
/// A folder gives every capture file directly in it, in natural order (`shot_2` before `shot_10`); folders in
/// it are not searched, links in it are followed to files only. Hidden files and files of no known format in
/// a folder are skipped and listed. A `.sigmf-data` beside its `.sigmf-meta` is one recording and counts
/// once, and so does a file that is named twice. Whether a file is in order shows only when it is opened.
///
/// # Errors
/// [`FormatError::Io`] for a missing or unreadable file or folder, [`FormatError::NotAFile`] for a device or
/// pipe, [`FormatError::UnknownFormat`] for a file of no known format that was named itself,
/// [`FormatError::NoCaptures`] for a folder without any capture.
pub fn find_captures(arguments: &[PathBuf]) -> Result<FoundCaptures, FormatError> {
    let mut found = FoundCaptures::default();
    let mut seen = Seen::default();
    for argument in arguments {
        let metadata = std::fs::metadata(argument).map_err(|source| io_error(argument, source))?;
        if metadata.is_dir() {
            let before = found.skipped.len();
            let files = files_in(argument, &mut found.skipped)?;
            if files.is_empty() {
                let skipped = found.skipped.len() - before;
                return Err(FormatError::NoCaptures { path: argument.clone(), skipped });
            }
            for file in files {
                add(file, &mut seen, &mut found)?;
            }
        } else {
            if format_of(argument)?.is_none() {
                return Err(FormatError::UnknownFormat {
                    path: argument.clone(),
                    known: super::FORMATS.iter().map(|format| format.name()).collect::<Vec<_>>().join(", "),
                });
            }
            add(argument.clone(), &mut seen, &mut found)?;
        }
    }
    Ok(found)
}

/// The capture files directly in `folder`, in natural order.
fn files_in(folder: &Path, skipped: &mut Vec<Skipped>) -> Result<Vec<PathBuf>, FormatError> {
    let mut entries = std::fs::read_dir(folder)
        .and_then(Iterator::collect::<Result<Vec<_>, _>>)
        .map_err(|source| io_error(folder, source))?
        .into_iter()
        .map(|entry| (entry.file_name().to_string_lossy().into_owned(), entry.path()))
        .collect::<Vec<_>>();
    entries.sort_by(|(one, _), (other, _)| natural_order(one, other));
    let mut files = Vec::new();
    for (name, path) in entries {
        let reason = if name.starts_with('.') {
            SkipReason::Hidden
        } else if std::fs::symlink_metadata(&path).is_ok_and(|metadata| metadata.is_dir()) {
            SkipReason::Folder
        } else if RegularFile::find(&path).is_err() {
            SkipReason::NotAFile
        } else if format_of(&path)?.is_some() {
            files.push(path);
            continue;
        } else {
            SkipReason::UnknownFormat
        };
        skipped.push(Skipped { path, reason });
    }
    Ok(files)
}

/// The files named so far, by what they really are.
#[derive(Debug, Default)]
struct Seen {
    named: HashSet<PathBuf>,
    captures: HashSet<PathBuf>,
}

/// Adds a file unless it is there: a pair of `.sigmf-data` and `.sigmf-meta` by its meta file, whichever is
/// named.
fn add(path: PathBuf, seen: &mut Seen, found: &mut FoundCaptures) -> Result<(), FormatError> {
    let canonical = |path: &Path| std::fs::canonicalize(path).map_err(|source| io_error(path, source));
    let first_time = seen.named.insert(canonical(&path)?);
    let path = meta_beside(&path).unwrap_or(path);
    if seen.captures.insert(canonical(&path)?) {
        found.files.push(path);
    } else if !first_time {
        found.skipped.push(Skipped { path, reason: SkipReason::Repeated });
    }
    Ok(())
}

/// The `.sigmf-meta` beside a `.sigmf-data`, if there is one.
fn meta_beside(path: &Path) -> Option<PathBuf> {
    let meta = has_ending(path, DATA_ENDING).then(|| path.with_extension("sigmf-meta"))?;
    meta.is_file().then_some(meta)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn names(paths: &[PathBuf]) -> Vec<String> {
        paths.iter().map(|path| super::super::regular_file::file_name(path)).collect()
    }

    #[test]
    fn a_folder_gives_its_captures_in_natural_order_and_tells_the_rest() {
        let folder = tempfile::tempdir().unwrap();
        let at = |name: &str| folder.path().join(name);
        for name in ["shot_10.csv", "shot_2.CSV", ".hidden.csv", "about.md", "v.sigmf-data", "v.sigmf-meta"] {
            std::fs::write(at(name), "1,2\n3,4\n").unwrap();
        }
        std::fs::write(at("notes.txt"), "nothing to read here\n").unwrap();
        std::fs::write(at("table.txt"), "0\t1\n1\t2\n").unwrap();
        std::fs::create_dir(at("inner")).unwrap();
        let found = find_captures(&[folder.path().to_owned()]).unwrap();
        assert_eq!(names(&found.files), ["shot_2.CSV", "shot_10.csv", "table.txt", "v.sigmf-meta"]);
        let skipped = found
            .skipped
            .iter()
            .map(|skipped| (super::super::regular_file::file_name(&skipped.path), skipped.reason))
            .collect::<Vec<_>>();
        assert_eq!(
            skipped,
            [
                (".hidden.csv".into(), SkipReason::Hidden),
                ("about.md".into(), SkipReason::UnknownFormat),
                ("inner".into(), SkipReason::Folder),
                ("notes.txt".into(), SkipReason::UnknownFormat),
            ]
        );
    }

    #[test]
    fn what_is_named_twice_counts_once_and_is_told() {
        let folder = tempfile::tempdir().unwrap();
        let file = folder.path().join("a.csv");
        std::fs::write(&file, "1,2\n").unwrap();
        let found = find_captures(&[file.clone(), folder.path().to_owned()]).unwrap();
        assert_eq!(found.files, [file]);
        assert_eq!(found.skipped.len(), 1);
        assert_eq!(found.skipped[0].reason, SkipReason::Repeated);
    }

    #[test]
    fn a_data_file_named_alone_stands_for_its_recording() {
        let folder = tempfile::tempdir().unwrap();
        let (data, meta) = (folder.path().join("v.sigmf-data"), folder.path().join("v.sigmf-meta"));
        std::fs::write(&data, "").unwrap();
        assert_eq!(find_captures(std::slice::from_ref(&data)).unwrap().files, std::slice::from_ref(&data));
        std::fs::write(&meta, "{}").unwrap();
        assert_eq!(find_captures(&[data]).unwrap().files, [meta]);
    }

    #[test]
    fn missing_and_empty_is_an_error() {
        let folder = tempfile::tempdir().unwrap();
        let missing = folder.path().join("not-there.csv");
        let error = find_captures(&[missing]).unwrap_err();
        assert!(error.to_string().contains("not-there.csv"), "{error}");
        std::fs::write(folder.path().join("about.md"), "words").unwrap();
        let error = find_captures(&[folder.path().to_owned()]).unwrap_err();
        assert!(matches!(error, FormatError::NoCaptures { skipped: 1, .. }), "{error}");
        let error = find_captures(&[folder.path().join("about.md")]).unwrap_err();
        assert!(matches!(error, FormatError::UnknownFormat { .. }), "{error}");
    }

    #[cfg(unix)]
    #[test]
    fn sockets_are_never_opened_and_links_lead_to_files_only() {
        let folder = tempfile::tempdir().unwrap();
        let at = |name: &str| folder.path().join(name);
        let _listening = std::os::unix::net::UnixListener::bind(at("a.csv")).unwrap();
        let elsewhere = tempfile::tempdir().unwrap();
        std::fs::write(elsewhere.path().join("x"), "1\n2\n").unwrap();
        std::os::unix::fs::symlink(elsewhere.path(), at("b.csv")).unwrap();
        std::os::unix::fs::symlink(elsewhere.path().join("x"), at("c.csv")).unwrap();
        let found = find_captures(&[folder.path().to_owned()]).unwrap();
        assert_eq!(names(&found.files), ["c.csv"]);
        assert!(found.skipped.iter().all(|skipped| skipped.reason == SkipReason::NotAFile));
        assert_eq!(found.skipped.len(), 2);
        assert!(matches!(find_captures(&[at("a.csv")]).unwrap_err(), FormatError::NotAFile { .. }));
        assert!(matches!(find_captures(&["/dev/zero".into()]).unwrap_err(), FormatError::NotAFile { .. }));
    }
}
