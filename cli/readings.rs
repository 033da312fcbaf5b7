//! Readings as a CSV file: which column is what, and the cells of each row in SI.
//!
//! Comma, semicolon or tab; comments (#) and a byte-order mark are passed over; in a file with semicolons a decimal comma
//! is understood. What is wrong with the file as a whole is an error, what is wrong with a cell belongs to its row.

use std::borrow::Cow;
use std::fmt;
use std::path::PathBuf;

use csv::{ByteRecord, ReaderBuilder};

use crate::document::quoted;
use crate::inputs::{Entry, Item, Rules, Use, Values};
use crate::progress::grouped;

/// Most columns of a file.
const MOST_COLUMNS: usize = 1000;

/// Where readings come from, for messages.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum From {
    /// A file.
    File(PathBuf),
    /// Standard input.
    Stdin,
}

impl fmt::Display for From {
    fn fmt(&self, f: &mut fmt::Formatter) -> fmt::Result {
        match self {
            From::File(path) => write!(f, "{path:?}"),
            From::Stdin => f.write_str("standard input"),
        }
    }
}

/// What is wrong with a file of readings as a whole.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum ReadingsError {
    /// Nothing in it.
    #[error("{from} is empty; begin with a line of column names, for example {example}")]
    Empty {
        /// Where from.
        from: From,
        /// A header that does.
        example: String,
    },
    /// Names, but no readings.
    #[error("{from} has a line of column names, but no readings below it")]
    NoRows {
        /// Where from.
        from: From,
    },
    /// Not UTF-8 where it has to be.
    #[error("{from}, line {line}: the column names are not text in UTF-8; save the file as UTF-8")]
    Encoding {
        /// Where from.
        from: From,
        /// Line, from 1.
        line: u64,
    },
    /// Far too many columns.
    #[error("{from}, line {line} has {} columns, at most {MOST_COLUMNS} are read; check the file", grouped(*.count))]
    Wide {
        /// Where from.
        from: From,
        /// Line, from 1.
        line: u64,
        /// How many.
        count: usize,
    },
    /// A column that is not there.
    #[error("{from} has no column for the {name}; add one, for example {example}{otherwise}")]
    Missing {
        /// Where from.
        from: From,
        /// Of what.
        name: &'static str,
        /// A column that does.
        example: &'static str,
        /// Another way out.
        otherwise: &'static str,
    },
    /// A column that will not do.
    #[error("{from}, line {line}, column {}: {what}", quoted(.name))]
    Column {
        /// Where from.
        from: From,
        /// Line, from 1.
        line: u64,
        /// Its name.
        name: String,
        /// What is wrong.
        what: String,
    },
}

/// A column that is read.
#[derive(Clone, Debug, PartialEq)]
pub struct Column {
    /// Its place in a row.
    pub index: usize,
    /// Its name.
    pub name: String,
    /// What it is.
    pub entry: Entry,
    /// Its unit.
    pub unit: String,
}

/// A file of readings.
pub struct Readings {
    /// Between the cells.
    pub delimiter: u8,
    /// All names.
    pub names: Vec<String>,
    /// What is read.
    pub columns: Vec<Column>,
    /// The rows.
    pub rows: Vec<ByteRecord>,
    /// What a person should know, though it is no error.
    pub notes: Vec<String>,
}

/// The delimiter: that of the first line with names.
fn delimiter(bytes: &[u8]) -> u8 {
    let mut lines = bytes.split(|b| *b == b'\n');
    let is_name = |l: &&[u8]| !l.starts_with(b"#") && !l.iter().all(u8::is_ascii_whitespace);
    let line = lines.find(is_name).unwrap_or_default();
    [b';', b'\t'].into_iter().find(|d| line.contains(d)).unwrap_or(b',')
}

