//! Columns of a table to be written: how wide each is, and each cell as its bytes.
//!
//! A number that does not fit its width is an error, never a number cut short.

use std::io::Write as _;

use super::encoding::TextEncoding;
use crate::layers::layer::Cell;
use crate::layers::names::cut;
use crate::layers::result_columns::Holds;

/// Widest text a table can hold, in bytes.
const WIDEST_TEXT: usize = 254;
/// Widest number that other programs are sure to read as one.
const WIDEST_NUMBER: usize = 20;
/// Width and decimals of numbers that need an exponent or very many digits, as other programs declare such columns.
const FREE: (usize, u8) = (24, 15);
/// Most digits of a whole number that other programs read exactly.
const WHOLE_DIGITS: usize = 18;
/// From here on a number without an exponent is longer than any column.
const LARGE: f64 = 1e15;

/// How the cells of a column are printed.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Style {
    Text,
    Bool,
    Whole,
    /// With so many decimals.
    Fixed(usize),
    /// The shortest text that reads back the same.
    Shortest,
}

/// One column to be written.
pub(super) struct OutColumn<'a> {
    /// Its name, in the table's encoding.
    name: Vec<u8>,
    kind: u8,
    width: usize,
    decimals: u8,
    style: Style,
    cells: &'a [Cell],
    encoding: TextEncoding,
    /// Texts that are longer than a table can hold.
    pub cut_texts: usize,
}

impl<'a> OutColumn<'a> {
    /// A column of ours.
    pub fn ours(name: &str, holds: Holds, cells: &'a [Cell], encoding: TextEncoding) -> Self {
        let is_number = |cell: &Cell| matches!(cell, Cell::Null | Cell::Whole(_) | Cell::Real(_));
        match holds {
            Holds::Real(decimals) if cells.iter().all(is_number) => Self::fixed(name, decimals.into(), cells, encoding),
            Holds::Text => Self::text(name, cells, encoding),
            Holds::Whole | Holds::Real(_) => Self::found(name, cells, encoding),
        }
    }

    /// A column whose type is found from its cells.
    pub fn found(name: &str, cells: &'a [Cell], encoding: TextEncoding) -> Self {
        let (mut bools, mut wholes, mut reals, mut texts) = (0, 0, 0, 0);
        for cell in cells {
            match cell {
                Cell::Null => {}
                Cell::Bool(_) => bools += 1,
                Cell::Whole(_) => wholes += 1,
                Cell::Real(_) => reals += 1,
                Cell::Text(_) => texts += 1,
            }
        }
        match (bools, wholes, reals, texts) {
            (1.., 0, 0, 0) => Self::new(name, b'L', (1, 0), Style::Bool, cells, encoding),
            (0, 1.., 0, 0) => Self::whole(name, cells, encoding),
            (0, _, 1.., 0) => Self::real(name, cells, encoding),
            _ => Self::text(name, cells, encoding),
        }
    }

    fn new(
        name: &str,
        kind: u8,
        (width, decimals): (usize, u8),
        style: Style,
        cells: &'a [Cell],
        encoding: TextEncoding,
    ) -> Self {
        OutColumn {
            name: encoding.encode(name).unwrap_or_else(|| name.as_bytes().to_vec()),
            kind,
            width: width.max(1),
            decimals,
            style,
            cells,
            encoding,
            cut_texts: 0,
        }
    }

    fn whole(name: &str, cells: &'a [Cell], encoding: TextEncoding) -> Self {
        let mut buffer = Vec::new();
        let mut width = 1;
        for cell in cells {
            buffer.clear();
            print(cell, Style::Whole, &mut buffer);
            width = width.max(buffer.len());
        }
        if width > WHOLE_DIGITS {
            return Self::text(name, cells, encoding);
        }
        Self::new(name, b'N', (width, 0), Style::Whole, cells, encoding)
    }

    fn fixed(name: &str, decimals: usize, cells: &'a [Cell], encoding: TextEncoding) -> Self {
        // Of numbers with one sign the one farthest from zero is the longest, so only two need to be printed.
        let (mut least, mut greatest) = (0.0_f64, 0.0_f64);
        for value in cells.iter().filter_map(number).filter(|value| value.is_finite()) {
            (least, greatest) = (least.min(value), greatest.max(value));
        }
        if greatest.max(-least) >= LARGE {
            return Self::new(name, b'N', FREE, Style::Shortest, cells, encoding);
        }
        let width = [least, greatest].map(|value| format!("{value:.decimals$}").len());
        let width = width[0].max(width[1]);
        Self::new(
            name,
            b'N',
            (width, decimals as u8),
            Style::Fixed(decimals),
            cells,
            encoding,
        )
    }

