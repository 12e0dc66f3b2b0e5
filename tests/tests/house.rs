//! The house stands as DEVELOPERS.md draws it: who may know whom, and rooms that are read in one sitting.

#![allow(clippy::unwrap_used, reason = "a test that unwraps fails with the line it stands on")]

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};

fn root() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).parent().expect("the tests member lies in the workspace").to_owned()
}

fn manifest(folder: &str) -> toml::Table {
    let path = root().join(folder).join("Cargo.toml");
    std::fs::read_to_string(&path)
        .unwrap_or_else(|error| panic!("{}: {error}", path.display()))
        .parse()
        .unwrap()
}

/// Names of the packages that a member needs outside its tests.
fn dependencies(folder: &str) -> BTreeSet<String> {
    let manifest = manifest(folder);
    assert!(!manifest.contains_key("build-dependencies"), "{folder} has a build script's dependencies");
    manifest
        .get("dependencies")
        .and_then(toml::Value::as_table)
        .map_or_else(BTreeSet::new, |table| table.keys().cloned().collect())
}

#[test]
fn arrows_point_down_only() {
    let allowed: [(&str, &[&str]); 5] = [
        ("crates/core", &[]),
        ("crates/solver", &[]),
        ("crates/sim", &["arcstead-core", "arcstead-solver"]),
        ("crates/arcstead", &["arcstead-core", "arcstead-solver"]),
        ("crates/cli", &["arcstead", "arcstead-sim"]),
    ];
    let crates: BTreeSet<String> = std::fs::read_dir(root().join("crates"))
        .unwrap()
        .map(|entry| format!("crates/{}", entry.unwrap().file_name().to_string_lossy()))
        .collect();
    assert_eq!(crates, allowed.iter().map(|(folder, _)| (*folder).to_owned()).collect());
    for (folder, may) in allowed {
        let found: Vec<String> =
            dependencies(folder).into_iter().filter(|name| name.starts_with("arcstead")).collect();
        for name in &found {
            assert!(may.contains(&name.as_str()), "{folder} must not know {name}");
        }
    }
}

#[test]
fn rooms_do_not_know_what_they_must_not() {
    let forbidden: [(&str, &[&str]); 4] = [
        // Positions and files are none of its business.
        ("crates/core", &["serde", "serde_json", "toml", "csv", "clap", "argmin"]),
        // Samples and files are none of its business.
        ("crates/solver", &["realfft", "rustfft", "serde", "serde_json", "toml", "csv", "clap"]),
        // Files are none of its business.
        ("crates/sim", &["serde", "serde_json", "toml", "csv", "clap", "argmin"]),
        // The terminal is none of its business.
        ("crates/arcstead", &["clap", "comfy-table", "indicatif", "anstream", "ctrlc"]),
    ];
    for (folder, names) in forbidden {
        let found = dependencies(folder);
        for name in names {
            assert!(!found.contains(*name), "{folder} must not depend on {name}");
        }
    }
}

#[test]
fn every_member_takes_the_shared_lints_and_versions() {
    for folder in
        ["crates/core", "crates/solver", "crates/sim", "crates/arcstead", "crates/cli", "tests", "benches"]
    {
        let manifest = manifest(folder);
        assert_eq!(manifest["lints"]["workspace"].as_bool(), Some(true), "{folder}");
        for table in ["dependencies", "dev-dependencies"] {
            for (name, value) in manifest.get(table).and_then(toml::Value::as_table).into_iter().flatten() {
                let shared = value.get("workspace").and_then(toml::Value::as_bool) == Some(true);
                assert!(shared, "{folder}: {name} does not take its version from the workspace");
            }
        }
    }
}

fn rust_files(folder: &Path, found: &mut Vec<PathBuf>) {
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            rust_files(&path, found);
        } else if path.extension().is_some_and(|ending| ending == "rs") {
            found.push(path);
        }
    }
}

#[test]
fn files_are_read_in_one_sitting() {
    let mut files = Vec::new();
    for folder in ["crates", "tests", "benches"] {
        rust_files(&root().join(folder), &mut files);
    }
    assert!(files.len() > 50, "the walk found {} files only", files.len());
    for path in files {
        let lines = std::fs::read_to_string(&path).unwrap().lines().count();
        assert!(lines <= 600, "{} has {lines} lines", path.display());
    }
}

#[test]
fn libraries_forbid_nothing_less_than_the_workspace() {
    let workspace = manifest(".");
    let lints = &workspace["workspace"]["lints"];
    assert_eq!(lints["rust"]["unsafe_code"].as_str(), Some("forbid"));
    for lint in ["print_stdout", "print_stderr", "unwrap_used", "float_cmp", "todo", "dbg_macro"] {
        assert!(lints["clippy"].get(lint).is_some(), "{lint}");
    }
}
