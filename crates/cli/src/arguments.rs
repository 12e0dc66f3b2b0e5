//! The command line as it was typed.

use std::ffi::OsString;
use std::path::PathBuf;

use arcstead::core::Method;
use clap::{Args, Parser, Subcommand, ValueEnum};

const STATUSES: &str = "\
Results go to stdout or to --output; progress, warnings and errors go to stderr.

Exit status: 0 done (also when no source is found), 1 the work failed or no capture could be read, 2 wrong usage or \
a wrong site file, 130 stopped by Ctrl-C (the result of what was read is told, marked as incomplete).";

const LOCATE_EXAMPLES: &str = "\
Examples:
  arcstead locate site.toml visit/
  arcstead locate site.toml shot_1.csv shot_2.csv --band 300,1200
  arcstead locate site.toml second=visit2/ --format json --output visit2.json
  arcstead locate site.toml --arrivals arrivals.csv

With --format csv, one row per source: source, captures, x_m, y_m, z_m (best point), sigma_x_m, sigma_y_m, sigma_z_m, \
semi_major_m, semi_minor_m, ellipse_azimuth_deg, confidence, region_min_x_m to region_max_z_m (box of the region), \
region_bounded, azimuth_deg, elevation_deg, range_min_m, range_max_m (from the middle of the antennas), chi_square, \
degrees_of_freedom, p_value, statement, statement_assets (separated by ;), statement_probability, first_asset, \
first_asset_probability, elsewhere_probability, flags (separated by ;), first, last (times), first_capture, \
stances, incomplete. What is not known is empty. Where flags hold range-undetermined, the direction is known and the point is not.";

const ARRIVALS_EXAMPLES: &str = "\
Examples:
  arcstead arrivals site.toml visit/
  arcstead arrivals site.toml visit/ --output arrivals.csv

`arcstead locate site.toml --arrivals arrivals.csv` reads the CSV back.";

const INSPECT_EXAMPLES: &str = "\
Examples:
  arcstead inspect visit/
  arcstead inspect shot_1.csv --sample-rate 5 -v

With --format csv, one row per capture and channel: capture, file, time, sample_rate_hz, samples, channel, offset, \
noise_rms, largest, snr_db, pulse, clipped, dead, carriers_mhz (separated by ;). Levels are in the unit of the samples, \
which is not calibrated.";

const SIMULATE_EXAMPLES: &str = "\
Examples:
  arcstead simulate site.toml --source 5.4,17,3.5 --captures 40 --output rehearsal
  arcstead simulate site.toml --source \"Bushing T1 phase A\" --seed 7 --output rehearsal
  arcstead locate site.toml rehearsal

Sample rate, bits, bandwidth, delays and bands are those of the site file. FOLDER gets visit.sigmf-meta, \
visit.sigmf-data and truth.json. The same seed gives the same bytes.";

/// Finds which insulator string, bushing or arrester is discharging.
///
/// Reads recordings of the radio pulses of electrical discharges, taken with several antennas at once, finds when each
/// pulse reached each antenna, and tells where it came from and on which asset that is.
#[derive(Debug, Parser)]
#[command(name = "arcstead", version, arg_required_else_help = true, max_term_width = 100, after_help = STATUSES)]
pub(crate) struct Arguments {
    #[command(subcommand)]
    pub(crate) command: Command,
    #[command(flatten)]
    pub(crate) talk: TalkArguments,
}

#[derive(Debug, Subcommand)]
pub(crate) enum Command {
    /// Find the source of the pulses and rank the assets it may be on
    #[command(after_long_help = LOCATE_EXAMPLES)]
    Locate(LocateArguments),
    /// Tell when each pulse reached each antenna, and how exactly
    #[command(after_long_help = ARRIVALS_EXAMPLES)]
    Arrivals(ArrivalsArguments),
    /// Tell what is in capture files; needs no site file
    #[command(after_long_help = INSPECT_EXAMPLES)]
    Inspect(InspectArguments),
    /// Make the captures of a visit that has not happened
    #[command(after_long_help = SIMULATE_EXAMPLES)]
    Simulate(SimulateArguments),
}