    fn real(name: &str, cells: &'a [Cell], encoding: TextEncoding) -> Self {
        let (mut before, mut after) = (1, 0);
        for value in cells.iter().filter_map(number).filter(|value| value.is_finite()) {
            if value.abs() >= LARGE {
                after = usize::MAX;
                break;
            }
            let text = format!("{value}");
            let point = text.find('.').unwrap_or(text.len());
            before = before.max(point);
            after = after.max(text.len().saturating_sub(point + 1));
        }
        if after > FREE.1.into() || before + 1 + after > WIDEST_NUMBER {
            return Self::new(name, b'N', FREE, Style::Shortest, cells, encoding);
        }
        // A column of numbers without a fraction still holds numbers: one decimal keeps it from being taken for ids.
        let after = after.max(1);
        Self::new(
            name,
            b'N',
            (before + 1 + after, after as u8),
            Style::Fixed(after),
            cells,
            encoding,
        )
    }

    fn text(name: &str, cells: &'a [Cell], encoding: TextEncoding) -> Self {
        let mut column = Self::new(name, b'C', (1, 0), Style::Text, cells, encoding);
        let (mut width, mut cut_texts) = (1, 0);
        for row in 0..cells.len() {
            let text = column.encoded(row, usize::MAX);
            width = width.max(text.len());
            cut_texts += usize::from(text.len() > WIDEST_TEXT);
        }
        column.width = width.min(WIDEST_TEXT);
        column.cut_texts = cut_texts;
        column
    }

    /// Bytes of the column in a record.
    pub fn width(&self) -> usize {
        self.width
    }

    /// The descriptor of the header.
    pub fn descriptor(&self) -> [u8; 32] {
        let mut bytes = [0; 32];
        let length = self.name.len().min(10);
        bytes[..length].copy_from_slice(&self.name[..length]);
        bytes[11] = self.kind;
        bytes[16] = self.width as u8;
        bytes[17] = self.decimals;
        bytes
    }

    /// Appends the bytes of a cell to a record; the text that does not fit if it does not.
    pub fn append(&self, row: usize, record: &mut Vec<u8>) -> Result<(), String> {
        let start = record.len();
        match self.style {
            Style::Text => record.extend_from_slice(&self.encoded(row, self.width)),
            style => print(&self.cells[row], style, record),
        }
        let length = record.len() - start;
        if length > self.width {
            return Err(String::from_utf8_lossy(&record[start..]).into_owned());
        }
        record.resize(start + self.width, b' ');
        // Numbers stand at the right of their column.
        if matches!(self.style, Style::Whole | Style::Fixed(_) | Style::Shortest) {
            record[start..].rotate_right(self.width - length);
        }
        Ok(())
    }

    /// A cell as text in the table's encoding, shortened to at most so many bytes.
    fn encoded(&self, row: usize, most: usize) -> Vec<u8> {
        let mut plain = Vec::new();
        let text = match &self.cells[row] {
            Cell::Text(text) => text,
            other => {
                print(other, Style::Text, &mut plain);
                std::str::from_utf8(&plain).expect("numbers print as plain text")
            }
        };
        let bytes = encode(self.encoding, text);
        if bytes.len() <= most {
            return bytes;
        }
        let ending = self.encoding.encode("…").unwrap_or_else(|| b"...".to_vec());
        let mut kept = cut(text, most);
        loop {
            let mut bytes = encode(self.encoding, kept);
            if bytes.len() + ending.len() <= most || kept.is_empty() {
                bytes.extend_from_slice(&ending);
                bytes.truncate(most);
                return bytes;
            }
            kept = cut(kept, kept.len() - 1);
        }
    }
}

/// A text in an encoding; a letter that it lacks becomes a question mark.
fn encode(encoding: TextEncoding, text: &str) -> Vec<u8> {
    if text.is_ascii() {
        return text.as_bytes().to_vec();
    }
    encoding.encode(text).unwrap_or_else(|| {
        let mut letter = [0; 4];
        text.chars()
            .flat_map(|c| {
                encoding
                    .encode(c.encode_utf8(&mut letter))
                    .unwrap_or_else(|| b"?".to_vec())
            })
            .collect()
    })
}

fn number(cell: &Cell) -> Option<f64> {
    match cell {
        Cell::Whole(value) => Some(*value as f64),
        Cell::Real(value) => Some(*value),
        _ => None,
    }
}

