//! Numbers as they are printed.

use super::screen::Screen;

/// A probability as whole percent. Neither certainty nor impossibility is ever printed: those are not to be had.
pub(super) fn percent(probability: f64) -> String {
    if probability < 0.01 {
        "<1 %".into()
    } else if probability > 0.99 {
        ">99 %".into()
    } else {
        format!("{:.0} %", probability * 100.0)
    }
}

/// A confidence level as percent, with the digits it has.
pub(super) fn level(confidence: f64) -> String {
    let digits = format!("{:.2}", confidence * 100.0);
    format!("{} %", digits.trim_end_matches('0').trim_end_matches('.'))
}

/// A length in metres with three significant digits or centimetres, whichever is coarser.
pub(super) fn metres(length_m: f64) -> String {
    if length_m.abs() < 10.0 {
        format!("{length_m:.2}")
    } else if length_m.abs() < 100.0 {
        format!("{length_m:.1}")
    } else {
        format!("{length_m:.0}")
    }
}

/// A point of the site.
pub(super) fn point(position_m: [f64; 3]) -> String {
    let [x, y, z] = position_m;
    format!("x {x:.2}, y {y:.2}, z {z:.2} m")
}

/// An angle, with its standard deviation where there is one.
pub(super) fn angle(angle_deg: f64, sigma_deg: Option<f64>, screen: Screen) -> String {
    let Screen { degree, plus_minus, .. } = screen;
    match sigma_deg {
        Some(sigma_deg) => format!("{angle_deg:.1} {plus_minus} {sigma_deg:.1}{degree}"),
        None => format!("{angle_deg:.1}{degree}"),
    }
}

/// A number with so many decimals, or a dash.
pub(super) fn decimals(value: Option<f64>, digits: usize) -> String {
    value.map_or_else(|| "-".into(), |value| format!("{value:.digits$}"))
}

/// A number of nanoseconds with its sign, or a dash.
pub(super) fn signed(value: Option<f64>) -> String {
    let text = value.map_or_else(|| "-".into(), |value| format!("{value:+.2}"));
    if text == "-0.00" { "+0.00".into() } else { text }
}

/// A number of things: `1 capture`, `2 captures`.
pub(crate) fn count(number: usize, one: &str) -> String {
    if number == 1 { format!("1 {one}") } else { format!("{number} {one}s") }
}

/// The middle one of the values; of an even number the upper of the two. None of no values.
pub(super) fn middle(values: impl IntoIterator<Item = f64>) -> Option<f64> {
    let mut values: Vec<f64> = values.into_iter().collect();
    values.sort_by(f64::total_cmp);
    values.get(values.len() / 2).copied()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn certainty_is_never_printed() {
        assert_eq!(
            [0.0, 0.004, 0.01, 0.354, 0.99, 0.994, 1.0].map(percent),
            ["<1 %", "<1 %", "1 %", "35 %", "99 %", ">99 %", ">99 %"]
        );
        assert_eq!([0.5, 0.95, 0.999, 0.9999].map(level), ["50 %", "95 %", "99.9 %", "99.99 %"]);
    }

    #[test]
    fn the_middle_value() {
        assert_eq!(middle([3.0, 1.0, 2.0]), Some(2.0));
        assert_eq!(middle([]), None);
    }
}
