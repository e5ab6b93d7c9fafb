//! A bill of materials as comma-separated values after RFC 4180, columns found by their names.
//! Must not know what any part is for.

use std::collections::HashMap;

use super::Against;
use crate::build::lower::designators;

/// What a column holds.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Column {
    /// Designators.
    Refs,
    /// How many.
    Quantity,
    /// Order code.
    Code,
    /// Value, `0R22`.
    Value,
    /// Ratings; there may be several columns of it.
    Rating,
    /// In words.
    Description,
    /// Order codes that may be used instead.
    Alternates,
    /// The part of the spec, as a template names it.
    Spec,
}

/// Every kind of column, its name on the command line, and the headings it is known by, in lower
/// case without signs.
pub const COLUMNS: &[(Column, &str, &[&str])] = &[
    (
        Column::Refs,
        "refs",
        &[
            "ref",
            "refs",
            "reference",
            "references",
            "refdes",
            "designator",
            "designators",
            "referencedesignator",
            "referencedesignators",
            "position",
            "positions",
        ],
    ),
    (
        Column::Quantity,
        "quantity",
        &[
            "qty",
            "quantity",
            "quant",
            "count",
            "amount",
            "number",
            "pcs",
            "pieces",
            "qtyperkit",
            "qtyperboard",
        ],
    ),
    (
        Column::Code,
        "code",
        &[
            "ordercode",
            "code",
            "part",
            "partno",
            "partnr",
            "partnumber",
            "mpn",
            "mfrpart",
            "mfrpartno",
            "mfrpartnumber",
            "mfgpartnumber",
            "manufacturerpart",
            "manufacturerpartno",
            "manufacturerpartnumber",
            "type",
            "sku",
            "ordernumber",
            "orderno",
        ],
    ),
    (Column::Value, "value", &["value", "val", "comment"]),
    (
        Column::Rating,
        "rating",
        &[
            "rating",
            "ratings",
            "rated",
            "voltage",
            "current",
            "power",
            "wattage",
            "volts",
            "watts",
            "tolerance",
        ],
    ),
    (
        Column::Description,
        "description",
        &[
            "description",
            "desc",
            "details",
            "text",
            "item",
            "name",
            "remarks",
            "notes",
        ],
    ),
    (
        Column::Alternates,
        "alternates",
        &[
            "alternate",
            "alternates",
            "alternative",
            "alternatives",
            "alt",
            "substitute",
            "substitutes",
            "secondsource",
            "equivalent",
            "equivalents",
        ],
    ),
    (Column::Spec, "spec", &["spec", "specline", "place"]),
];

/// One row that is ordered.
#[derive(Clone, Debug, Default)]
pub struct Row {
    /// Its line in the file.
    pub line: u64,
    /// Designators.
    pub refs: Vec<String>,
    /// How many; from the designators where no column says it.
    pub quantity: Option<u32>,
    /// The text of a quantity that is no number.
    pub bad_quantity: Option<String>,
    /// Order code.
    pub code: String,
    /// Value and ratings.
    pub values: Vec<String>,
    /// In words.
    pub description: String,
    /// Order codes that may be used instead.
    pub alternates: Vec<String>,
    /// The part of the spec.
    pub spec: String,
}

impl Row {
    /// What it says, in one line.
    #[must_use]
    pub fn text(&self) -> String {
        let count = self.quantity.map(|n| format!("{n} x")).unwrap_or_default();
        let refs = self.refs.join(" ");
        let values = self.values.join(" ");
        let all = [&count, &refs, &self.code, &values, &self.description];
        let said: Vec<&str> = all
            .into_iter()
            .map(String::as_str)
            .filter(|t| !t.is_empty())
            .collect();
        said.join(" ")
    }
}

/// A list.
#[derive(Clone, Debug, Default)]
pub struct List {
    /// Rows that are ordered, in order.
    pub rows: Vec<Row>,
}

/// Read a list.
///
/// # Errors
/// In words: no header that is understood, a row of another length, nothing to find parts by.
pub(super) fn read(given: &Against<'_>) -> Result<List, String> {
    let cannot = |why: String| format!("{}: {why}", given.name);
    let text = given.text.trim_start_matches('\u{feff}');
    let mut reader = ::csv::ReaderBuilder::new()
        .delimiter(delimiter(text))
        .trim(::csv::Trim::All)
        .from_reader(text.as_bytes());
    let headings = reader.headers().map_err(|e| cannot(e.to_string()))?.clone();
    let columns = columns(&headings, given.columns).map_err(cannot)?;
    let starts: Vec<usize> = text.match_indices('\n').map(|(at, _)| at + 1).collect();
    let mut list = List::default();
    for record in reader.records() {
        let record = record.map_err(|e| cannot(fault(&e)))?;
        let line = line_of(text, &starts, record.position());
        let row = row(&record, &columns, line);
        let blank = record.iter().all(str::is_empty);
        // nothing of it is ordered
        let unfitted = row.quantity == Some(0);
        if !blank && !unfitted {
            list.rows.push(row);
        }
    }
    Ok(list)
}

