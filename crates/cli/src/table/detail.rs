//! What `--verbose` adds to the sources: fit, covariances, members, rejected captures, options.

use arcstead::documents::{LocateDocument, SourceResult};

use super::figures::count;
use super::layout::{self, Side};
use super::screen::Screen;
use crate::console::on_one_line;
use crate::rejected;

/// Fit, covariances and members of a source.
pub(super) fn of_source(source: &SourceResult, screen: Screen) -> String {
    let fit = &source.fit;
    let freedom = count(fit.degrees_of_freedom, "degree");
    let told = match fit.p_value {
        Some(p_value) => {
            format!("chi-square {:.2} with {freedom} of freedom, p = {p_value:.3}", fit.chi_square)
        }
        None => format!("chi-square {:.2} with {freedom} of freedom: it cannot be tested", fit.chi_square),
    };
    let region = &source.region;
    let [low, high] = [region.min_m, region.max_m].map(super::figures::point);
    let size = match (region.volume_m3, region.area_m2) {
        (Some(volume_m3), _) => format!("{volume_m3:.3} m3"),
        (None, Some(area_m2)) => format!("{area_m2:.3} m2"),
        (None, None) => "size not known".into(),
    };
    let edge = if region.bounded { "" } else { ", cut off by the edge of the search box" };
    let mut rows = vec![
        ("Fit".to_owned(), told),
        ("Region".to_owned(), format!("{size}, from {low} to {high}{edge}")),
        ("Stances".to_owned(), source.stances.join(", ")),
    ];
    if let (Some(first), Some(last)) = (source.first, source.last) {
        rows.push(("Taken".to_owned(), format!("{first} to {last}")));
    }
    rows.push(("Captures".to_owned(), on_one_line(&source.members.join(", "))));
    let mut text = layout::labelled(&rows, screen);

    let header = ["Covariance m2", "xx", "yy", "zz", "xy", "xz", "yz"];
    let header: Vec<(&str, Side)> = header
        .into_iter()
        .map(|name| (name, if name.len() > 2 { Side::Left } else { Side::Right }))
        .collect();
    let parts = [
        ("total", source.covariance_m2),
        ("random", source.random_covariance_m2),
        ("systematic", source.systematic_covariance_m2),
    ];
    let rows: Vec<Vec<String>> = parts
        .into_iter()
        .filter_map(|(name, covariance)| {
            let m = covariance?;
            let entries = [m[0][0], m[1][1], m[2][2], m[0][1], m[0][2], m[1][2]];
            let entries = entries.map(|entry| format!("{entry:.2e}"));
            Some([name.to_owned()].into_iter().chain(entries).collect())
        })
        .collect();
    if !rows.is_empty() {
        text += "\n";
        text += &layout::columns(&header, &rows, screen);
    }
    text
}

/// Rejected captures and options of the run.
pub(super) fn of_document(document: &LocateDocument, screen: Screen) -> String {
    let mut text = String::new();
    if !document.captures.rejected.is_empty() {
        text += "Rejected captures:\n";
        text += &layout::bullets(&rejected::lines(&document.captures.rejected, true), screen);
        text += "\n";
    }
    let options: Vec<String> =
        document.head.options.iter().map(|(name, value)| format!("{name} = {value}")).collect();
    text += &layout::labelled(&[("Options".to_owned(), options.join(", "))], screen);
    text += "\n";
    text
}
