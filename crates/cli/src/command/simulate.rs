//! `arcstead simulate`: captures of a visit that has not happened, and the truth beside them.

use std::fs;
use std::path::Path;

use arcstead::documents::{
    Document, Head, Inputs, Program, TrueAntenna, TrueCapture, TrueSource, TruthDocument,
};
use arcstead::formats::sigmf::{SigmfWriter, StoredAs, WriterSettings};
use arcstead::formats::{ReadSettings, open_captures};
use arcstead::site::{MAIN_STANCE, Site};
use arcstead::{ArrivalOptions, CaptureTime, Watch};
use arcstead_sim::{CarrierSetting, RecorderSetting, SourceSetting, Visit, VisitSettings};
use serde_json::json;

use crate::arguments::{Place, SimulateArguments};
use crate::console::Console;
use crate::failure::Failure;
use crate::output::without_temporary_name;
use crate::progress::Progress;
use crate::status;
use crate::table::figures::count;

/// The recording in the folder.
const RECORDING: &str = "visit";
/// What may not be there yet, in the order in which it must go: no meta file without its data and its truth.
const FILES: [&str; 3] = ["visit.sigmf-data", "truth.json", "visit.sigmf-meta"];
/// When every simulated visit begins, in seconds of UTC: 2026-01-01T00:00:00Z, at a zero of the mains.
const BEGIN_UNIX_S: i64 = 1_767_225_600;
/// Level of the strongest carrier over the noise, in dB; the help of `--carriers` says it.
const CARRIER_LEVEL_DB: f64 = 10.0;

pub(crate) fn run(asked: &SimulateArguments, console: &mut Console<'_>) -> Result<u8, Failure> {
    let site = Site::read(&asked.site)?;
    check_folder(asked)?;
    let visit = Visit::new(&site.geometry, settings(asked, &site)?)?;

    let staging = staging_folder(&asked.output).map_err(|source| cannot_write(&asked.output, source))?;
    let progress = Progress::begin(&console.talk, Some(visit.capture_count()));
    let written = write_recording(&visit, &site, staging.path(), &progress);
    progress.end();
    if !written? {
        console.talk.warn("stopped; nothing was written");
        return Ok(status::INTERRUPTED);
    }
    let names = capture_names(&staging.path().join(FILES[2]))?;
    let truth = truth(asked, &site, &visit, &names).to_json()?;
    fs::write(staging.path().join(FILES[1]), truth)
        .map_err(|source| cannot_write(&asked.output.join(FILES[1]), source))?;
    move_into_place(staging, &asked.output).map_err(|source| cannot_write(&asked.output, source))?;

    let (folder, captures) = (asked.output.display(), count(visit.capture_count(), "capture"));
    console.talk.say(&format!("{captures} written to {folder}, and the truth about them"));
    Ok(status::DONE)
}

fn cannot_write(path: &Path, source: std::io::Error) -> Failure {
    Failure::Write { path: path.to_owned(), source: without_temporary_name(source) }
}

/// Whether the folder can take the files.
fn check_folder(asked: &SimulateArguments) -> Result<(), Failure> {
    let folder = &asked.output;
    if folder.exists() && !folder.is_dir() {
        return Err(Failure::NotAFolder { path: folder.clone() });
    }
    let found = FILES.iter().map(|name| folder.join(name)).find(|path| path.exists());
    match found {
        Some(path) if !asked.force => Err(Failure::Exists { path }),
        _ => Ok(()),
    }
}

