//! The result: to stdout, or to a file that appears whole or not at all.

use std::io::ErrorKind;
use std::path::{Path, PathBuf};

use arcstead::whole_file::{self, folder_of};

use crate::console::Console;
use crate::failure::Failure;
use crate::table::Screen;

/// Where the result goes.
#[derive(Debug)]
pub(crate) struct Output {
    /// None for stdout.
    file: Option<PathBuf>,
}

impl Output {
    /// Checks before the work what can be checked: a file (`-` is stdout) in a folder that exists, none of the `inputs`.
    ///
    /// # Errors
    /// [`Failure::OutputIsFolder`], [`Failure::OutputIsInput`], [`Failure::Write`] when its folder does not exist.
    pub(crate) fn check<'i>(
        asked: Option<&Path>,
        inputs: impl IntoIterator<Item = &'i Path>,
    ) -> Result<Self, Failure> {
        let Some(path) = asked.filter(|path| *path != Path::new("-")) else { return Ok(Self { file: None }) };
        // A link is followed, so that what it leads to is replaced and not the link.
        let path = match path.canonicalize() {
            Ok(real) if real.is_dir() => return Err(Failure::OutputIsFolder { path: path.to_owned() }),
            Ok(real) => {
                if inputs.into_iter().any(|input| input.canonicalize().is_ok_and(|input| input == real)) {
                    return Err(Failure::OutputIsInput { path: path.to_owned() });
                }
                real
            }
            Err(_) => path.to_owned(),
        };
        match std::fs::metadata(folder_of(&path)) {
            Ok(folder) if folder.is_dir() => Ok(Self { file: Some(path) }),
            Ok(_) => Err(Failure::Write { path, source: ErrorKind::NotADirectory.into() }),
            Err(source) => Err(Failure::Write { path, source }),
        }
    }

    /// Checks that the result replaces none of the files that are read, which arguments name by their folders.
    ///
    /// # Errors
    /// [`Failure::OutputIsInput`].
    pub(crate) fn spare(&self, files: &[PathBuf]) -> Result<(), Failure> {
        let Some(path) = &self.file else { return Ok(()) };
        let Ok(real) = path.canonicalize() else { return Ok(()) };
        if files.iter().any(|file| file.canonicalize().is_ok_and(|file| file == real)) {
            return Err(Failure::OutputIsInput { path: path.clone() });
        }
        Ok(())
    }

    /// What the result is shown on.
    pub(crate) fn screen(&self, console: &Console<'_>) -> Screen {
        if self.file.is_some() { console.screen.of_file() } else { console.screen }
    }

    /// Writes the whole result. Emphasis in `text` is taken out where it would not show.
    ///
    /// # Errors
    /// [`Failure::Write`] or [`Failure::Stdout`]; a reader that closes its pipe has seen what it wanted, which is no error.
    pub(crate) fn write(&self, text: &str, console: &mut Console<'_>) -> Result<(), Failure> {
        let emphasis = if self.file.is_some() { console.emphasis_in_files } else { console.emphasis };
        let plain;
        let text = if emphasis {
            text
        } else {
            plain = anstream::adapter::strip_str(text).to_string();
            &plain
        };
        match &self.file {
            None => match console.stdout.write_all(text.as_bytes()).and_then(|()| console.stdout.flush()) {
                Err(error) if error.kind() == ErrorKind::BrokenPipe => Ok(()),
                written => written.map_err(Failure::Stdout),
            },
            Some(path) => whole_file::write(path, text.as_bytes()).map_err(|source| Failure::Write {
                path: path.clone(),
                source: without_temporary_name(source),
            }),
        }
    }
}

