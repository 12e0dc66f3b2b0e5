//! The sources found, for a person who has ten seconds: what to inspect first, how sure, what else it could be, then
//! where it is, what weakened the result, and what to know before acting on it.

use arcstead::documents::{Flag, LocateDocument, SourceResult};

use super::figures::{count, decimals, signed};
use super::layout::{self, Side};
use super::screen::Screen;
use super::{detail, each, place, verdict, words};

/// The text of a result.
pub(crate) fn text(document: &LocateDocument, screen: Screen, verbose: bool) -> String {
    let mut text = String::new();
    let solved_by_itself = document.head.options.get("each").is_some_and(|each| each == true);
    match document.sources.as_slice() {
        [] => text += &no_source(document, screen),
        sources if solved_by_itself => text += &each::text(document, sources, screen),
        sources => {
            for (index, source) in sources.iter().enumerate() {
                text += &one_source(document, index, source, screen, verbose);
                text += "\n";
            }
        }
    }
    if verbose {
        text += &detail::of_document(document, screen);
    }
    if !document.cautions.is_empty() {
        text += "Before acting on this:\n";
        text += &layout::bullets(&document.cautions, screen);
    }
    text
}

fn site_of(document: &LocateDocument) -> &str {
    document.head.site.as_deref().unwrap_or("This site")
}

/// That the run was stopped, if it was.
fn stopped(document: &LocateDocument) -> Option<String> {
    let (read, all) = (document.captures.read, document.head.inputs.count);
    document.incomplete.then(|| format!("INCOMPLETE: stopped after {read} of {all} captures."))
}

/// The captures the result is of: all there are, or all that were read before it was stopped.
fn captures_told(document: &LocateDocument) -> usize {
    if document.incomplete { document.captures.read } else { document.head.inputs.count }
}

fn no_source(document: &LocateDocument, screen: Screen) -> String {
    let mut text = layout::headline("No source found", screen);
    let counts = &document.captures;
    let read = count(captures_told(document), "capture");
    text +=
        &layout::paragraph(&format!("{}: {read}, none of them tells a place.", site_of(document)), screen);
    text += &stopped(document).map_or_else(String::new, |stopped| layout::paragraph(&stopped, screen));
    text += "\n";
    let mut rows = Vec::new();
    if counts.stray > 0 {
        rows.push((
            "With a pulse".to_owned(),
            format!("{}, without a common place", count(counts.stray, "capture")),
        ));
    }
    if !counts.rejected.is_empty() {
        rows.push(("Rejected".to_owned(), words::rejected(counts)));
    }
    text += &layout::labelled(&rows, screen);
    text += "\n";
    text
}

fn one_source(
    document: &LocateDocument,
    index: usize,
    source: &SourceResult,
    screen: Screen,
    verbose: bool,
) -> String {
    let mut text = layout::headline(&verdict::headline(source), screen);
    text += &verdict::unchecked(source).map_or_else(String::new, |text| layout::paragraph(&text, screen));
    text += &layout::paragraph(&captures_of(document, index, source), screen);
    text += &stopped(document).map_or_else(String::new, |stopped| layout::paragraph(&stopped, screen));
    text += "\n";

    let mut rows = Vec::from_iter(verdict::other_candidates(source));
    rows.extend(place::rows(source, screen));
    if !source.flags.is_empty() {
        let flags: Vec<&str> = source.flags.iter().map(|&flag| words::flag_words(flag)).collect();
        rows.push(("Weak points".to_owned(), flags.join("; ")));
    }
    if index == 0 {
        rows.extend(words::not_used(&document.captures).map(|text| ("Not used".to_owned(), text)));
    }
    text += &layout::labelled(&rows, screen);

    text += "\n";
    let asset = if place::unreliable(source) { "Asset (unreliable ranking)" } else { "Asset" };
    text += &layout::columns(
        &[(asset, Side::Left), ("Probability", Side::Right)],
        &verdict::ranking(source),
        screen,
    );
    text += "\n";
    text += &antennas(source, screen);
    if verbose {
        text += "\n";
        text += &detail::of_source(source, screen);
    }
    text
}

/// Which captures speak for the source.
fn captures_of(document: &LocateDocument, index: usize, source: &SourceResult) -> String {
    let (site, all) = (site_of(document), captures_told(document));
    match document.sources.len() {
        1 if all == 1 => format!("{site}: from one capture."),
        1 if source.flags.contains(&Flag::Scattered) => {
            format!("{site}: {} of {all} captures are alike, but not within their errors.", source.captures)
        }
        1 => format!("{site}: {} of {all} captures agree on this source.", source.captures),
        sources => {
            format!("{site}: source {} of {sources}, {} of {all} captures.", index + 1, source.captures)
        }
    }
}

fn antennas(source: &SourceResult, screen: Screen) -> String {
    let header = [
        ("Antenna", Side::Left),
        ("SNR dB", Side::Right),
        ("Residual ns", Side::Right),
        ("Sigma ns", Side::Right),
        ("Line of sight", Side::Left),
        ("Used", Side::Left),
    ];
    // Where nothing can be checked the residuals are zero by construction: printed, they would look like a perfect fit.
    let checked = source.fit.p_value.is_some() || source.flags.contains(&Flag::PoorFit);
    let rows: Vec<Vec<String>> = source
        .antennas
        .iter()
        .map(|antenna| {
            let used = match (antenna.used, antenna.residual_ns) {
                (true, _) => "yes",
                (false, Some(_)) => "left out",
                (false, None) => "no",
            };
            vec![
                antenna.name.clone(),
                decimals(antenna.snr_db, 0),
                signed(antenna.residual_ns.filter(|_| checked || !antenna.used)),
                decimals(antenna.sigma_ns, 2),
                if antenna.line_of_sight { "clear" } else { "hidden" }.into(),
                used.into(),
            ]
        })
        .collect();
    layout::columns(&header, &rows, screen)
}
