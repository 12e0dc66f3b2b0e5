//! The whole program on the demo site, as a user would run it.

#![allow(clippy::unwrap_used, reason = "a test that unwraps fails with the line it stands on")]

use std::path::{Path, PathBuf};

use arcstead::documents::{Document, LocateDocument, Statement, TruthDocument};
use assert_cmd::Command;

const SITE: &str = "marl-bank/site.toml";

fn demo(path: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).parent().unwrap().join("demo-sites").join(path)
}

fn program(arguments: &[&str]) -> Command {
    let mut command = Command::cargo_bin("arcstead-under-test").unwrap();
    command.args(arguments);
    command
}

fn path(path: &Path) -> &str {
    path.to_str().unwrap()
}

/// Standard output of a run that must end well.
fn told(arguments: &[&str]) -> String {
    let output = program(arguments).output().unwrap();
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    String::from_utf8(output.stdout).unwrap()
}

fn located(site: &Path, captures: &[&str]) -> LocateDocument {
    let mut arguments = vec!["locate", path(site), "--format", "json", "--quiet"];
    arguments.extend(captures);
    LocateDocument::from_json(&told(&arguments)).unwrap()
}

fn truth(path: &Path) -> TruthDocument {
    TruthDocument::from_json(&std::fs::read_to_string(path).unwrap()).unwrap()
}

/// Whether the truth lies in the box around the region, and within four sigmas of the position.
fn assert_holds_the_truth(document: &LocateDocument, truth: &TruthDocument) {
    let source = &document.sources[0];
    let at = truth.sources[0].position_m;
    let covariance = source.covariance_m2.unwrap();
    for axis in 0..3 {
        assert!(source.region.min_m[axis] <= at[axis] && at[axis] <= source.region.max_m[axis]);
        let error = (source.position_m[axis] - at[axis]).abs();
        assert!(error < 4.0 * covariance[axis][axis].sqrt(), "{error} m along axis {axis}");
    }
}

#[test]
fn the_independent_visit_names_the_true_asset_and_holds_the_truth() {
    let document = located(&demo(SITE), &[path(&demo("marl-bank/independent"))]);
    let truth = truth(&demo("marl-bank/independent/truth.json"));
    let source = &document.sources[0];
    assert_eq!(source.verdict.statement, Statement::One);
    assert_eq!(Some(&source.verdict.assets[0]), truth.sources[0].asset.as_ref());
    assert!(source.verdict.probability > 0.95);
    assert!(source.captures >= 25, "{} captures used", source.captures);
    assert_holds_the_truth(&document, &truth);
    assert!(source.first.unwrap() < source.last.unwrap());
    let sum = source.assets.iter().map(|asset| asset.probability).sum::<f64>() + source.elsewhere_probability;
    assert!((sum - 1.0).abs() < 1e-9);
    assert_eq!(document.captures.read, 40);
    assert_eq!(document.captures.used + document.captures.stray + document.captures.rejected.len(), 40);
}

#[test]
fn every_method_names_it() {
    for method in ["gated", "correlation", "energy", "akaike", "threshold"] {
        let document = located(&demo(SITE), &[path(&demo("marl-bank/independent")), "--method", method]);
        let verdict = &document.sources[0].verdict;
        assert_eq!(verdict.assets, ["Voltage transformer phase A"], "{method}");
        assert_eq!(document.head.options["method"], method);
    }
}

#[test]
fn the_captures_in_csv_are_the_captures_in_sigmf() {
    // Numbers 2, 14 and 27 of the recording, as an oscilloscope writes them.
    let csv = located(&demo(SITE), &[path(&demo("marl-bank/independent-csv")), "--each"]);
    let all = located(&demo(SITE), &[path(&demo("marl-bank/independent")), "--each"]);
    assert_eq!(csv.sources.len(), 3);
    for (source, number) in csv.sources.iter().zip([2, 14, 27]) {
        let name = format!("visit.sigmf-meta#{number}");
        let same = all.sources.iter().find(|other| other.members[0] == name).unwrap();
        for axis in 0..3 {
            // Volts of a few digits against counts.
            assert!((source.position_m[axis] - same.position_m[axis]).abs() < 0.02);
        }
        assert_eq!(source.verdict.assets, same.verdict.assets);
    }
}

