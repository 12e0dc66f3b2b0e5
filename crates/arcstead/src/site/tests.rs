//! Whole site files: what a right one says, and what is told about wrong ones. All sites are invented.

use super::*;
use approx::assert_relative_eq;
use arcstead_solver::{Air, PositionSigma};
use nalgebra::Vector3;

/// A site file that uses every key.
const WHOLE: &str = r#"schema = 1

[site]
name = "Marl Bank 132 kV, bay 3"
mains_frequency_hz = 50
origin = { latitude_deg = 52.0, longitude_deg = -1.5, height_m = 80.0 }

[air]
refractivity_n_units = 300

[search]
min_m = [-5.0, -5.0, 0.0]
max_m = [30.0, 25.0, 14.0]

[verdict]
elsewhere_prior = 0.2
late_prior = 0.05
late_scale_ns = 12.0

[recorder]
sample_rate_gsps = 5.0
bandwidth_mhz = 1500
bits = 8

[planning]
snr_at_10m_db = 20.0

[[antenna]]
name = "A1"
channel = 2
position_m = [0.0, 0.0, 2.0]
position_sigma_m = 0.02
delay_ns = 52.10
delay_sigma_ns = 0.05
response_sigma_ns = 0.07
band_mhz = [300, 1500]

[[antenna]]
name = "A2"
channel = 1
position_m = [12, 0, 2]
position_sigma_m = [0.01, 0.02, 0.05]

[[antenna]]
name = "A3"
channel = 3
position_m = [12.0, 9.0, 3.2]

[[antenna]]
name = "A4"
channel = 4
position_m = [0.0, 9.0, 1.4]

[[asset]]
name = "Bushing T1 phase A"
kind = "bushing"
at_m = [12.0, 8.0, 6.2]

[[asset]]
name = "String 3"
from_m = [4.0, 4.0, 9.0]
to_m = [4.0, 4.0, 11.0]
radius_m = 0.2
weight = 2

[[obstacle]]
name = "relay house"
footprint_m = [[4.0, 4.0], [8.0, 4.0], [8.0, 7.0], [4.0, 7.0]]
top_m = 3.5

[[stand_area]]
footprint_m = [[-4.0, -4.0], [28.0, -4.0], [28.0, 0.0], [-4.0, 0.0]]
height_m = [1.2, 3.5]

[[keep_out]]
name = "live busbar clearance"
footprint_m = [[10.0, 6.0], [14.0, 6.0], [14.0, 8.0], [10.0, 8.0]]

[[stance]]
name = "south gate"
position_m = { A1 = [2.0, -14.0, 2.0], A2 = [14.0, -14.5, 2.0], A3 = [13.0, -6.0, 3.2], A4 = [1.0, -6.0, 1.4] }

[[mark]]
name = "corner post"
position_m = [0.0, 10.0, 0.0]

[[tape]]
between = ["A1", "corner post"]
distance_m = 10.198
sigma_m = 0.01
"#;

/// The least that a site file for `locate` on a plane says.
const LEAST: &str = r#"schema = 1
[site]
name = "Marl Bank"
[[antenna]]
name = "A1"
channel = 1
position_m = [0.0, 0.0, 2.0]
"#;

/// The mistakes in the text, as `LINE:COLUMN: text`.
fn told(text: &str) -> Vec<String> {
    match Site::parse(text, "site.toml") {
        Err(SiteError::Mistakes { mistakes, .. }) => mistakes.iter().map(Mistake::to_string).collect(),
        other => panic!("expected mistakes, found {other:?}"),
    }
}

/// The one mistake in `WHOLE` once `from` is replaced by `to`.
fn told_after(from: &str, to: &str) -> String {
    assert_eq!(WHOLE.matches(from).count(), 1, "{from}");
    let mut told = told(&WHOLE.replace(from, to));
    assert_eq!(told.len(), 1, "{told:#?}");
    told.remove(0)
}

