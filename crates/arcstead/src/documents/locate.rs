//! `arcstead/locate/1`: the sources found, where they are, and on which asset.

use serde::{Deserialize, Serialize};

use super::head::Head;
use super::written::Document;
use crate::capture_time::CaptureTime;

/// The sources found in a visit. Positions are in site coordinates: metres, x east, y north, z up.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct LocateDocument {
    /// What every document begins with.
    #[serde(flatten)]
    pub head: Head,
    /// Whether the run was stopped before all captures were read. Written only when it was.
    #[serde(default, skip_serializing_if = "is_false")]
    pub incomplete: bool,
    /// What became of the captures.
    pub captures: CaptureCounts,
    /// The sources, the one with most captures first.
    pub sources: Vec<SourceResult>,
    /// What the reader of the result must know beside it, in sentences.
    pub cautions: Vec<String>,
}

impl Document for LocateDocument {
    const SCHEMA: &'static str = "arcstead/locate/1";

    fn head(&self) -> &Head {
        &self.head
    }
}

pub(super) fn is_false(flag: &bool) -> bool {
    !flag
}

/// What became of the captures.
#[derive(Debug, Clone, PartialEq, Eq, Default, Serialize, Deserialize)]
pub struct CaptureCounts {
    /// Captures read.
    pub read: usize,
    /// Captures that belong to a source that is told.
    pub used: usize,
    /// Captures with a pulse that belongs to no source.
    pub stray: usize,
    /// Captures that gave no arrivals, each with its reason.
    pub rejected: Vec<RejectedCapture>,
}

/// A capture that gave no arrivals.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
pub struct RejectedCapture {
    /// Name of the capture.
    pub capture: String,
    /// Why, in words.
    pub reason: String,
}

/// One source.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct SourceResult {
    /// Number of captures of this source.
    pub captures: usize,
    /// Best point of the mode that holds most posterior mass, in metres.
    pub position_m: [f64; 3],
    /// Covariance of the position in m^2: the sum of the random and the systematic part. On a plane the third row and
    /// column are zero. None where the times fix no point (far outside a small array).
    pub covariance_m2: Option<[[f64; 3]; 3]>,
    /// The part that more captures would lessen, in m^2.
    pub random_covariance_m2: Option<[[f64; 3]; 3]>,
    /// The part from delays, survey and response that no number of captures lessens, in m^2.
    pub systematic_covariance_m2: Option<[[f64; 3]; 3]>,
    /// Horizontal ellipse of the covariance.
    pub ellipse: Option<Ellipse>,
    /// Highest-posterior-density region inside the search volume.
    pub region: Region,
    /// Direction to the position from the middle of the array.
    pub bearing: Bearing,
    /// How well the times agree with the position.
    pub fit: Fit,
    /// One entry per antenna of the site, in its order.
    pub antennas: Vec<AntennaResult>,
    /// What is stated about the asset.
    pub verdict: Verdict,
    /// All assets of the site, the most probable first; with `elsewhere_probability` they sum to 1.
    pub assets: Vec<AssetProbability>,
    /// Probability that the source is on none of the assets.
    pub elsewhere_probability: f64,
    /// The other modes, the one with most posterior mass first.
    pub alternatives: Vec<Alternative>,
    /// What is remarkable about the result.
    pub flags: Vec<Flag>,
    /// Names of the stances whose captures were used; the positions of `[[antenna]]` are the stance `main`.
    pub stances: Vec<String>,
    /// Time of the first capture; none where the captures carry no time.
    pub first: Option<CaptureTime>,
    /// Time of the last capture.
    pub last: Option<CaptureTime>,
    /// Names of the captures, in the order they were read.
    pub members: Vec<String>,
}

/// The horizontal ellipse of a position's covariance.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Ellipse {
    /// Probability that it holds the source, 0 to 1.
    pub confidence: f64,
    /// Half of the long axis in metres.
    pub semi_major_m: f64,
    /// Half of the short axis in metres.
    pub semi_minor_m: f64,
    /// Direction of the long axis, clockwise from north (+y) in degrees, 0 to 180.
    pub azimuth_deg: f64,
}

