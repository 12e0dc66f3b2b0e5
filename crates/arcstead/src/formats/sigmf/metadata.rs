//! What a `.sigmf-meta` says, as far as it concerns the samples.

use serde_json::{Map, Value};

use super::datatype::Datatype;
use super::error::SigmfError;
use crate::formats::limits::MAX_CHANNELS;
use crate::{CaptureTime, CaptureTimeError};

/// The one extension known here; see [`super`].
pub(super) const EXTENSION: &str = "arcstead";
/// Its only key.
pub(super) const VOLTS_PER_COUNT: &str = "arcstead:volts_per_count";

/// The contents of a meta file.
#[derive(Debug)]
pub(super) struct Metadata {
    pub(super) datatype: Datatype,
    pub(super) sample_rate_hz: Option<f64>,
    pub(super) channel_count: ChannelCount,
    /// Name of a data file that is not called as the standard wants.
    pub(super) dataset: Option<String>,
    pub(super) trailing_bytes: u64,
    /// `core:offset`: the number of the first sample in the file.
    pub(super) offset: u64,
    /// One positive number per channel.
    pub(super) volts_per_count: Option<Vec<f64>>,
    /// In the order of the file, sorted by start; one at least.
    pub(super) segments: Vec<Segment>,
}

/// Channels as the file says: what cannot be read is kept to be told with the path.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum ChannelCount {
    /// 1 to [`MAX_CHANNELS`].
    Read(usize),
    /// Beyond.
    TooMany(u64),
}

/// One entry of `captures`.
#[derive(Debug)]
pub(super) struct Segment {
    pub(super) start: u64,
    pub(super) header_bytes: u64,
    /// A time that is none costs its own capture only.
    pub(super) time: Result<Option<CaptureTime>, CaptureTimeError>,
    pub(super) frequency_hz: Option<f64>,
}

impl Metadata {
    /// Reads the text of a meta file.
    pub(super) fn parse(text: &[u8]) -> Result<Self, SigmfError> {
        // JSON written on some systems begins with a byte order mark, which it should not.
        let text = text.strip_prefix(b"\xef\xbb\xbf").unwrap_or(text);
        let root: Value = serde_json::from_slice(text).map_err(SigmfError::Json)?;
        let global = match root.get("global") {
            Some(Value::Object(global)) => Keys { map: global, place: String::new() },
            Some(other) => return Err(wrong("global", other, "an object")),
            None => {
                return Err(missing("global", "an object with `core:datatype`; is this a SigMF meta file?"));
            }
        };
        check_version(&global)?;
        check_extensions(&global)?;
        if let Some(value @ Value::Bool(true)) = global.get("core:metadata_only") {
            return Err(wrong("core:metadata_only", value, "a recording with samples"));
        }
        let datatype = global.text("core:datatype")?.ok_or_else(|| missing("core:datatype", DATATYPES))?;
        let datatype = Datatype::parse(datatype).ok_or_else(|| SigmfError::Value {
            key: "core:datatype".into(),
            found: format!("\"{datatype}\""),
            expected: DATATYPES,
        })?;
        let channel_count = match global.count("core:num_channels")?.unwrap_or(1) {
            0 => return Err(wrong("core:num_channels", &Value::from(0), "1 or more")),
            found => match usize::try_from(found) {
                Ok(count) if count <= MAX_CHANNELS => ChannelCount::Read(count),
                _ => ChannelCount::TooMany(found),
            },
        };
        let offset = global.count("core:offset")?.unwrap_or(0);
        Ok(Self {
            datatype,
            sample_rate_hz: global.number("core:sample_rate")?,
            channel_count,
            dataset: global.text("core:dataset")?.map(str::to_owned),
            trailing_bytes: global.count("core:trailing_bytes")?.unwrap_or(0),
            offset,
            volts_per_count: volts_per_count(&global, datatype, channel_count)?,
            segments: segments(&root, offset)?,
        })
    }
}

const DATATYPES: &str = "r or c, then f32, f64, i32, i16, u32 or u16 with _le or _be, or i8 or u8 without";

fn check_version(global: &Keys<'_>) -> Result<(), SigmfError> {
    match global.text("core:version")? {
        Some(version) if version.split('.').next() != Some("1") => Err(SigmfError::Value {
            key: "core:version".into(),
            found: format!("\"{version}\""),
            expected: "a version that begins with 1.",
        }),
        // Required by the standard, but nothing here depends on it.
        _ => Ok(()),
    }
}

