//! What each kind of number in a site file can be, and the slips of unit that are made with it.

use super::mistake::UnitSlip;

/// A kind of number: its unit in the file, its limits, and units it is taken for by mistake.
///
/// The limits are wide: they are there for slips of unit and for numbers that would ruin a computation, not to judge a
/// site. They are a matter of judgement (common practice, no source).
#[derive(Debug)]
pub(super) struct Quantity {
    /// The unit, as it is written.
    pub(super) unit: &'static str,
    /// The limits in words, without the unit.
    pub(super) expected: &'static str,
    least: f64,
    most: f64,
    /// Whether `least` itself is not allowed.
    above_least: bool,
    /// Magnitudes below this, zero aside, are a slip of unit; 0 for none.
    smallest: f64,
    /// Other units: what one of them is in `unit`, and its name. The nearest to `unit` first.
    slips: &'static [(f64, &'static str)],
}

impl Quantity {
    /// Whether the number can be what it is given as.
    pub(super) fn allows(&self, value: f64) -> bool {
        let above = if self.above_least { value > self.least } else { value >= self.least };
        above && value <= self.most && (value.abs() >= self.smallest || value.abs() <= 0.0)
    }

    /// The unit that a number which is not allowed seems to be in: the first in which it would be.
    pub(super) fn slip(&self, value: f64) -> Option<UnitSlip> {
        self.slips.iter().find(|(scale, _)| self.allows(value * scale)).map(|&(scale, looks_like)| UnitSlip {
            looks_like,
            unit: self.unit,
            instead: to_digits(value * scale),
        })
    }
}

/// Rounded to twelve digits, which a change of unit keeps and its rounding does not disturb.
fn to_digits(value: f64) -> f64 {
    format!("{value:.11e}").parse().unwrap_or(value)
}

const MILLIMETRES: (f64, &str) = (1e-3, "millimetres");
const CENTIMETRES: (f64, &str) = (1e-2, "centimetres");
const TO_NANOSECONDS: &[(f64, &str)] = &[(1e-3, "picoseconds"), (1e9, "seconds")];
const TO_MEGAHERTZ: &[(f64, &str)] = &[(1e-3, "kilohertz"), (1e-6, "hertz")];

/// No limits but that of the type.
const PLAIN: Quantity = Quantity {
    unit: "",
    expected: "a number",
    least: f64::MIN,
    most: f64::MAX,
    above_least: false,
    smallest: 0.0,
    slips: &[],
};

pub(super) const COORDINATE_M: Quantity = Quantity {
    unit: "m",
    expected: "a site coordinate from -100000 to 100000",
    least: -1e5,
    most: 1e5,
    slips: &[MILLIMETRES],
    ..PLAIN
};
pub(super) const RADIUS_M: Quantity = Quantity {
    unit: "m",
    expected: "a radius from 0 to 100",
    least: 0.0,
    most: 100.0,
    slips: &[MILLIMETRES],
    ..PLAIN
};
pub(super) const SIGMA_M: Quantity = Quantity {
    unit: "m",
    expected: "a standard deviation above 0 and at most 10",
    least: 0.0,
    most: 10.0,
    above_least: true,
    slips: &[CENTIMETRES, MILLIMETRES],
    ..PLAIN
};
pub(super) const DISTANCE_M: Quantity = Quantity {
    unit: "m",
    expected: "a distance above 0 and at most 10000",
    least: 0.0,
    most: 1e4,
    above_least: true,
    slips: &[MILLIMETRES],
    ..PLAIN
};
pub(super) const DELAY_NS: Quantity = Quantity {
    unit: "ns",
    expected: "a delay from -100000 to 100000",
    least: -1e5,
    most: 1e5,
    smallest: 1e-6,
    slips: TO_NANOSECONDS,
    ..PLAIN
};
pub(super) const SIGMA_NS: Quantity = Quantity {
    unit: "ns",
    expected: "a standard deviation above 0 and at most 1000",
    least: 0.0,
    most: 1e3,
    above_least: true,
    smallest: 1e-6,
    slips: TO_NANOSECONDS,
};
pub(super) const LATE_SCALE_NS: Quantity = Quantity {
    unit: "ns",
    expected: "a time above 0 and at most 10000",
    least: 0.0,
    most: 1e4,
    above_least: true,
    smallest: 1e-6,
    slips: TO_NANOSECONDS,
};
pub(super) const FREQUENCY_MHZ: Quantity = Quantity {
    unit: "MHz",
    expected: "a frequency above 0 and at most 100000",
    least: 0.0,
    most: 1e5,
    above_least: true,
    slips: TO_MEGAHERTZ,
    ..PLAIN
};
pub(super) const SAMPLE_RATE_GSPS: Quantity = Quantity {
    unit: "GS/s",
    expected: "a sample rate above 0 and at most 1000",
    least: 0.0,
    most: 1e3,
    above_least: true,
    slips: &[(1e-3, "MS/s"), (1e-9, "samples per second")],
    ..PLAIN
};
pub(super) const MAINS_HZ: Quantity =
    Quantity { unit: "Hz", expected: "a mains frequency from 1 to 1000", least: 1.0, most: 1e3, ..PLAIN };