/// An error of the system without the name of the temporary file or folder, which nobody has given and nobody will find.
pub(crate) fn without_temporary_name(error: std::io::Error) -> std::io::Error {
    if error.raw_os_error().is_some() { error } else { error.kind().into() }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::arguments::{Color, TalkArguments};
    use std::io::Write;

    struct Closed;

    impl Write for Closed {
        fn write(&mut self, _: &[u8]) -> std::io::Result<usize> {
            Err(ErrorKind::BrokenPipe.into())
        }

        fn flush(&mut self) -> std::io::Result<()> {
            Ok(())
        }
    }

    fn with_console<R>(color: Color, work: impl FnOnce(&mut Console<'_>) -> R) -> (R, String) {
        let (mut stdout, mut stderr) = (Vec::new(), Vec::new());
        let talk = TalkArguments { quiet: false, verbose: false, color };
        let result = work(&mut Console::new(&talk, &mut stdout, &mut stderr));
        (result, String::from_utf8(stdout).unwrap())
    }

    fn entries(folder: &Path) -> Vec<String> {
        let entries = std::fs::read_dir(folder).unwrap();
        entries.map(|entry| entry.unwrap().file_name().into_string().unwrap()).collect()
    }

    #[test]
    fn a_file_is_replaced_whole_and_nothing_else_is_left() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("result.json");
        std::fs::write(&path, "something longer that was there before").unwrap();
        let output = Output::check(Some(&path), []).unwrap();
        with_console(Color::Auto, |console| output.write("\x1b[1mnew\x1b[0m\n", console).unwrap());
        assert_eq!(std::fs::read_to_string(&path).unwrap(), "new\n");
        assert_eq!(entries(folder.path()), ["result.json"]);
    }

    #[cfg(unix)]
    #[test]
    fn a_file_that_is_replaced_keeps_who_may_read_it() {
        use std::os::unix::fs::PermissionsExt;
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("result.json");
        for mode in [0o600, 0o664] {
            std::fs::write(&path, "old").unwrap();
            std::fs::set_permissions(&path, PermissionsExt::from_mode(mode)).unwrap();
            let output = Output::check(Some(&path), []).unwrap();
            with_console(Color::Auto, |console| output.write("new", console).unwrap());
            assert_eq!(std::fs::read_to_string(&path).unwrap(), "new");
            assert_eq!(std::fs::metadata(&path).unwrap().permissions().mode() & 0o777, mode);
        }
    }

    #[test]
    fn a_temporary_name_is_not_told() {
        let folder = tempfile::tempdir().unwrap();
        let missing = folder.path().join("missing");
        let error = tempfile::tempdir_in(&missing).unwrap_err();
        assert!(error.to_string().contains("missing"), "{error}");
        let told = without_temporary_name(error);
        assert_eq!(told.kind(), ErrorKind::NotFound);
        assert!(!told.to_string().contains("missing"), "{told}");
        let told = std::fs::read_dir(&missing).map_err(without_temporary_name).unwrap_err();
        assert!(told.raw_os_error().is_some(), "what the system says itself stays: {told}");
    }

    #[test]
    fn a_write_that_fails_leaves_the_old_file_and_no_other() {
        let folder = tempfile::tempdir().unwrap();
        let inner = folder.path().join("inner");
        std::fs::create_dir(&inner).unwrap();
        let output = Output::check(Some(&inner.join("result.json")), []).unwrap();
        // The folder goes away, and a folder of the file's name comes: the last step must fail.
        std::fs::create_dir(inner.join("result.json")).unwrap();
        std::fs::write(inner.join("result.json").join("kept"), "").unwrap();
        let (failed, _) = with_console(Color::Auto, |console| output.write("new", console).unwrap_err());
        assert!(matches!(failed, Failure::Write { .. }), "{failed}");
        assert_eq!(entries(&inner), ["result.json"]);
    }

    #[test]
    fn what_cannot_be_written_is_told_before_the_work() {
        let folder = tempfile::tempdir().unwrap();
        let input = folder.path().join("site.toml");
        std::fs::write(&input, "").unwrap();
        let check = |path: &Path| Output::check(Some(path), [input.as_path()]).unwrap_err();
        assert!(matches!(check(folder.path()), Failure::OutputIsFolder { .. }));
        assert!(matches!(check(&input), Failure::OutputIsInput { .. }));
        assert!(matches!(check(&folder.path().join("none/x.json")), Failure::Write { .. }));
    }

    #[test]
    fn stdout_gets_emphasis_only_where_it_was_asked_for() {
        let output = Output::check(Some(Path::new("-")), []).unwrap();
        let told =
            |color| with_console(color, |console| output.write("\x1b[1mnew\x1b[0m", console).unwrap()).1;
        assert_eq!(told(Color::Never), "new");
        assert_eq!(told(Color::Always), "\x1b[1mnew\x1b[0m");
    }

    #[test]
    fn a_closed_pipe_is_no_error() {
        let (mut stdout, mut stderr) = (Vec::new(), Vec::new());
        let talk = TalkArguments { quiet: false, verbose: false, color: Color::Never };
        let mut closed = Closed;
        let mut console = Console::new(&talk, &mut stdout, &mut stderr);
        console.stdout = &mut closed;
        Output { file: None }.write("text", &mut console).unwrap();
    }
}
