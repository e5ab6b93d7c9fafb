//! Impedance tables: CSV files named by `load … { table "…" }`.
//! Must not know what is driven by them.

use std::path::PathBuf;

use crate::analysis::Tables;
use crate::build::{Needs, Project};
use crate::finding::{Finding, Site};
use crate::physics::load::{Table, TableRow};
use crate::physics::math::PI;
use crate::physics::unit::{Hertz, Ohm};
use crate::source::Files;

/// Read every table that a load names. What is wrong with one is a finding at the line that names it.
pub fn load(project: &Project, files: &dyn Files, findings: &mut Vec<Finding>) -> Tables {
    let mut tables = Tables::new();
    for block in project.of_kind("load") {
        for line in block
            .lines
            .iter()
            .filter(|l| l.key.name == "table" && !l.none)
        {
            let Some((text, site)) = line
                .groups
                .first()
                .and_then(|g| Some((g.text("text")?, g.get("text")?.site)))
            else {
                continue;
            };
            let read = project
                .beside(files, site.file, text)
                .and_then(|path: PathBuf| files.read(&path));
            let table = read.and_then(|csv| parse(&csv));
            let table = table.map_err(|why| {
                findings.push(complain(site, text, &why));
                Needs::because(format!("table \"{text}\" cannot be used: {why}"))
            });
            tables.insert(site, table);
        }
    }
    tables
}

fn complain(site: Site, text: &str, why: &str) -> Finding {
    Finding::error(
        "data.table",
        site,
        format!("table `{text}` cannot be used: {why}"),
        "a table is CSV with a header that names frequency (Hz), modulus (ohm) and phase (deg), one point a row, frequencies rising".to_owned(),
    )
}

/// A CSV text as a table: a header with columns for frequency, modulus and phase, in any order.
///
/// # Errors
/// What is wrong, with the row, counted from one.
pub fn parse(csv: &str) -> Result<Table, String> {
    let mut reader = csv::ReaderBuilder::new()
        .trim(csv::Trim::All)
        .flexible(true)
        .comment(Some(b'#'))
        .from_reader(csv.trim_start_matches('\u{feff}').as_bytes());
    let header = reader.headers().map_err(|e| e.to_string())?.clone();
    let column = |names: &[&str]| {
        header.iter().position(|h| {
            let h = h.to_ascii_lowercase();
            let word = h.split(|c: char| !c.is_alphanumeric()).next().unwrap_or("");
            names.contains(&word)
        })
    };
    let frequency =
        column(&["frequency", "freq", "f", "hz"]).ok_or("no column is headed frequency")?;
    let modulus = column(&["modulus", "impedance", "magnitude", "z", "ohm"])
        .ok_or("no column is headed modulus")?;
    let phase = column(&["phase", "angle", "deg"]).ok_or("no column is headed phase")?;
    let mut rows = Vec::new();
    for (at, record) in reader.records().enumerate() {
        let record = record.map_err(|e| e.to_string())?;
        let number = |column: usize| -> Result<f64, String> {
            let text = record
                .get(column)
                .ok_or_else(|| format!("row {} has too few columns", at + 1))?;
            text.parse::<f64>()
                .ok()
                .filter(|x| x.is_finite())
                .ok_or_else(|| format!("row {}: `{text}` is no number", at + 1))
        };
        rows.push(TableRow {
            frequency: Hertz(number(frequency)?),
            modulus: Ohm(number(modulus)?),
            angle_rad: number(phase)? * PI / 180.0,
        });
    }
    Table::new(&rows).map_err(|e| format!("{e:?}"))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn columns_are_found_by_name() {
        let table =
            parse("phase (deg), frequency (Hz), modulus (ohm)\n-10, 20, 8\n5, 2000, 6\n").unwrap();
        assert_eq!(
            (
                table.band().bottom().0.round(),
                table.band().top().0.round()
            ),
            (20.0, 2000.0)
        );
    }

    #[test]
    fn what_is_wrong_names_the_row() {
        assert!(
            parse("f,z,phase\n20,8,0\n30,x,0\n")
                .unwrap_err()
                .contains("row 2")
        );
        assert!(parse("f,z\n20,8\n").unwrap_err().contains("phase"));
        assert!(parse("").is_err());
        assert!(parse("f,z,phase\n20,8,0\n10,8,0\n").is_err());
    }
}