/// What a name means: none for a column that is passed through.
fn meaning(name: &str) -> Result<Option<(Entry, String)>, String> {
    let stem_of = |name: &str| -> Option<(Entry, String)> {
        let (stem, unit) = name.rsplit_once('_')?;
        Some((Entry::named(stem)?, unit.to_string()))
    };
    if let Some(entry) = Entry::named(name) {
        let units = entry.item.dimension().unit_list();
        let example = entry.item.column();
        return Err(format!("the name has no unit; add {units}, for example {example}"));
    }
    let Some((entry, unit)) = stem_of(name) else {
        // A slip in the case of a letter shall not make a reading a column that is passed through.
        return match stem_of(&name.to_lowercase()) {
            Some((entry, _)) => {
                let u = if entry.uncertainty { "u_" } else { "" };
                Err(format!("did you mean {u}{}? Names are written in small letters", entry.item.column()))
            }
            None => Ok(None),
        };
    };
    let dimension = entry.item.dimension();
    if dimension.to_si(1.0, &unit).is_none() {
        return Err(format!("the name has the unit {unit:?}; give {}", dimension.unit_list()));
    }
    Ok(Some((entry, unit)))
}

impl Readings {
    /// Reads a whole file. `voltage_given` says that the voltage is known without a column.
    ///
    /// # Errors
    /// See [`ReadingsError`].
    pub fn read(
        from: &From,
        bytes: &[u8],
        rules: &Rules,
        voltage_given: bool,
    ) -> Result<Readings, ReadingsError> {
        let bytes = bytes.strip_prefix(b"\xef\xbb\xbf").unwrap_or(bytes);
        let delimiter = delimiter(bytes);
        let mut reader = ReaderBuilder::new()
            .delimiter(delimiter)
            .comment(Some(b'#'))
            .flexible(true)
            .has_headers(false)
            .from_reader(bytes);
        let mut header = ByteRecord::new();
        // Bytes in memory read without error, whatever they are.
        let found = reader.read_byte_record(&mut header).unwrap_or(false);
        let blank = header.iter().all(|c| c.iter().all(u8::is_ascii_whitespace));
        if !found || blank {
            let example = rules.needed().iter().map(|i| i.column()).collect::<Vec<_>>().join(",");
            return Err(ReadingsError::Empty { from: from.clone(), example });
        }
        let line = header.position().map_or(1, csv::Position::line);
        if header.len() > MOST_COLUMNS {
            return Err(ReadingsError::Wide { from: from.clone(), line, count: header.len() });
        }
        let names: Option<Vec<String>> = header
            .iter()
            .map(|cell| std::str::from_utf8(cell).ok().map(|name| name.trim().to_string()))
            .collect();
        let names = names.ok_or_else(|| ReadingsError::Encoding { from: from.clone(), line })?;
        let mut columns: Vec<Column> = Vec::new();
        let mut notes = Vec::new();
        for (index, name) in names.iter().enumerate() {
            let wrong =
                |what: String| ReadingsError::Column { from: from.clone(), line, name: name.clone(), what };
            let Some((entry, unit)) = meaning(name).map_err(wrong)? else { continue };
            match rules.admits(entry).map_err(wrong)? {
                Use::Taken => {}
                Use::Follows => {
                    notes.push(format!(
                        "column {} is passed through and not used: along the hinge gap and tilt follow from the beam angle",
                        quoted(name)
                    ));
                    continue;
                }
            }
            if let Some(other) = columns.iter().find(|c| c.entry == entry) {
                return Err(wrong(format!("{} is the same quantity; keep one of them", quoted(&other.name))));
            }
            columns.push(Column { index, name: name.clone(), entry, unit });
        }
        for item in rules.needed() {
            let known = columns.iter().any(|c| c.entry == Entry { item, uncertainty: false })
                || (item == Item::Voltage && voltage_given);
            if !known {
                let otherwise =
                    if item == Item::Voltage { ", or give --voltage for all readings" } else { "" };
                let (name, example) = (item.name(), item.column());
                return Err(ReadingsError::Missing { from: from.clone(), name, example, otherwise });
            }
        }
        let rows: Vec<ByteRecord> = reader.byte_records().filter_map(Result::ok).collect();
        if rows.is_empty() {
            return Err(ReadingsError::NoRows { from: from.clone() });
        }
        Ok(Readings { delimiter, names, columns, rows, notes })
    }