/// A cell as plain text. What is not finite is blank, as null is.
fn print(cell: &Cell, style: Style, out: &mut Vec<u8>) {
    let value = match cell {
        Cell::Null => return,
        Cell::Bool(value) => {
            let letters: &[u8] = match (style, value) {
                (Style::Bool, true) => b"T",
                (Style::Bool, false) => b"F",
                (_, true) => b"true",
                (_, false) => b"false",
            };
            return out.extend_from_slice(letters);
        }
        Cell::Whole(value) => match style {
            Style::Fixed(decimals) => {
                let _ = write!(out, "{value}");
                if decimals > 0 {
                    out.push(b'.');
                    out.resize(out.len() + decimals, b'0');
                }
                return;
            }
            _ => {
                let _ = write!(out, "{value}");
                return;
            }
        },
        Cell::Text(text) => return out.extend_from_slice(text.as_bytes()),
        Cell::Real(value) => *value,
    };
    if !value.is_finite() {
        return;
    }
    let start = out.len();
    let _ = match style {
        Style::Fixed(decimals) => write!(out, "{value:.decimals$}"),
        _ if value == 0.0 => write!(out, "0"),
        _ if value.abs() < LARGE && value.abs() > 1e-6 => write!(out, "{value}"),
        _ => write!(out, "{value:e}"),
    };
    // No minus before a value that rounds to zero.
    if out[start] == b'-' && out[start + 1..].iter().all(|byte| b"0.".contains(byte)) {
        out.remove(start);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn column(cells: &[Cell]) -> (u8, usize, u8, Vec<String>) {
        let column = OutColumn::found("x", cells, TextEncoding::of(Some("UTF-8"), 0, None));
        let texts = (0..cells.len())
            .map(|row| {
                let mut bytes = Vec::new();
                column.append(row, &mut bytes).unwrap();
                String::from_utf8(bytes).unwrap()
            })
            .collect();
        (column.kind, column.width, column.decimals, texts)
    }

    #[test]
    fn the_type_is_found_from_all_cells() {
        use Cell::{Bool, Null, Real, Text, Whole};
        for (cells, kind, width, decimals, texts) in [
            (vec![Null, Null], b'C', 1, 0, vec![" ", " "]),
            (vec![Bool(true), Null, Bool(false)], b'L', 1, 0, vec!["T", " ", "F"]),
            (vec![Whole(-5), Whole(123), Null], b'N', 3, 0, vec![" -5", "123", "   "]),
            (vec![Whole(5), Real(-0.25)], b'N', 5, 2, vec![" 5.00", "-0.25"]),
            (vec![Real(12.0)], b'N', 4, 1, vec!["12.0"]),
            (vec![Whole(1), Text("a".into())], b'C', 1, 0, vec!["1", "a"]),
            (
                vec![Text("ß".into()), Text("abc".into())],
                b'C',
                3,
                0,
                vec!["ß ", "abc"],
            ),
            (vec![Bool(true), Whole(1)], b'C', 4, 0, vec!["true", "1   "]),
            (vec![Whole(i64::MAX)], b'C', 19, 0, vec!["9223372036854775807"]),
            (vec![Real(1e300)], b'N', 24, 15, vec!["                   1e300"]),
            (vec![Real(f64::NAN), Real(0.5)], b'N', 3, 1, vec!["   ", "0.5"]),
        ] {
            assert_eq!(
                column(&cells),
                (kind, width, decimals, texts.into_iter().map(String::from).collect()),
                "{cells:?}"
            );
        }
    }

    #[test]
    fn every_number_reads_back_the_same() {
        for value in [
            0.1,
            1.0 / 3.0,
            123_456.789_012,
            1e-7,
            -2.5e-12,
            1e22,
            f64::MAX,
            f64::MIN_POSITIVE,
        ] {
            let (_, _, _, texts) = column(&[Cell::Real(value), Cell::Real(1.5)]);
            assert_eq!(texts[0].trim().parse::<f64>().unwrap(), value);
        }
    }

    #[test]
    fn long_texts_are_cut_between_letters() {
        let long = "ä".repeat(200);
        let cells = [Cell::Text(long.clone().into())];
        let column = OutColumn::found("x", &cells, TextEncoding::of(Some("UTF-8"), 0, None));
        assert_eq!((column.width, column.cut_texts), (254, 1));
        let mut bytes = Vec::new();
        column.append(0, &mut bytes).unwrap();
        assert_eq!(
            String::from_utf8(bytes).unwrap().trim_end(),
            format!("{}…", "ä".repeat(125))
        );
        let latin = OutColumn::found("x", &cells, TextEncoding::of(Some("1252"), 0, None));
        assert_eq!((latin.width, latin.cut_texts), (200, 0));
    }

    #[test]
    fn our_numbers_have_the_decimals_asked_for() {
        let cells = [Cell::Real(-0.00004), Cell::Real(1234.5), Cell::Null, Cell::Whole(7)];
        let utf8 = TextEncoding::of(Some("UTF-8"), 0, None);
        let column = OutColumn::ours("vel_mps", Holds::Real(3), &cells, utf8);
        let mut record = Vec::new();
        for row in 0..4 {
            column.append(row, &mut record).unwrap();
        }
        assert_eq!(String::from_utf8(record).unwrap(), "   0.0001234.500           7.000");
        assert_eq!(column.descriptor()[..8], *b"vel_mps\0");
    }
}