fn check_extensions(global: &Keys<'_>) -> Result<(), SigmfError> {
    let extensions = match global.get("core:extensions") {
        None => return Ok(()),
        Some(Value::Array(extensions)) => extensions,
        Some(other) => return Err(wrong("core:extensions", other, "an array")),
    };
    for extension in extensions {
        let name = extension.get("name").and_then(Value::as_str).unwrap_or("without a name");
        if extension.get("optional") == Some(&Value::Bool(false)) && name != EXTENSION {
            return Err(SigmfError::Extension { name: name.to_owned() });
        }
    }
    Ok(())
}

fn volts_per_count(
    global: &Keys<'_>,
    datatype: Datatype,
    channels: ChannelCount,
) -> Result<Option<Vec<f64>>, SigmfError> {
    let Some(value) = global.get(VOLTS_PER_COUNT) else { return Ok(None) };
    let expected = "an array of one positive number per channel, with an integer `core:datatype`";
    let scales = value
        .as_array()
        .filter(|scales| channels == ChannelCount::Read(scales.len()) && datatype.number.is_integer())
        .and_then(|scales| {
            scales
                .iter()
                .map(|scale| scale.as_f64().filter(|scale| *scale > 0.0 && scale.is_finite()))
                .collect()
        });
    match scales {
        Some(scales) => Ok(Some(scales)),
        None => Err(wrong(VOLTS_PER_COUNT, value, expected)),
    }
}

fn segments(root: &Value, offset: u64) -> Result<Vec<Segment>, SigmfError> {
    let entries = match root.get("captures") {
        Some(Value::Array(entries)) => entries.as_slice(),
        Some(other) => return Err(wrong("captures", other, "an array")),
        None => return Err(missing("captures", "an array, empty or with `core:sample_start` in each entry")),
    };
    if entries.is_empty() {
        return Ok(vec![Segment { start: offset, header_bytes: 0, time: Ok(None), frequency_hz: None }]);
    }
    let mut earliest = offset;
    let mut segments = Vec::with_capacity(entries.len());
    for (index, entry) in entries.iter().enumerate() {
        let place = format!("captures[{index}] ");
        let Value::Object(map) = entry else { return Err(wrong(place.trim_end(), entry, "an object")) };
        let keys = Keys { map, place };
        let start = keys.count("core:sample_start")?.ok_or_else(|| {
            missing(&format!("{}core:sample_start", keys.place), "a whole number of 0 or more")
        })?;
        if start < earliest {
            return Err(SigmfError::Unsorted { segment: index + 1, found: start, expected: earliest });
        }
        earliest = start;
        segments.push(Segment {
            start,
            header_bytes: keys.count("core:header_bytes")?.unwrap_or(0),
            time: keys.text("core:datetime")?.map(CaptureTime::parse_rfc3339).transpose(),
            frequency_hz: keys.number("core:frequency")?,
        });
    }
    Ok(segments)
}

/// An object of the meta file, and where it is in it.
struct Keys<'a> {
    map: &'a Map<String, Value>,
    place: String,
}

impl<'a> Keys<'a> {
    /// The value of a key; null counts as not given.
    fn get(&self, key: &str) -> Option<&'a Value> {
        self.map.get(key).filter(|value| !value.is_null())
    }

    fn read<T>(
        &self,
        key: &str,
        expected: &'static str,
        read: impl Fn(&'a Value) -> Option<T>,
    ) -> Result<Option<T>, SigmfError> {
        match self.get(key) {
            None => Ok(None),
            Some(value) => match read(value) {
                Some(read) => Ok(Some(read)),
                None => Err(wrong(&format!("{}{key}", self.place), value, expected)),
            },
        }
    }

    fn text(&self, key: &str) -> Result<Option<&'a str>, SigmfError> {
        self.read(key, "a text", Value::as_str)
    }

    fn number(&self, key: &str) -> Result<Option<f64>, SigmfError> {
        self.read(key, "a number", Value::as_f64)
    }

    fn count(&self, key: &str) -> Result<Option<u64>, SigmfError> {
        // Some programs write whole numbers with a decimal point; 2^53 is where such a number stops being
        // exact.
        let whole = |value: &Value| {
            let number = value.as_f64()?;
            (number.fract().abs() < f64::MIN_POSITIVE && (0.0..=9_007_199_254_740_992.0).contains(&number))
                .then_some(number as u64)
        };
        self.read(key, "a whole number of 0 or more", |value| value.as_u64().or_else(|| whole(value)))
    }
}

