//! Whole recordings, written, made by hand, and damaged. Samples and rates are invented.

use std::path::{Path, PathBuf};

use arcstead_core::Capture;
use tempfile::TempDir;

use super::{SigmfWriteError, SigmfWriter, StoredAs, WriterSettings};
use crate::CaptureTime;
use crate::formats::{CaptureFile, FormatError, ReadSettings, Recorded, open_captures};

fn open(path: &Path) -> Result<Box<dyn CaptureFile>, FormatError> {
    open_captures(path, &ReadSettings::default())
}

/// A recording made by hand: keys of `global`, entries of `captures`, bytes.
fn recording(global: &str, captures: &str, bytes: &[u8]) -> (TempDir, PathBuf) {
    let folder = tempfile::tempdir().unwrap();
    let meta = folder.path().join("x.sigmf-meta");
    let text = format!(
        r#"{{"global": {{"core:version": "1.2.5", "core:sample_rate": 1e9, {global}}}, "captures": {captures}, "annotations": []}}"#
    );
    std::fs::write(&meta, text).unwrap();
    std::fs::write(folder.path().join("x.sigmf-data"), bytes).unwrap();
    (folder, meta)
}

fn read_all(path: &Path) -> Vec<Result<Recorded, FormatError>> {
    let file = open(path).unwrap();
    (0..file.capture_count()).map(|index| file.read(index)).collect()
}

fn channels(recorded: &Recorded) -> Vec<Vec<f32>> {
    recorded.capture.channels().map(<[f32]>::to_vec).collect()
}