    /// The values of a row, or what is wrong with each of its cells.
    pub fn values(&self, row: &ByteRecord, rules: &Rules) -> Result<Values, Vec<String>> {
        let line = row.position().map_or(0, csv::Position::line);
        if row.len() != self.names.len() {
            let (found, wanted) = (grouped(row.len()), self.names.len());
            return Err(vec![format!("line {line}: {found} cells, but the header has {wanted}")]);
        }
        let (mut values, mut wrong) = (Values::default(), Vec::new());
        for column in &self.columns {
            let cell = String::from_utf8_lossy(&row[column.index]);
            let text = cell.trim();
            let checked = number(text, self.delimiter).and_then(|v| {
                let si = column.entry.item.dimension().to_si(v, &column.unit).unwrap_or(v);
                rules.check(column.entry, si, &column.unit).map_err(|what| format!("{text} {what}"))?;
                Ok(si)
            });
            match checked {
                Ok(si) => values.put(column.entry, si),
                Err(what) => wrong.push(format!("line {line}, column {}: {what}", column.name)),
            }
        }
        if wrong.is_empty() {
            Ok(values)
        } else {
            Err(wrong)
        }
    }
}

/// The number in a cell.
fn number(text: &str, delimiter: u8) -> Result<f64, String> {
    if text.is_empty() {
        return Err("the cell is empty; write a number (0 for an uncertainty that is not known)".into());
    }
    let mut plain = Cow::Borrowed(text);
    if plain.contains('\u{2212}') {
        plain = plain.replace('\u{2212}', "-").into();
    }
    if delimiter != b',' && plain.contains(',') && !plain.contains('.') {
        plain = plain.replacen(',', ".", 1).into();
    }
    let digits = plain.bytes().any(|b| b.is_ascii_digit());
    match plain.parse::<f64>() {
        Ok(v) if v.is_finite() && digits => Ok(v),
        Ok(_) => Err(format!("{} is not a finite number", quoted(text))),
        Err(_) => Err(format!("{} is not a number", quoted(text))),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixture::{table, table_job};
    use proptest::prelude::*;

    fn read<T>(text: &[u8], then: impl Fn(&Readings, &Rules) -> T) -> Result<T, String> {
        let (job, table) = (table_job(), table());
        let rules = Rules { job: &job, table: &table };
        let readings = Readings::read(&From::Stdin, text, &rules, false).map_err(|e| e.to_string())?;
        Ok(then(&readings, &rules))
    }

    fn cells(text: &str) -> Result<Vec<Result<Values, Vec<String>>>, String> {
        read(text.as_bytes(), |r, rules| r.rows.iter().map(|row| r.values(row, rules)).collect())
    }

    #[test]
    fn columns_are_found_in_any_order() {
        let text = "\u{feff}# spring run\nvoltage_V,note,tilt_mrad,gap_um,u_gap_um\n400,\"a, b\",2,4000,5\n";
        let row = cells(text).unwrap().remove(0).unwrap();
        let get = |name: &str| {
            let e = Entry::named(name).unwrap();
            row.get(e.item, e.uncertainty)
        };
        assert_eq!(
            [get("gap"), get("tilt"), get("voltage"), get("u_gap"), get("u_tilt")],
            [Some(0.004), Some(0.002), Some(400.0), Some(5.0 / 1e6), None]
        );
        let german = cells("gap_mm;tilt_deg;voltage_V\n3,25;0,5;1e2\n").unwrap().remove(0).unwrap();
        assert_eq!(german.get(Item::Pose(crate::tables::axis::Variable::Gap), false), Some(0.00325));
        assert!(cells("gap_mm\ttilt_deg\tvoltage_V\r\n3\t0\t1\r\n").unwrap()[0].is_ok());
    }

    #[test]
    fn a_file_that_will_not_do_is_refused() {
        let wide = "x,".repeat(1_000_000);
        for (text, sentence) in [
            ("", "standard input is empty; begin with a line of column names, for example gap_mm,tilt_deg,voltage_V"),
            ("# only a comment\n", "is empty"),
            (" \n", "is empty"),
            ("gap_mm,tilt_deg,voltage_V\n", "no readings below it"),
            ("gap_mm,tilt_deg\n3,0\n", "has no column for the voltage; add one, for example voltage_V, or give --voltage"),
            ("gap_mm,voltage_V\n3,0\n", "has no column for the tilt; add one, for example tilt_deg"),
            ("gap,tilt_deg,voltage_V\n3,0,1\n", "line 1, column \"gap\": the name has no unit; add m, cm, mm, um or in"),
            ("gap_ft,tilt_deg,voltage_V\n3,0,1\n", "column \"gap_ft\": the name has the unit \"ft\""),
            ("Gap_mm,tilt_deg,voltage_V\n3,0,1\n", "column \"Gap_mm\": did you mean gap_mm?"),
            ("gap_mm,gap_um,tilt_deg,voltage_V\n3,0,1,1\n", "column \"gap_um\": \"gap_mm\" is the same quantity"),
            ("gap_mm,tilt_deg,voltage_V,u_roll_deg\n3,0,1,1\n", "column \"u_roll_deg\": cannot be taken into account"),
            (wide.as_str(), "line 1 has 1 000 001 columns, at most 1000 are read"),
        ] {
            let error = read(text.as_bytes(), |_, _| ()).unwrap_err();
            assert!(error.contains(sentence), "{error}");
        }
        assert!(read(b"gap_mm,\xff\n", |_, _| ()).unwrap_err().contains("not text in UTF-8"));
    }

    #[test]
    fn every_wrong_cell_is_named() {
        let rows = cells(
            "gap_mm,tilt_deg,voltage_V\n9.1,0,400\nabc,,1e999\n3,0\n3,0,400,5\n3,NaN,infinity\n\n3,0,4\n",
        )
        .unwrap();
        let wrong: Vec<String> =
            rows.iter().map(|r| r.as_ref().err().map_or(String::new(), |w| w.join(" | "))).collect();
        let empty = "the cell is empty; write a number (0 for an uncertainty that is not known)";
        assert_eq!(
            wrong,
            [
                "line 2, column gap_mm: 9.1 is outside the table, 2 to 8 mm".to_string(),
                format!(
                    "line 3, column gap_mm: \"abc\" is not a number | line 3, column tilt_deg: {empty} | line 3, column \
                     voltage_V: \"1e999\" is not a finite number"
                ),
                "line 4: 2 cells, but the header has 3".into(),
                "line 5: 4 cells, but the header has 3".into(),
                "line 6, column tilt_deg: \"NaN\" is not a finite number | line 6, column voltage_V: \"infinity\" is not \
                 a finite number"
                    .into(),
                String::new(),
            ]
        );
    }

    proptest! {
        #![proptest_config(ProptestConfig { cases: 128, failure_persistence: None, ..ProptestConfig::default() })]

        #[test]
        fn any_bytes_are_readings_or_a_sentence(bytes in prop::collection::vec(any::<u8>(), 0..200)) {
            if let Err(sentence) = read(&bytes, |_, _| ()) {
                prop_assert!(sentence.starts_with("standard input"));
            }
        }

        #[test]
        fn any_rows_are_values_or_sentences(rows in "[-+0-9eE.,;\"a\n ]{0,120}") {
            let text = format!("gap_mm,tilt_deg,voltage_V\n{rows}");
            if let Ok(rows) = cells(&text) {
                for wrong in rows.into_iter().filter_map(Result::err) {
                    prop_assert!(wrong.iter().all(|w| w.starts_with("line ")));
                }
            }
        }
    }
}
