//! The header habits of recorders, as small files. Only their shapes are those of instruments: the numbers
//! are invented.

use std::fmt::Write;

use crate::formats::{CaptureFile, ReadSettings, Recorded, open_captures};

fn with_file<T>(
    bytes: &[u8],
    rate_hz: Option<f64>,
    with: impl FnOnce(Box<dyn CaptureFile>) -> T,
) -> Result<T, String> {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("shot.csv");
    std::fs::write(&path, bytes).unwrap();
    let settings = ReadSettings { sample_rate_hz: rate_hz };
    open_captures(&path, &settings).map(with).map_err(|error| error.message())
}

fn read_bytes(bytes: &[u8], rate_hz: Option<f64>) -> Result<Recorded, String> {
    with_file(bytes, rate_hz, |file| {
        assert_eq!((file.capture_count(), file.capture_name(0).as_str()), (1, "shot.csv"));
        file.read(0).map_err(|error| error.message())
    })?
}

fn read(text: &str) -> Result<Recorded, String> {
    read_bytes(text.as_bytes(), None)
}

/// The samples every variant below holds: two channels.
const EXPECTED: [[f32; 4]; 2] = [[0.5, -0.25, 1.0, 0.0], [2.0, 4.0, -8.0, 1.5]];

fn assert_reads(what: &str, recorded: Result<Recorded, String>, rate_hz: f64) {
    let recorded = recorded.unwrap_or_else(|error| panic!("{what}: {error}"));
    let found = recorded.capture.channels().map(<[f32]>::to_vec).collect::<Vec<_>>();
    assert_eq!(found, EXPECTED, "{what}");
    let ratio = recorded.capture.sample_rate_hz() / rate_hz;
    assert!((ratio - 1.0).abs() < 1e-9, "{what}: {}", recorded.capture.sample_rate_hz());
    assert!(!recorded.envelope_only);
}

#[test]
fn a_row_of_names_and_a_row_of_units() {
    let text = "x-axis,1,2\nsecond,Volt,Volt\n-2e-10,0.5,2\n0,-0.25,4\n2e-10,1,-8\n4e-10,0,1.5\n";
    assert_reads("point", read(text), 5e9);
    let units = "Time,CH1,CH2\n(ns),(mV),(V)\n-0.2,500,2\n0.0,-250,4\n0.2,1000,-8\n0.4,0,1.5\n";
    assert_reads("units", read(units), 5e9);
    let in_names =
        "Time (ns);Channel A (V);Channel B (V)\n\n-0,2;0,5;2\n0,0;-0,25;4\n0,2;1,0;-8\n0,4;0;1,5\n";
    assert_reads("decimal comma", read(in_names), 5e9);
    let tabs = "Time\tA\tB\nµs\tV\tV\n0\t0.5\t2\n0.0002\t-0.25\t4\n0.0004\t1\t-8\n0.0006\t0\t1.5\n";
    assert_reads("tabs", read(tabs), 5e9);
    // Every dress of the same text: byte order mark, CRLF, last separator, blank last lines, no last line
    // feed, Latin-1.
    let comma = tabs.replace('\t', ",");
    assert_reads("mark", read(&format!("\u{feff}{comma}")), 5e9);
    assert_reads("crlf", read(&comma.replace('\n', "\r\n")), 5e9);
    assert_reads("last separator", read(&comma.replace('\n', ",\n")), 5e9);
    assert_reads("blank last lines", read(&format!("{comma}\n , \n\n")), 5e9);
    assert_reads("no line feed", read(comma.trim_end()), 5e9);
    let latin_1 = comma.chars().map(|letter| u32::from(letter) as u8).collect::<Vec<_>>();
    assert_reads("Latin-1", read_bytes(&latin_1, None), 5e9);
    let quoted = "\"Time, s\",\"CH1\",\"CH2\"\n\"0\",\"0.5\",\"2\"\n2e-10,-0.25,4\n4e-10,1,-8\n6e-10,0,1.5\n";
    assert_reads("quoted", read(quoted), 5e9);
}

#[test]
fn keys_and_values_before_the_table() {
    let text = "Model,X-1\nRecord Length,4,Record Length,4\nSample Interval,2e-10,Sample Interval,2e-10\n\
                Vertical Units,V,Vertical Units,V\nProbe Factor,10,Probe Factor,10\n\
                Date,2026-03-04T10:15:00.5Z\n\nTIME,CH1,CH2\n\
                -2e-10,0.5,2\n0,-0.25,4\n2e-10,1,-8\n4e-10,0,1.5\n";
    let recorded = read(text);
    assert_eq!(recorded.as_ref().unwrap().time.unwrap().to_string(), "2026-03-04T10:15:00.5Z");
    assert_reads("keys", recorded, 5e9);
    assert_reads("crlf", read(&text.replace('\n', "\r\n")), 5e9);
    let without_zone = text.replace(".5Z", "");
    assert_eq!(read(&without_zone).unwrap().time, None);
    let error = read(&text.replace(",2e-10,", ",1e-10,").replace("l,2e-10\n", "l,1e-10\n")).unwrap_err();
    assert!(
        error.contains("header states a sample interval of 1e-10 s") && error.contains("2e-10"),
        "{error}"
    );
}

