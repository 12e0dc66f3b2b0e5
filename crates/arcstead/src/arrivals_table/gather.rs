//! Rows made into captures.

use std::collections::HashSet;

use nalgebra::DMatrix;

use super::capture_arrivals::{AntennaArrival, CaptureArrivals};
use super::error::{TableMistake, TablePlace};
use super::row::{Row, told_delay_ns};
use crate::site::nearest_name::nearest;
use crate::site::{MAIN_STANCE, Site};

type Placed<T> = Result<T, (TablePlace, TableMistake)>;

/// Takes rows and gives captures, each when the first row of the next one comes.
#[derive(Debug)]
pub(super) struct Gatherer<'s> {
    site: &'s Site,
    /// Names of capture and stance of those that were given.
    seen: HashSet<(String, String)>,
    open: Option<Open>,
}

/// The capture whose rows are coming.
#[derive(Debug)]
struct Open {
    arrivals: CaptureArrivals,
    covariances: Vec<Option<Vec<f64>>>,
    places: Vec<TablePlace>,
}

impl<'s> Gatherer<'s> {
    pub(super) fn new(site: &'s Site) -> Self {
        Self { site, seen: HashSet::new(), open: None }
    }

    /// Takes one row; gives the capture before it when the row begins another.
    pub(super) fn take(&mut self, place: TablePlace, row: Row) -> Placed<Option<CaptureArrivals>> {
        let at = |mistake| (place, mistake);
        let stance = row.stance.as_deref().filter(|stance| !stance.is_empty()).unwrap_or(MAIN_STANCE);
        let same = |open: &Open| open.arrivals.capture == row.capture && open.arrivals.stance == stance;
        let mut done = None;
        if !self.open.as_ref().is_some_and(same) {
            done = self.finish()?;
            let known =
                || std::iter::once(MAIN_STANCE).chain(self.site.stances.iter().map(|s| s.name.as_str()));
            if !known().any(|known| known == stance) {
                let nearest = nearest(stance, known()).map(str::to_owned);
                return Err(at(TableMistake::UnknownStance { found: stance.to_owned(), nearest }));
            }
            if row.capture.is_empty() {
                return Err(at(TableMistake::Empty { column: "capture" }));
            }
            if !self.seen.insert((row.capture.clone(), stance.to_owned())) {
                return Err(at(TableMistake::Scattered { capture: row.capture }));
            }
        }
        let open = self.open.get_or_insert_with(|| Open {
            arrivals: CaptureArrivals {
                capture: row.capture.clone(),
                time: row.time,
                stance: stance.to_owned(),
                antennas: vec![],
                covariance_s2: DMatrix::zeros(0, 0),
            },
            covariances: vec![],
            places: vec![],
        });
        if open.arrivals.time != row.time {
            return Err(at(TableMistake::TimeDiffers { capture: row.capture }));
        }
        let Some(antenna) = self.site.antenna_named(&row.antenna) else {
            let names = self.site.geometry.antennas.iter().map(|antenna| antenna.name.as_str());
            let nearest = nearest(&row.antenna, names).map(str::to_owned);
            return Err(at(TableMistake::UnknownAntenna { found: row.antenna, nearest }));
        };
        // Refused here and not at the end: a table must not make a capture longer than the site.
        if open.arrivals.antennas.iter().any(|earlier| earlier.antenna == antenna) {
            let (capture, antenna) = (row.capture, row.antenna);
            return Err(at(TableMistake::RepeatedAntenna { capture, antenna }));
        }
        // The difference first: where both delays are the same, the arrival stays what it is to the last digit.
        let correction_s =
            row.delay_ns.map_or(0.0, |read_ns| (read_ns - told_delay_ns(&self.site.chains[antenna])) * 1e-9);
        open.arrivals.antennas.push(AntennaArrival {
            antenna,
            arrival_s: row.arrival_s.map(|arrival_s| arrival_s + correction_s),
            sigma_s: row.sigma_s,
            snr_db: row.snr_db,
            flags: row.channel_flags().map_err(at)?,
        });
        open.covariances.push(row.covariance_s2);
        open.places.push(place);
        Ok(done)
    }

    /// Gives the last capture, when there is one.
    pub(super) fn finish(&mut self) -> Placed<Option<CaptureArrivals>> {
        let Some(Open { mut arrivals, covariances, places }) = self.open.take() else { return Ok(None) };
        let rows = arrivals.antennas.len();
        let diagonal = covariances.iter().all(Option::is_none);
        let mut covariance_s2 = DMatrix::zeros(rows, rows);
        for (row, covariance) in covariances.into_iter().enumerate() {
            let entry = &arrivals.antennas[row];
            match (covariance, entry.sigma_s) {
                (Some(values), _) if values.len() != rows => {
                    let mistake = TableMistake::CovarianceLength { found: values.len(), expected: rows };
                    return Err((places[row], mistake));
                }
                (Some(values), _) => covariance_s2.row_mut(row).copy_from_slice(&values),
                (None, Some(sigma_s)) if diagonal => covariance_s2[(row, row)] = sigma_s * sigma_s,
                (None, Some(_)) => return Err((places[row], TableMistake::CovarianceMissing)),
                (None, None) => {}
            }
        }
        arrivals.covariance_s2 = covariance_s2;
        arrivals.check(self.site).map_err(|(row, mistake)| (places[row], mistake))?;
        Ok(Some(arrivals))
    }
}
