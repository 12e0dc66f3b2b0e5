//! Tables of results made by hand: each statement, no source, unknown range.

use arcstead::documents::{
    Alternative, AntennaResult, AssetProbability, Bearing, CaptureCounts, Document, Ellipse, Fit, Flag, Head,
    Inputs, LocateDocument, Program, Region, RejectedCapture, SourceResult, Statement, Verdict,
};

use super::Screen;
use super::layout::{self, Side};

fn source() -> SourceResult {
    SourceResult {
        captures: 38,
        position_m: [11.9, 8.1, 5.3],
        covariance_m2: Some([[0.01, 0.0, 0.0], [0.0, 0.01, 0.0], [0.0, 0.0, 0.04]]),
        random_covariance_m2: Some([[0.0; 3]; 3]),
        systematic_covariance_m2: None,
        ellipse: Some(Ellipse { confidence: 0.95, semi_major_m: 0.3, semi_minor_m: 0.2, azimuth_deg: 41.0 }),
        region: Region {
            confidence: 0.95,
            volume_m3: Some(0.4),
            area_m2: None,
            min_m: [11.5, 7.8, 4.9],
            max_m: [12.3, 8.5, 5.8],
            bounded: true,
        },
        bearing: Bearing {
            from_m: [6.0, 5.0, 2.3],
            azimuth_deg: 62.1,
            elevation_deg: 24.0,
            azimuth_sigma_deg: Some(0.4),
            elevation_sigma_deg: Some(0.6),
            range_m: Some([6.1, 41.0]),
        },
        fit: Fit { chi_square: 1.3, degrees_of_freedom: 1, p_value: Some(0.25) },
        antennas: vec![
            AntennaResult {
                name: "A1".into(),
                used: true,
                residual_ns: Some(-0.001),
                sigma_ns: Some(0.08),
                snr_db: Some(21.0),
                line_of_sight: true,
            },
            AntennaResult {
                name: "A2".into(),
                used: false,
                residual_ns: Some(9.5),
                sigma_ns: Some(0.08),
                snr_db: Some(12.0),
                line_of_sight: false,
            },
            AntennaResult {
                name: "A3".into(),
                used: false,
                residual_ns: None,
                sigma_ns: None,
                snr_db: None,
                line_of_sight: true,
            },
        ],
        verdict: Verdict {
            statement: Statement::One,
            assets: vec!["Bushing T1 phase A".into()],
            probability: 0.93,
        },
        assets: ranked(&[0.93, 0.04, 0.004, 0.003, 0.003]),
        elsewhere_probability: 0.02,
        alternatives: vec![Alternative { position_m: [3.1, 20.2, 4.0], probability: 0.02 }],
        flags: vec![],
        stances: vec!["main".into()],
        first: Some("2026-03-04T10:15:00Z".parse().unwrap()),
        last: Some("2026-03-04T10:16:10Z".parse().unwrap()),
        members: vec!["shot_1.csv".into()],
    }
}

fn ranked(probabilities: &[f64]) -> Vec<AssetProbability> {
    let names =
        ["Bushing T1 phase A", "Bushing T1 phase B", "Arrester phase A", "Arrester phase B", "String 7"];
    let pairs = names.iter().zip(probabilities);
    pairs.map(|(name, &probability)| AssetProbability { name: (*name).into(), probability }).collect()
}

fn document(sources: Vec<SourceResult>) -> LocateDocument {
    LocateDocument {
        head: Head {
            schema: LocateDocument::SCHEMA.into(),
            program: Program::this(),
            site: Some("Marl Bank".into()),
            inputs: Inputs { files: vec!["visit".into()], count: 40, site_sha256: None },
            options: serde_json::Map::from_iter([("each".to_owned(), false.into())]),
        },
        incomplete: false,
        captures: CaptureCounts {
            read: 39,
            used: 38,
            stray: 1,
            rejected: vec![RejectedCapture { capture: "shot_7.csv".into(), reason: "no pulse".into() }],
        },
        sources,
        cautions: vec![
            "A caution that is long enough to be broken into two lines of the table, as cautions are.".into(),
        ],
    }
}

/// The table in both alphabets, with all there is; checked to fit, and given without emphasis.
fn table(document: &LocateDocument) -> String {
    for screen in [Screen::UNICODE, Screen::ASCII] {
        for verbose in [true, false] {
            let text = plain(&super::locate::text(document, screen, verbose));
            for line in text.lines() {
                assert!(line.chars().count() <= usize::from(screen.width), "too wide: {line}");
                assert_eq!(line.trim_end(), line);
            }
            assert!(screen == Screen::UNICODE || text.is_ascii(), "{text}");
        }
    }
    plain(&super::locate::text(document, Screen::UNICODE, false))
}

fn plain(text: &str) -> String {
    anstream::adapter::strip_str(text).to_string()
}