#[test]
fn a_whole_site_is_read_in_si_units() {
    let site = Site::parse(WHOLE, "site.toml").unwrap();
    assert_eq!(site.name, "Marl Bank 132 kV, bay 3");
    assert_eq!(site.mains_frequency_hz, Some(50.0));
    assert_eq!(site.origin, Some(Origin { latitude_deg: 52.0, longitude_deg: -1.5, height_m: 80.0 }));
    assert_eq!(site.geometry.air, Air::from_refractivity(300.0));
    assert_eq!(site.geometry.search.min_m, Vector3::new(-5.0, -5.0, 0.0));
    assert_eq!(site.geometry.search.max_m, Vector3::new(30.0, 25.0, 14.0));
    assert_relative_eq!(site.geometry.priors.elsewhere, 0.2);
    assert_relative_eq!(site.geometry.priors.late, 0.05);
    assert_relative_eq!(site.geometry.priors.late_scale_s, 12e-9);
    assert_eq!(
        site.recorder,
        Recorder { sample_rate_hz: Some(5e9), bandwidth_hz: Some(1.5e9), bits: Some(8) }
    );
    assert_eq!(site.planning.snr_at_10m_db, Some(20.0));

    let first = &site.geometry.antennas[0];
    assert_eq!(first.position_sigma, PositionSigma::Isotropic(0.02));
    assert_relative_eq!(first.delay_sigma_s, 0.05e-9);
    assert_relative_eq!(first.response_sigma_s, 0.07e-9);
    assert_eq!(site.chains[0].channel, 1, "counted from 0");
    assert_relative_eq!(site.chains[0].delay_s, 52.10e-9);
    assert_eq!(site.chains[0].band_hz, Some((3e8, 1.5e9)));
    let second = &site.geometry.antennas[1];
    assert_eq!(second.position_m, Vector3::new(12.0, 0.0, 2.0));
    assert_eq!(second.position_sigma, PositionSigma::PerAxis(Vector3::new(0.01, 0.02, 0.05)));

    let [bushing, string] = &site.geometry.assets[..] else { panic!("two assets") };
    assert_eq!((bushing.from_m, bushing.kind.as_str()), (bushing.to_m, "bushing"));
    assert_eq!(string.to_m, Vector3::new(4.0, 4.0, 11.0));
    assert_relative_eq!(string.radius_m, 0.2);
    assert_relative_eq!(string.weight, 2.0);
    assert_eq!(site.geometry.obstacles[0].footprint_m.len(), 4);
    assert_relative_eq!(site.geometry.obstacles[0].base_m, 0.0);
    assert!(site.stand_areas[0].contains(&Vector3::new(0.0, -1.0, 2.0)));
    assert!(!site.stand_areas[0].contains(&Vector3::new(0.0, -1.0, 4.0)));
    assert!(site.keep_outs[0].contains(&Vector3::new(12.0, 7.0, 100.0)));
    assert_eq!(site.tapes[0].between, (TapeEnd::Antenna(0), TapeEnd::Mark(0)));
    assert_eq!(site.antenna_named("A3"), Some(2));

    let south = site.geometry_of_stance("south gate").unwrap();
    assert_eq!(south.antennas[3].position_m, Vector3::new(1.0, -6.0, 1.4));
    assert_eq!(site.geometry_of_stance(MAIN_STANCE), Some(site.geometry.clone()));
    assert_eq!(site.geometry_of_stance("north gate"), None);
    assert!(site.ready_to_locate().is_ok());
}

#[test]
fn what_is_not_said_has_its_default() {
    let site = Site::parse(LEAST, "site.toml").unwrap();
    let antenna = &site.geometry.antennas[0];
    assert_eq!(antenna.position_sigma, PositionSigma::Isotropic(0.03));
    assert_relative_eq!(antenna.delay_sigma_s, 0.1e-9);
    assert_relative_eq!(antenna.response_sigma_s, 0.05e-9);
    assert_eq!(site.chains[0], Chain { channel: 0, delay_s: 0.0, band_hz: None });
    assert_eq!(site.geometry.air, Air::default());
    assert_eq!(site.geometry.priors, arcstead_solver::Priors::default());
    assert_eq!(site.geometry.search.min_m, Vector3::new(-5.0, -5.0, 0.0));
    assert_eq!(site.geometry.search.max_m, Vector3::new(5.0, 5.0, 7.0));
    assert_eq!((site.recorder, site.planning), (Recorder::default(), Planning::default()));
    let asset = "\n[[asset]]\nname = \"X\"\nat_m = [0, 0, 0]\n";
    let with_asset = Site::parse(&format!("{LEAST}{asset}"), "site.toml").unwrap();
    assert_relative_eq!(with_asset.geometry.assets[0].radius_m, 0.3);
    assert_relative_eq!(with_asset.geometry.assets[0].weight, 1.0);
}

