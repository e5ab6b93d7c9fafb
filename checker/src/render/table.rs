//! Columns that stand in line in a terminal, as wide as their widest cell.
//! Must not know what stands in them.

use std::fmt::{self, Write};

use super::escape;
use super::terminal::Style;

/// Rows of cells, each row with a colour.
#[derive(Debug)]
pub(super) struct Table<const N: usize> {
    rows: Vec<([String; N], Option<&'static str>)>,
    right: [bool; N],
}

impl<const N: usize> Table<N> {
    /// With these headings; `right` says which columns hold numbers.
    pub(super) fn new(headings: [&str; N], right: [bool; N]) -> Self {
        Self {
            rows: vec![(headings.map(str::to_owned), None)],
            right,
        }
    }

    /// One more row; the text may come from anywhere.
    pub(super) fn row(&mut self, cells: [String; N], colour: Option<&'static str>) {
        let cells = cells.map(|c| escape::terminal(&c).into_owned());
        self.rows.push((cells, colour));
    }

    /// All rows, after an indent.
    pub(super) fn write(&self, out: &mut String, indent: usize, style: Style) -> fmt::Result {
        let mut widths = [0; N];
        for (cells, _) in &self.rows {
            for (width, cell) in widths.iter_mut().zip(cells) {
                *width = (*width).max(cell.chars().count());
            }
        }
        for (cells, colour) in &self.rows {
            let mut line = " ".repeat(indent);
            for ((cell, width), right) in cells.iter().zip(widths).zip(self.right) {
                let room = " ".repeat(width.saturating_sub(cell.chars().count()));
                let (before, after) = if right {
                    (room.as_str(), "")
                } else {
                    ("", room.as_str())
                };
                line.push_str(before);
                line.push_str(cell);
                line.push_str(after);
                line.push_str("  ");
            }
            let line = line.trim_end();
            match colour.filter(|_| style.colour) {
                Some(colour) => writeln!(out, "{colour}{line}\u{1b}[0m")?,
                None => writeln!(out, "{line}")?,
            }
        }
        Ok(())
    }
}
