//! When a capture was taken: a moment in UTC, to the picosecond.

use std::fmt;
use std::str::FromStr;

use serde::{Deserialize, Serialize};
use thiserror::Error;

/// Picoseconds in a second.
const PS_PER_S: u64 = 1_000_000_000_000;
/// Seconds in a day; UTC as counted here has no leap seconds.
const S_PER_DAY: i64 = 86_400;
/// 1970-01-01 as days after 0000-01-01.
const EPOCH_DAYS: i64 = 719_528;
/// The first second of the year 0000 and the first of the year 10000, after 1970-01-01T00:00:00Z.
const RANGE_S: std::ops::Range<i64> = -EPOCH_DAYS * S_PER_DAY..(3_652_425 - EPOCH_DAYS) * S_PER_DAY;

/// A moment in UTC, to the picosecond, between the years 0000 and 9999.
///
/// It is written as RFC 3339 (Klyne and Newman, 2002), the form of `core:datetime` in SigMF, in arrivals tables and
/// in result documents. At 5 GS/s a sample lasts 200 ps, so the nanoseconds of date libraries do not do; beside
/// the fraction there are only the lengths of the months to know, and the proleptic Gregorian calendar is counted
/// here. Moments order in time. Leap seconds are not counted: a second 60 is the first second of the next minute.
///
/// ```
/// use arcstead::CaptureTime;
/// let time: CaptureTime = "2026-03-04T11:15:00.0000000002+01:00".parse()?;
/// assert_eq!(time.to_string(), "2026-03-04T10:15:00.0000000002Z");
/// assert_eq!(time.picoseconds(), 200);
/// # Ok::<(), arcstead::CaptureTimeError>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Serialize, Deserialize)]
#[serde(try_from = "String", into = "String")]
pub struct CaptureTime {
    // The order of the fields is the order of moments.
    unix_seconds: i64,
    picoseconds: u64,
}

/// Why a text is no [`CaptureTime`].
#[derive(Debug, Clone, PartialEq, Eq, Error)]
#[non_exhaustive]
pub enum CaptureTimeError {
    /// The text has not the form of RFC 3339.
    #[error(
        "`{found}` is no time; expected RFC 3339 with a zone, such as 2026-03-04T10:15:00.25Z or ...+01:00"
    )]
    Form {
        /// The text.
        found: String,
    },
    /// A part of the time is beyond what it can be.
    #[error("`{found}` is no time: its {part} is {value}, expected {least} to {most}")]
    Part {
        /// The text.
        found: String,
        /// Which part: month, day, hour, minute, second, hour or minute of the zone.
        part: &'static str,
        /// What it is.
        value: i64,
        /// The least it can be.
        least: i64,
        /// The most it can be.
        most: i64,
    },
    /// The moment is before the year 0000 or after the year 9999 in UTC.
    #[error("`{found}` lies outside the years 0000 to 9999 of UTC")]
    Range {
        /// The text.
        found: String,
    },
}

impl CaptureTime {
    /// The moment `unix_seconds` whole seconds and `picoseconds` after 1970-01-01T00:00:00Z; `picoseconds` counts
    /// forward also before 1970, and more than a second of them carries over. None outside the years 0000 to 9999.
    #[must_use]
    pub fn from_unix(unix_seconds: i64, picoseconds: u64) -> Option<Self> {
        // A u64 of picoseconds is less than 2^25 seconds.
        let carried = i64::try_from(picoseconds / PS_PER_S).ok()?;
        let unix_seconds = unix_seconds.checked_add(carried)?;
        RANGE_S.contains(&unix_seconds).then_some(Self { unix_seconds, picoseconds: picoseconds % PS_PER_S })
    }

    /// Whole seconds after 1970-01-01T00:00:00Z, rounded down: negative before.
    #[must_use]
    pub fn unix_seconds(self) -> i64 {
        self.unix_seconds
    }

    /// Picoseconds after the whole second, 0 to 999 999 999 999.
    #[must_use]
    pub fn picoseconds(self) -> u64 {
        self.picoseconds
    }

    /// How much later this moment is than `earlier`, in seconds; negative when it is before it.
    ///
    /// Exact to rounding of the result: the difference is taken in whole picoseconds.
    #[must_use]
    pub fn seconds_since(self, earlier: Self) -> f64 {
        let seconds = i128::from(self.unix_seconds) - i128::from(earlier.unix_seconds);
        let picoseconds = i128::from(self.picoseconds) - i128::from(earlier.picoseconds);
        (seconds * i128::from(PS_PER_S) + picoseconds) as f64 / PS_PER_S as f64
    }