#[test]
fn all_mistakes_of_a_file_are_told_at_once() {
    let text = r#"schema = 1

[site]
nam = "Marl Bank"

[air]
refractivity_n_units = 315
speed_m_per_ns = 0.2

[recorder]
sample_rate_gsps = 5e9
bits = 65

[[antenna]]
name = "A1"
channel = 1
posiiton_m = [0.0, 0.0, 2.0]

[[antenna]]
name = "A1"
channel = 1
position_m = [0.0, nan]
position_sigma_m = 0
band_mhz = [3e8, 1.5e9]

[[asset]]
name = "String 3"
at_m = [1.0, 2.0, 3.0]
from_m = [1.0, 2.0, 3.0]
weight = "heavy"

[[obstacle]]
name = "house"
footprint_m = [[0, 0], [4, 4], [4, 0], [0, 4]]
base_m = 3.0
top_m = 2.0

[[stance]]
name = "main"
position_m = { A1 = [0, 0, 2], A7 = [0, 0, 2] }
"#;
    assert_eq!(
        told(text),
        [
            "3:1: [site] has no `name`; expected a name in quotes",
            "4:1: unknown key `nam` in [site], did you mean `name`?",
            "8:18: [air] has both `refractivity_n_units` and `speed_m_per_ns`; expected one of the two",
            "11:20: `sample_rate_gsps` in [recorder] is 5e9; expected a sample rate above 0 and at most 1000 GS/s: \
             5e9 samples per second is 5 GS/s",
            "12:8: `bits` in [recorder] is 65; expected a whole number from 1 to 64",
            "14:1: [[antenna]] `A1` has no `position_m`; expected a place [x, y, z] in metres",
            "17:1: unknown key `posiiton_m` in [[antenna]] `A1`, did you mean `position_m`?",
            "20:8: the antenna name `A1` is taken: it stands in line 15 already; expected each once",
            "21:11: the channel `1` is taken: it stands in line 16 already; expected each once",
            "22:14: `position_m` in [[antenna]] `A1` has 2 values; expected a place [x, y, z] in metres",
            "23:20: `position_sigma_m` in [[antenna]] `A1` is 0; expected a standard deviation above 0 and at most 10 m",
            "24:13: `band_mhz` in [[antenna]] `A1` is 3e8; expected a frequency above 0 and at most 100000 MHz: \
             3e8 hertz is 300 MHz",
            "24:18: `band_mhz` in [[antenna]] `A1` is 1.5e9; expected a frequency above 0 and at most 100000 MHz: \
             1.5e9 hertz is 1500 MHz",
            "29:10: [[asset]] `String 3` has both `at_m` and `from_m`; expected one of the two",
            "29:10: [[asset]] `String 3` has `from_m` but no `to_m`; expected both",
            "30:10: `weight` in [[asset]] `String 3` is \"heavy\", a text; expected a weight from 0.000001 to 1000000",
            "34:32: the footprint of [[obstacle]] `house` crosses itself: the side from corner 1 meets the side from \
             corner 3; expected the corners in order round the outline",
            "36:9: `top_m` in [[obstacle]] `house`: 3 is not below 2; expected `base_m` (0 where not given) below `top_m`",
            "39:8: `name` in [[stance]] `main` is \"main\"; expected another name: `main` is where the [[antenna]] \
             tables stand",
            "40:32: `position_m` in [[stance]] `main`: there is no antenna `A7`, did you mean `A1`?",
        ]
    );
}

#[test]
fn the_file_is_named_before_every_line() {
    let error = Site::parse("schema = 1\n", "visits/site.toml").unwrap_err().to_string();
    assert_eq!(
        error,
        "visits/site.toml:1:1: the file has no `site`; expected a table [site] with the name of the site\n\
         visits/site.toml:1:1: there is nothing to search around; expected an [[antenna]] or [[asset]], or [search] \
         with min_m and max_m"
    );
}