#[test]
fn the_same_bytes_for_any_number_of_threads() {
    let (site, captures) = (demo(SITE), demo("marl-bank/independent"));
    let with = |threads: &str| {
        told(&["locate", path(&site), path(&captures), "--format", "json", "--quiet", "--threads", threads])
    };
    assert_eq!(with("1"), with("2"));
    assert_eq!(with("1"), with("5"));
}

#[test]
fn arrivals_written_and_read_back_give_the_same_sources() {
    let folder = tempfile::tempdir().unwrap();
    let (site, captures) = (demo(SITE), demo("marl-bank/independent"));
    let whole = folder.path().join("all.csv");
    told(&["arrivals", path(&site), path(&captures), "--output", path(&whole)]);
    // Two parts of the one table: captures are not split.
    let text = std::fs::read_to_string(&whole).unwrap();
    let lines: Vec<&str> = text.lines().collect();
    let (header, rows) = lines.split_first().unwrap();
    assert_eq!(*header, "capture,time,stance,antenna,arrival_s,sigma_s,snr_db,delay_ns,covariance_s2,flags");
    assert_eq!(rows.len(), 160);
    let parts = [&rows[..68], &rows[68..]].map(|part| {
        let file = folder.path().join(format!("part-{}.csv", part.len()));
        std::fs::write(&file, format!("{header}\n{}\n", part.join("\n"))).unwrap();
        file
    });
    let direct = located(&site, &[path(&captures)]);
    let one = located(&site, &["--arrivals", path(&whole)]);
    let two = located(&site, &["--arrivals", path(&parts[0]), "--arrivals", path(&parts[1])]);
    assert_eq!(direct.sources, one.sources);
    assert_eq!(direct.sources, two.sources);
    let json = folder.path().join("all.json");
    told(&["arrivals", path(&site), path(&captures), "--output", path(&json)]);
    assert_eq!(direct.sources, located(&site, &["--arrivals", path(&json)]).sources);
}

#[test]
fn a_simulated_visit_is_the_same_bytes_and_is_located() {
    let folder = tempfile::tempdir().unwrap();
    let site = demo(SITE);
    let simulate = |name: &str| {
        let to = folder.path().join(name);
        let source = "Disconnector post phase B";
        told(&["simulate", path(&site), "--source", source, "--output", path(&to), "--seed", "7", "--quiet"]);
        to
    };
    let (one, two) = (simulate("one"), simulate("two"));
    for file in ["visit.sigmf-data", "visit.sigmf-meta", "truth.json"] {
        assert_eq!(std::fs::read(one.join(file)).unwrap(), std::fs::read(two.join(file)).unwrap(), "{file}");
    }
    let document = located(&site, &[path(&one)]);
    assert_eq!(document.sources[0].verdict.assets, ["Disconnector post phase B"]);
    assert_holds_the_truth(&document, &truth(&one.join("truth.json")));
    // Nothing is overwritten unasked.
    program(&["simulate", path(&site), "--source", "1,2,3", "--output", path(&one)]).assert().failure();
}

#[test]
fn no_pulse_is_a_result() {
    let folder = tempfile::tempdir().unwrap();
    let mut state = 1_u64;
    let mut noise = || {
        // Sum of uniform numbers: near enough to a normal one (a linear congruential generator; from memory).
        (0..12)
            .map(|_| {
                state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
                (state >> 40) as f64 / f64::from(1 << 24) - 0.5
            })
            .sum::<f64>()
    };
    for shot in 1..=3 {
        let rows: Vec<String> = (0..1500)
            .map(|n| {
                let time = f64::from(n) * 2e-10;
                format!("{time:e},{},{},{},{}", noise(), noise(), noise(), noise())
            })
            .collect();
        let text = format!("time,ch1,ch2,ch3,ch4\ns,V,V,V,V\n{}\n", rows.join("\n"));
        std::fs::write(folder.path().join(format!("shot_{shot}.csv")), text).unwrap();
    }
    let text = told(&["locate", path(&demo(SITE)), path(folder.path())]);
    assert!(text.to_lowercase().contains("no source found"), "{text}");
    let document = located(&demo(SITE), &[path(folder.path())]);
    assert!(document.sources.is_empty());
    assert_eq!(document.captures.rejected.len(), 3);
}