    /// Reads RFC 3339: date, time of day, any number of fraction digits, and the zone as `Z` or an offset.
    /// `T` and `Z` may be small and a space may stand for `T`. Digits beyond the picosecond are dropped.
    ///
    /// # Errors
    /// [`CaptureTimeError`] for a text of another form, a day or hour there is not, or a moment outside the years
    /// 0000 to 9999 of UTC.
    pub fn parse_rfc3339(text: &str) -> Result<Self, CaptureTimeError> {
        let form = || CaptureTimeError::Form { found: text.to_owned() };
        let within = |part, value: i64, least, most| {
            if (least..=most).contains(&value) {
                Ok(value)
            } else {
                Err(CaptureTimeError::Part { found: text.to_owned(), part, value, least, most })
            }
        };
        let mut rest = text.as_bytes();
        let year = digits(&mut rest, 4).ok_or_else(form)?;
        mark(&mut rest, b"-").ok_or_else(form)?;
        let month = digits(&mut rest, 2).ok_or_else(form)?;
        mark(&mut rest, b"-").ok_or_else(form)?;
        let day = digits(&mut rest, 2).ok_or_else(form)?;
        mark(&mut rest, b"Tt ").ok_or_else(form)?;
        let hour = digits(&mut rest, 2).ok_or_else(form)?;
        mark(&mut rest, b":").ok_or_else(form)?;
        let minute = digits(&mut rest, 2).ok_or_else(form)?;
        mark(&mut rest, b":").ok_or_else(form)?;
        let second = digits(&mut rest, 2).ok_or_else(form)?;
        let picoseconds =
            if mark(&mut rest, b".").is_some() { fraction_ps(&mut rest).ok_or_else(form)? } else { 0 };
        let (sign, zone_hour, zone_minute) = match mark(&mut rest, b"Zz+-").ok_or_else(form)? {
            sign @ (b'+' | b'-') => {
                let zone_hour = digits(&mut rest, 2).ok_or_else(form)?;
                mark(&mut rest, b":").ok_or_else(form)?;
                (if sign == b'+' { 1 } else { -1 }, zone_hour, digits(&mut rest, 2).ok_or_else(form)?)
            }
            _ => (0, 0, 0),
        };
        if !rest.is_empty() {
            return Err(form());
        }
        within("month", month, 1, 12)?;
        within("day", day, 1, days_in_month(year, month))?;
        within("hour", hour, 0, 23)?;
        within("minute", minute, 0, 59)?;
        within("second", second, 0, 60)?;
        within("hour of the zone", zone_hour, 0, 23)?;
        within("minute of the zone", zone_minute, 0, 59)?;
        let local = days_from_date(year, month, day) * S_PER_DAY + hour * 3600 + minute * 60 + second;
        let unix_seconds = local - sign * (zone_hour * 3600 + zone_minute * 60);
        Self::from_unix(unix_seconds, picoseconds)
            .ok_or_else(|| CaptureTimeError::Range { found: text.to_owned() })
    }
}

impl fmt::Display for CaptureTime {
    /// RFC 3339 in UTC, the fraction without trailing zeros and left out when it is zero.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (year, month, day) = date_from_days(self.unix_seconds.div_euclid(S_PER_DAY));
        let second_of_day = self.unix_seconds.rem_euclid(S_PER_DAY);
        let (hour, minute, second) = (second_of_day / 3600, second_of_day / 60 % 60, second_of_day % 60);
        write!(f, "{year:04}-{month:02}-{day:02}T{hour:02}:{minute:02}:{second:02}")?;
        if self.picoseconds != 0 {
            let fraction = format!("{:012}", self.picoseconds);
            write!(f, ".{}", fraction.trim_end_matches('0'))?;
        }
        f.write_str("Z")
    }
}

impl FromStr for CaptureTime {
    type Err = CaptureTimeError;

    fn from_str(text: &str) -> Result<Self, Self::Err> {
        Self::parse_rfc3339(text)
    }
}

impl TryFrom<String> for CaptureTime {
    type Error = CaptureTimeError;