/// The highest-posterior-density region inside the search volume.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Region {
    /// Probability that it holds the source, 0 to 1.
    pub confidence: f64,
    /// Volume in m^3; none for a search on a plane.
    pub volume_m3: Option<f64>,
    /// Area in m^2; given (and written) only for a search on a plane.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub area_m2: Option<f64>,
    /// Lowest corner of the box around it, in metres.
    pub min_m: [f64; 3],
    /// Highest corner of the box around it, in metres.
    pub max_m: [f64; 3],
    /// False when it touches the edge of the search volume: then it may go on outside.
    pub bounded: bool,
}

/// Direction to a source from the middle of the array.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Bearing {
    /// The middle of the antennas, in metres.
    pub from_m: [f64; 3],
    /// Clockwise from north (+y) in degrees, 0 to 360.
    pub azimuth_deg: f64,
    /// Above the horizontal in degrees, -90 to 90.
    pub elevation_deg: f64,
    /// Standard deviation of the azimuth in degrees; none where the times do not fix it.
    pub azimuth_sigma_deg: Option<f64>,
    /// Standard deviation of the elevation in degrees; none where the times do not fix it, and on a plane.
    pub elevation_sigma_deg: Option<f64>,
    /// Shortest and longest distance from `from_m` that the region holds, in metres; none where it was not worked out.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub range_m: Option<[f64; 2]>,
}

/// How well the times agree with the position.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Fit {
    /// Sum of squared whitened residuals of the antennas that see the position.
    pub chi_square: f64,
    /// Antennas used that see the position - 1 - unknown coordinates: an arrival that came round an obstacle checks nothing.
    pub degrees_of_freedom: usize,
    /// Probability of a chi-square at least as large by chance; none with no degree of freedom.
    pub p_value: Option<f64>,
}

/// What one antenna had to do with a source.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct AntennaResult {
    /// Name of the antenna.
    pub name: String,
    /// Whether its arrivals took part.
    pub used: bool,
    /// Arrival minus what the position explains, in nanoseconds, positive when late; none without an arrival.
    pub residual_ns: Option<f64>,
    /// Standard deviation of the arrival, random and systematic together, in nanoseconds; none without an arrival.
    pub sigma_ns: Option<f64>,
    /// Median over the captures of pulse peak over noise rms in dB, both after the timing band-pass.
    pub snr_db: Option<f64>,
    /// Whether the straight way from the position is clear of obstacles.
    pub line_of_sight: bool,
}

/// What is stated about the asset.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Verdict {
    /// The statement.
    pub statement: Statement,
    /// The assets it names: one for `one`, two or three for `one-of`, else none.
    pub assets: Vec<String>,
    /// Probability of what is stated, 0 to 1; with `cannot-tell` that of the most probable hypothesis.
    pub probability: f64,
}

/// The kinds of statement.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
#[non_exhaustive]
pub enum Statement {
    /// One asset has a probability of 0.8 or more.
    One,
    /// At most three assets together have 0.95 or more.
    OneOf,
    /// On none of the assets, with 0.8 or more.
    Elsewhere,
    /// Neither, or the times do not fit.
    CannotTell,
}

/// An asset and its probability.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct AssetProbability {
    /// Name of the asset.
    pub name: String,
    /// Probability that the source is on it, 0 to 1.
    pub probability: f64,
}

/// Another mode of the posterior.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Alternative {
    /// Its best point in metres.
    pub position_m: [f64; 3],
    /// The posterior mass it holds, 0 to 1.
    pub probability: f64,
}