#[test]
fn text_that_is_no_toml_is_told_with_its_place() {
    assert_eq!(
        told("schema = 1\nschema = 1\n[[antenna]\nname = = \"A\"\n"),
        [
            "2:1: not TOML at `schema`: duplicate key",
            "3:11: not TOML: unclosed array table, expected `]`",
            "4:8: not TOML at `=`: extra `=`, expected nothing",
        ]
    );
    // Columns count characters, not bytes.
    assert!(told("schema = 1\n\"\u{e9}\u{e9}\" = = 1\n")[0].starts_with("2:8:"));
}

#[test]
fn another_schema_is_told_alone() {
    let text = WHOLE.replace("schema = 1\n", "schema = 2\nnew_table = 3\n");
    assert_eq!(told(&text), ["1:10: schema is 2; this program reads schema 1"]);
    assert_eq!(told(&WHOLE.replace("schema = 1", "schema = \"1\"")).len(), 1);
    assert_eq!(
        told(&WHOLE.replace("schema = 1\n", "")),
        ["1:1: the file has no `schema`; expected schema = 1"]
    );
}

#[test]
fn one_mistake_each() {
    for (from, to, expected) in [
        ("[[keep_out]]", "[keep_out]", "[[keep_out]] with two brackets"),
        ("channel = 2", "channel = 0", "a whole number from 1 to 256"),
        ("channel = 2", "channel = 2.0", "is 2.0, a number; expected a whole number from 1 to 256"),
        ("channel = 2\n", "", "has no `channel`; expected the channel of the capture, counted from 1"),
        ("name = \"String 3\"", "name = \" String 3\"", "no blanks around the name"),
        ("name = \"String 3\"", "name = \"\"", "a name that is not empty"),
        ("delay_ns = 52.10", "delay_ns = 52.1e-9", "52.1e-9 seconds is 52.1 ns"),
        (
            "delay_ns = 52.10",
            "delay_ns = inf",
            "`delay_ns` in [[antenna]] `A1` is inf; expected a finite number",
        ),
        ("delay_ns = 52.10", "delay_ns = 1e999", "is 1e999; expected a finite number"),
        ("delay_ns = 52.10", "delay_ns = 2026-03-04", "a date; expected a delay"),
        ("delay_sigma_ns = 0.05", "delay_sigma_ns = -0.05", "above 0 and at most 1000 ns"),
        ("band_mhz = [300, 1500]", "band_mhz = [1500, 300]", "1500 is not below 300"),
        ("[12, 0, 2]", "[12000000, 0, 2]", "12000000 millimetres is 12000 m"),
        ("[0.01, 0.02, 0.05]", "[0.01, 0.02]", "has 2 values; expected one number, or [x, y, z]"),
        ("[0.01, 0.02, 0.05]", "[0.01, 0, 0.05]", "is 0; expected a standard deviation above 0"),
        (
            "position_m = [12, 0, 2]",
            "position_wgs84 = [52.0, -1.5, 80.0]\nposition_m = [12, 0, 2]",
            "in degrees are not read yet; give `position_m`",
        ),
        (
            "at_m = [12.0, 8.0, 6.2]",
            "",
            "has no `at_m`; expected the place [x, y, z] in metres, or a straight piece",
        ),
        ("to_m = [4.0, 4.0, 11.0]", "", "has `from_m` but no `to_m`; expected both"),
        (
            "name = \"String 3\"",
            "name = \"Bushing T1 phase A\"",
            "the asset name `Bushing T1 phase A` is taken: it stands in line 55 already",
        ),
        ("radius_m = 0.2", "radius_m = -0.2", "a radius from 0 to 100 m"),
        ("weight = 2", "weight = 0", "a weight from 0.000001"),
        ("elsewhere_prior = 0.2", "elsewhere_prior = 20", "20 per cent is 0.2"),
        ("late_scale_ns = 12.0", "late_scale_ns = 0", "a time above 0"),
        ("refractivity_n_units = 300", "refractivity_n_units = 1.0003", "(n - 1) 1e6"),
        ("refractivity_n_units = 300", "speed_m_per_ns = 2.0e8", "2.0e8 m/s is 0.2 m/ns"),
        ("mains_frequency_hz = 50", "mains_frequency_hz = 0", "a mains frequency from 1 to 1000 Hz"),
        ("latitude_deg = 52.0", "latitude_deg = 152.0", "a latitude from -90 to 90"),
        (", height_m = 80.0 }", " }", "`origin` of [site] has no `height_m`"),
        ("top_m = 3.5", "top_m = 0", "0 is not below 0"),
        ("height_m = [1.2, 3.5]", "height_m = 1.2", "the lowest and highest antenna height"),
        ("[14.0, 6.0], [14.0, 8.0], [10.0, 8.0]]", "[14.0, 6.0]]", "has 2 corners; expected 3 to 1000"),
        ("[10.0, 8.0]]", "[10.0, 8.0], [10.0, 6.0]]", "corners 5 and 1 of the footprint"),
        ("[10.0, 8.0]]", "[10.0]]", "has 1 values; expected a corner [x, y]"),
        (
            "max_m = [30.0, 25.0, 14.0]",
            "max_m = [30.0, -25.0, 14.0]",
            "-5 is not below -25; expected y of `min_m`",
        ),
        ("max_m = [30.0, 25.0, 14.0]", "max_m = [30.0, 25.0, 0.0]", "or `height_m` for a search on a plane"),
        ("max_m = [30.0, 25.0, 14.0]", "", "has `min_m` but no `max_m`"),
        (
            "max_m = [30.0, 25.0, 14.0]",
            "max_m = [30.0, 25.0, 14.0]\nheight_m = 20.0",
            "is 20, outside 0 to 14",
        ),
        ("max_m = [30.0, 25.0, 14.0]", "max_m = [30.0, 25.0]", "expected a place [x, y, z]"),
        (", A4 = [1.0, -6.0, 1.4] }", " }", "does not place antenna `A4`"),
        (
            "A4 = [1.0, -6.0, 1.4] }",
            "A4 = [1.0, -6.0] }",
            "`A4` in `position_m` of [[stance]] `south gate` has 2 values",
        ),
        ("name = \"south gate\"", "name = \"south=gate\"", "without `=`"),
        (
            "name = \"corner post\"",
            "name = \"corner pots\"",
            "no antenna or mark `corner post`, did you mean `corner pots`?",
        ),
        ("[\"A1\", \"corner post\"]", "[\"A1\"]", "has 1 values; expected two names"),
        ("[\"A1\", \"corner post\"]", "[\"A1\", \"A1\"]", "is between `A1` and itself"),
        ("[\"A1\", \"corner post\"]", "[\"A1\", 3]", "is 3, a whole number; expected two names"),
        ("distance_m = 10.198", "distance_m = 10198", "10198 millimetres is 10.198 m"),
        ("sigma_m = 0.01\n", "sigma_m = 0\n", "a standard deviation above 0"),
    ] {
        let told = told_after(from, to);
        assert!(told.contains(expected), "{to}: {told}");
    }
    let third = "name = \"A2\"\nposition_m = [0, 0, 0]\n[[mark]]\nname = \"corner post\"";
    assert!(
        told_after("name = \"corner post\"", third).contains("is \"A2\"; expected another name: an antenna")
    );
}