    fn try_from(text: String) -> Result<Self, Self::Error> {
        Self::parse_rfc3339(&text)
    }
}

impl From<CaptureTime> for String {
    fn from(time: CaptureTime) -> Self {
        time.to_string()
    }
}

/// Takes exactly `count` digits off the front.
fn digits(rest: &mut &[u8], count: usize) -> Option<i64> {
    let (taken, left) = rest.split_at_checked(count)?;
    *rest = left;
    taken.iter().try_fold(0, |value, byte| byte.is_ascii_digit().then(|| value * 10 + i64::from(byte - b'0')))
}

/// Takes one byte off the front when it is one of `allowed`.
fn mark(rest: &mut &[u8], allowed: &[u8]) -> Option<u8> {
    let (&first, left) = rest.split_first()?;
    allowed.contains(&first).then(|| {
        *rest = left;
        first
    })
}

/// Takes all digits off the front as a fraction of a second; none where there is no digit.
fn fraction_ps(rest: &mut &[u8]) -> Option<u64> {
    let count = rest.iter().take_while(|byte| byte.is_ascii_digit()).count();
    let (taken, left) = rest.split_at(count);
    *rest = left;
    let zeros = std::iter::repeat(&b'0');
    let value = taken.iter().chain(zeros).take(12).fold(0, |value, byte| value * 10 + u64::from(byte - b'0'));
    (count > 0).then_some(value)
}

fn is_leap(year: i64) -> bool {
    year % 4 == 0 && (year % 100 != 0 || year % 400 == 0)
}

fn days_in_month(year: i64, month: i64) -> i64 {
    match month {
        2 if is_leap(year) => 29,
        2 => 28,
        4 | 6 | 9 | 11 => 30,
        _ => 31,
    }
}

/// Days from 0000-01-01 to the first of January of a year from 0 on: 365 for each year before it, and one more
/// for each leap year among them (the year 0 is one).
fn days_before_year(year: i64) -> i64 {
    let last = year - 1;
    365 * year + if year > 0 { last / 4 - last / 100 + last / 400 + 1 } else { 0 }
}

/// Days after 1970-01-01 of a date of the proleptic Gregorian calendar.
fn days_from_date(year: i64, month: i64, day: i64) -> i64 {
    days_before_year(year) + (1..month).map(|m| days_in_month(year, m)).sum::<i64>() + day - 1 - EPOCH_DAYS
}