#[test]
fn keys_beside_the_samples() {
    let text = "Record Length,4,Points,-2e-10,0.5,2\nSample Interval,2e-10,s,0,-0.25,4\n\
                Note,a text,,2e-10,1,-8\n,,,4e-10,0,1.5\n";
    assert_reads("keys beside the samples", read(text), 5e9);
}

#[test]
fn an_index_column_and_an_increment() {
    let text = "X,CH1,CH2,Start,Increment\nSequence,Volt,Volt,-1e-6,2e-10\n0,0.5,2,,\n1,-0.25,4,,\n2,1,-8,,\n3,0,1.5,,\n";
    assert_reads("in the row of units", read(text), 5e9);
    let beside = "X,CH1,CH2,Start,Increment\n0,0.5,2,-1e-6,2e-10\n1,-0.25,4,,\n2,1,-8,,\n3,0,1.5,,\n";
    assert_reads("in the first row", read(beside), 5e9);
    let error = read(&text.replace("2,1,-8", "3,1,-8")).unwrap_err();
    assert!(error.contains("line 5: the index column goes from 1 to 3"), "{error}");
}

#[test]
fn no_time_column() {
    let text = "# made by hand\n# Sample Rate: 5 GS/s\nCH1,CH2\n0.5,2\n-0.25,4\n1,-8\n0,1.5\n";
    assert_reads("a rate", read(text), 5e9);
    let text = "XORIGIN;-0,5;us\nXINCREMENT;0,2;ns\nCH1;CH2\n0,5;2\n-0,25;4\n1;-8\n0;1,5\n";
    assert_reads("an increment", read(text), 5e9);
}

#[test]
fn bare_numbers_take_the_rate_of_the_site() {
    let text = "0.5,2\n-0.25,4\n1,-8\n0,1.5\n";
    assert_reads("columns", read_bytes(text.as_bytes(), Some(5e9)), 5e9);
    let error = read(text).unwrap_err();
    assert!(error.contains("shot.csv gives no sample rate; put `sample_rate_gsps`"), "{error}");
    let one = read_bytes(b"0.5,-0.25,1,0,", Some(5e9)).unwrap();
    assert_eq!((one.capture.channel_count(), one.capture.channel(0)), (1, &EXPECTED[0][..]));
    let one = read_bytes(b"0.5\n-0.25\n1\n0\n", Some(5e9)).unwrap();
    assert_eq!((one.capture.channel_count(), one.capture.channel(0)), (1, &EXPECTED[0][..]));
    // A row longer than what is looked at to find the table, cut in the middle of a number.
    let row = (0..30_000).map(|k| format!("{}.5", k % 100)).collect::<Vec<_>>().join(";");
    let one = read_bytes(row.as_bytes(), Some(5e9)).unwrap();
    assert_eq!((one.capture.channel_count(), one.capture.sample_count()), (1, 30_000));
    assert_eq!(one.capture.channel(0)[29_999].to_bits(), 99.5_f32.to_bits());
}

#[test]
fn segments_are_captures() {
    let head = "Segments,2,SegmentSize,4\nSegment,TrigTime,TimeSinceSegment1\n#1,2026-03-04T10:15:00Z,0\n\
                #2,2026-03-04T10:15:01Z,1\nTime,Ampl,Ampl\n";
    let rows = "-2e-10,0.5,2\n0,-0.25,4\n2e-10,1,-8\n4e-10,0,1.5\n";
    let text = format!("{head}{rows}{rows}");
    with_file(text.as_bytes(), None, |file| {
        assert_eq!(file.capture_count(), 2);
        for index in 0..2 {
            let recorded = file.read(index).unwrap();
            assert_eq!(recorded.name, format!("shot.csv#{}", index + 1));
            assert_eq!(recorded.time.unwrap().to_string(), format!("2026-03-04T10:15:0{index}Z"));
            assert_reads(&recorded.name.clone(), Ok(recorded), 5e9);
        }
    })
    .unwrap();
    // Cut short: the first is fine, the second is not, and a third that was promised is not either.
    for cut in [format!("{head}{rows}-2e-10,0.5,2\n"), format!("{head}{rows}")] {
        with_file(cut.as_bytes(), None, |file| {
            assert_eq!(file.capture_count(), 2);
            assert_reads("the first", file.read(0).map_err(|error| error.message()), 5e9);
            assert!(file.read(1).unwrap_err().message().contains("the file was cut short"));
        })
        .unwrap();
    }
    let promised = text.replace("Segments,2", "Segments,1000000000000");
    with_file(promised.as_bytes(), None, |file| assert_eq!(file.capture_count(), 3)).unwrap();
    assert!(with_file(format!("{text}{rows}").as_bytes(), None, |_| ()).unwrap_err().contains("rows go on"));
}