/// What is remarkable about a result.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
#[non_exhaustive]
pub enum Flag {
    /// As many unknowns as data: no arrival can be checked.
    FewAntennas,
    /// The range interval spans more than 2 to 1 or touches the edge of the search: trust the bearing, not the point.
    RangeUndetermined,
    /// Another mode holds 0.05 or more.
    MirrorAmbiguity,
    /// Chi-square is larger than chance allows (p < 0.001).
    PoorFit,
    /// An arrival is late: reflected, or its way is hidden.
    AntennaLate,
    /// An arrival is too early: a cycle slip, a noise pick, or a wrong delay or position.
    AntennaEarly,
    /// The region touches the edge of the search volume.
    RegionTouchesSearchEdge,
    /// The position rests on arrivals that came round an obstacle, late by unknown amounts; nothing is stated.
    Hidden,
    /// The captures scatter far more than their sigmas allow: the sigmas are wrong, or more than one source discharges;
    /// nothing is stated.
    Scattered,
}

impl Flag {
    /// Its name in documents.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::FewAntennas => "few-antennas",
            Self::RangeUndetermined => "range-undetermined",
            Self::MirrorAmbiguity => "mirror-ambiguity",
            Self::PoorFit => "poor-fit",
            Self::AntennaLate => "antenna-late",
            Self::AntennaEarly => "antenna-early",
            Self::RegionTouchesSearchEdge => "region-touches-search-edge",
            Self::Hidden => "hidden",
            Self::Scattered => "scattered",
        }
    }
}

impl Statement {
    /// Its name in documents.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::One => "one",
            Self::OneOf => "one-of",
            Self::Elsewhere => "elsewhere",
            Self::CannotTell => "cannot-tell",
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::documents::{DocumentError, Inputs, Program};

