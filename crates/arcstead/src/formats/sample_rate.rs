//! One sample rate from what the file says and what the site says.

use std::path::Path;

use super::error::FormatError;
use super::limits::{MAX_SAMPLE_RATE_HZ, MIN_SAMPLE_RATE_HZ};

/// Greatest relative difference between the rate of a file and the rate of the site that passes as the same:
/// a rate that was typed with three digits still agrees, another setting of the recorder does not.
pub(super) const RATE_TOLERANCE: f64 = 1e-3;

/// The rate of a file: its own where it carries one, which then must agree with the site's; else the site's.
pub(super) fn agreed_rate_hz(
    path: &Path,
    file_hz: Option<f64>,
    site_hz: Option<f64>,
) -> Result<f64, FormatError> {
    let Some(rate_hz) = file_hz.or(site_hz) else {
        return Err(FormatError::NoSampleRate { path: path.to_owned() });
    };
    if !(MIN_SAMPLE_RATE_HZ..=MAX_SAMPLE_RATE_HZ).contains(&rate_hz) {
        return Err(FormatError::SampleRate { path: path.to_owned(), found_hz: rate_hz });
    }
    match (file_hz, site_hz) {
        (Some(file_hz), Some(site_hz)) if !same_rate(file_hz, site_hz) => {
            Err(FormatError::RateDisagrees { path: path.to_owned(), file_hz, site_hz })
        }
        _ => Ok(rate_hz),
    }
}

/// Whether two rates, or two intervals, are the same within [`RATE_TOLERANCE`].
pub(super) fn same_rate(one: f64, other: f64) -> bool {
    (one - other).abs() <= RATE_TOLERANCE * other.abs()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_file_counts_and_the_site_must_agree() {
        let rate = |file, site| agreed_rate_hz(Path::new("x"), file, site);
        assert!(matches!(rate(None, None), Err(FormatError::NoSampleRate { .. })));
        assert_eq!(rate(None, Some(5e9)).unwrap().to_bits(), 5e9_f64.to_bits());
        assert_eq!(rate(Some(5.004e9), Some(5e9)).unwrap().to_bits(), 5.004e9_f64.to_bits());
        let error = rate(Some(2.5e9), Some(5e9)).unwrap_err().to_string();
        assert!(error.contains("2.5 GS/s") && error.contains("says 5 GS/s"), "{error}");
        for bad in [0.0, -1.0, f64::NAN, f64::INFINITY, 1e300] {
            assert!(matches!(rate(Some(bad), None), Err(FormatError::SampleRate { .. })), "{bad}");
            assert!(matches!(rate(None, Some(bad)), Err(FormatError::SampleRate { .. })), "{bad}");
        }
    }
}