/// What was asked for, with what the site file says of recorder, antennas and chains.
fn settings(asked: &SimulateArguments, site: &Site) -> Result<VisitSettings, Failure> {
    let default = VisitSettings::default();
    let recorder = RecorderSetting {
        sample_rate_hz: site.recorder.sample_rate_hz.ok_or(Failure::NoSampleRate)?,
        sample_count: asked.samples,
        // More bits than the simulator has are told by it, and so are more than fit.
        bits: site.recorder.bits.map_or(default.recorder.bits, |bits| u8::try_from(bits).unwrap_or(u8::MAX)),
        bandwidth_hz: site.recorder.bandwidth_hz.unwrap_or(default.recorder.bandwidth_hz),
    };
    let carriers = if asked.carriers { CarrierSetting::usual(CARRIER_LEVEL_DB) } else { Vec::new() };
    let nyquist_hz = recorder.sample_rate_hz / 2.0;
    let settings = VisitSettings {
        sources: asked.source.iter().map(|place| source(asked, site, place)).collect::<Result<_, _>>()?,
        captures: asked.captures as usize,
        seed: asked.seed,
        recorder,
        band_hz: ArrivalOptions::default().band_of(site).unwrap_or(default.band_hz),
        nominal_delay_s: site.chains.iter().map(|chain| chain.delay_s).collect(),
        // What lies beyond half the sample rate never reaches the converter.
        carriers: carriers.into_iter().filter(|carrier| carrier.frequency_hz <= nyquist_hz).collect(),
        mains_frequency_hz: site.mains_frequency_hz,
        ..default
    };
    Ok(if asked.perfect {
        VisitSettings {
            draw_errors: false,
            gain_spread_db: 0.0,
            ripple_db: 0.0,
            ground_reflection: Some(0.0),
            scatterers: 0,
            ..settings
        }
    } else {
        settings
    })
}

fn source(asked: &SimulateArguments, site: &Site, place: &Place) -> Result<SourceSetting, Failure> {
    let setting = match place {
        Place::At(position_m) => SourceSetting::at(*position_m),
        Place::Asset(name) => {
            let assets = &site.geometry.assets;
            let asset =
                assets.iter().find(|asset| asset.name == *name).ok_or_else(|| Failure::NoSuchAsset {
                    name: name.clone(),
                    known: assets.iter().map(|asset| asset.name.as_str()).collect::<Vec<_>>().join("; "),
                })?;
            SourceSetting::at((asset.from_m + asset.to_m) / 2.0)
        }
    };
    let snr_db = asked.snr.or(site.planning.snr_at_10m_db).unwrap_or(setting.snr_at_10m_db);
    Ok(SourceSetting { snr_at_10m_db: snr_db, ..setting })
}

/// A folder that goes away unless it is moved into place: in the folder itself where there is one, else beside it.
fn staging_folder(folder: &Path) -> std::io::Result<tempfile::TempDir> {
    let beside = folder.parent().filter(|parent| !parent.as_os_str().is_empty()).unwrap_or(Path::new("."));
    let mut builder = tempfile::Builder::new();
    builder.prefix(".arcstead-");
    #[cfg(unix)]
    let everybody = std::os::unix::fs::PermissionsExt::from_mode(0o777);
    #[cfg(unix)]
    // Less the process's mask; by default only the owner could read a temporary folder.
    builder.permissions(everybody);
    let place = if folder.is_dir() { folder } else { beside };
    // Asked first, because the system's own words tell more than those of the temporary folder.
    fs::metadata(place)?;
    builder.tempdir_in(place)
}

/// Writes the captures; false when Ctrl-C came before the last.
fn write_recording(
    visit: &Visit,
    site: &Site,
    folder: &Path,
    progress: &Progress<'_, '_>,
) -> Result<bool, Failure> {
    let recorder = visit.settings().recorder;
    let truth = visit.truth();
    // Integers of 8 and 16 bits have the recorder's own range. Of other numbers of bits the range of the integer would be
    // a wrong one, and clipping would not be seen: those are stored as they are.
    let stored_as = match recorder.bits {
        8 => StoredAs::I8,
        16 => StoredAs::I16,
        _ => StoredAs::F32,
    };
    let codes = f64::from(1_u32 << (recorder.bits - 1));
    let settings = WriterSettings {
        channel_count: truth.full_scale_v.len(),
        sample_rate_hz: recorder.sample_rate_hz,
        stored_as,
        volts_per_count: (stored_as != StoredAs::F32)
            .then(|| truth.full_scale_v.iter().map(|full_v| full_v / codes).collect()),
        description: Some(format!("Simulated by arcstead for {}; not a measurement", site.name)),
    };
    let mut writer = SigmfWriter::create(&folder.join(RECORDING), settings)?;
    let mut worker = visit.worker();
    for (index, capture) in truth.captures.iter().enumerate() {
        if progress.stop() {
            return Ok(false);
        }
        let first_sample_s = capture.emission_s - capture.emission_in_record_s;
        writer.write(&worker.capture(index), moment(first_sample_s))?;
        progress.capture_done();
    }
    writer.finish()?;
    Ok(true)
}