/// What is said beside the result, and how.
#[derive(Debug, Args)]
pub(crate) struct TalkArguments {
    /// Say nothing but errors
    #[arg(short, long, global = true, conflicts_with = "verbose")]
    pub(crate) quiet: bool,
    /// Tell more: every capture by name, options, covariances
    #[arg(short, long, global = true)]
    pub(crate) verbose: bool,
    /// Emphasis in the output; NO_COLOR is obeyed
    #[arg(long, global = true, value_enum, value_name = "WHEN", default_value_t = Color::Auto)]
    pub(crate) color: Color,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(crate) enum Color {
    Auto,
    Always,
    Never,
}

/// Where the result goes.
#[derive(Debug, Args)]
pub(crate) struct OutputArguments {
    /// How the result is written [default: json or csv where FILE ends so, else table]
    #[arg(long, value_enum, value_name = "FORMAT")]
    pub(crate) format: Option<Format>,
    /// File the result is written to, whole or not at all [default: stdout]
    #[arg(long, value_name = "FILE")]
    pub(crate) output: Option<PathBuf>,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(crate) enum Format {
    /// For reading
    Table,
    /// The whole result
    Json,
    /// One row per thing
    Csv,
}

impl OutputArguments {
    /// The format asked for, by name or by the ending of the file.
    pub(crate) fn format(&self) -> Format {
        self.format.unwrap_or(match self.ending().as_deref() {
            Some("json") => Format::Json,
            Some("csv") => Format::Csv,
            _ => Format::Table,
        })
    }

    /// What the user may have meant otherwise: a table, where the ending of the file is that of something else.
    pub(crate) fn doubt(&self) -> Option<String> {
        let ending = self.ending().filter(|ending| !["json", "csv", "txt"].contains(&ending.as_str()))?;
        self.format.is_none().then(|| {
            format!("no format goes with the ending .{ending}; a table is written (--format chooses another)")
        })
    }