/// The line a record begins on. The reader's own count stands before the line feed that ends the
/// record before.
fn line_of(text: &str, starts: &[usize], at: Option<&::csv::Position>) -> u64 {
    let at = at.map_or(0, |p| usize::try_from(p.byte()).unwrap_or(usize::MAX));
    let ends = text.get(at..).map_or(0, |rest| {
        rest.len() - rest.trim_start_matches(['\r', '\n']).len()
    });
    starts.partition_point(|start| *start <= at + ends) as u64 + 1
}

/// The comma of RFC 4180, or the semicolon or tab of a spreadsheet where decimals have a comma.
fn delimiter(text: &str) -> u8 {
    let head = text.lines().next().unwrap_or_default();
    let count = |sign: char| head.matches(sign).count();
    [';', '\t']
        .into_iter()
        .find(|sign| count(*sign) > count(','))
        .map_or(b',', |sign| sign as u8)
}

/// Where each column stands.
fn columns(
    headings: &::csv::StringRecord,
    mapped: &[(Column, String)],
) -> Result<HashMap<Column, Vec<usize>>, String> {
    let mut out: HashMap<Column, Vec<usize>> = HashMap::new();
    let listed = || headings.iter().collect::<Vec<_>>().join(", ");
    for (column, name) in mapped {
        match headings.iter().position(|h| plain(h) == plain(name)) {
            Some(at) => out.entry(*column).or_default().push(at),
            None => {
                return Err(format!(
                    "no column is headed {name}; there are: {}",
                    listed()
                ));
            }
        }
    }
    for (at, heading) in headings.iter().enumerate() {
        let taken = out.values().flatten().any(|t| *t == at);
        let named = |c: &Column| mapped.iter().any(|(m, _)| m == c);
        let known = COLUMNS
            .iter()
            .find(|(_, _, names)| names.contains(&plain(heading).as_str()));
        if let Some((column, ..)) = known
            && !taken
            && !named(column)
        {
            out.entry(*column).or_default().push(at);
        }
    }
    let by = [Column::Refs, Column::Code, Column::Spec, Column::Value];
    if by.iter().any(|c| out.contains_key(c)) {
        Ok(out)
    } else {
        Err(format!(
            "no column of designators or order codes among: {}; name one with --column refs=HEADING",
            listed()
        ))
    }
}

/// Lower case, letters and digits only.
fn plain(text: &str) -> String {
    text.chars()
        .filter(|c| c.is_alphanumeric())
        .flat_map(char::to_lowercase)
        .collect()
}

fn row(record: &::csv::StringRecord, columns: &HashMap<Column, Vec<usize>>, line: u64) -> Row {
    let cells = |column: Column| {
        let at = columns.get(&column).map(Vec::as_slice).unwrap_or_default();
        at.iter()
            .filter_map(|at| record.get(*at))
            .filter(|t| !t.is_empty())
    };
    let joined = |column| cells(column).collect::<Vec<_>>().join(" ");
    let refs = references(&joined(Column::Refs));
    let quantity = joined(Column::Quantity);
    let (count, bad_quantity) = match (whole(&quantity), quantity.is_empty()) {
        (Some(n), _) => (Some(n), None),
        (None, true) => (u32::try_from(refs.len()).ok().filter(|n| *n > 0), None),
        (None, false) => (None, Some(quantity)),
    };
    let alternates = cells(Column::Alternates)
        .flat_map(|t| t.split([',', ';', '|']))
        .map(|t| t.trim().to_owned())
        .filter(|t| !t.is_empty())
        .collect();
    Row {
        line,
        refs,
        quantity: count,
        bad_quantity,
        code: joined(Column::Code),
        values: cells(Column::Value)
            .chain(cells(Column::Rating))
            .map(str::to_owned)
            .collect(),
        description: joined(Column::Description),
        alternates,
        spec: joined(Column::Spec),
    }
}