/// Year, month and day of a day after 1970-01-01 that lies in the years 0000 to 9999.
fn date_from_days(days: i64) -> (i64, i64, i64) {
    let days = days + EPOCH_DAYS;
    // 146 097 days are 400 years exactly; the division is right or one year too far.
    let mut year = days * 400 / 146_097;
    if days_before_year(year) > days {
        year -= 1;
    } else if days_before_year(year + 1) <= days {
        year += 1;
    }
    let mut left = days - days_before_year(year);
    let mut month = 1;
    while left >= days_in_month(year, month) {
        left -= days_in_month(year, month);
        month += 1;
    }
    (year, month, left + 1)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn time(text: &str) -> CaptureTime {
        text.parse().unwrap()
    }

    #[test]
    fn known_moments() {
        // RFC 3339 (2002), section 5.8: the examples, and which of them are the same moment.
        assert_eq!(time("1985-04-12T23:20:50.52Z").unix_seconds(), 482_196_050);
        assert_eq!(time("1985-04-12T23:20:50.52Z").picoseconds(), 520_000_000_000);
        assert_eq!(time("1996-12-19T16:39:57-08:00"), time("1996-12-20T00:39:57Z"));
        assert_eq!(time("1990-12-31T23:59:60Z"), time("1990-12-31T15:59:60-08:00"));
        assert_eq!(time("1937-01-01T12:00:27.87+00:20"), time("1937-01-01T11:40:27.87Z"));
        // From memory: POSIX seconds of the epoch, of a billion seconds and of the last 32-bit second.
        assert_eq!(time("1970-01-01T00:00:00Z").unix_seconds(), 0);
        assert_eq!(time("2001-09-09T01:46:40Z").unix_seconds(), 1_000_000_000);
        assert_eq!(time("2038-01-19T03:14:07Z").unix_seconds(), 2_147_483_647);
    }

    #[test]
    fn every_day_of_ten_thousand_years_comes_back() {
        let mut expected = (0, 1, 1);
        for days in RANGE_S.start / S_PER_DAY..RANGE_S.end / S_PER_DAY {
            let (year, month, day) = date_from_days(days);
            assert_eq!((year, month, day), expected, "the day after the one before");
            assert_eq!(days_from_date(year, month, day), days);
            expected = if day < days_in_month(year, month) {
                (year, month, day + 1)
            } else if month < 12 {
                (year, month + 1, 1)
            } else {
                (year + 1, 1, 1)
            };
        }
        assert_eq!(expected, (10_000, 1, 1));
    }

    #[test]
    fn fractions_of_any_length() {
        for (text, printed) in [
            ("2026-03-04T10:15:00.5Z", "2026-03-04T10:15:00.5Z"),
            ("2026-03-04 10:15:00.000z", "2026-03-04T10:15:00Z"),
            ("2026-03-04t10:15:00.000000000001Z", "2026-03-04T10:15:00.000000000001Z"),
            ("2026-03-04T10:15:00.0000000002009999Z", "2026-03-04T10:15:00.0000000002Z"),
            ("1969-12-31T23:59:59.75Z", "1969-12-31T23:59:59.75Z"),
            ("0000-01-01T00:00:00Z", "0000-01-01T00:00:00Z"),
            ("9999-12-31T23:59:59.999999999999Z", "9999-12-31T23:59:59.999999999999Z"),
            ("2024-02-29T23:30:00-01:00", "2024-03-01T00:30:00Z"),
        ] {
            assert_eq!(time(text).to_string(), printed);
            assert_eq!(time(printed), time(text));
        }
    }

    #[test]
    fn what_is_no_time_is_told() {
        for text in [
            "",
            "2026-03-04",
            "2026-03-04T10:15:00",
            "2026-03-04T10:15Z",
            "2026-3-4T10:15:00Z",
            "2026-03-04T10:15:00.Z",
            "2026-03-04T10:15:00,5Z",
            "2026-03-04T10:15:00+0100",
            "2026-03-04T10:15:00Zulu",
            "+026-03-04T10:15:00Z",
            "2026-03-04T10:15:0\u{665}Z",
        ] {
            assert_eq!(text.parse::<CaptureTime>(), Err(CaptureTimeError::Form { found: text.into() }));
        }
        let error = "2025-02-29T00:00:00Z".parse::<CaptureTime>().unwrap_err();
        assert_eq!(error.to_string(), "`2025-02-29T00:00:00Z` is no time: its day is 29, expected 1 to 28");
        for text in ["2026-13-01T00:00:00Z", "2026-01-01T24:00:00Z", "2026-01-01T00:00:00+00:60"] {
            assert!(matches!(text.parse::<CaptureTime>(), Err(CaptureTimeError::Part { .. })), "{text}");
        }
        assert!(matches!(
            "9999-12-31T23:59:59-00:01".parse::<CaptureTime>(),
            Err(CaptureTimeError::Range { .. })
        ));
    }

    #[test]
    fn moments_order_and_differ() {
        let (first, second) =
            (time("1969-12-31T23:59:59.9999999998Z"), time("1970-01-01T00:00:00.0000000003Z"));
        assert!(first < second);
        assert_eq!(second.seconds_since(first).to_bits(), 500e-12_f64.to_bits());
        assert_eq!(first.seconds_since(second).to_bits(), (-500e-12_f64).to_bits());
    }

    #[test]
    fn seconds_of_unix_carry_and_end() {
        assert_eq!(CaptureTime::from_unix(-1, 1_500_000_000_000), CaptureTime::from_unix(0, 500_000_000_000));
        assert_eq!(CaptureTime::from_unix(i64::MAX, u64::MAX), None);
        assert_eq!(CaptureTime::from_unix(RANGE_S.end, 0), None);
        assert!(CaptureTime::from_unix(RANGE_S.end - 1, 0).is_some());
    }

    #[test]
    fn documents_carry_it_as_text() {
        let json = serde_json::to_string(&time("2026-03-04T10:15:00.25Z")).unwrap();
        assert_eq!(json, "\"2026-03-04T10:15:00.25Z\"");
        assert_eq!(serde_json::from_str::<CaptureTime>(&json).unwrap(), time("2026-03-04T10:15:00.25Z"));
        assert!(serde_json::from_str::<CaptureTime>("\"now\"").is_err());
    }
}
