//! The program as it is called: what goes where, and how it ends.

#![allow(clippy::unwrap_used, reason = "what cannot be set up for a test ends it where it stands")]

use std::fs;
use std::path::{Path, PathBuf};

use arcstead::documents::{Document, InspectDocument, LocateDocument, Statement, TruthDocument};
use arcstead_cli::status;
use tempfile::TempDir;

/// An invented site whose assets lie well apart, recorded with 8 bits. A fifth antenna makes arrivals checkable.
const SITE: &str = r#"
schema = 1
[site]
name = "Test Yard"
[recorder]
sample_rate_gsps = 5.0
bandwidth_mhz = 1500
bits = 8
[[antenna]]
name = "A1"
channel = 1
position_m = [0.0, 0.0, 2.0]
delay_ns = 40.0
band_mhz = [300, 1500]
[[antenna]]
name = "A2"
channel = 2
position_m = [14.0, 0.0, 4.5]
delay_ns = 41.5
band_mhz = [300, 1500]
[[antenna]]
name = "A3"
channel = 3
position_m = [14.0, 12.0, 1.5]
delay_ns = 39.0
band_mhz = [300, 1500]
[[antenna]]
name = "A4"
channel = 4
position_m = [0.0, 12.0, 5.0]
delay_ns = 42.0
band_mhz = [300, 1500]
[[antenna]]
name = "A5"
channel = 5
position_m = [7.0, -3.0, 6.0]
delay_ns = 42.0
band_mhz = [300, 1500]
[[asset]]
name = "Bushing east"
at_m = [10.0, 7.0, 4.0]
[[asset]]
name = "Bushing west"
at_m = [4.0, 7.0, 4.0]
[[stance]]
name = "gate"
position_m = { A1 = [1.0, 0.0, 2.0], A2 = [15.0, 0.0, 4.5], A3 = [15.0, 12.0, 1.5], A4 = [1.0, 12.0, 5.0], A5 = [8.0, -3.0, 6.0] }
"#;

struct Ended {
    status: u8,
    stdout: String,
    stderr: String,
}

fn arcstead(arguments: &[&str]) -> Ended {
    let (mut stdout, mut stderr) = (Vec::new(), Vec::new());
    let status = arcstead_cli::run(["arcstead"].iter().chain(arguments).copied(), &mut stdout, &mut stderr);
    let text = |bytes| String::from_utf8(bytes).unwrap();
    Ended { status, stdout: text(stdout), stderr: text(stderr) }
}

struct Yard {
    folder: TempDir,
    site: String,
}

