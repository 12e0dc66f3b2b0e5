//! What is stated about the asset, in a line, and what else it could be.

use arcstead::documents::{Flag, SourceResult, Statement};

use super::figures::percent;
use super::words::either;

/// From this probability on it would be stated, were there an arrival to check it by.
const ALMOST_SURE: f64 = 0.8;
/// Least probability of what is named beside a statement.
const WORTH_NAMING: f64 = 0.01;
/// Most hypotheses that are named beside a statement.
const MOST_NAMED: usize = 4;
/// Assets that are ranked whatever their probability.
const LEAST_RANKED: usize = 3;
/// The hypothesis that the source is on no asset.
pub(super) const ELSEWHERE: &str = "elsewhere (on none of the assets)";

/// The statement, as the first line that is read.
///
/// A result that cannot tell begins with those words, and never with a single name.
pub(super) fn headline(source: &SourceResult) -> String {
    let verdict = &source.verdict;
    let probability = percent(verdict.probability);
    match (verdict.statement, verdict.assets.as_slice()) {
        _ if source.assets.is_empty() => "The site file lists no assets; see the position".into(),
        (Statement::One, [asset]) => format!("Inspect first: {asset}   {probability}"),
        (Statement::OneOf, [_, _, ..]) => {
            format!("One of these: {}   {probability} together", either(&verdict.assets))
        }
        (Statement::Elsewhere, _) => format!("On none of the listed assets   {probability}"),
        _ if source.flags.contains(&Flag::PoorFit) => {
            "Cannot tell: the arrivals fit no place within their errors".into()
        }
        _ if source.flags.contains(&Flag::Scattered) => {
            "Cannot tell: the captures do not agree on one source".into()
        }
        _ if source.flags.contains(&Flag::Hidden) => {
            "Cannot tell: only a place hidden from some antennas explains the arrivals".into()
        }
        _ if source.elsewhere_probability >= ALMOST_SURE => {
            "Cannot tell: on none of the listed assets, if delays and positions are right".into()
        }
        _ => match candidates(source, &[]).as_slice() {
            [] | [_] => "Cannot tell on which asset it is".into(),
            several => format!("Cannot tell: {}", either(several)),
        },
    }
}

/// That no arrival could be checked, where something is stated all the same.
pub(super) fn unchecked(source: &SourceResult) -> Option<String> {
    let stated = source.verdict.statement != Statement::CannotTell;
    (stated && source.fit.p_value.is_none()).then(|| {
        let used = source.antennas.iter().filter(|antenna| antenna.used).count();
        format!("Not checked: with {used} antennas a wrong cable, channel or position would not show.")
    })
}

/// What else it could be, or the candidates where the first line could not name them.
pub(super) fn other_candidates(source: &SourceResult) -> Option<(String, String)> {
    let verdict = &source.verdict;
    let row = |label: &str, names: &[String], none: &str| {
        let text = if names.is_empty() { none.to_owned() } else { names.join("; ") };
        Some((label.to_owned(), text))
    };
    match verdict.statement {
        _ if source.assets.is_empty() => None,
        Statement::One | Statement::OneOf => {
            row("It could also be", &candidates(source, &verdict.assets), "nothing else above 1 %")
        }
        Statement::Elsewhere => row(
            "It could also be",
            &candidates(source, &[ELSEWHERE.to_owned()]),
            "none of the assets is above 1 %",
        ),
        _ if super::place::unreliable(source) => {
            row("Unreliable", &candidates(source, &[]), "nothing is above 1 %")
        }
        _ => None,
    }
}

/// All hypotheses worth naming but those in `but`, the most probable first, each with its probability.
fn candidates(source: &SourceResult, but: &[String]) -> Vec<String> {
    let mut worth: Vec<(&str, f64)> = hypotheses(source)
        .into_iter()
        .filter(|&(name, probability)| {
            probability >= WORTH_NAMING && !but.iter().any(|excluded| excluded == name)
        })
        .collect();
    let more = worth.len().saturating_sub(MOST_NAMED);
    worth.truncate(MOST_NAMED);
    let mut names: Vec<String> =
        worth.iter().map(|(name, probability)| format!("{name} {}", percent(*probability))).collect();
    if more > 0 {
        names.push(format!("{more} more below"));
    }
    names
}

/// The ranking: what is above 1 %, three assets at least, and elsewhere.
pub(super) fn ranking(source: &SourceResult) -> Vec<Vec<String>> {
    let worth = source.assets.iter().filter(|asset| asset.probability >= WORTH_NAMING).count();
    let least = worth.max(LEAST_RANKED).min(source.assets.len());
    let told: Vec<&str> = source.assets[..least].iter().map(|asset| asset.name.as_str()).collect();
    hypotheses(source)
        .into_iter()
        .filter(|(name, _)| *name == ELSEWHERE || told.contains(name))
        .map(|(name, probability)| vec![name.to_owned(), percent(probability)])
        .collect()
}

/// The assets and elsewhere, the most probable first.
fn hypotheses(source: &SourceResult) -> Vec<(&str, f64)> {
    let assets = source.assets.iter().map(|asset| (asset.name.as_str(), asset.probability));
    let mut all: Vec<_> = assets.chain([(ELSEWHERE, source.elsewhere_probability)]).collect();
    all.sort_by(|(_, a), (_, b)| b.total_cmp(a));
    all
}
