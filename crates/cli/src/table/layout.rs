//! Columns and wrapped text, 80 columns wide.

use comfy_table::presets::NOTHING;
use comfy_table::{Cell, CellAlignment, ColumnConstraint, ContentArrangement, LineStyle, Table, Width};

use super::glyphs::Glyphs;
use crate::console::{on_one_line, without_controls};

/// Width of everything that is printed.
pub(super) const WIDTH: u16 = 80;
/// Width of the labels before their texts.
const LABEL_WIDTH: u16 = 18;

/// How a column stands. Only texts on the left are broken into lines where the table gets too wide.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Side {
    Left,
    /// Numbers.
    Right,
    /// Names on the left that must stay in one piece.
    Whole,
}

fn bare() -> Table {
    let mut table = Table::new();
    table.load_style(NOTHING).set_content_arrangement(ContentArrangement::Dynamic).set_width(WIDTH);
    table
}

fn cell(text: &str) -> Cell {
    Cell::new(without_controls(text))
}

fn ended(table: &Table) -> String {
    format!("{}\n", table.trim_fmt())
}

/// Text on lines of its own, with emphasis.
pub(super) fn headline(text: &str) -> String {
    format!("\x1b[1m{}\x1b[0m\n", paragraph(&on_one_line(text)).trim_end())
}

/// Text broken into lines.
pub(super) fn paragraph(text: &str) -> String {
    let mut table = bare();
    table.add_row([cell(text)]);
    for column in table.column_iter_mut() {
        column.set_padding((0, 0));
    }
    ended(&table)
}

/// A label before each text, indented; nothing of nothing.
pub(super) fn labelled(rows: &[(String, String)]) -> String {
    if rows.is_empty() {
        return String::new();
    }
    let mut table = bare();
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
pub(super) fn bullets(texts: &[String]) -> String {
    if texts.is_empty() {
        return String::new();
    }
    let mut table = bare();
    for text in texts {
        table.add_row([cell("-"), cell(&on_one_line(text))]);
    }
    for (column, padding) in table.column_iter_mut().zip([(2, 1), (0, 0)]) {
        column.set_padding(padding);
    }
    ended(&table)
}

/// A table with a header; nothing of nothing.
pub(super) fn columns(header: &[(&str, Side)], rows: &[Vec<String>], glyphs: Glyphs) -> String {
    if rows.is_empty() {
        return String::new();
    }
    let mut table = bare();
    let rule = LineStyle::new(glyphs.rule, glyphs.rule, glyphs.rule, glyphs.rule);
    table.load_style(NOTHING.header_separator(rule));
    table.set_header(header.iter().map(|(name, _)| cell(name)));
    for row in rows {
        table.add_row(row.iter().map(|text| cell(&on_one_line(text))));
    }
    pad(&mut table);
    for (column, (_, side)) in table.column_iter_mut().zip(header) {
        match side {
            Side::Left => column.set_cell_alignment(CellAlignment::Left),
            Side::Right => column.set_cell_alignment(CellAlignment::Right),
            Side::Whole => {}
        }
        if *side != Side::Left {
            column.set_constraint(ColumnConstraint::ContentWidth);
        }
    }
    ended(&table)
}

/// Two blanks before the first column and after every one.
fn pad(table: &mut Table) {
    for (index, column) in table.column_iter_mut().enumerate() {
        column.set_padding((if index == 0 { 2 } else { 0 }, 2));
    }
}
