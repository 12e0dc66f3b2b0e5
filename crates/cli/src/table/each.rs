//! Captures that were solved one by one: a tally of the statements, and a row for each.

use arcstead::documents::{Flag, LocateDocument, SourceResult, Statement};

use super::figures::{count, metres, percent};
use super::layout::{self, Side};
use super::screen::Screen;
use super::words::{either, not_used};

/// What one capture by itself states, in words.
fn statement(source: &SourceResult) -> String {
    let verdict = &source.verdict;
    match (verdict.statement, verdict.assets.as_slice()) {
        (Statement::One, [asset]) => asset.clone(),
        (Statement::OneOf, [_, _, ..]) => either(&verdict.assets),
        (Statement::Elsewhere, _) => "on none of the assets".into(),
        _ => "cannot tell".into(),
    }
}

/// The text of captures solved one by one.
pub(super) fn text(document: &LocateDocument, sources: &[SourceResult], screen: Screen) -> String {
    let told = format!(
        "{} solved one by one: {} of {}",
        document.head.site.as_deref().unwrap_or("This site"),
        sources.len(),
        count(document.head.inputs.count, "capture")
    );
    let mut text = layout::headline(&format!("{told} gave a position"), screen);
    if document.incomplete {
        text += &layout::paragraph("INCOMPLETE: stopped before the last capture.", screen);
    }
    text += "\n";
    let mut tally: Vec<(String, usize)> = Vec::new();
    for source in sources {
        let said = statement(source);
        match tally.iter_mut().find(|(known, _)| *known == said) {
            Some((_, number)) => *number += 1,
            None => tally.push((said, 1)),
        }
    }
    tally.sort_by(|(a, a_number), (b, b_number)| b_number.cmp(a_number).then_with(|| a.cmp(b)));
    let header = [("No", Side::Right), ("Statement", Side::Left), ("Captures", Side::Right)];
    let rows = tally.iter().enumerate();
    let rows: Vec<Vec<String>> = rows
        .map(|(index, (said, number))| vec![(index + 1).to_string(), said.clone(), number.to_string()])
        .collect();
    text += &layout::columns(&header, &rows, screen);
    text += "\n";
    let header = [
        ("Capture", Side::Whole),
        ("x m", Side::Right),
        ("y m", Side::Right),
        ("z m", Side::Right),
        ("Half axis m", Side::Right),
        ("No", Side::Right),
        ("Probability", Side::Right),
    ];
    let rows = sources.iter().map(|source| {
        let said = statement(source);
        row(source, tally.iter().position(|(known, _)| *known == said).map_or(0, |index| index + 1))
    });
    text += &layout::columns(&header, &rows.collect::<Vec<_>>(), screen);
    text += "\n";
    let unused = not_used(&document.captures).map(|text| ("Not used".to_owned(), text));
    text += &layout::labelled(&Vec::from_iter(unused), screen);
    text += "\n";
    text
}

/// The row of a capture, with the number of its statement.
fn row(source: &SourceResult, number: usize) -> Vec<String> {
    // A point of unknown range would be read as a place.
    let known = !source.flags.contains(&Flag::RangeUndetermined);
    let coordinate =
        |axis: usize| if known { format!("{:.2}", source.position_m[axis]) } else { "?".to_owned() };
    let half_axis = source.ellipse.filter(|_| known).map(|ellipse| metres(ellipse.semi_major_m));
    let probability = match source.verdict.statement {
        Statement::CannotTell => "-".to_owned(),
        _ => percent(source.verdict.probability),
    };
    vec![
        source.members.first().cloned().unwrap_or_default(),
        coordinate(0),
        coordinate(1),
        coordinate(2),
        half_axis.unwrap_or_else(|| "?".into()),
        number.to_string(),
        probability,
    ]
}
