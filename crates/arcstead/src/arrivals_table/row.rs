//! One row of the table, and how it stands in CSV.

use arcstead_core::ChannelFlags;
use csv::StringRecord;
use serde::{Deserialize, Serialize};

use super::capture_arrivals::CaptureArrivals;
use super::error::TableMistake;
use crate::capture_time::CaptureTime;
use crate::site::nearest_name::nearest;
use crate::site::{Chain, Site};

/// The columns in the order in which they are written.
pub(super) const COLUMNS: [&str; 10] = [
    "capture",
    "time",
    "stance",
    "antenna",
    "arrival_s",
    "sigma_s",
    "snr_db",
    "delay_ns",
    "covariance_s2",
    "flags",
];

/// The columns that must be there when a table is read.
const NEEDED: [&str; 4] = ["capture", "antenna", "arrival_s", "sigma_s"];

/// One row, names not yet looked up. Its fields are the columns.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub(super) struct Row {
    pub(super) capture: String,
    #[serde(default)]
    pub(super) time: Option<CaptureTime>,
    #[serde(default)]
    pub(super) stance: Option<String>,
    pub(super) antenna: String,
    pub(super) arrival_s: Option<f64>,
    pub(super) sigma_s: Option<f64>,
    #[serde(default)]
    pub(super) snr_db: Option<f64>,
    #[serde(default)]
    pub(super) delay_ns: Option<f64>,
    #[serde(default)]
    pub(super) covariance_s2: Option<Vec<f64>>,
    #[serde(default)]
    pub(super) flags: Vec<String>,
}

/// The delay of a chain as the table tells it: in nanoseconds, to twelve digits, so that 52.1e-9 s is told as 52.1.
pub(super) fn told_delay_ns(chain: &Chain) -> f64 {
    let delay_ns = chain.delay_s * 1e9;
    format!("{delay_ns:.11e}").parse().unwrap_or(delay_ns)
}

impl Row {
    /// Row `index` of a capture that was checked against the site.
    pub(super) fn of(arrivals: &CaptureArrivals, index: usize, site: &Site) -> Self {
        let entry = &arrivals.antennas[index];
        let received = entry.arrival_s.is_some();
        Self {
            capture: arrivals.capture.clone(),
            time: arrivals.time,
            stance: Some(arrivals.stance.clone()),
            antenna: site.geometry.antennas[entry.antenna].name.clone(),
            arrival_s: entry.arrival_s,
            sigma_s: entry.sigma_s,
            snr_db: entry.snr_db,
            delay_ns: Some(told_delay_ns(&site.chains[entry.antenna])),
            covariance_s2: received.then(|| arrivals.covariance_s2.row(index).iter().copied().collect()),
            flags: entry.flags.names().map(str::to_owned).collect(),
        }
    }

    /// The fields as CSV has them, in the order of [`COLUMNS`].
    pub(super) fn fields(&self) -> [String; 10] {
        // Debug gives the shortest digits that read back exactly, with an exponent where that is shorter to read.
        let number = |value: Option<f64>| value.map_or(String::new(), |value| format!("{value:?}"));
        let covariance: Vec<_> =
            self.covariance_s2.iter().flatten().map(|value| format!("{value:?}")).collect();
        [
            self.capture.clone(),
            self.time.map_or(String::new(), |time| time.to_string()),
            self.stance.clone().unwrap_or_default(),
            self.antenna.clone(),
            number(self.arrival_s),
            number(self.sigma_s),
            number(self.snr_db),
            number(self.delay_ns),
            covariance.join(";"),
            self.flags.join(";"),
        ]
    }

    /// The flags of the row.
    pub(super) fn channel_flags(&self) -> Result<ChannelFlags, TableMistake> {
        ChannelFlags::from_names(self.flags.iter().map(String::as_str))
            .map_err(|found| TableMistake::UnknownFlag { found: found.to_owned() })
    }
}

/// Where each column stands in a CSV file.
#[derive(Debug)]
pub(super) struct Header {
    /// For each of [`COLUMNS`] the field of a record, where the column is there.
    fields: [Option<usize>; 10],
}

impl Header {
    pub(super) fn read(record: &StringRecord) -> Result<Self, TableMistake> {
        let mut fields = [None; 10];
        let mut unknown = Vec::new();
        for (field, found) in record.iter().map(str::trim).enumerate() {
            match COLUMNS.iter().position(|column| *column == found) {
                Some(column) if fields[column].is_some() => {
                    return Err(TableMistake::RepeatedColumn { column: COLUMNS[column] });
                }
                Some(column) => fields[column] = Some(field),
                None => unknown.push(found),
            }
        }
        for column in NEEDED {
            if !record.iter().any(|found| found.trim() == column) {
                let nearest = nearest(column, unknown.iter().copied()).map(str::to_owned);
                return Err(TableMistake::MissingColumn { column, nearest });
            }
        }
        // A column of the user's own is no matter; a known one misspelt would be passed over in silence.
        let absent =
            (0..COLUMNS.len()).filter(|&column| fields[column].is_none()).map(|column| COLUMNS[column]);
        let absent: Vec<_> = absent.collect();
        for found in unknown {
            if let Some(nearest) = nearest(found, absent.iter().copied()) {
                return Err(TableMistake::UnknownColumn { found: found.to_owned(), nearest });
            }
        }
        Ok(Self { fields })
    }

    /// The row that a record says.
    pub(super) fn row(&self, record: &StringRecord) -> Result<Row, TableMistake> {
        let field = |column: usize| {
            self.fields[column]
                .and_then(|field| record.get(field))
                .map(str::trim)
                .filter(|text| !text.is_empty())
        };
        let name = |column: usize| {
            field(column).map(str::to_owned).ok_or(TableMistake::Empty { column: COLUMNS[column] })
        };
        let number = |column: usize| field(column).map(|text| parsed(column, text)).transpose();
        Ok(Row {
            capture: name(0)?,
            time: field(1).map(|text| text.parse().map_err(TableMistake::Time)).transpose()?,
            stance: field(2).map(str::to_owned),
            antenna: name(3)?,
            arrival_s: number(4)?,
            sigma_s: number(5)?,
            snr_db: number(6)?,
            delay_ns: number(7)?,
            covariance_s2: field(8)
                .map(|text| text.split(';').map(|text| parsed(8, text.trim())).collect())
                .transpose()?,
            flags: field(9)
                .map_or(Vec::new(), |text| text.split(';').map(|flag| flag.trim().to_owned()).collect()),
        })
    }
}

fn parsed(column: usize, text: &str) -> Result<f64, TableMistake> {
    text.parse()
        .ok()
        .filter(|number: &f64| number.is_finite())
        .ok_or_else(|| TableMistake::Number { column: COLUMNS[column], found: format!("`{text}`") })
}
