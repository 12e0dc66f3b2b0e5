//! One row per source.

use arcstead::documents::{LocateDocument, SourceResult};

use super::rows::{Rows, number};

/// The columns; `--help` says what they hold.
const COLUMNS: [&str; 38] = [
    "source",
    "captures",
    "x_m",
    "y_m",
    "z_m",
    "sigma_x_m",
    "sigma_y_m",
    "sigma_z_m",
    "semi_major_m",
    "semi_minor_m",
    "ellipse_azimuth_deg",
    "confidence",
    "region_min_x_m",
    "region_min_y_m",
    "region_min_z_m",
    "region_max_x_m",
    "region_max_y_m",
    "region_max_z_m",
    "region_bounded",
    "azimuth_deg",
    "elevation_deg",
    "range_min_m",
    "range_max_m",
    "chi_square",
    "degrees_of_freedom",
    "p_value",
    "statement",
    "statement_assets",
    "statement_probability",
    "first_asset",
    "first_asset_probability",
    "elsewhere_probability",
    "flags",
    "first",
    "last",
    "first_capture",
    "stances",
    "incomplete",
];

/// The sources of the document as CSV; a header alone when there are none.
pub(crate) fn text(document: &LocateDocument) -> Result<String, csv::Error> {
    let mut rows = Rows::new(&COLUMNS)?;
    for (index, source) in document.sources.iter().enumerate() {
        rows.add(&row(index + 1, source, document.incomplete))?;
    }
    rows.into_text()
}

fn row(count: usize, source: &SourceResult, incomplete: bool) -> [String; 38] {
    let [x, y, z] = source.position_m;
    let sigma = |axis: usize| number(source.covariance_m2.map(|covariance| covariance[axis][axis].sqrt()));
    let (region, bearing, fit) = (&source.region, &source.bearing, &source.fit);
    let first = source.assets.first();
    let flags: Vec<&str> = source.flags.iter().map(|&flag| flag.name()).collect();
    [
        count.to_string(),
        source.captures.to_string(),
        number(Some(x)),
        number(Some(y)),
        number(Some(z)),
        sigma(0),
        sigma(1),
        sigma(2),
        number(source.ellipse.map(|ellipse| ellipse.semi_major_m)),
        number(source.ellipse.map(|ellipse| ellipse.semi_minor_m)),
        number(source.ellipse.map(|ellipse| ellipse.azimuth_deg)),
        number(Some(region.confidence)),
        number(Some(region.min_m[0])),
        number(Some(region.min_m[1])),
        number(Some(region.min_m[2])),
        number(Some(region.max_m[0])),
        number(Some(region.max_m[1])),
        number(Some(region.max_m[2])),
        region.bounded.to_string(),
        number(Some(bearing.azimuth_deg)),
        number(Some(bearing.elevation_deg)),
        number(bearing.range_m.map(|range| range[0])),
        number(bearing.range_m.map(|range| range[1])),
        number(Some(fit.chi_square)),
        fit.degrees_of_freedom.to_string(),
        number(fit.p_value),
        source.verdict.statement.name().to_owned(),
        source.verdict.assets.join(";"),
        number(Some(source.verdict.probability)),
        first.map_or_else(String::new, |asset| asset.name.clone()),
        number(first.map(|asset| asset.probability)),
        number(Some(source.elsewhere_probability)),
        flags.join(";"),
        source.first.map_or_else(String::new, |time| time.to_string()),
        source.last.map_or_else(String::new, |time| time.to_string()),
        source.members.first().cloned().unwrap_or_default(),
        source.stances.join(";"),
        incomplete.to_string(),
    ]
}
