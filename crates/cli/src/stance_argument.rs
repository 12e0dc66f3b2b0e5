//! `NAME=CAPTURE`: the stance a capture was taken from.

use std::ffi::{OsStr, OsString};
use std::path::{Path, PathBuf};

use arcstead::VisitError;
use arcstead::site::{MAIN_STANCE, Site};

/// The one stance of all `arguments`, and the files and folders they name.
///
/// What stands before the first `=` is a stance when the site has one of that name, or when there is no file of the
/// whole name: then it is a mistyped stance rather than a mistyped file.
///
/// # Errors
/// [`VisitError::SeveralStances`] when the arguments are of several stances. Whether the stance exists is not asked here.
pub(crate) fn split(site: &Site, arguments: &[OsString]) -> Result<(String, Vec<PathBuf>), VisitError> {
    let mut stance: Option<String> = None;
    let mut paths = Vec::new();
    for argument in arguments {
        let (name, path) = split_one(site, argument);
        match &stance {
            Some(first) if *first != name => {
                return Err(VisitError::SeveralStances { first: first.clone(), second: name });
            }
            _ => stance = Some(name),
        }
        paths.push(path);
    }
    Ok((stance.unwrap_or_else(|| MAIN_STANCE.to_owned()), paths))
}

fn split_one(site: &Site, argument: &OsStr) -> (String, PathBuf) {
    let whole = || (MAIN_STANCE.to_owned(), PathBuf::from(argument));
    // A path that is no Unicode cannot be cut; then it has no stance.
    let Some((name, path)) = argument.to_str().and_then(|text| text.split_once('=')) else { return whole() };
    let known = name == MAIN_STANCE || site.stances.iter().any(|stance| stance.name == name);
    if known || !Path::new(argument).exists() { (name.to_owned(), path.into()) } else { whole() }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn site() -> Site {
        let text = "schema = 1\n[site]\nname = \"S\"\n[[antenna]]\nname = \"A1\"\nchannel = 1\nposition_m = [0, 0, 2]\n\
                    [[stance]]\nname = \"gate\"\nposition_m = { A1 = [1, 1, 2] }\n";
        Site::parse(text, "site.toml").unwrap()
    }

    fn split_texts(arguments: &[&str]) -> Result<(String, Vec<PathBuf>), VisitError> {
        split(&site(), &arguments.iter().map(OsString::from).collect::<Vec<_>>())
    }

    #[test]
    fn a_stance_is_cut_off() {
        assert_eq!(split_texts(&["a.csv", "b"]).unwrap(), ("main".into(), vec!["a.csv".into(), "b".into()]));
        assert_eq!(split_texts(&["gate=a.csv"]).unwrap(), ("gate".into(), vec!["a.csv".into()]));
        assert_eq!(split_texts(&["gaet=a.csv"]).unwrap().0, "gaet");
        assert!(matches!(split_texts(&["a.csv", "gate=b.csv"]), Err(VisitError::SeveralStances { .. })));
        assert_eq!(split_texts(&["main=a.csv", "b.csv"]).unwrap().0, "main");
    }

    #[test]
    fn a_file_with_an_equals_sign_is_a_file() {
        let folder = tempfile::tempdir().unwrap();
        let file = folder.path().join("gain=3.csv");
        std::fs::write(&file, "1,2\n").unwrap();
        let (stance, paths) = split(&site(), &[file.clone().into_os_string()]).unwrap();
        assert_eq!((stance.as_str(), paths), ("main", vec![file]));
    }
}
