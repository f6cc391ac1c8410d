//! One CSV file as a table of text, with the line of every row.

use std::fs;
use std::path::{Path, PathBuf};

use super::error::{Place, TraceError};

/// A CSV file in memory.
#[derive(Debug, Clone)]
pub(super) struct Table {
    /// The file.
    pub(super) path: PathBuf,
    /// Names of the columns, as written.
    pub(super) header: Vec<String>,
    /// Cells of each row.
    pub(super) rows: Vec<csv::StringRecord>,
    /// The line of each row, from 1.
    pub(super) lines: Vec<u64>,
    /// Whether numbers are written with a decimal comma.
    pub(super) decimal_comma: bool,
}

/// Reads a file, and adds its bytes to those that identify the data.
pub(super) fn read(path: &Path, bytes_read: &mut Vec<u8>) -> Result<Table, TraceError> {
    let bytes = fs::read(path).map_err(|error| TraceError::Unreadable {
        path: path.to_owned(),
        reason: error.to_string(),
    })?;
    bytes_read.extend_from_slice(&bytes);
    let text = text_of(path, &bytes)?;
    let separator = separator(text);
    let mut reader = csv::ReaderBuilder::new()
        .delimiter(separator)
        .comment(Some(b'#'))
        .trim(csv::Trim::All)
        .flexible(true)
        .from_reader(text.as_bytes());
    let broken = |error: csv::Error| TraceError::Csv {
        path: path.to_owned(),
        reason: error.to_string(),
    };
    let header: Vec<String> = reader
        .headers()
        .map_err(broken)?
        .iter()
        .map(str::to_owned)
        .collect();
    let mut table = Table {
        path: path.to_owned(),
        header,
        rows: Vec::new(),
        lines: Vec::new(),
        decimal_comma: separator != b',',
    };
    for record in reader.records() {
        let record = record.map_err(broken)?;
        let line = record.position().map_or(0, csv::Position::line);
        table.push(record, line)?;
    }
    table.check_header()?;
    if table.rows.is_empty() {
        return Err(TraceError::EmptyFile(path.to_owned()));
    }
    Ok(table)
}

/// The text without a byte-order mark.
fn text_of<'a>(path: &Path, bytes: &'a [u8]) -> Result<&'a str, TraceError> {
    let text = std::str::from_utf8(bytes).map_err(|error| {
        let before = &bytes[..error.valid_up_to()];
        TraceError::NotUtf8 {
            path: path.to_owned(),
            line: 1 + before.iter().filter(|byte| **byte == b'\n').count() as u64,
        }
    })?;
    let text = text.strip_prefix('\u{feff}').unwrap_or(text);
    if text.trim().is_empty() {
        return Err(TraceError::EmptyFile(path.to_owned()));
    }
    Ok(text)
}

/// The separator that the header uses most: comma, semicolon or tab.
fn separator(text: &str) -> u8 {
    let header = text
        .lines()
        .find(|line| !line.trim_start().starts_with('#') && !line.trim().is_empty())
        .unwrap_or_default();
    let count = |separator: u8| header.bytes().filter(|byte| *byte == separator).count();
    // The first of the largest: a comma unless another is used more.
    [b',', b';', b'\t']
        .into_iter()
        .rev()
        .max_by_key(|separator| count(*separator))
        .unwrap_or(b',')
}

impl Table {
    fn push(&mut self, record: csv::StringRecord, line: u64) -> Result<(), TraceError> {
        // A line of nothing but separators or spaces is no row.
        if record.iter().all(str::is_empty) {
            return Ok(());
        }
        if record.len() != self.header.len() {
            return Err(TraceError::Ragged {
                path: self.path.clone(),
                line,
                found: record.len(),
                expected: self.header.len(),
            });
        }
        self.rows.push(record);
        self.lines.push(line);
        Ok(())
    }

    fn check_header(&self) -> Result<(), TraceError> {
        for (position, name) in self.header.iter().enumerate() {
            if name.is_empty() {
                return Err(TraceError::UnnamedColumn {
                    path: self.path.clone(),
                    position: position + 1,
                });
            }
            if self.header[..position].contains(name) {
                return Err(TraceError::DuplicateColumn {
                    path: self.path.clone(),
                    name: name.clone(),
                });
            }
        }
        Ok(())
    }

    /// The position of a column by its plain name.
    pub(super) fn column(&self, name: &str) -> Option<usize> {
        self.header
            .iter()
            .position(|header| header.eq_ignore_ascii_case(name))
    }

    /// The place of a cell.
    pub(super) fn place(&self, row: usize, column: usize) -> Box<Place> {
        Box::new(Place {
            path: self.path.clone(),
            line: self.lines[row],
            column: self.header[column].clone(),
        })
    }

    /// The error for a column that must be there.
    pub(super) fn missing(&self, name: &'static str, remedy: &'static str) -> TraceError {
        TraceError::MissingColumn {
            path: self.path.clone(),
            name,
            header: self.header.join(", "),
            remedy,
        }
    }

    /// A cell as a number; `None` where it is empty.
    pub(super) fn number(&self, row: usize, column: usize) -> Result<Option<f64>, TraceError> {
        let text = &self.rows[row][column];
        if text.is_empty() {
            return Ok(None);
        }
        let parsed = if self.decimal_comma && text.contains(',') {
            text.replacen(',', ".", 1).parse::<f64>()
        } else {
            text.parse::<f64>()
        };
        let place = || self.place(row, column);
        let owned = || text.to_owned();
        match parsed {
            Ok(value) if value.is_finite() => Ok(Some(value + 0.0)),
            Ok(_) => Err(TraceError::NotFinite {
                place: place(),
                text: owned(),
            }),
            Err(_) => Err(TraceError::NotANumber {
                place: place(),
                text: owned(),
            }),
        }
    }

    /// A cell as a number, or as the text of a flag.
    pub(super) fn sample(&self, row: usize, column: usize) -> Result<Option<f64>, TraceError> {
        match self.rows[row][column].to_ascii_lowercase().as_str() {
            "true" | "on" | "yes" => Ok(Some(1.0)),
            "false" | "off" | "no" => Ok(Some(0.0)),
            _ => self.number(row, column),
        }
    }

    /// A cell that must hold a number.
    pub(super) fn required(&self, row: usize, column: usize) -> Result<f64, TraceError> {
        self.number(row, column)?
            .ok_or_else(|| TraceError::EmptyCell {
                place: self.place(row, column),
            })
    }
}
