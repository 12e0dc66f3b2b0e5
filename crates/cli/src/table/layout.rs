//! Columns and wrapped text, as wide as the screen.

use comfy_table::presets::NOTHING;
use comfy_table::{Cell, CellAlignment, ColumnConstraint, ContentArrangement, LineStyle, Table, Width};

use super::screen::Screen;
use crate::console::{on_one_line, without_controls};

/// Width of the labels before their texts.
const LABEL_WIDTH: u16 = 18;

/// Longest word of a text in a column that stays whole on a narrow terminal: words in pieces are worse than a table that
/// is too wide.
const WHOLE_WORD: usize = 12;

/// How a column stands. Only texts on the left are broken into lines where the table gets too wide.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Side {
    Left,
    /// Numbers.
    Right,
    /// Names on the left that must stay in one piece.
    Whole,
}

fn bare(screen: Screen) -> Table {
    let mut table = Table::new();
    table.load_style(NOTHING).set_content_arrangement(ContentArrangement::Dynamic).set_width(screen.width);
    table
}

fn cell(text: &str) -> Cell {
    Cell::new(without_controls(text))
}

fn ended(table: &Table) -> String {
    format!("{}\n", table.trim_fmt())
}

/// Text on lines of its own, with emphasis.
pub(super) fn headline(text: &str, screen: Screen) -> String {
    format!("\x1b[1m{}\x1b[0m\n", paragraph(&on_one_line(text), screen).trim_end())
}

/// Text broken into lines.
pub(super) fn paragraph(text: &str, screen: Screen) -> String {
    let mut table = bare(screen);
    table.add_row([cell(text)]);
    for column in table.column_iter_mut() {
        column.set_padding((0, 0));
    }
    ended(&table)
}

/// A label before each text, indented; nothing of nothing.
pub(super) fn labelled(rows: &[(String, String)], screen: Screen) -> String {
    if rows.is_empty() {
        return String::new();
    }
    let mut table = bare(screen);
    for (label, text) in rows {
        table.add_row([cell(label), cell(text)]);
    }
    pad(&mut table);
    if let Some(column) = table.column_mut(0) {
        // Two of padding on the left and two on the right are part of the width.
        column.set_constraint(ColumnConstraint::Absolute(Width::Fixed(LABEL_WIDTH + 4)));
    }
    ended(&table)
}

/// A list, a dash before each text.
pub(super) fn bullets(texts: &[String], screen: Screen) -> String {
    if texts.is_empty() {
        return String::new();
    }
    let mut table = bare(screen);
    for text in texts {
        table.add_row([cell("-"), cell(&on_one_line(text))]);
    }
    for (column, padding) in table.column_iter_mut().zip([(2, 1), (0, 0)]) {
        column.set_padding(padding);
    }
    ended(&table)
}

/// A table with a header; nothing of nothing.
pub(super) fn columns(header: &[(&str, Side)], rows: &[Vec<String>], screen: Screen) -> String {
    if rows.is_empty() {
        return String::new();
    }
    let mut table = bare(screen);
    let rule = LineStyle::new(screen.rule, screen.rule, screen.rule, screen.rule);
    table.load_style(NOTHING.header_separator(rule));
    table.set_header(header.iter().map(|(name, _)| cell(name)));
    for row in rows {
        table.add_row(row.iter().map(|text| cell(&on_one_line(text))));
    }
    pad(&mut table);
    for (index, (column, (name, side))) in table.column_iter_mut().zip(header).enumerate() {
        match side {
            Side::Left => column.set_cell_alignment(CellAlignment::Left),
            Side::Right => column.set_cell_alignment(CellAlignment::Right),
            Side::Whole => {}
        }
        column.set_constraint(match side {
            Side::Left => {
                let texts = rows.iter().filter_map(|row| row.get(index)).map(String::as_str).chain([*name]);
                let words = texts.flat_map(str::split_whitespace).map(|word| word.chars().count());
                let word = words.max().unwrap_or(0).min(WHOLE_WORD) as u16;
                let padding = if index == 0 { 4 } else { 2 };
                ColumnConstraint::LowerBoundary(Width::Fixed(word + padding))
            }
            _ => ColumnConstraint::ContentWidth,
        });
    }
    ended(&table)
}

/// Two blanks before the first column and after every one.
fn pad(table: &mut Table) {
    for (index, column) in table.column_iter_mut().enumerate() {
        column.set_padding((if index == 0 { 2 } else { 0 }, 2));
    }
}