    fn document() -> LocateDocument {
        LocateDocument {
            head: Head {
                schema: LocateDocument::SCHEMA.into(),
                program: Program::this(),
                site: Some("Marl Bank".into()),
                inputs: Inputs { files: vec!["shot_1.csv".into()], count: 1, site_sha256: Some("00".into()) },
                options: serde_json::Map::from_iter([("confidence".to_owned(), 0.95.into())]),
            },
            incomplete: false,
            captures: CaptureCounts {
                read: 2,
                used: 1,
                stray: 0,
                rejected: vec![RejectedCapture { capture: "shot_2.csv".into(), reason: "no pulse".into() }],
            },
            sources: vec![SourceResult {
                captures: 1,
                position_m: [11.9, 8.1, 5.3],
                covariance_m2: Some([[0.01, 0.0, 0.0], [0.0, 0.01, 0.0], [0.0, 0.0, 0.04]]),
                random_covariance_m2: None,
                systematic_covariance_m2: None,
                ellipse: Some(Ellipse {
                    confidence: 0.95,
                    semi_major_m: 0.3,
                    semi_minor_m: 0.2,
                    azimuth_deg: 41.0,
                }),
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
                    elevation_sigma_deg: None,
                    range_m: None,
                },
                fit: Fit { chi_square: 0.0, degrees_of_freedom: 0, p_value: None },
                antennas: vec![AntennaResult {
                    name: "A1".into(),
                    used: true,
                    residual_ns: Some(0.04),
                    sigma_ns: Some(0.08),
                    snr_db: Some(21.0),
                    line_of_sight: true,
                }],
                verdict: Verdict {
                    statement: Statement::One,
                    assets: vec!["Bushing T1 phase A".into()],
                    probability: 0.97,
                },
                assets: vec![AssetProbability { name: "Bushing T1 phase A".into(), probability: 0.97 }],
                elsewhere_probability: 0.03,
                alternatives: vec![Alternative { position_m: [3.1, 20.2, 4.0], probability: 0.02 }],
                flags: vec![Flag::MirrorAmbiguity],
                stances: vec!["main".into()],
                first: Some("2026-03-04T10:15:00Z".parse().unwrap()),
                last: None,
                members: vec!["shot_1.csv".into()],
            }],
            cautions: vec!["none".into()],
        }
    }

    /// The keys of a JSON object in the order they are written.
    fn keys(value: &serde_json::Value) -> Vec<&str> {
        value.as_object().unwrap().keys().map(String::as_str).collect()
    }

    #[test]
    fn fields_stand_in_the_promised_order() {
        let text = document().to_json().unwrap();
        let json: serde_json::Value = serde_json::from_str(&text).unwrap();
        assert_eq!(
            keys(&json),
            ["schema", "program", "site", "inputs", "options", "captures", "sources", "cautions"]
        );
        let source = &json["sources"][0];
        assert_eq!(
            keys(source),
            [
                "captures",
                "position_m",
                "covariance_m2",
                "random_covariance_m2",
                "systematic_covariance_m2",
                "ellipse",
                "region",
                "bearing",
                "fit",
                "antennas",
                "verdict",
                "assets",
                "elsewhere_probability",
                "alternatives",
                "flags",
                "stances",
                "first",
                "last",
                "members"
            ]
        );
        assert_eq!(keys(&source["region"]), ["confidence", "volume_m3", "min_m", "max_m", "bounded"]);
        assert_eq!(
            keys(&source["antennas"][0]),
            ["name", "used", "residual_ns", "sigma_ns", "snr_db", "line_of_sight"]
        );
        assert_eq!(source["flags"], serde_json::json!(["mirror-ambiguity"]));
        assert_eq!(source["verdict"]["statement"], "one");
        assert_eq!(source["first"], "2026-03-04T10:15:00Z");
        assert!(source["last"].is_null() && source["fit"]["p_value"].is_null());
    }

    #[test]
    fn what_is_written_reads_back() {
        let whole = document();
        assert_eq!(LocateDocument::from_json(&whole.to_json().unwrap()).unwrap(), whole);
        let stopped = LocateDocument { incomplete: true, ..document() };
        let text = stopped.to_json().unwrap();
        assert!(text.contains("\"incomplete\": true"));
        assert_eq!(LocateDocument::from_json(&text).unwrap(), stopped);
    }

    #[test]
    fn a_number_that_is_none_is_refused_by_name() {
        let mut wrong = document();
        wrong.sources[0].bearing.azimuth_sigma_deg = Some(f64::NAN);
        let Err(DocumentError::NotFinite(refused)) = wrong.to_json() else { panic!("NaN was written") };
        assert_eq!(refused.field, "sources[0].bearing.azimuth_sigma_deg");
    }

    #[test]
    fn another_document_is_refused() {
        let mut other = document();
        other.head.schema = "arcstead/plan/1".into();
        assert!(matches!(other.to_json(), Err(DocumentError::Schema { .. })));
        let text = document().to_json().unwrap().replace("arcstead/locate/1", "arcstead/locate/2");
        let error = LocateDocument::from_json(&text).unwrap_err();
        assert_eq!(
            error.to_string(),
            "the document says schema `arcstead/locate/2`; expected `arcstead/locate/1`"
        );
        assert!(matches!(LocateDocument::from_json("{"), Err(DocumentError::Json(_))));
    }

    #[test]
    fn every_flag_and_statement_has_its_promised_name() {
        let flags = [
            Flag::FewAntennas,
            Flag::RangeUndetermined,
            Flag::MirrorAmbiguity,
            Flag::PoorFit,
            Flag::AntennaLate,
            Flag::AntennaEarly,
            Flag::RegionTouchesSearchEdge,
            Flag::Hidden,
            Flag::Scattered,
        ];
        assert_eq!(serde_json::to_value(flags).unwrap(), serde_json::json!(flags.map(Flag::name)));
        assert_eq!(
            serde_json::to_value(flags).unwrap(),
            serde_json::json!([
                "few-antennas",
                "range-undetermined",
                "mirror-ambiguity",
                "poor-fit",
                "antenna-late",
                "antenna-early",
                "region-touches-search-edge",
                "hidden",
                "scattered"
            ])
        );
        let statements = [Statement::One, Statement::OneOf, Statement::Elsewhere, Statement::CannotTell];
        assert_eq!(
            serde_json::to_value(statements).unwrap(),
            serde_json::json!(statements.map(Statement::name))
        );
        assert_eq!(
            serde_json::to_value(statements).unwrap(),
            serde_json::json!(["one", "one-of", "elsewhere", "cannot-tell"])
        );
    }
}