#[test]
fn every_real_datatype_reads_back_what_was_put_in() {
    // Interleaved: (1, -2), (3, 100), (-128, 127).
    let numbers = [1_i16, -2, 3, 100, -128, 127];
    let expected = [vec![1.0, 3.0, -128.0], vec![-2.0, 100.0, 127.0]];
    type Encode = fn(i16) -> Vec<u8>;
    type Range = Option<(f32, f32)>;
    let encodings: [(&str, Encode, Range); 14] = [
        ("ri8", |n| (n as i8).to_le_bytes().to_vec(), Some((-128.0, 127.0))),
        ("ru8", |n| vec![(n + 128) as u8], Some((-128.0, 127.0))),
        ("ri16_le", |n| n.to_le_bytes().to_vec(), None),
        ("ri16_be", |n| n.to_be_bytes().to_vec(), None),
        ("ru16_le", |n| ((i32::from(n) + 32768) as u16).to_le_bytes().to_vec(), None),
        ("ru16_be", |n| ((i32::from(n) + 32768) as u16).to_be_bytes().to_vec(), None),
        ("ri32_le", |n| i32::from(n).to_le_bytes().to_vec(), None),
        ("ri32_be", |n| i32::from(n).to_be_bytes().to_vec(), None),
        ("ru32_le", |n| ((i64::from(n) + (1 << 31)) as u32).to_le_bytes().to_vec(), None),
        ("ru32_be", |n| ((i64::from(n) + (1 << 31)) as u32).to_be_bytes().to_vec(), None),
        ("rf32_le", |n| f32::from(n).to_le_bytes().to_vec(), None),
        ("rf32_be", |n| f32::from(n).to_be_bytes().to_vec(), None),
        ("rf64_le", |n| f64::from(n).to_le_bytes().to_vec(), None),
        ("rf64_be", |n| f64::from(n).to_be_bytes().to_vec(), None),
    ];
    for (datatype, encode, range) in encodings {
        let bytes = numbers.iter().flat_map(|&number| encode(number)).collect::<Vec<_>>();
        let global = format!(r#""core:datatype": "{datatype}", "core:num_channels": 2"#);
        let (_folder, meta) = recording(&global, "[]", &bytes);
        let read = read_all(&meta).remove(0).unwrap();
        assert_eq!(channels(&read), expected, "{datatype}");
        assert_eq!(read.capture.range(1), range, "{datatype}");
        assert_eq!((read.name.as_str(), read.time, read.envelope_only), ("x.sigmf-meta", None, false));

        // The same numbers as two channels of complex samples: every second sample of the real equivalent is
        // one part of a complex one, Re((-1)^k z) exactly.
        let (_folder, meta) = recording(&global.replace("\"r", "\"c").replace(": 2", ": 1"), "[]", &bytes);
        let read = read_all(&meta).remove(0).unwrap();
        let found = read.capture.channel(0).iter().step_by(2).copied().collect::<Vec<_>>();
        for (found, expected) in found.iter().zip([1.0, -3.0, -128.0]) {
            assert!((found - expected).abs() < 1e-3, "{datatype}: {found} {expected}");
        }
        assert_eq!((read.capture.sample_count(), read.capture.range(0), read.envelope_only), (6, None, true));
        assert!((read.capture.sample_rate_hz() - 2e9).abs() < 1.0);
    }
}

#[test]
fn the_carrier_of_complex_samples_is_right_only_at_half_the_rate() {
    for (frequency, envelope_only) in [("5e8", false), ("1.2e9", true)] {
        let captures = format!(r#"[{{"core:sample_start": 0, "core:frequency": {frequency}}}]"#);
        let (_folder, meta) = recording(r#""core:datatype": "ci8""#, &captures, &[1, 2, 3, 4]);
        assert_eq!(read_all(&meta).remove(0).unwrap().envelope_only, envelope_only);
    }
}

#[test]
fn segments_headers_offset_and_trailer_are_where_the_standard_puts_them() {
    // header 2, frames 100 and 101, header 1, frame 102, trailer 2; two channels of one byte.
    let bytes = [99, 99, 1, 2, 3, 4, 99, 5, 6, 99, 99];
    let global = r#""core:datatype": "ri8", "core:num_channels": 2, "core:offset": 100,
        "core:trailing_bytes": 2, "core:dataset": "raw.bin""#;
    let captures = r#"[
        {"core:sample_start": 100, "core:header_bytes": 2, "core:datetime": "2026-03-04T10:15:00Z"},
        {"core:sample_start": 102, "core:header_bytes": 1}]"#;
    let (folder, meta) = recording(global, captures, &[]);
    std::fs::write(folder.path().join("raw.bin"), bytes).unwrap();
    let read = read_all(&meta).into_iter().map(Result::unwrap).collect::<Vec<_>>();
    assert_eq!(channels(&read[0]), [[1.0, 3.0], [2.0, 4.0]]);
    assert_eq!(channels(&read[1]), [[5.0], [6.0]]);
    assert_eq!(read[0].name, "x.sigmf-meta#1");
    assert_eq!(read[1].name, "x.sigmf-meta#2");
    assert_eq!(read[0].time.unwrap().to_string(), "2026-03-04T10:15:00Z");
    assert_eq!(read[1].time, None);
}

#[test]
fn a_file_that_is_cut_short_costs_only_what_is_missing() {
    let captures = r#"[{"core:sample_start": 0}, {"core:sample_start": 2}, {"core:sample_start": 4},
        {"core:sample_start": 1000000000000000000}]"#;
    let (_folder, meta) = recording(r#""core:datatype": "ri16_le""#, captures, &[1, 0, 2, 0, 3, 0, 4]);
    let read = read_all(&meta);
    assert_eq!(channels(read[0].as_ref().unwrap()), [[1.0, 2.0]]);
    for read in &read[1..] {
        let message = read.as_ref().unwrap_err().message();
        assert!(message.contains("x.sigmf-data, which holds 7 bytes"), "{message}");
    }
    // An odd byte at the end of the last one, and nothing at all.
    let (_folder, meta) = recording(r#""core:datatype": "ri16_le""#, "[]", &[1, 0, 2]);
    assert!(read_all(&meta)[0].as_ref().unwrap_err().message().contains("1 bytes remain"));
    let (_folder, meta) = recording(r#""core:datatype": "ri16_le""#, "[]", &[]);
    assert!(read_all(&meta)[0].as_ref().unwrap_err().message().contains("no samples"));
}

#[test]
fn a_sample_that_is_no_number_is_told_with_its_place() {
    for datatype in ["rf32_le", "cf32_le"] {
        let numbers = [0.0_f32, 1.0, f32::NAN, 3.0];
        let bytes = numbers.iter().flat_map(|number| number.to_le_bytes()).collect::<Vec<_>>();
        let (_folder, meta) = recording(&format!(r#""core:datatype": "{datatype}""#), "[]", &bytes);
        let message = read_all(&meta)[0].as_ref().unwrap_err().message();
        let sample = if datatype == "rf32_le" { 2 } else { 1 };
        assert!(message.contains(&format!("sample {sample} of channel 1 is NaN")), "{message}");
    }
}

#[test]
fn hostile_numbers_are_refused_before_anything_is_allocated() {
    let opened = |global: &str, captures: &str| {
        let (_folder, meta) = recording(global, captures, &[0; 64]);
        match open(&meta) {
            Err(error) => error.message(),
            Ok(file) => file.read(0).unwrap_err().message(),
        }
    };
    let ri8 = r#""core:datatype": "ri8""#;
    for (extra, captures, expected) in [
        (r#", "core:num_channels": 10000"#, "[]", "10000 channels; at most 256"),
        (r#", "core:num_channels": 18446744073709551615"#, "[]", "at most 256"),
        (r#", "core:sample_rate": 0"#, "[]", "sample rate of 0 Hz"),
        (r#", "core:sample_rate": 1e300"#, "[]", "expected 1e0 to 1e12 Hz"),
        (r#", "core:trailing_bytes": 18446744073709551615"#, "[]", "no samples"),
        ("", r#"[{"core:sample_start": 0}, {"core:sample_start": 18446744073709551615}]"#, "holds 64 bytes"),
        ("", r#"[{"core:sample_start": 0, "core:header_bytes": 18446744073709551615}]"#, "holds 64 bytes"),
        (r#", "core:num_channels": 200"#, r#"[{"core:sample_start": 9223372036854775807}]"#, "beyond 2^64"),
    ] {
        let message = opened(&format!("{ri8}{extra}"), captures);
        assert!(message.contains(expected), "{message} / {expected}");
    }
}

#[test]
fn no_name_leads_out_of_the_folder() {
    for name in ["../secret", "/etc/hostname", "..", ".", "", "a/b", "c:\\\\x", "inner/../../secret"] {
        let global = format!(r#""core:datatype": "ri8", "core:dataset": "{name}""#);
        let (_folder, meta) = recording(&global, "[]", &[1]);
        assert!(open(&meta).unwrap_err().message().contains("leads out of the folder"), "{name}");
    }
    #[cfg(unix)]
    {
        let (folder, meta) = recording(r#""core:datatype": "ri8", "core:dataset": "raw""#, "[]", &[1]);
        let elsewhere = tempfile::NamedTempFile::new().unwrap();
        std::os::unix::fs::symlink(elsewhere.path(), folder.path().join("raw")).unwrap();
        assert!(open(&meta).unwrap_err().message().contains("leads out of the folder"));
    }
}

#[test]
fn halves_and_archives_are_told() {
    let folder = tempfile::tempdir().unwrap();
    let at = |name: &str| folder.path().join(name);
    std::fs::write(at("a.sigmf"), "tar").unwrap();
    assert!(open(&at("a.sigmf")).unwrap_err().message().contains("unpack it"));
    std::fs::write(at("a.sigmf-data"), "x").unwrap();
    assert!(open(&at("a.sigmf-data")).unwrap_err().message().contains("no a.sigmf-meta beside it"));
    std::fs::write(
        at("b.sigmf-meta"),
        r#"{"global": {"core:datatype": "ri8", "core:sample_rate": 1}, "captures": []}"#,
    )
    .unwrap();
    assert!(open(&at("b.sigmf-meta")).unwrap_err().message().contains("b.sigmf-data cannot be read"));
    let (_folder, meta) = recording(r#""core:datatype": "ri8""#, "[]", &[1, 2]);
    let data = open(&meta.with_extension("sigmf-data")).unwrap();
    assert_eq!(data.capture_name(0), "x.sigmf-meta");
    assert!(matches!(data.read(1), Err(FormatError::NoSuchCapture { index: 1, count: 1, .. })));
    let site = ReadSettings { sample_rate_hz: Some(2e9) };
    assert!(matches!(open_captures(&meta, &site), Err(FormatError::RateDisagrees { .. })));
}

fn settings(stored_as: StoredAs, volts_per_count: Option<Vec<f64>>) -> WriterSettings {
    WriterSettings { channel_count: 2, sample_rate_hz: 5e9, stored_as, volts_per_count, description: None }
}

#[test]
fn what_is_written_reads_back() {
    let folder = tempfile::tempdir().unwrap();
    let time = CaptureTime::parse_rfc3339("2026-03-04T10:15:00.0000000002Z").unwrap();
    let one = Capture::new(5e9, vec![vec![1.0, -2.0, 3.0], vec![-128.0, 127.0, 0.0]]).unwrap();
    let two = Capture::new(5e9, vec![vec![5.0], vec![6.0]]).unwrap();
    for (name, stored_as) in [("i8", StoredAs::I8), ("i16", StoredAs::I16), ("f32", StoredAs::F32)] {
        let mut writer = SigmfWriter::create(&folder.path().join(name), settings(stored_as, None)).unwrap();
        writer.write(&one, Some(time)).unwrap();
        writer.write(&two, None).unwrap();
        let meta = writer.finish().unwrap();
        let read = read_all(&meta).into_iter().map(Result::unwrap).collect::<Vec<_>>();
        assert_eq!(read.len(), 2);
        for (read, (written, time)) in read.iter().zip([(&one, Some(time)), (&two, None)]) {
            assert_eq!(channels(read), written.channels().map(<[f32]>::to_vec).collect::<Vec<_>>());
            assert_eq!(read.time, time);
            assert_eq!(read.capture.sample_rate_hz().to_bits(), 5e9_f64.to_bits());
        }
    }
}

#[test]
fn volts_go_through_counts() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("v.sigmf-meta");
    let mut writer = SigmfWriter::create(&path, settings(StoredAs::I8, Some(vec![0.5, 0.25]))).unwrap();
    writer.write(&Capture::new(5e9, vec![vec![1.0, -1.6], vec![0.25, 31.75]]).unwrap(), None).unwrap();
    assert_eq!(writer.finish().unwrap(), path);
    assert_eq!(std::fs::read(folder.path().join("v.sigmf-data")).unwrap(), [2, 1, 0xfd, 127]);
    let read = read_all(&path).remove(0).unwrap();
    assert_eq!(channels(&read), [[1.0, -1.5], [0.25, 31.75]]);
    assert_eq!((read.capture.range(0), read.capture.range(1)), (Some((-64.0, 63.5)), Some((-32.0, 31.75))));
}

#[test]
fn a_recording_appears_whole_or_not_at_all() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("visit");
    let count = || std::fs::read_dir(folder.path()).unwrap().count();
    let mut writer = SigmfWriter::create(&path, settings(StoredAs::I8, None)).unwrap();
    let good = Capture::new(5e9, vec![vec![1.0], vec![2.0]]).unwrap();
    writer.write(&good, None).unwrap();
    let loud = Capture::new(5e9, vec![vec![1.0, 2.0], vec![2.0, 127.6]]).unwrap();
    let error = writer.write(&loud, None).unwrap_err();
    assert!(matches!(error, SigmfWriteError::Counts { channel: 2, sample: 1, .. }), "{error}");
    let other = Capture::new(5e9, vec![vec![1.0]]).unwrap();
    assert!(matches!(writer.write(&other, None), Err(SigmfWriteError::Other { .. })));
    assert!(!path.with_extension("sigmf-meta").exists());
    drop(writer);
    assert_eq!(count(), 0);

    for _ in 0..2 {
        let mut writer = SigmfWriter::create(&path, settings(StoredAs::I8, None)).unwrap();
        writer.write(&good, None).unwrap();
        let meta = writer.finish().unwrap();
        assert_eq!(channels(read_all(&meta)[0].as_ref().unwrap()), [[1.0], [2.0]]);
        assert_eq!(count(), 2);
    }
}

#[test]
fn what_could_not_be_read_back_is_not_begun() {
    let folder = tempfile::tempdir().unwrap();
    let create = |settings| SigmfWriter::create(&folder.path().join("x"), settings);
    let ok = settings(StoredAs::F32, None);
    for bad in [
        WriterSettings { channel_count: 0, ..ok.clone() },
        WriterSettings { channel_count: 257, ..ok.clone() },
        WriterSettings { sample_rate_hz: f64::NAN, ..ok.clone() },
    ] {
        assert!(matches!(create(bad), Err(SigmfWriteError::Settings { .. })));
    }
    for bad in [
        settings(StoredAs::F32, Some(vec![1.0, 1.0])),
        settings(StoredAs::I8, Some(vec![1.0])),
        settings(StoredAs::I8, Some(vec![1.0, 0.0])),
    ] {
        assert!(matches!(create(bad), Err(SigmfWriteError::VoltsPerCount { .. })));
    }
    let nameless = SigmfWriter::create(&folder.path().join(".sigmf-meta"), ok.clone());
    assert!(matches!(nameless, Err(SigmfWriteError::Name { .. })));
    let nowhere = SigmfWriter::create(&folder.path().join("no").join("x"), ok);
    assert!(matches!(nowhere, Err(SigmfWriteError::Io { .. })));
}