fn missing(key: &str, expected: &'static str) -> SigmfError {
    SigmfError::Missing { key: key.to_owned(), expected }
}

fn wrong(key: &str, found: &Value, expected: &'static str) -> SigmfError {
    // A hostile value may be as long as the file.
    let mut found = found.to_string();
    if let Some((end, _)) = found.char_indices().nth(80) {
        found.truncate(end);
        found.push_str("...");
    }
    SigmfError::Value { key: key.to_owned(), found, expected }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn parse(global: &str, captures: &str) -> Result<Metadata, SigmfError> {
        let text = format!(
            r#"{{"global": {{"core:version": "1.2.5", {global}}}, "captures": {captures}, "annotations": []}}"#
        );
        Metadata::parse(text.as_bytes())
    }

    #[test]
    fn mistakes_are_told_by_key() {
        let datatype = r#""core:datatype": "ri8""#;
        let cases = [
            ("\"a\": 1".to_owned(), "[]", "`core:datatype` is missing"),
            (r#""core:datatype": "ri12""#.to_owned(), "[]", "`core:datatype` is \"ri12\"; expected r or c"),
            (r#""core:datatype": 8"#.to_owned(), "[]", "`core:datatype` is 8; expected a text"),
            (format!(r#"{datatype}, "core:version": "2.0.0""#), "[]", "`core:version` is \"2.0.0\""),
            (format!(r#"{datatype}, "core:num_channels": 0"#), "[]", "`core:num_channels` is 0"),
            (format!(r#"{datatype}, "core:num_channels": -4"#), "[]", "`core:num_channels` is -4"),
            (format!(r#"{datatype}, "core:offset": 1.5"#), "[]", "`core:offset` is 1.5"),
            (format!(r#"{datatype}, "core:metadata_only": true"#), "[]", "`core:metadata_only`"),
            (
                format!(
                    r#"{datatype}, "core:extensions": [{{"name": "odd", "version": "1.0.0", "optional": false}}]"#
                ),
                "[]",
                "needs the extension `odd`",
            ),
            (
                format!(r#"{datatype}, "arcstead:volts_per_count": [0.1, 0.1]"#),
                "[]",
                "one positive number per channel",
            ),
            (
                format!(r#"{datatype}, "arcstead:volts_per_count": [0.0]"#),
                "[]",
                "one positive number per channel",
            ),
            (datatype.to_owned(), "{}", "`captures` is {}"),
            (datatype.to_owned(), "[3]", "`captures[0]` is 3"),
            (datatype.to_owned(), "[{}]", "`captures[0] core:sample_start` is missing"),
            (
                datatype.to_owned(),
                r#"[{"core:sample_start": 5}, {"core:sample_start": 4}]"#,
                "segment 2 begins at sample 4, before sample 5",
            ),
        ];
        for (global, captures, expected) in cases {
            let error = parse(&global, captures).unwrap_err().to_string();
            assert!(error.contains(expected), "{error} / {expected}");
        }
        assert!(matches!(Metadata::parse(b"{"), Err(SigmfError::Json(_))));
        assert!(matches!(Metadata::parse(b"[]"), Err(SigmfError::Missing { .. })));
        assert!(matches!(Metadata::parse("[".repeat(100_000).as_bytes()), Err(SigmfError::Json(_))));
        let long = parse(&format!(r#""core:datatype": "{}""#, "µ".repeat(500)), "[]").unwrap_err();
        assert!(long.to_string().len() < 2_000);
    }

    #[test]
    fn a_bad_time_stays_with_its_segment() {
        let captures = r#"[{"core:sample_start": 0, "core:datetime": "yesterday"},
            {"core:sample_start": 4.0, "core:datetime": "2026-03-04T10:15:00.000000000125Z"}]"#;
        let metadata = parse(r#""core:datatype": "ri8", "core:num_channels": 300"#, captures).unwrap();
        assert_eq!(metadata.channel_count, ChannelCount::TooMany(300));
        assert!(metadata.segments[0].time.is_err());
        assert_eq!(metadata.segments[1].start, 4);
        let time = metadata.segments[1].time.as_ref().unwrap().unwrap();
        assert_eq!(time.to_string(), "2026-03-04T10:15:00.000000000125Z");
    }
}