/// `4`, `4.0`, `4 pcs`.
fn whole(text: &str) -> Option<u32> {
    let end = text
        .find(|c: char| !c.is_ascii_digit())
        .unwrap_or(text.len());
    let (digits, rest) = text.split_at(end);
    let rest = rest
        .strip_prefix(".")
        .map_or(rest, |r| r.trim_start_matches('0'));
    let word = rest.trim();
    let counts = word.is_empty() || ["x", "pc", "pcs", "off", "pieces"].contains(&word);
    counts.then(|| digits.parse().ok()).flatten()
}

/// `Q7, Q8; Q9-Q11 R1-3`: each spelled out. A word that is no designator is kept as it is.
fn references(text: &str) -> Vec<String> {
    let text = text.replace(['\u{2013}', '\u{2014}'], "-");
    let mut out = Vec::new();
    for word in text
        .split([',', ';', ' ', '\t', '\n', '\r'])
        .filter(|w| !w.is_empty())
    {
        let full = match word.split_once('-') {
            // R1-3 is R1-R3
            Some((from, to)) if to.starts_with(|c: char| c.is_ascii_digit()) => {
                let letters = from.trim_end_matches(|c: char| c.is_ascii_digit());
                format!("{from}-{letters}{to}")
            }
            _ => word.to_owned(),
        };
        match designators(&full) {
            Some(refs) => out.extend(refs),
            None => out.push(word.to_owned()),
        }
    }
    out
}

fn fault(error: &::csv::Error) -> String {
    match error.kind() {
        ::csv::ErrorKind::UnequalLengths {
            pos,
            expected_len,
            len,
        } => {
            let line = pos.as_ref().map_or(0, ::csv::Position::line);
            format!("line {line} has {len} cells where the header has {expected_len}")
        }
        _ => error.to_string(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::bom::Basis;
    use proptest::prelude::*;

    fn list(text: &str) -> Result<List, String> {
        read(&Against {
            name: "bom.csv",
            text,
            columns: &[],
            basis: Basis::Build,
        })
    }

    #[test]
    fn columns_go_by_many_names() {
        for text in [
            "Designator,Qty,MPN,Value\n\"Q7, Q8\",2,N16-Y,\n",
            "\u{feff}Ref Des;Quantity;Order code;Comment\r\nQ7-Q8;2;N16-Y;\r\n",
            "QTY\tReference\tPart Number\n2 pcs\tQ7-8\tN16-Y\n",
        ] {
            let rows = list(text).unwrap().rows;
            assert_eq!(rows.len(), 1, "{text}");
            assert_eq!(rows[0].refs, ["Q7", "Q8"]);
            assert_eq!(
                (rows[0].quantity, rows[0].code.as_str()),
                (Some(2), "N16-Y")
            );
            assert_eq!(rows[0].line, 2);
        }
    }

    /// RFC 4180, 2.5 to 2.7: line breaks, commas and doubled quotes inside quotes.
    #[test]
    fn quoted_cells_are_cells() {
        let rows = list("ref,description\r\nR1,\"a \"\"b\"\",\nc\"\r\nR2,d\r\n")
            .unwrap()
            .rows;
        assert_eq!(rows[0].description, "a \"b\",\nc");
        assert_eq!(rows[1].line, 4);
    }

    #[test]
    fn a_list_that_is_none_says_why() {
        assert!(list("").is_err());
        assert!(list("a,b\n1,2\n").unwrap_err().contains("--column"));
        assert!(
            list("ref,qty\nR1\n")
                .unwrap_err()
                .contains("line 2 has 1 cells")
        );
    }

    proptest! {
        /// Any text as a list: rows or a reason, on lines that are there.
        #[test]
        fn any_text_is_a_list_or_says_why(text in "(?s)(ref,qty,value\n)?[Rr0-9,;\"\r\n\t /µ.\\-xuV\u{0}\u{feff}]{0,120}|(?s).{0,60}") {
            match list(&text) {
                Ok(list) => {
                    let lines = text.lines().count() as u64 + 1;
                    for row in &list.rows {
                        prop_assert!((1..=lines).contains(&row.line), "{} of {lines}", row.line);
                        for value in &row.values {
                            let all = crate::quantity::Dimension::ALL;
                            let (found, _) = crate::bom::reading::quantities(value, &all);
                            prop_assert!(found.iter().all(|q| q.value.is_finite()));
                        }
                    }
                }
                Err(why) => prop_assert!(!why.is_empty()),
            }
        }
    }

    #[test]
    fn quantities_are_whole_numbers() {
        assert_eq!(whole("4"), Some(4));
        assert_eq!(whole("4.0"), Some(4));
        assert_eq!(whole("4 pcs"), Some(4));
        for bad in ["four", "4.5", "-1", "", "4 m", "99999999999"] {
            assert_eq!(whole(bad), None, "{bad}");
        }
    }
}