#[test]
fn envelopes_are_refused() {
    let text = "Time,CH1\n0,1\n0,-1\n4e-10,2\n4e-10,-2\n8e-10,1\n8e-10,-1\n";
    assert!(read(text).unwrap_err().contains("every time stands twice"));
}

#[test]
fn rates_that_disagree_name_both() {
    let text = "Time,CH1,CH2\n-2e-10,0.5,2\n0,-0.25,4\n2e-10,1,-8\n4e-10,0,1.5\n";
    assert_reads("agreed", read_bytes(text.as_bytes(), Some(5.001e9)), 5e9);
    let error = read_bytes(text.as_bytes(), Some(2.5e9)).unwrap_err();
    assert!(error.contains("shot.csv was sampled at 5") && error.contains("says 2.5 GS/s"), "{error}");
    let error = read(&text.replace("e-10", "e-310")).unwrap_err();
    assert!(error.contains("sample rate of"), "{error}");
}

#[test]
fn mistakes_name_the_line() {
    let table = |row: &str| {
        format!("a line\n\nTime,CH1,CH2\n0,0.5,2\n2e-10,-0.25,4\n{row}\n6e-10,0,1.5\n8e-10,0,1\n")
    };
    for (row, expected) in [
        ("4e-10,abc,1", "shot.csv, line 6: `abc` in column 2; expected a finite number with a decimal point"),
        ("4e-10,nan,1", "line 6: `nan` in column 2"),
        ("4e-10,1,****", "line 6: `****` in column 3"),
        ("4e-10,1,>1.2", "a greater range"),
        (
            "4e-10,1e39,1",
            "line 6: `1e39` in column 2; expected a finite number with a decimal point below 3e38",
        ),
        ("4e-10,1", "line 6: column 3 is empty"),
        ("4e-10,,1", "line 6: column 2 is empty"),
        ("4e-10,1,2,3", "line 6: `3` in column 4, where the rows before have none"),
        ("", "line 7: rows go on after a blank line"),
        (",,", "line 7: rows go on after a blank line"),
        ("9e-10,1,2", "line 6: the time column is not even"),
    ] {
        for text in [table(row), table(row).replace('\n', "\r\n")] {
            let error = read(&text).unwrap_err();
            assert!(error.contains(expected), "{error} / {expected}");
        }
    }
    let error = read("t;a\n0,0;1,5\n0,2;1,5\n0,4;1.5\n").unwrap_err();
    assert!(
        error.contains("line 4: `1.5` in column 2; expected a finite number with a decimal comma"),
        "{error}"
    );
    assert!(read("1,204\n0,043\n2,435\n").unwrap_err().contains("line 2: the comma in `0,043`"));
}

#[test]
fn what_is_no_table_is_told() {
    assert!(read("").unwrap_err().contains("the file is empty"));
    assert!(read(" \n\n").unwrap_err().contains("the file is empty"));
    assert!(read("only\nwords\n").unwrap_err().contains("no table of numbers"));
    assert!(read("Time,CH1\n0,1\n1e-9,2\nthe end\n").unwrap_err().contains("no table of numbers"));
    let error = read("Time\n0\n1e-9\n2e-9\n3e-9\n").unwrap_err();
    assert!(error.contains("no column of samples"), "{error}");
    assert!(read_bytes(b"\xff\xfe1\0,\x002\0", None).unwrap_err().contains("UTF-16"));
    assert!(
        read(&"preamble,\n".repeat(10_000))
            .unwrap_err()
            .contains("no table of numbers in the first 65536 bytes")
    );
    let wide = (0..300).map(|_| "1").collect::<Vec<_>>().join(",");
    assert!(read(&format!("{wide}\n{wide}\n")).unwrap_err().contains("300 channels; at most 256"));
}

#[test]
fn a_long_file_reads_in_one_pass() {
    let mut text = "Time,CH1,CH2\r\ns,V,V\r\n".to_owned();
    for k in 0..50_000 {
        write!(text, "{:.5e},{},{}\r\n", f64::from(k) * 2e-10, k % 7, f64::from(k) / 8.0).unwrap();
    }
    let recorded = read(&text).unwrap();
    assert_eq!((recorded.capture.channel_count(), recorded.capture.sample_count()), (2, 50_000));
    assert_eq!(recorded.capture.channel(1)[49_999].to_bits(), 6249.875_f32.to_bits());
    assert!((recorded.capture.sample_rate_hz() / 5e9 - 1.0).abs() < 1e-5);
}