/// A refractivity of 1 to 2 N units is no air on earth, but what a refractive index looks like.
pub(super) const REFRACTIVITY: Quantity = Quantity {
    unit: "N units",
    expected: "a refractivity (n - 1) 1e6 from 2 to 1000, or 0 for vacuum,",
    least: 0.0,
    most: 1e3,
    smallest: 2.0,
    ..PLAIN
};
pub(super) const SPEED_M_PER_NS: Quantity = Quantity {
    unit: "m/ns",
    expected: "a speed from 0.01 to that of light in vacuum, 0.299792458",
    least: 0.01,
    most: 0.299_792_458,
    slips: &[(1e-3, "m/us"), (1e-9, "m/s")],
    ..PLAIN
};
pub(super) const SNR_DB: Quantity =
    Quantity { unit: "dB", expected: "a ratio from -60 to 120", least: -60.0, most: 120.0, ..PLAIN };
/// 1 would rule out what cannot be known; 0 is allowed, for those who do know.
pub(super) const PRIOR: Quantity = Quantity {
    unit: "",
    expected: "a probability from 0 to 0.99",
    least: 0.0,
    most: 0.99,
    slips: &[(1e-2, "per cent")],
    ..PLAIN
};
pub(super) const WEIGHT: Quantity =
    Quantity { unit: "", expected: "a weight from 0.000001 to 1000000", least: 1e-6, most: 1e6, ..PLAIN };
pub(super) const LATITUDE_DEG: Quantity =
    Quantity { unit: "degrees", expected: "a latitude from -90 to 90", least: -90.0, most: 90.0, ..PLAIN };
pub(super) const LONGITUDE_DEG: Quantity = Quantity {
    unit: "degrees",
    expected: "a longitude from -180 to 180",
    least: -180.0,
    most: 180.0,
    ..PLAIN
};
pub(super) const ELLIPSOID_HEIGHT_M: Quantity = Quantity {
    unit: "m",
    expected: "a height from -1000 to 10000",
    least: -1e3,
    most: 1e4,
    slips: &[MILLIMETRES],
    ..PLAIN
};

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn limits_are_kept() {
        assert!(RADIUS_M.allows(0.0) && !RADIUS_M.allows(-1e-9));
        assert!(!SIGMA_M.allows(0.0) && SIGMA_M.allows(1e-4));
        assert!(DELAY_NS.allows(0.0) && DELAY_NS.allows(-52.1) && !DELAY_NS.allows(52.1e-9));
        assert!(REFRACTIVITY.allows(0.0) && REFRACTIVITY.allows(315.0) && !REFRACTIVITY.allows(1.000_315));
        assert!(!COORDINATE_M.allows(f64::NAN) && !PLAIN.allows(f64::INFINITY));
    }

    #[test]
    fn the_unit_that_was_meant_is_told() {
        let instead = |quantity: &Quantity, value: f64| {
            assert!(!quantity.allows(value), "{value}");
            quantity.slip(value).map(|slip| (slip.looks_like, slip.instead.to_string()))
        };
        let told = |looks_like, instead: &str| Some((looks_like, instead.to_owned()));
        assert_eq!(instead(&SAMPLE_RATE_GSPS, 5e9), told("samples per second", "5"));
        assert_eq!(instead(&SAMPLE_RATE_GSPS, 5000.0), told("MS/s", "5"));
        assert_eq!(instead(&FREQUENCY_MHZ, 3e8), told("hertz", "300"));
        assert_eq!(instead(&FREQUENCY_MHZ, 3e5), told("kilohertz", "300"));
        assert_eq!(instead(&COORDINATE_M, 125_500.0), told("millimetres", "125.5"));
        assert_eq!(instead(&DELAY_NS, 52.1e-9), told("seconds", "52.1"));
        assert_eq!(instead(&SIGMA_NS, 50_000.0), told("picoseconds", "50"));
        assert_eq!(instead(&SIGMA_NS, 5e-11), told("seconds", "0.05"));
        assert_eq!(instead(&SPEED_M_PER_NS, 2.025e8), told("m/s", "0.2025"));
        assert_eq!(instead(&PRIOR, 10.0), told("per cent", "0.1"));
        assert_eq!(instead(&SIGMA_M, 20.0), told("centimetres", "0.2"));
        assert_eq!(instead(&SIGMA_M, -0.1), None);
    }
}