#[test]
fn a_search_on_a_plane() {
    let cut = Site::parse(&WHOLE.replace("14.0]\n", "14.0]\nheight_m = 6.0\n"), "").unwrap().geometry.search;
    assert!(cut.is_plane());
    assert_eq!((cut.min_m, cut.max_m), (Vector3::new(-5.0, -5.0, 6.0), Vector3::new(30.0, 25.0, 6.0)));
    let pairs = WHOLE.replace(
        "min_m = [-5.0, -5.0, 0.0]\nmax_m = [30.0, 25.0, 14.0]",
        "min_m = [-5.0, -5.0]\nmax_m = [30.0, 25.0]\nheight_m = 6.0",
    );
    assert_eq!(Site::parse(&pairs, "").unwrap().geometry.search, cut);
    let around = Site::parse(&format!("{LEAST}[search]\nheight_m = 1.0\n"), "").unwrap().geometry.search;
    assert_eq!((around.min_m, around.max_m), (Vector3::new(-5.0, -5.0, 1.0), Vector3::new(5.0, 5.0, 1.0)));
}

#[test]
fn what_locate_asks_beyond_the_file() {
    let text = WHOLE
        .replace("position_m = [12, 0, 2]", "position_m = [0.0, 0.0, 2.0005]")
        .replace("position_m = [12.0, 9.0, 3.2]", "position_m = [12.0, 7.0, 3.2]")
        .replace("A4 = [1.0, -6.0, 1.4]", "A4 = [6.0, 5.0, 1.4]");
    let site = Site::parse(&text, "site.toml").unwrap();
    assert_eq!(
        site.ready_to_locate().unwrap_err().to_string(),
        "site.toml:38:1: antennas `A1` and `A2` stand at the same place in stance `main`; expected them apart\n\
         site.toml:44:1: antenna `A3` stands inside the keep-out `live busbar clearance` in stance `main`, where the \
         site allows no antenna and no person\n\
         site.toml:79:1: antenna `A4` stands inside the obstacle `relay house` in stance `south gate`; expected it \
         outside"
    );
    let few = Site::parse(LEAST, "site.toml").unwrap();
    assert_eq!(
        few.ready_to_locate().unwrap_err().to_string(),
        "site.toml:4:1: 1 antennas; a place with 3 unknown coordinates needs at least 4"
    );
}

