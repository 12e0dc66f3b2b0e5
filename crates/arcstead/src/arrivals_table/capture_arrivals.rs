//! The arrivals of one capture, at antennas.

use arcstead_core::ChannelFlags;
use nalgebra::DMatrix;

use super::error::TableMistake;
use crate::capture_time::CaptureTime;
use crate::site::Site;

/// How far `sigma_s` may be from the root of its variance, relative: what rounding to a few digits by hand leaves.
const SIGMA_AGREES: f64 = 1e-3;
/// How far the two halves of a covariance, or a correlation and 1, may be apart, relative: rounding.
const ROUNDING: f64 = 1e-9;

/// The arrivals of one capture, delays already subtracted: a group of rows of the table.
#[derive(Debug, Clone, PartialEq)]
pub struct CaptureArrivals {
    /// Name of the capture.
    pub capture: String,
    /// When it was taken, where that is known.
    pub time: Option<CaptureTime>,
    /// Name of the stance it was taken from; `main` is where the `[[antenna]]` tables stand.
    pub stance: String,
    /// Its rows: some of the antennas of the site, each at most once.
    pub antennas: Vec<AntennaArrival>,
    /// Random covariance in s^2, shape rows x rows in the order of `antennas`; rows and columns of missed arrivals
    /// are zero. Its diagonal is `sigma_s` squared.
    pub covariance_s2: DMatrix<f64>,
}

/// The arrival at one antenna.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct AntennaArrival {
    /// Index of the antenna in the site.
    pub antenna: usize,
    /// Arrival in seconds after the first sample of the capture, the antenna's delay subtracted; none when missed.
    pub arrival_s: Option<f64>,
    /// Random standard deviation of the arrival in seconds; none when missed.
    pub sigma_s: Option<f64>,
    /// 20 log10 of pulse peak over noise rms in dB; none where not known.
    pub snr_db: Option<f64>,
    /// What is wrong or remarkable with the channel.
    pub flags: ChannelFlags,
}

impl CaptureArrivals {
    /// Number of rows with an arrival.
    #[must_use]
    pub fn received(&self) -> usize {
        self.antennas.iter().filter(|row| row.arrival_s.is_some()).count()
    }

    /// Whether the parts agree with each other and with the site; the row to blame comes with the mistake.
    pub(super) fn check(&self, site: &Site) -> Result<(), (usize, TableMistake)> {
        let rows = self.antennas.len();
        let antennas = &site.geometry.antennas;
        let name = |row: usize| antennas[self.antennas[row].antenna].name.clone();
        for (row, entry) in self.antennas.iter().enumerate() {
            let Some(antenna) = antennas.get(entry.antenna) else {
                return Err((
                    row,
                    TableMistake::NoSuchAntenna { index: entry.antenna, antennas: antennas.len() },
                ));
            };
            if self.antennas[..row].iter().any(|earlier| earlier.antenna == entry.antenna) {
                let (capture, antenna) = (self.capture.clone(), antenna.name.clone());
                return Err((row, TableMistake::RepeatedAntenna { capture, antenna }));
            }
            for (column, value) in
                [("arrival_s", entry.arrival_s), ("sigma_s", entry.sigma_s), ("snr_db", entry.snr_db)]
            {
                if let Some(found) = value.filter(|value| !value.is_finite()) {
                    return Err((row, TableMistake::Number { column, found: found.to_string() }));
                }
            }
            match (entry.arrival_s, entry.sigma_s) {
                (Some(_), None) => return Err((row, TableMistake::NoSigma)),
                (None, Some(_)) => return Err((row, TableMistake::SigmaAlone)),
                (Some(_), Some(found_s)) if found_s <= 0.0 => {
                    return Err((row, TableMistake::Sigma { found_s }));
                }
                _ => {}
            }
        }
        if self.covariance_s2.shape() != (rows, rows) {
            let found = self.covariance_s2.ncols();
            return Err((0, TableMistake::CovarianceLength { found, expected: rows }));
        }
        for row in 0..rows {
            for column in 0..=row {
                let (below, above) = (self.covariance_s2[(row, column)], self.covariance_s2[(column, row)]);
                let [sigma_row, sigma_column] =
                    [row, column].map(|at| self.antennas[at].sigma_s.unwrap_or(0.0));
                let most = sigma_row * sigma_column;
                if !(below.is_finite() && above.is_finite()) {
                    let found = if below.is_finite() { above } else { below }.to_string();
                    return Err((row, TableMistake::Number { column: "covariance_s2", found }));
                }
                if row == column {
                    if (below.max(0.0).sqrt() - sigma_row).abs() > SIGMA_AGREES * sigma_row {
                        let mistake =
                            TableMistake::CovarianceSigma { sigma_s: sigma_row, variance_s2: below };
                        return Err((row, mistake));
                    }
                } else if (below - above).abs() > ROUNDING * most {
                    let (first, second) = (name(column), name(row));
                    return Err((row, TableMistake::CovarianceHalves { first, second, above, below }));
                } else if below.abs() > most * (1.0 + SIGMA_AGREES).powi(2) {
                    let (first, second) = (name(column), name(row));
                    return Err((
                        row,
                        TableMistake::CovarianceSize { first, second, found_s2: below, most_s2: most },
                    ));
                }
            }
        }
        Ok(())
    }
}
