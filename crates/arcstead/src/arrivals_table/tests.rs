//! Tables out and in again, and what is told about wrong ones. The site and the numbers are invented.

use super::*;
use crate::documents::{ARRIVALS_SCHEMA, Head, Inputs, Program};
use crate::site::Site;
use arcstead_core::ChannelFlags;
use nalgebra::DMatrix;

fn head() -> Head {
    Head {
        schema: ARRIVALS_SCHEMA.into(),
        program: Program::this(),
        site: Some("Marl Bank".into()),
        inputs: Inputs { files: vec![], count: 0, site_sha256: None },
        options: serde_json::Map::new(),
    }
}

fn site() -> Site {
    site_with_delay("52.1")
}

fn site_with_delay(delay_ns: &str) -> Site {
    let mut text = "schema = 1\n[site]\nname = \"Marl Bank\"\n".to_owned();
    for (channel, name) in [(1, "A1"), (2, "A2"), (3, "north, high")] {
        text += &format!(
            "[[antenna]]\nname = \"{name}\"\nchannel = {channel}\nposition_m = [{channel}, 0, 2]\n\
             delay_ns = {delay_ns}\n"
        );
    }
    text += "[[stance]]\nname = \"gate\"\nposition_m = { A1 = [0, 1, 2], A2 = [1, 1, 2], \"north, high\" = [2, 1, 2] }\n";
    Site::parse(&text, "site.toml").unwrap()
}

/// A stream of numbers with arbitrary digits (the splitmix64 generator; from memory).
fn digits(seed: &mut u64) -> f64 {
    *seed = seed.wrapping_add(0x9e37_79b9_7f4a_7c15);
    let mut z = *seed;
    z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
    ((z ^ (z >> 31)) >> 11) as f64 / (1_u64 << 53) as f64
}

/// `count` captures of all three antennas, some arrivals missed, with full covariances of arbitrary digits.
fn captures(count: usize) -> Vec<CaptureArrivals> {
    let mut seed = 5;
    (0..count)
        .map(|number| {
            let missed = number % 4;
            let sigma_s: Vec<f64> = (0..3).map(|_| 1e-11 + 1e-10 * digits(&mut seed)).collect();
            let row = |antenna: usize, seed: &mut u64| {
                let received = antenna != missed;
                AntennaArrival {
                    antenna,
                    arrival_s: received.then(|| digits(seed) * 1e-6 - 1e-8),
                    sigma_s: received.then(|| sigma_s[antenna]),
                    snr_db: received.then(|| 40.0 * digits(seed)),
                    flags: ChannelFlags::from_names(if received {
                        vec!["carrier", "weak"]
                    } else {
                        vec!["dead"]
                    })
                    .unwrap(),
                }
            };
            let correlation = 0.5 * digits(&mut seed);
            let covariance_s2 = DMatrix::from_fn(3, 3, |i, j| match (i == missed || j == missed, i == j) {
                (true, _) => 0.0,
                (false, true) => sigma_s[i] * sigma_s[i],
                (false, false) => correlation * (sigma_s[i.min(j)] * sigma_s[i.max(j)]),
            });
            CaptureArrivals {
                capture: format!("shot_{number}.csv"),
                time: (number % 3 > 0).then(|| "2026-03-04T10:15:00.0000000002Z".parse().unwrap()),
                stance: if number % 2 == 0 { "main" } else { "gate" }.into(),
                antennas: (0..3).map(|antenna| row(antenna, &mut seed)).collect(),
                covariance_s2,
            }
        })
        .collect()
}

fn written_csv(site: &Site, captures: &[CaptureArrivals]) -> String {
    let mut writer = ArrivalsWriter::csv(Vec::new(), "table.csv", site).unwrap();
    for capture in captures {
        writer.write(capture).unwrap();
    }
    String::from_utf8(writer.finish().unwrap()).unwrap()
}

fn read_csv(text: &str, site: &Site) -> Result<Vec<CaptureArrivals>, ArrivalsTableError> {
    ArrivalsReader::new(text.as_bytes(), "table.csv", site)?.collect()
}