/// The moment `after_s` seconds after the begin of the visit.
fn moment(after_s: f64) -> Option<CaptureTime> {
    let seconds = after_s.floor();
    CaptureTime::from_unix(BEGIN_UNIX_S + seconds as i64, ((after_s - seconds) * 1e12).round() as u64)
}

/// The names that a reader will give the captures.
fn capture_names(meta: &Path) -> Result<Vec<String>, Failure> {
    let file = open_captures(meta, &ReadSettings::default())?;
    Ok((0..file.capture_count()).map(|index| file.capture_name(index)).collect())
}

fn truth(asked: &SimulateArguments, site: &Site, visit: &Visit, names: &[String]) -> TruthDocument {
    let (settings, truth) = (visit.settings(), visit.truth());
    let errors = &truth.errors;
    let options = serde_json::Map::from_iter([
        ("captures".to_owned(), json!(settings.captures)),
        ("seed".to_owned(), json!(settings.seed)),
        ("snr".to_owned(), json!(settings.sources.first().map(|source| source.snr_at_10m_db))),
        ("samples".to_owned(), json!(settings.recorder.sample_count)),
        ("carriers".to_owned(), json!(asked.carriers)),
        ("perfect".to_owned(), json!(asked.perfect)),
        ("sample_rate_gsps".to_owned(), json!(settings.recorder.sample_rate_hz / 1e9)),
        ("bits".to_owned(), json!(settings.recorder.bits)),
        ("bandwidth_mhz".to_owned(), json!(settings.recorder.bandwidth_hz / 1e6)),
        ("band_mhz".to_owned(), json!([settings.band_hz.0 / 1e6, settings.band_hz.1 / 1e6])),
        ("ground_reflection".to_owned(), json!(truth.ground_reflection)),
    ]);
    TruthDocument {
        head: Head {
            schema: TruthDocument::SCHEMA.into(),
            program: Program::this(),
            site: Some(site.name.clone()),
            inputs: Inputs { files: vec![], count: 0, site_sha256: Some(site.sha256.clone()) },
            options,
        },
        seed: settings.seed,
        sources: truth
            .sources
            .iter()
            .zip(&asked.source)
            .zip(&errors.response_error_s)
            .map(|((source, place), response_error_s)| TrueSource {
                position_m: source.position_m.into(),
                asset: match place {
                    Place::At(_) => None,
                    Place::Asset(name) => Some(name.clone()),
                },
                response_error_ns: response_error_s.iter().map(|error_s| error_s * 1e9).collect(),
            })
            .collect(),
        antennas: site
            .geometry
            .antennas
            .iter()
            .enumerate()
            .map(|(index, antenna)| TrueAntenna {
                name: antenna.name.clone(),
                stance: MAIN_STANCE.into(),
                delay_ns: (truth.nominal_delay_s[index] + errors.delay_error_s[index]) * 1e9,
                delay_error_ns: errors.delay_error_s[index] * 1e9,
                position_m: truth.antenna_position_m[index].into(),
                position_error_m: errors.survey_error_m[index].into(),
                gain_db: truth.gain_db[index],
            })
            .collect(),
        captures: truth
            .captures
            .iter()
            .zip(names)
            .map(|(capture, name)| TrueCapture {
                name: name.clone(),
                source: Some(capture.source),
                stance: MAIN_STANCE.into(),
                emission_s: Some(capture.emission_in_record_s),
            })
            .collect(),
    }
}

/// Makes the files appear: a new folder in one step, in a folder that was there the meta file last.
fn move_into_place(staging: tempfile::TempDir, folder: &Path) -> std::io::Result<()> {
    if !folder.exists() {
        fs::rename(staging.path(), folder)?;
        // Nothing is there any more to be taken away.
        let _ = staging.keep();
        return Ok(());
    }
    // An older meta file goes first: no moment pairs old and new.
    match fs::remove_file(folder.join(FILES[2])) {
        Err(error) if error.kind() != std::io::ErrorKind::NotFound => return Err(error),
        _ => {}
    }
    for name in FILES {
        fs::rename(staging.path().join(name), folder.join(name))?;
    }
    staging.close()
}