impl Yard {
    fn new() -> Self {
        let folder = tempfile::tempdir().unwrap();
        let site = folder.path().join("site.toml");
        fs::write(&site, SITE).unwrap();
        Self { site: site.display().to_string(), folder }
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    fn name(&self, name: &str) -> String {
        self.path(name).display().to_string()
    }

    /// Simulates a visit of a few strong captures from "Bushing east" into a folder.
    fn simulated(&self, name: &str) -> String {
        let folder = self.name(name);
        let ended = arcstead(&[
            "simulate",
            &self.site,
            "--source",
            "Bushing east",
            "--captures",
            "6",
            "--snr",
            "35",
            "--output",
            &folder,
        ]);
        assert_eq!((ended.status, ended.stdout.as_str()), (status::DONE, ""), "{}", ended.stderr);
        folder
    }
}

fn entries(folder: &Path) -> Vec<String> {
    let entries = fs::read_dir(folder).unwrap();
    let mut names: Vec<String> = entries.map(|one| one.unwrap().file_name().into_string().unwrap()).collect();
    names.sort();
    names
}

#[test]
fn a_simulated_visit_is_found_by_every_way_in() {
    let yard = Yard::new();
    let visit = yard.simulated("visit");
    let table = arcstead(&["locate", &yard.site, &visit]);
    assert_eq!(table.status, status::DONE, "{}", table.stderr);
    assert!(table.stdout.starts_with("Inspect first: Bushing east   "), "{}", table.stdout);
    // What is said goes to stderr, and not at all with --quiet; that the truth is no capture needs no saying.
    assert!(!table.stderr.contains("truth.json"), "{}", table.stderr);
    fs::write(Path::new(&visit).join("notes.md"), "words").unwrap();
    assert!(arcstead(&["locate", &yard.site, &visit]).stderr.contains("notes.md"));
    assert_eq!(arcstead(&["locate", "-q", &yard.site, &visit]).stderr, "");

    let json = arcstead(&["locate", &yard.site, &visit, "--format", "json", "--threads", "1"]);
    let document = LocateDocument::from_json(&json.stdout).unwrap();
    assert_eq!(document.sources[0].verdict.statement, Statement::One);
    assert_eq!(document.sources[0].verdict.assets, ["Bushing east"]);
    let three = arcstead(&["locate", &yard.site, &visit, "--format", "json", "--threads", "3"]);
    assert_eq!(json.stdout, three.stdout, "the threads change nothing");

    // By way of an arrivals table, in a file whose ending gives the format.
    let rows = yard.name("arrivals.csv");
    let arrivals = arcstead(&["arrivals", &yard.site, &visit, "--output", &rows]);
    assert_eq!((arrivals.status, arrivals.stdout.as_str()), (status::DONE, ""), "{}", arrivals.stderr);
    assert!(fs::read_to_string(&rows).unwrap().starts_with("capture,time,stance,antenna,arrival_s,"));
    let again = arcstead(&["locate", &yard.site, "--arrivals", &rows, "--format", "json"]);
    let again = LocateDocument::from_json(&again.stdout).unwrap();
    assert_eq!(again.sources, document.sources);

    let each = arcstead(&["locate", &yard.site, &visit, "--each", "--format", "csv"]);
    assert_eq!(each.status, status::DONE, "{}", each.stderr);
    let mut sheet = csv::Reader::from_reader(each.stdout.as_bytes());
    assert_eq!(sheet.records().count(), 6);
}

#[test]
fn a_simulation_repeats_and_tells_its_truth() {
    let yard = Yard::new();
    let (one, other) = (yard.simulated("one"), yard.simulated("other"));
    assert_eq!(entries(Path::new(&one)), ["truth.json", "visit.sigmf-data", "visit.sigmf-meta"]);
    for name in entries(Path::new(&one)) {
        let read = |folder: &str| fs::read(Path::new(folder).join(&name)).unwrap();
        assert_eq!(read(&one), read(&other), "{name}");
    }
    let truth = fs::read_to_string(Path::new(&one).join("truth.json")).unwrap();
    let truth = TruthDocument::from_json(&truth).unwrap();
    assert_eq!(truth.sources[0].position_m.map(|at| at as i32), [10, 7, 4]);
    assert_eq!(truth.sources[0].asset.as_deref(), Some("Bushing east"));

    let inspected = arcstead(&["inspect", &one, "--format", "json"]);
    let inspected = InspectDocument::from_json(&inspected.stdout).unwrap();
    let names: Vec<&str> = inspected.captures.iter().map(|capture| capture.name.as_str()).collect();
    assert_eq!(names, truth.captures.iter().map(|capture| capture.name.as_str()).collect::<Vec<_>>());
    assert_eq!(inspected.captures[0].channels.len(), 5);

    // Not over an earlier one, unless asked; and then whole.
    let again = |more: &[&str]| {
        let common = ["simulate", &yard.site, "--source", "4,7,4", "--captures", "3", "--output", &one];
        arcstead(&[&common, more].concat())
    };
    let refused = again(&[]);
    assert_eq!(refused.status, status::USAGE);
    assert!(
        refused.stderr.starts_with("error: ") && refused.stderr.contains("--force"),
        "{}",
        refused.stderr
    );
    assert_eq!(again(&["--force", "--perfect", "--carriers"]).status, status::DONE);
    assert_eq!(entries(Path::new(&one)), ["truth.json", "visit.sigmf-data", "visit.sigmf-meta"]);
    let truth = fs::read_to_string(Path::new(&one).join("truth.json")).unwrap();
    let truth = TruthDocument::from_json(&truth).unwrap();
    assert_eq!((truth.captures.len(), truth.sources[0].asset.as_deref()), (3, None));
    assert!(truth.antennas.iter().all(|antenna| antenna.delay_error_ns.abs() < 1e-12));
}

#[test]
fn inspect_needs_no_site_and_fits_the_screen() {
    let yard = Yard::new();
    let visit = yard.simulated("visit");
    for more in [&["-v"][..], &[]] {
        let ended = arcstead(&[&["inspect", &visit], more].concat());
        assert_eq!(ended.status, status::DONE, "{}", ended.stderr);
        assert!(ended.stdout.starts_with("6 captures in 1 file\n"), "{}", ended.stdout);
        assert!(
            ended.stdout.contains("5 channels and 1500 samples at 5 GS/s (300.0 ns)"),
            "{}",
            ended.stdout
        );
        assert!(ended.stdout.lines().all(|line| line.chars().count() <= 80), "{}", ended.stdout);
    }
    let rows = arcstead(&["inspect", &visit, "--format", "csv"]).stdout;
    assert_eq!(csv::Reader::from_reader(rows.as_bytes()).records().count(), 30);
}

#[test]
fn arrivals_are_told_as_table_and_json() {
    let yard = Yard::new();
    let visit = yard.simulated("visit");
    let table = arcstead(&["arrivals", &yard.site, &visit, "-v"]).stdout;
    assert!(table.starts_with("Test Yard: a pulse in 6 of 6 captures\n"), "{table}");
    assert!(table.lines().all(|line| line.chars().count() <= 80), "{table}");
    let json = arcstead(&["arrivals", &yard.site, &visit, "--format", "json"]).stdout;
    let rows: serde_json::Value = serde_json::from_str(&json).unwrap();
    assert_eq!(rows["schema"], "arcstead/arrivals/1");
    assert_eq!(rows["arrivals"].as_array().unwrap().len(), 30);
}

#[test]
fn no_source_is_a_result() {
    let yard = Yard::new();
    let quiet = yard.name("quiet");
    let ended = arcstead(&[
        "simulate",
        &yard.site,
        "--source",
        "4,7,4",
        "--captures",
        "4",
        "--snr",
        "-60",
        "--output",
        &quiet,
    ]);
    assert_eq!(ended.status, status::DONE, "{}", ended.stderr);
    let ended = arcstead(&["locate", &yard.site, &quiet]);
    assert_eq!(ended.status, status::DONE, "{}", ended.stderr);
    assert!(ended.stdout.starts_with("No source found\n"), "{}", ended.stdout);
}

#[test]
fn a_damaged_capture_costs_itself_and_only_damaged_ones_the_run() {
    let yard = Yard::new();
    let visit = yard.simulated("visit");
    fs::write(Path::new(&visit).join("bad.csv"), "1,2\n3\nfour,5\n").unwrap();
    let ended = arcstead(&["locate", &yard.site, &visit]);
    assert_eq!(ended.status, status::DONE, "{}", ended.stderr);
    assert!(ended.stderr.contains("warning: ") && ended.stderr.contains("bad.csv"), "{}", ended.stderr);
    assert!(ended.stdout.contains("6 of 7 captures"), "{}", ended.stdout);

    let bad = yard.name("visit/bad.csv");
    for command in [&["locate", &yard.site, &bad][..], &["arrivals", &yard.site, &bad], &["inspect", &bad]] {
        let ended = arcstead(command);
        assert_eq!((ended.status, ended.stdout.as_str()), (status::FAILED, ""), "{}", ended.stderr);
        assert!(ended.stderr.starts_with("error: the capture could not be read:"), "{}", ended.stderr);
    }
}

#[test]
fn captures_that_fail_alike_are_told_in_one_line() {
    let yard = Yard::new();
    let visit = yard.simulated("visit");
    let band = ["--band", "3000,4000"];
    for command in
        [&["locate", &yard.site, &visit][..], &["arrivals", &yard.site, &visit], &["inspect", &visit]]
    {
        let ended = arcstead(&[command, &band].concat());
        assert_eq!(ended.status, status::FAILED, "{}", ended.stderr);
        let lines: Vec<&str> = ended.stderr.lines().collect();
        assert_eq!(lines.len(), 2, "{}", ended.stderr);
        assert!(lines[1].starts_with("  6 captures (visit.sigmf-meta#1 ...): "), "{}", ended.stderr);
    }

    for name in ["a.csv", "b.csv", "c.csv"] {
        fs::write(Path::new(&visit).join(name), "0.5,2\n-0.25,4\n1,-8\n0,1.5\n").unwrap();
    }
    let one = arcstead(&["inspect", &yard.name("visit/a.csv")]);
    assert_eq!(one.stderr.matches("a.csv").count(), 1, "{}", one.stderr);
    assert!(one.stderr.contains("give `inspect` a --sample-rate"), "{}", one.stderr);
    let grouped = arcstead(&["inspect", &visit]);
    let warnings = grouped.stderr.lines().filter(|line| line.starts_with("warning: ")).collect::<Vec<_>>();
    assert_eq!(warnings.len(), 1, "{}", grouped.stderr);
    assert!(warnings[0].starts_with("warning: 3 captures ("), "{}", grouped.stderr);
    assert!(warnings[0].contains("a.csv ...): gives no sample rate"), "{}", grouped.stderr);
    let each = arcstead(&["inspect", &visit, "-v"]);
    assert_eq!(each.stderr.matches("warning: ").count(), 3, "{}", each.stderr);
}

#[test]
fn an_output_that_cannot_be_made_is_named_as_it_was_given() {
    let yard = Yard::new();
    let folder = yard.name("not/there");
    let ended = arcstead(&["simulate", &yard.site, "--source", "4,7,4", "--output", &folder]);
    assert_eq!(ended.status, status::FAILED, "{}", ended.stderr);
    assert!(ended.stderr.contains(&folder) && !ended.stderr.contains(".arcstead-"), "{}", ended.stderr);
    assert_eq!(entries(yard.folder.path()), ["site.toml"]);
}

#[test]
fn wrong_usage_ends_with_its_own_status() {
    let yard = Yard::new();
    let visit = yard.simulated("visit");
    let missing = yard.name("missing.csv");
    let gate = format!("gate={visit}");
    let gaet = format!("gaet={visit}");
    let cases: [(&[&str], u8, &str); 12] = [
        (&[], status::USAGE, "Usage"),
        (&["find"], status::USAGE, "unrecognized"),
        (&["locate", &yard.site], status::USAGE, "required"),
        (&["locate", &missing, &visit], status::USAGE, "missing.csv"),
        (&["locate", &yard.site, &missing], status::FAILED, "missing.csv"),
        (&["locate", &yard.site, "--arrivals", &missing], status::FAILED, "missing.csv"),
        (&["locate", &yard.site, &visit, &gate], status::USAGE, "one stance"),
        (&["locate", &yard.site, &gaet], status::USAGE, "no stance \"gaet\""),
        (&["locate", &yard.site, &visit, "--output", &yard.site], status::USAGE, "to be read"),
        (&["locate", &yard.site, &visit, "--output", "/nowhere/at/all"], status::FAILED, "cannot be written"),
        (
            &["simulate", &yard.site, "--source", "Bushing", "--output", &missing],
            status::USAGE,
            "Bushing east",
        ),
        (&["simulate", &yard.site, "--source", "0,0,2", "--output", &missing], status::USAGE, "A1"),
    ];
    for (arguments, expected, told) in cases {
        let ended = arcstead(arguments);
        assert_eq!((ended.status, ended.stdout.as_str()), (expected, ""), "{arguments:?}: {}", ended.stderr);
        assert!(ended.stderr.contains(told), "{arguments:?}: {}", ended.stderr);
    }
    assert!(!Path::new(&missing).exists());
    assert_eq!(entries(yard.folder.path()), ["site.toml", "visit"], "nothing is left behind");
}

#[test]
fn all_mistakes_of_a_site_file_are_told_a_line_each() {
    let yard = Yard::new();
    fs::write(
        &yard.site,
        SITE.replace("channel = 2", "channel = 1").replace("delay_ns = 40.0", "dealy_ns = 4"),
    )
    .unwrap();
    let ended = arcstead(&["locate", &yard.site, "captures"]);
    assert_eq!(ended.status, status::USAGE);
    let lines: Vec<&str> = ended.stderr.lines().collect();
    assert_eq!(lines[0], "error: the site file has 2 mistakes:");
    assert!(lines[1..].iter().all(|line| line.starts_with(&format!("{}:", yard.site))), "{}", ended.stderr);
    assert!(ended.stderr.contains("did you mean `delay_ns`?"), "{}", ended.stderr);
}

#[test]
fn help_and_version_go_to_stdout() {
    for arguments in [&["--help"][..], &["--version"], &["locate", "--help"], &["simulate", "-h"]] {
        let ended = arcstead(arguments);
        assert_eq!((ended.status, ended.stderr.as_str()), (status::DONE, ""));
        assert!(!ended.stdout.is_empty());
    }
    let help = arcstead(&["locate", "--help"]).stdout;
    for told in ["Examples:", "first_asset_probability", "--each", "--confidence"] {
        assert!(help.contains(told), "{told} is not in\n{help}");
    }
}