#[test]
fn csv_reads_back_exactly() {
    let (site, captures) = (site(), captures(300));
    assert_eq!(read_csv(&written_csv(&site, &captures), &site).unwrap(), captures);
}

#[test]
fn json_reads_back_exactly_and_has_the_same_columns() {
    let (site, captures) = (site(), captures(300));
    let mut writer = ArrivalsWriter::json(Vec::new(), "table.json", &site, &head()).unwrap();
    for capture in &captures {
        writer.write(capture).unwrap();
    }
    let text = String::from_utf8(writer.finish().unwrap()).unwrap();
    assert_eq!(read_json(&text, "table.json", &site).unwrap(), captures);
    let json: serde_json::Value = serde_json::from_str(&text).unwrap();
    let header = written_csv(&site, &[]);
    let keys: Vec<_> = json["arrivals"][0].as_object().unwrap().keys().map(String::as_str).collect();
    assert_eq!(keys.join(","), header.trim_end());
    assert_eq!(json["schema"], "arcstead/arrivals/1");
    assert_eq!(json["program"]["name"], "arcstead");
    let empty = ArrivalsWriter::json(Vec::new(), "", &site, &head()).unwrap().finish().unwrap();
    assert_eq!(read_json(std::str::from_utf8(&empty).unwrap(), "", &site).unwrap(), []);
}

#[test]
fn a_table_of_any_partition_says_the_same() {
    let (site, captures) = (site(), captures(10));
    let mut parts = Vec::new();
    for part in [&captures[..3], &captures[3..4], &captures[4..]] {
        parts.extend(read_csv(&written_csv(&site, part), &site).unwrap());
    }
    assert_eq!(parts, captures);
}

#[test]
fn the_table_is_written_as_promised() {
    let capture = CaptureArrivals {
        capture: "shot_1".into(),
        time: Some("2026-03-04T10:15:00Z".parse().unwrap()),
        stance: "main".into(),
        antennas: vec![
            AntennaArrival {
                antenna: 2,
                arrival_s: Some(1.5e-7),
                sigma_s: Some(0.5),
                snr_db: Some(21.0),
                flags: ChannelFlags::from_names(["clipped", "weak"]).unwrap(),
            },
            AntennaArrival {
                antenna: 0,
                arrival_s: None,
                sigma_s: None,
                snr_db: None,
                flags: ChannelFlags::default(),
            },
        ],
        covariance_s2: DMatrix::from_row_slice(2, 2, &[0.25, 0.0, 0.0, 0.0]),
    };
    assert_eq!(
        written_csv(&site(), &[capture]),
        "capture,time,stance,antenna,arrival_s,sigma_s,snr_db,delay_ns,covariance_s2,flags\n\
         shot_1,2026-03-04T10:15:00Z,main,\"north, high\",1.5e-7,0.5,21.0,52.1,0.25;0.0,clipped;weak\n\
         shot_1,2026-03-04T10:15:00Z,main,A1,,,,52.1,,\n"
    );
}

#[test]
fn the_least_table_has_a_diagonal_covariance() {
    let text = "\u{feff}antenna, sigma_s ,arrival_s,capture,my note\nA2,2e-10,3e-7,s1,x\nA1,,,s1,\nA1,1e-10,-4e-7,s2,\n";
    let [first, second] = &read_csv(text, &site()).unwrap()[..] else { panic!("two captures") };
    assert_eq!(first.covariance_s2, DMatrix::from_row_slice(2, 2, &[2e-10 * 2e-10, 0.0, 0.0, 0.0]));
    assert_eq!((first.stance.as_str(), first.time, first.received()), ("main", None, 1));
    // No delay column: what was subtracted is taken to be the site's.
    assert_eq!((second.antennas[0].antenna, second.antennas[0].arrival_s), (0, Some(-4e-7)));
}

