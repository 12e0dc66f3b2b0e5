//! Where the source is: point, ellipse, height, bearing, other places.

use arcstead::documents::{Alternative, Bearing, Flag, SourceResult};

use super::figures::{angle, level, metres, percent, point};
use super::screen::Screen;

/// Other places that are told.
const MOST_PLACES: usize = 3;
/// Least probability of another place that is told.
const WORTH_TELLING: f64 = 0.01;

/// The rows about the place. Where the range is not determined a bearing and a range interval stand in place of a point.
pub(super) fn rows(source: &SourceResult, screen: Screen) -> Vec<(String, String)> {
    let mut rows = Vec::new();
    let mut add = |label: &str, text: String| rows.push((label.to_owned(), text));
    let (bearing, region) = (&source.bearing, &source.region);
    if unreliable(source) {
        // Neither error nor bearing of a place that is not believed means anything.
        add("Least bad place", format!("{}; do not go by it", point(source.position_m)));
        return rows;
    }
    if source.flags.contains(&Flag::RangeUndetermined) {
        add("Direction", format!("{}, seen from {}", direction(bearing, screen), point(bearing.from_m)));
        add("Distance", distance(bearing, region.confidence));
    } else {
        add("Position", format!("{} (east, north, up)", point(source.position_m)));
        if let Some(ellipse) = source.ellipse {
            let axis = angle(ellipse.azimuth_deg, None, screen);
            let (major, minor) = (metres(ellipse.semi_major_m), metres(ellipse.semi_minor_m));
            let text = format!("{major} by {minor} m, half axes; the longer one {axis} from north");
            add(&format!("{} ellipse", level(ellipse.confidence)), text);
        }
        add("Height", height(source, screen));
        add("Bearing", format!("{}, from the middle of the antennas", direction(bearing, screen)));
    }
    let others: Vec<String> = source.alternatives.iter().filter_map(other_place).take(MOST_PLACES).collect();
    if !others.is_empty() {
        add(
            "Other places",
            format!("the arrivals alone would also fit {}; the assets are weighed above", others.join("; ")),
        );
    }
    rows
}

/// Whether the place told is one that is not believed.
pub(super) fn unreliable(source: &SourceResult) -> bool {
    [Flag::PoorFit, Flag::Hidden, Flag::Scattered].iter().any(|flag| source.flags.contains(flag))
}

fn height(source: &SourceResult, screen: Screen) -> String {
    let region = &source.region;
    let [low, high] = [region.min_m[2], region.max_m[2]].map(metres);
    if region.area_m2.is_some() {
        return format!("searched at {low} m only");
    }
    let sigma = match source.covariance_m2 {
        Some(covariance_m2) => {
            let sigma_m = covariance_m2[2][2].sqrt();
            format!(
                "{} {} {} m (one sigma); ",
                metres(source.position_m[2]),
                screen.plus_minus,
                metres(sigma_m)
            )
        }
        None => String::new(),
    };
    // The region holds every place that fits: its heights say nothing of this one where there are others.
    if source.flags.contains(&Flag::MirrorAmbiguity) && !sigma.is_empty() {
        return sigma.trim_end_matches("; ").to_owned();
    }
    format!("{sigma}{} region {low} to {high} m", level(region.confidence))
}

/// Bearing and, in space, elevation.
fn direction(bearing: &Bearing, screen: Screen) -> String {
    let azimuth = angle(bearing.azimuth_deg, bearing.azimuth_sigma_deg, screen);
    let above = if bearing.elevation_deg < 0.0 { "down" } else { "up" };
    let elevation = angle(bearing.elevation_deg.abs(), bearing.elevation_sigma_deg, screen);
    format!("{azimuth} from north, {elevation} {above}")
}

fn distance(bearing: &Bearing, confidence: f64) -> String {
    match bearing.range_m {
        Some([near_m, far_m]) => {
            format!(
                "{} to {} m from there ({}); a point is not known",
                metres(near_m),
                metres(far_m),
                level(confidence)
            )
        }
        None => "not known".into(),
    }
}

fn other_place(place: &Alternative) -> Option<String> {
    (place.probability >= WORTH_TELLING)
        .then(|| format!("{} ({})", point(place.position_m), percent(place.probability)))
}