/// The text in one line, for what may be broken anywhere.
fn joined(text: &str) -> String {
    text.split_whitespace().collect::<Vec<_>>().join(" ")
}

fn first_line(text: &str) -> &str {
    text.lines().next().unwrap()
}

#[test]
fn one_asset() {
    let text = table(&document(vec![source()]));
    assert_eq!(first_line(&text), "Inspect first: Bushing T1 phase A   93 %");
    assert_eq!(text.lines().nth(1).unwrap(), "Marl Bank: 38 of 40 captures agree on this source.");
    let joined = joined(&text);
    for told in [
        "It could also be Bushing T1 phase B 4 %; elsewhere (on none of the assets) 2 %",
        "Position x 11.90, y 8.10, z 5.30 m",
        "95 % ellipse 0.30 by 0.20 m, half axes; the longer one 41.0° from north",
        "5.30 ± 0.20 m (one sigma); 95 % region 4.90 to 5.80 m Bearing 62.1 ± 0.4° from north, 24.0 ± 0.6° up",
        "Other places the arrivals alone would also fit x 3.10, y 20.20, z 4.00 m (2 %)",
        "1 capture outside the source told 1 capture without enough pulses, or not readable: 1 x no pulse",
        "A1 21 +0.00 0.08 clear yes",
        "A2 12 +9.50 0.08 hidden left out",
        "A3 - - - clear no",
        "- A caution that is long enough",
    ] {
        assert!(joined.contains(told), "{told} is not in\n{text}");
    }
    // Above 1 % or among the first three, and elsewhere in its place.
    let rows: Vec<&str> =
        text.lines().skip_while(|line| !line.contains("Probability")).skip(2).take(4).collect();
    let names = ["Bushing T1 phase A", "Bushing T1 phase B", "elsewhere", "Arrester phase A"];
    for (row, name) in rows.iter().zip(names) {
        assert!(row.trim_start().starts_with(name), "{text}");
    }
    assert!(rows[3].ends_with("<1 %") && !text.contains("String 7"), "{text}");
}

#[test]
fn one_of_several() {
    let mut source = source();
    source.assets = ranked(&[0.55, 0.41, 0.01, 0.0, 0.0]);
    source.verdict = Verdict {
        statement: Statement::OneOf,
        assets: vec!["Bushing T1 phase A".into(), "Bushing T1 phase B".into()],
        probability: 0.96,
    };
    let text = table(&document(vec![source]));
    assert_eq!(
        joined(&text).split(" Marl").next().unwrap(),
        "One of these: Bushing T1 phase A or Bushing T1 phase B 96 % together"
    );
}

#[test]
fn elsewhere() {
    let mut source = source();
    source.assets = ranked(&[0.12, 0.0]);
    source.elsewhere_probability = 0.88;
    source.verdict = Verdict { statement: Statement::Elsewhere, assets: vec![], probability: 0.88 };
    let text = table(&document(vec![source]));
    assert_eq!(first_line(&text), "On none of the listed assets   88 %");
    assert!(joined(&text).contains("It could also be Bushing T1 phase A 12 % Position"), "{text}");
}

#[test]
fn cannot_tell_comes_first_and_never_with_a_single_name() {
    let mut source = source();
    source.assets = ranked(&[0.5, 0.2, 0.15, 0.0, 0.0]);
    source.elsewhere_probability = 0.15;
    source.verdict = Verdict { statement: Statement::CannotTell, assets: vec![], probability: 0.5 };
    let text = table(&document(vec![source.clone()]));
    assert!(
        joined(&text).starts_with(
            "Cannot tell: Bushing T1 phase A 50 %, Bushing T1 phase B 20 %, Arrester phase A 15 % or elsewhere (on none \
             of the assets) 15 % Marl Bank:"
        ),
        "{text}"
    );

    source.flags = vec![Flag::PoorFit];
    source.assets = ranked(&[0.995, 0.004]);
    source.elsewhere_probability = 0.001;
    source.verdict.probability = 0.995;
    let text = table(&document(vec![source.clone()]));
    assert_eq!(first_line(&text), "Cannot tell: the arrivals fit no place within their errors");
    assert!(joined(&text).contains("Unreliable Bushing T1 phase A >99 %"), "{text}");

    source.flags = vec![];
    assert_eq!(first_line(&table(&document(vec![source]))), "Cannot tell on which asset it is");
}

#[test]
fn an_unknown_range_gives_no_point() {
    let mut source = source();
    source.flags = vec![Flag::RangeUndetermined, Flag::FewAntennas];
    let text = table(&document(vec![source.clone()]));
    let joined = joined(&text);
    assert!(!text.contains("11.90") && !text.contains("Position"), "{text}");
    assert!(
        joined.contains("Direction 62.1 ± 0.4° from north, 24.0 ± 0.6° up, seen from x 6.00, y 5.00"),
        "{text}"
    );
    assert!(joined.contains("Distance 6.10 to 41.0 m from there (95 %); a point is not known"), "{text}");
    assert!(joined.contains("the direction is known, the distance is not; too few antennas"), "{text}");

    let mut each = document(vec![source.clone(), source]);
    each.head.options.insert("each".into(), true.into());
    assert!(!table(&each).contains("11.90"));
}