#[test]
fn the_delay_read_is_exchanged_for_the_sites() {
    let table = written_csv(&site_with_delay("52.1"), &captures(8));
    let (same, other) = (site_with_delay("52.1"), site_with_delay("50.0"));
    let kept = read_csv(&table, &same).unwrap();
    for (kept, changed) in kept.iter().zip(read_csv(&table, &other).unwrap()) {
        for (kept, changed) in kept.antennas.iter().zip(&changed.antennas) {
            let difference_s = changed.arrival_s.zip(kept.arrival_s).map(|(changed, kept)| changed - kept);
            // The arrival without any delay is arrival + delay read, so less delay leaves a later one.
            assert!(difference_s.is_none_or(|s| (s - 2.1e-9).abs() < 1e-21), "{difference_s:?}");
        }
    }
}

/// What is told about the least table with this header and these rows.
fn told(rows: &str) -> String {
    read_csv(rows, &site()).unwrap_err().to_string()
}

#[test]
fn mistakes_are_told_with_their_line() {
    const LEAST: &str = "capture,antenna,arrival_s,sigma_s\n";
    for (rows, expected) in [
        (
            "s1,A1,1e-7,1e-10\ns1,A9,1e-7,1e-10",
            "table.csv:3: the site has no antenna `A9`, did you mean `A1`?",
        ),
        ("s1,A1,1e-7,1e-10\ns1,A1,1e-7,1e-10", "table.csv:3: capture `s1` has antenna `A1` twice"),
        ("s1,A1,1e-7,1e-10\ns2,A1,1e-7,1e-10\ns1,A2,1e-7,1e-10", "table.csv:4: capture `s1` was told before"),
        ("s1,A1,1e-7,", "table.csv:2: `arrival_s` is there but no `sigma_s`"),
        ("s1,A1,,1e-10", "table.csv:2: `sigma_s` is there but no `arrival_s`"),
        ("s1,A1,1e-7,0", "table.csv:2: `sigma_s` is 0; expected a standard deviation above 0"),
        ("s1,A1,nan,1e-10", "table.csv:2: `arrival_s` is `nan`; expected a finite number"),
        (
            "s1,A1,\"1,5e-7\",1e-10",
            "table.csv:2: `arrival_s` is `1,5e-7`; expected a finite number with a decimal point",
        ),
        (",A1,1e-7,1e-10", "table.csv:2: `capture` is empty"),
        ("s1,A1,1e-7", "table.csv:2: not CSV as expected"),
    ] {
        let told = told(&format!("{LEAST}{rows}\n"));
        assert!(told.starts_with(expected), "{rows}: {told}");
    }
    for (table, expected) in [
        ("", "table.csv:1: there is no column `capture`"),
        (
            "capture,antena,arrival_s,sigma_s\n",
            "table.csv:1: there is no column `antenna`, did you mean `antena`?",
        ),
        ("capture;antenna;arrival_s;sigma_s\n", "table.csv:1: there is no column `capture`; needed are"),
        (
            "capture,antenna,arrival_s,sigma_s,stanse\n",
            "table.csv:1: unknown column `stanse`, did you mean `stance`?",
        ),
        ("capture,antenna,arrival_s,sigma_s,antenna\n", "table.csv:1: the column `antenna` is there twice"),
        (
            "capture,antenna,arrival_s,sigma_s,stance\ns1,A1,1e-7,1e-10,gates\n",
            "table.csv:2: the site has no stance `gates`, did you mean `gate`?",
        ),
        (
            "capture,antenna,arrival_s,sigma_s,flags\ns1,A1,1e-7,1e-10,odd\n",
            "table.csv:2: there is no flag `odd`",
        ),
        (
            "capture,antenna,arrival_s,sigma_s,time\ns1,A1,1e-7,1e-10,noon\n",
            "table.csv:2: `time`: `noon` is no time; expected RFC 3339",
        ),
        (
            "capture,antenna,arrival_s,sigma_s,time\ns1,A1,1e-7,1e-10,2026-03-04T10:15:00Z\ns1,A2,,,\n",
            "table.csv:3: capture `s1` has another time here",
        ),
    ] {
        let told = told(table);
        assert!(told.starts_with(expected), "{table}: {told}");
    }
}