    /// The ending of the file in small letters.
    fn ending(&self) -> Option<String> {
        self.output.as_ref()?.extension()?.to_str().map(str::to_ascii_lowercase)
    }
}

/// How arrival times are found.
#[derive(Debug, Args)]
pub(crate) struct TimingArguments {
    /// How arrivals are found
    #[arg(long, value_enum, value_name = "METHOD", default_value_t = MethodName::Gated)]
    pub(crate) method: MethodName,
    /// Band used, in MHz [default: what antennas and recorder share]
    #[arg(long, value_name = "LOW,HIGH", value_parser = band_hz)]
    pub(crate) band: Option<Band>,
    /// Leave carriers (broadcast and radio lines) in
    #[arg(long)]
    pub(crate) no_excise: bool,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(crate) enum MethodName {
    /// An onset by energy gates a short window; correlation of the windows gives the delays
    Gated,
    /// Correlation of the whole records
    Correlation,
    /// The onset alone, by the energy criterion
    Energy,
    /// The onset alone, by Akaike's criterion
    Akaike,
    /// The onset alone, where a share of the peak is reached
    Threshold,
}

impl TimingArguments {
    pub(crate) fn options(&self) -> arcstead::ArrivalOptions {
        arcstead::ArrivalOptions {
            method: match self.method {
                MethodName::Gated => Method::Gated,
                MethodName::Correlation => Method::Correlation,
                MethodName::Energy => Method::Energy,
                MethodName::Akaike => Method::Akaike,
                MethodName::Threshold => Method::Threshold,
            },
            band_hz: self.band.map(|band| (band.low_hz, band.high_hz)),
            excise: !self.no_excise,
        }
    }
}

#[derive(Debug, Args)]
pub(crate) struct LocateArguments {
    /// Site file
    pub(crate) site: PathBuf,
    /// Capture files or folders of them; NAME=CAPTURE for captures of the stance NAME
    #[arg(value_name = "CAPTURE", required_unless_present = "arrivals", conflicts_with = "arrivals")]
    pub(crate) captures: Vec<OsString>,
    /// Arrivals table in place of captures; may be repeated
    #[arg(long, value_name = "TABLE.csv", conflicts_with_all = ["method", "band", "no_excise"])]
    pub(crate) arrivals: Vec<PathBuf>,
    #[command(flatten)]
    pub(crate) timing: TimingArguments,
    /// Solve every capture by itself, without grouping captures into sources
    #[arg(long)]
    pub(crate) each: bool,
    /// Probability that the regions told hold the source, 0.5 to 0.9999
    #[arg(long, value_name = "LEVEL", default_value = "0.95", value_parser = confidence)]
    pub(crate) confidence: f64,
    /// Number of threads [default: one for each processor]
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
    pub(crate) threads: Option<u16>,
    #[command(flatten)]
    pub(crate) output: OutputArguments,
}

#[derive(Debug, Args)]
pub(crate) struct ArrivalsArguments {
    /// Site file
    pub(crate) site: PathBuf,
    /// Capture files or folders of them; NAME=CAPTURE for captures of the stance NAME
    #[arg(value_name = "CAPTURE", required = true)]
    pub(crate) captures: Vec<OsString>,
    #[command(flatten)]
    pub(crate) timing: TimingArguments,
    /// Number of threads [default: one for each processor]
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
    pub(crate) threads: Option<u16>,
    #[command(flatten)]
    pub(crate) output: OutputArguments,
}

#[derive(Debug, Args)]
pub(crate) struct InspectArguments {
    /// Capture files or folders of them
    #[arg(value_name = "CAPTURE", required = true)]
    pub(crate) captures: Vec<PathBuf>,
    /// Band in which noise and pulse are measured, in MHz [default: most of the spectrum]
    #[arg(long, value_name = "LOW,HIGH", value_parser = band_hz)]
    pub(crate) band: Option<Band>,
    /// Sample rate of files that carry none, in GS/s
    #[arg(long, value_name = "GSPS", value_parser = sample_rate_gsps)]
    pub(crate) sample_rate: Option<f64>,
    #[command(flatten)]
    pub(crate) output: OutputArguments,
}

#[derive(Debug, Args)]
pub(crate) struct SimulateArguments {
    /// Site file
    pub(crate) site: PathBuf,
    /// Where it discharges: X,Y,Z in metres, or the name of an asset (its middle); may be repeated
    #[arg(long, value_name = "X,Y,Z", required = true, allow_hyphen_values = true, value_parser = place)]
    pub(crate) source: Vec<Place>,
    /// Number of captures
    #[arg(long, value_name = "N", default_value_t = 40, value_parser = clap::value_parser!(u32).range(1..=1_000_000))]
    pub(crate) captures: u32,
    /// Seed of everything that is drawn
    #[arg(long, value_name = "N", default_value_t = 1)]
    pub(crate) seed: u64,
    /// Folder for the captures and truth.json; made where there is none
    #[arg(long, value_name = "FOLDER")]
    pub(crate) output: PathBuf,
    /// Pulse peak over noise rms at 10 m with a clear line, in dB [default: [planning] of the site file, else 20]
    #[arg(long, value_name = "DB", allow_hyphen_values = true, value_parser = finite)]
    pub(crate) snr: Option<f64>,
    /// Samples of each channel in one capture
    #[arg(long, value_name = "N", default_value_t = 1500)]
    pub(crate) samples: usize,
    /// Add the carriers of broadcast and mobile telephony, the strongest 10 dB over the noise
    #[arg(long)]
    pub(crate) carriers: bool,
    /// Everything is exactly as the site file says: no errors, antennas all alike, no reflections; noise remains
    #[arg(long)]
    pub(crate) perfect: bool,
    /// Replace an earlier simulation in FOLDER
    #[arg(long)]
    pub(crate) force: bool,
}

/// A band in hertz.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Band {
    pub(crate) low_hz: f64,
    pub(crate) high_hz: f64,
}

/// Where a simulated source is.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum Place {
    /// At these coordinates in metres.
    At([f64; 3]),
    /// In the middle of the asset of this name.
    Asset(String),
}

fn finite(text: &str) -> Result<f64, String> {
    match text.trim().parse::<f64>() {
        Ok(value) if value.is_finite() => Ok(value),
        _ => Err("expected a number".into()),
    }
}

fn numbers(text: &str) -> Result<Vec<f64>, String> {
    text.split(',').map(finite).collect()
}

fn band_hz(text: &str) -> Result<Band, String> {
    match numbers(text).as_deref() {
        Ok(&[low_mhz, high_mhz]) if low_mhz > 0.0 && low_mhz < high_mhz => {
            Ok(Band { low_hz: low_mhz * 1e6, high_hz: high_mhz * 1e6 })
        }
        _ => Err("expected LOW,HIGH in MHz with 0 < LOW < HIGH, such as 300,1500".into()),
    }
}

fn confidence(text: &str) -> Result<f64, String> {
    match finite(text) {
        Ok(level) if (0.5..=0.9999).contains(&level) => Ok(level),
        _ => Err("expected a probability from 0.5 to 0.9999, such as 0.95".into()),
    }
}

fn sample_rate_gsps(text: &str) -> Result<f64, String> {
    match finite(text) {
        Ok(rate_gsps) if rate_gsps > 0.0 => Ok(rate_gsps),
        _ => Err("expected a sample rate in GS/s, such as 5".into()),
    }
}

fn place(text: &str) -> Result<Place, String> {
    let all_numbers = text.split(',').all(|part| part.trim().parse::<f64>().is_ok());
    match numbers(text).as_deref() {
        Ok(&[x, y, z]) => Ok(Place::At([x, y, z])),
        _ if all_numbers => {
            Err("expected X,Y,Z in metres, such as 5.4,17,3.5, or the name of an asset".into())
        }
        _ => Ok(Place::Asset(text.trim().to_owned())),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use clap::CommandFactory;

    fn parse(line: &str) -> Result<Arguments, clap::Error> {
        Arguments::try_parse_from(line.split(' '))
    }

    #[test]
    fn the_definition_is_sound() {
        Arguments::command().debug_assert();
    }

    #[test]
    fn bands_and_places_are_read() {
        assert_eq!(band_hz("300,1500"), Ok(Band { low_hz: 300e6, high_hz: 1500e6 }));
        for wrong in ["300", "0,5", "5,5", "9,5", "1,2,3", "a,b", "1,inf", "nan,3"] {
            assert!(band_hz(wrong).is_err(), "{wrong}");
        }
        assert_eq!(place("-1,2.5,3e0"), Ok(Place::At([-1.0, 2.5, 3.0])));
        assert_eq!(place("Bushing A, line side"), Ok(Place::Asset("Bushing A, line side".into())));
        for wrong in ["1,2", "1,2,3,4", "nan,1,2", "7"] {
            assert!(place(wrong).is_err(), "{wrong}");
        }
    }

    #[test]
    fn confidence_is_a_sensible_probability() {
        for wrong in ["0", "0.49", "1", "0.99999", "95", "nan", "much"] {
            assert!(parse(&format!("arcstead locate s.toml c --confidence {wrong}")).is_err(), "{wrong}");
        }
        assert!(parse("arcstead locate s.toml c --confidence 0.9999").is_ok());
    }

    #[test]
    fn captures_and_tables_exclude_each_other() {
        assert!(parse("arcstead locate s.toml").is_err());
        assert!(parse("arcstead locate s.toml c --arrivals t.csv").is_err());
        assert!(parse("arcstead locate s.toml --arrivals t.csv --method energy").is_err());
        assert!(parse("arcstead locate s.toml --arrivals t.csv --arrivals u.csv --each").is_ok());
        assert!(parse("arcstead locate -q -v s.toml c").is_err());
    }

    #[test]
    fn a_source_may_begin_with_a_minus() {
        let parsed = parse("arcstead simulate s.toml --source -1,-2,3 --output f").unwrap();
        let Command::Simulate(asked) = parsed.command else { panic!("another command") };
        assert_eq!(asked.source, [Place::At([-1.0, -2.0, 3.0])]);
    }

    #[test]
    fn the_ending_of_the_output_gives_the_format() {
        let format = |line: &str| match parse(line).unwrap().command {
            Command::Locate(asked) => asked.output.format(),
            _ => panic!("another command"),
        };
        assert_eq!(format("arcstead locate s.toml c"), Format::Table);
        assert_eq!(format("arcstead locate s.toml c --output r.json"), Format::Json);
        assert_eq!(format("arcstead locate s.toml c --output r.csv"), Format::Csv);
        assert_eq!(format("arcstead locate s.toml c --output r.csv --format table"), Format::Table);
        assert_eq!(format("arcstead locate s.toml c --output R.JSON"), Format::Json);
    }

    #[test]
    fn an_ending_that_no_format_has_is_doubted() {
        let doubt = |line: &str| match parse(line).unwrap().command {
            Command::Inspect(asked) => asked.output.doubt(),
            _ => panic!("another command"),
        };
        assert!(doubt("arcstead inspect c --output r.pdf").unwrap().contains("ending .pdf; a table"));
        for fine in
            ["", " --output r.csv", " --output r.Txt", " --output r", " --output r.pdf --format table"]
        {
            assert_eq!(doubt(&format!("arcstead inspect c{fine}")), None, "{fine}");
        }
    }
}