#[test]
fn five_mistakes_are_told_each_with_its_line() {
    let folder = tempfile::tempdir().unwrap();
    let text = std::fs::read_to_string(demo(SITE)).unwrap();
    let wrong = text
        .replacen("position_m = [-1.7, 14.7, 3.9]", "posiiton_m = [-1.7, 14.7, 3.9]", 1)
        .replacen("channel = 2", "channel = 1", 1)
        .replacen("delay_sigma_ns = 0.08", "delay_sigma_ns = 0", 1)
        .replacen("sample_rate_gsps = 5.0", "sample_rate_gsps = 5e9", 1)
        .replacen("name = \"Line string phase B\"", "name = \"Line string phase A\"", 1);
    let site = folder.path().join("site.toml");
    std::fs::write(&site, &wrong).unwrap();
    let output = program(&["locate", path(&site), path(&demo("marl-bank/independent"))]).output().unwrap();
    assert_eq!(output.status.code(), Some(2));
    let told = String::from_utf8(output.stderr).unwrap();
    for (what, part) in [
        ("did you mean `position_m`", "posiiton_m"),
        ("channel", "channel = 1"),
        ("delay_sigma_ns", "delay_sigma_ns = 0 "),
        ("GS/s", "sample_rate_gsps = 5e9"),
        ("Line string phase A", "name = \"Line string phase A\""),
    ] {
        let lines: Vec<usize> = wrong
            .lines()
            .enumerate()
            .filter(|(_, line)| line.contains(part))
            .map(|(index, _)| index + 1)
            .collect();
        let placed = told.lines().any(|line| {
            line.contains(what) && lines.iter().any(|number| line.contains(&format!("site.toml:{number}:")))
        });
        assert!(placed, "{part} in one of the lines {lines:?} is not told:\n{told}");
    }
    assert!(output.stdout.is_empty());
}

#[test]
fn a_damaged_capture_costs_itself_only() {
    let folder = tempfile::tempdir().unwrap();
    for entry in std::fs::read_dir(demo("marl-bank/independent-csv")).unwrap() {
        let entry = entry.unwrap();
        std::fs::copy(entry.path(), folder.path().join(entry.file_name())).unwrap();
    }
    let whole = std::fs::read_to_string(folder.path().join("shot_001.csv")).unwrap();
    std::fs::write(folder.path().join("shot_009.csv"), whole.replacen("0.0", "abc", 40)).unwrap();
    let document = located(&demo(SITE), &[path(folder.path())]);
    assert_eq!(document.captures.read, 3);
    assert!(document.captures.rejected.iter().any(|one| one.capture.contains("shot_009.csv")));
    assert_eq!(document.sources[0].verdict.assets, ["Voltage transformer phase A"]);
}

#[test]
fn nothing_to_read_fails() {
    let folder = tempfile::tempdir().unwrap();
    let site = demo(SITE);
    program(&["locate", path(&site), path(folder.path())]).assert().code(1);
    program(&["locate", path(&site), path(&folder.path().join("missing.csv"))]).assert().code(1);
    program(&["locate", path(&site)]).assert().code(2);
    program(&["locate", path(&folder.path().join("missing.toml")), path(folder.path())]).assert().code(2);
}

#[test]
fn inspect_needs_no_site() {
    let text = told(&["inspect", path(&demo("marl-bank/independent"))]);
    assert!(text.contains("5 GS/s"), "{text}");
    let json = told(&["inspect", path(&demo("marl-bank/independent")), "--format", "json"]);
    let document: serde_json::Value = serde_json::from_str(&json).unwrap();
    assert_eq!(document["schema"], "arcstead/inspect/1");
    assert_eq!(document["captures"].as_array().unwrap().len(), 40);
    assert_eq!(document["captures"][0]["channels"].as_array().unwrap().len(), 4);
}