#[test]
fn a_covariance_that_cannot_be_is_refused() {
    for (first, second, expected) in [
        ("1", "0;1", "table.csv:2: `covariance_s2` has 1 values; expected 2"),
        ("1;0", "", "table.csv:3: `covariance_s2` is given for some arrivals"),
        ("4;0", "0;1", "table.csv:2: `sigma_s` is 1 but its variance in `covariance_s2` is 4"),
        (
            "1;0.5",
            "0.4;1",
            "table.csv:3: the covariance of `A1` and `A2` is 0.5 in the one row and 0.4 in the other",
        ),
        ("1;-2", "-2;1", "table.csv:3: the covariance of `A1` and `A2` is -2; expected at most"),
        ("1;inf", "inf;1", "table.csv:2: `covariance_s2` is `inf`"),
    ] {
        let told = told(&format!(
            "capture,antenna,arrival_s,sigma_s,covariance_s2\ns1,A1,0,1,{first}\ns1,A2,0,1,{second}\n"
        ));
        assert!(told.starts_with(expected), "{told}");
    }
}

#[test]
fn reading_ends_with_the_first_mistake() {
    let (site, text) = (site(), "capture,antenna,arrival_s,sigma_s\ns1,A1,1,1\ns2,A1,x,1\ns3,A1,1,1\n");
    let mut reader = ArrivalsReader::new(text.as_bytes(), "table.csv", &site).unwrap();
    // The capture before the mistake was not known to be whole when the mistake came.
    assert!(reader.next().unwrap().is_err());
    assert!(reader.next().is_none());
}

#[test]
fn what_does_not_belong_together_is_not_written() {
    let site = site();
    let good = captures(2).remove(1);
    let refused = |change: &dyn Fn(&mut CaptureArrivals)| {
        let mut wrong = good.clone();
        change(&mut wrong);
        let mut writer = ArrivalsWriter::csv(Vec::new(), "table.csv", &site).unwrap();
        assert!(writer.write(&wrong).is_err());
        let text = String::from_utf8(writer.finish().unwrap()).unwrap();
        assert_eq!(text.lines().count(), 1, "nothing but the header");
    };
    refused(&|wrong| wrong.antennas[0].antenna = 7);
    refused(&|wrong| wrong.antennas[0].antenna = 2);
    refused(&|wrong| wrong.antennas[0].arrival_s = Some(f64::NAN));
    refused(&|wrong| wrong.antennas[0].snr_db = Some(f64::INFINITY));
    refused(&|wrong| wrong.antennas[0].sigma_s = None);
    refused(&|wrong| wrong.covariance_s2[(0, 0)] *= 2.0);
    refused(&|wrong| wrong.covariance_s2[(0, 2)] += 1e-21);
    refused(&|wrong| wrong.covariance_s2 = DMatrix::zeros(2, 2));
    refused(&|wrong| wrong.stance = "moon".into());
}

#[test]
fn json_mistakes_are_told_with_their_row() {
    let site = site();
    let row = r#"{"capture":"s1","antenna":"A1","arrival_s":1e-7,"sigma_s":1e-10}"#;
    let told = |text: &str| read_json(text, "table.json", &site).unwrap_err().to_string();
    let of = |rows: &str| format!(r#"{{"schema":"arcstead/arrivals/1","arrivals":[{rows}]}}"#);
    assert_eq!(read_json(&of(row), "table.json", &site).unwrap()[0].received(), 1);
    assert!(
        told(&of(&format!("{row},{row}")))
            .starts_with("table.json: row 2: capture `s1` has antenna `A1` twice")
    );
    assert!(told(&of(row).replace("arrivals/1", "locate/1")).contains("says schema `arcstead/locate/1`"));
    assert!(told("{}").starts_with("table.json: not JSON as expected"));
}

#[test]
fn tables_in_files_are_read_and_folders_refused() {
    let (site, captures) = (site(), captures(5));
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("table.csv");
    std::fs::write(&path, written_csv(&site, &captures)).unwrap();
    let read: Vec<_> = ArrivalsReader::open(&path, &site).unwrap().collect::<Result<_, _>>().unwrap();
    assert_eq!(read, captures);
    let refused = |path: &std::path::Path| ArrivalsReader::open(path, &site).unwrap_err().mistake;
    assert!(matches!(refused(folder.path()), TableMistake::NotAFile));
    assert!(matches!(refused(&folder.path().join("none")), TableMistake::File(_)));
}