#[test]
fn a_plane_has_one_height() {
    let mut source = source();
    source.region = Region { area_m2: Some(0.3), volume_m3: None, ..source.region };
    assert!(joined(&table(&document(vec![source]))).contains("Height searched at 4.90 m only"));
}

#[test]
fn no_source() {
    let text = table(&document(vec![]));
    assert_eq!(first_line(&text), "No source found");
    let joined = joined(&text);
    assert!(joined.contains("Marl Bank: 40 captures, none of them tells a place."), "{text}");
    assert!(joined.contains("With a pulse 1 capture, without a common place"), "{text}");
    assert!(
        joined.contains("Rejected 1 capture without enough pulses, or not readable: 1 x no pulse"),
        "{text}"
    );
}

#[test]
fn what_was_stopped_says_so() {
    for sources in [vec![], vec![source()]] {
        let mut document = document(sources);
        document.incomplete = true;
        document.captures.read = 38;
        document.head.inputs.count = 90;
        let text = table(&document);
        assert!(text.contains("INCOMPLETE: stopped after 38 of 90 captures."), "{text}");
        assert!(text.contains("38 of 38 captures agree") || text.contains("38 captures, none"), "{text}");
    }
}

#[test]
fn captures_one_by_one() {
    let mut other = source();
    other.verdict = Verdict { statement: Statement::CannotTell, assets: vec![], probability: 0.4 };
    let mut document = document(vec![source(), other, source()]);
    document.head.options.insert("each".into(), true.into());
    let text = table(&document);
    assert_eq!(first_line(&text), "Marl Bank solved one by one: 3 of 40 captures gave a position");
    let joined = joined(&text);
    assert!(joined.contains("1 Bushing T1 phase A 2 2 cannot tell 1"), "{text}");
    assert!(joined.contains("shot_1.csv 11.90 8.10 5.30 0.30 1 93 %"), "{text}");
    assert!(joined.contains("shot_1.csv 11.90 8.10 5.30 0.30 2 -"), "{text}");
}

#[test]
fn on_a_narrow_terminal_words_are_broken_to_its_width() {
    let text = "Words that are long enough to be broken into several lines of any terminal, narrow or not.";
    for columns in [40, 50, 66] {
        let screen = Screen::UNICODE.of_columns(Some(columns));
        let rows = [vec![text.to_owned(), "1.25".to_owned()]];
        for told in [
            layout::headline(text, screen),
            layout::paragraph(text, screen),
            layout::labelled(&[("Label".to_owned(), text.to_owned())], screen),
            layout::bullets(&[text.to_owned()], screen),
            layout::columns(&[("Words", Side::Left), ("Number", Side::Right)], &rows, screen),
        ] {
            let told = plain(&told);
            let widest = told.lines().map(|line| line.chars().count()).max().unwrap();
            assert!(
                widest <= usize::from(columns) && widest + 14 > usize::from(columns),
                "{columns}:\n{told}"
            );
        }
    }
}

#[test]
fn a_name_from_a_file_cannot_steer_the_terminal() {
    let mut source = source();
    source.verdict.assets = vec!["\x1b[2Jhidden".into()];
    let text = super::locate::text(&document(vec![source]), Screen::ASCII, false);
    assert!(!text.contains("\x1b[2J") && text.contains("?[2Jhidden"), "{text}");
}

#[test]
fn sheets_have_a_field_for_every_column() {
    let mut unknown = source();
    unknown.covariance_m2 = None;
    unknown.ellipse = None;
    unknown.bearing.range_m = None;
    unknown.flags = vec![Flag::FewAntennas, Flag::RangeUndetermined];
    let text = crate::sheet::locate::text(&document(vec![source(), unknown])).unwrap();
    let mut rows = csv::Reader::from_reader(text.as_bytes());
    let header = rows.headers().unwrap().clone();
    let rows: Vec<csv::StringRecord> = rows.records().collect::<Result<_, _>>().unwrap();
    let field = |row: usize, name: &str| &rows[row][header.iter().position(|column| column == name).unwrap()];
    assert_eq!((field(0, "x_m"), field(0, "sigma_z_m"), field(0, "statement")), ("11.9", "0.2", "one"));
    assert_eq!((field(1, "sigma_z_m"), field(1, "range_min_m")), ("", ""));
    assert_eq!(field(1, "flags"), "few-antennas;range-undetermined");
    assert_eq!((field(0, "range_max_m"), field(0, "last")), ("41.0", "2026-03-04T10:16:10Z"));
}