#[test]
fn files_are_read_and_hostile_ones_refused() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("site.toml");
    std::fs::write(&path, WHOLE).unwrap();
    let site = Site::read(&path).unwrap();
    assert_eq!(site, Site { path: path.clone(), ..Site::parse(WHOLE, "x").unwrap() });

    assert!(matches!(Site::read(folder.path()), Err(SiteError::NotAFile { .. })));
    assert!(matches!(Site::read(&folder.path().join("none")), Err(SiteError::Read { .. })));
    std::fs::write(&path, vec![b'#'; (4 << 20) + 1]).unwrap();
    assert!(matches!(Site::read(&path), Err(SiteError::TooLarge { .. })));
    std::fs::write(&path, b"schema = 1\n# \xc3\xa9\xff\n").unwrap();
    let error = Site::read(&path).unwrap_err().to_string();
    assert!(
        error.ends_with("site.toml:2:4: not text: the byte 0xff is no UTF-8; save the file as UTF-8"),
        "{error}"
    );
    let deep = format!("x = {}{}", "[".repeat(100_000), "]".repeat(100_000));
    assert!(Site::parse(&deep, "").is_err());
}

#[test]
fn an_antenna_without_a_position_is_for_tape_alone() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("site.toml");
    let text = WHOLE.replace("position_m = [12.0, 9.0, 3.2]\n", "");
    std::fs::write(&path, &text).unwrap();
    assert_eq!(
        told(&text),
        ["44:1: [[antenna]] `A3` has no `position_m`; expected a place [x, y, z] in metres"]
    );
    let site = Site::read_for_tape(&path).unwrap();
    assert_eq!(site.free_antennas, [2]);
    let told = site.ready_to_locate().unwrap_err().to_string();
    assert!(told.ends_with(
        "site.toml:44:1: [[antenna]] `A3` has no `position_m`; expected a place [x, y, z] in metres"
    ));
}

#[test]
fn the_digest_is_that_of_the_text() {
    // From GNU coreutils' sha256sum on the bytes of the text.
    assert_eq!(
        Site::parse(LEAST, "").unwrap().sha256,
        "a3657e711a8108a484711136e3f986fce9493f26da8ac5a85fa2fa88cf339745"
    );
}

#[test]
fn a_damaged_file_is_told_wherever_the_damage_is() {
    let lines = WHOLE.lines().count();
    let mut wrong = 0;
    for at in 0..WHOLE.len() {
        for with in ["", "\"", "[", "\n", "=", "-", "9", "\u{e9}"] {
            let damaged = format!("{}{with}{}", &WHOLE[..at], &WHOLE[at + 1..]);
            match Site::parse(&damaged, "site.toml") {
                // A digit more or a comment less still makes a site.
                Ok(site) => assert_eq!(site.chains.len(), site.geometry.antennas.len()),
                Err(SiteError::Mistakes { mistakes, .. }) => {
                    wrong += 1;
                    assert!(!mistakes.is_empty());
                    assert!(
                        mistakes.iter().all(|mistake| (1..=lines + 2).contains(&mistake.line)),
                        "{mistakes:?}"
                    );
                }
                Err(other) => panic!("{other}"),
            }
        }
    }
    assert!(wrong > 5 * WHOLE.len(), "most damage is noticed: {wrong} of {}", 8 * WHOLE.len());
}
