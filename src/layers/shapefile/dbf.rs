//! The attribute table of a shapefile, read by its bytes.
//!
//! Own code, because the library for this reads numbers as binary floats (asset ids and measured lengths lose digits),
//! fails a whole record for one odd number, and loses the order of the columns. Here a number is exact, one that is none
//! is that cell alone, as text, and the record's bytes stay at hand for the writer.

use crate::layers::layer::Cell;

/// One column as the header describes it.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Field {
    /// Its name, to be decoded.
    pub name: Vec<u8>,
    /// Its type, as a letter.
    pub kind: u8,
    /// Offset of its bytes in a record.
    pub offset: usize,
    /// Its width in bytes.
    pub width: usize,
    /// Digits after the point.
    pub decimals: u8,
}

/// A table over the bytes of its file.
#[derive(Clone, Debug)]
pub(super) struct Dbf<'a> {
    bytes: &'a [u8],
    /// The columns, in file order.
    pub fields: Vec<Field>,
    header_length: usize,
    record_length: usize,
    /// Number of records, deleted ones among them.
    pub records: usize,
    /// The language byte.
    pub language: u8,
}

const HEADER: usize = 32;
const DESCRIPTOR: usize = 32;
const END_OF_DESCRIPTORS: u8 = 0x0d;

impl<'a> Dbf<'a> {
    /// Reads the header; the reason as the middle of a sentence if it cannot be.
    pub fn new(bytes: &'a [u8]) -> Result<Self, String> {
        if bytes.len() < HEADER + 1 {
            return Err("the attribute table is cut short in its header".into());
        }
        let records = u32::from_le_bytes([bytes[4], bytes[5], bytes[6], bytes[7]]) as usize;
        let header_length = u16::from_le_bytes([bytes[8], bytes[9]]) as usize;
        let record_length = u16::from_le_bytes([bytes[10], bytes[11]]) as usize;
        if header_length < HEADER + 1 || record_length == 0 {
            return Err("the attribute table has a header that makes no sense".into());
        }
        let end = records
            .checked_mul(record_length)
            .and_then(|size| size.checked_add(header_length));
        if end.is_none_or(|end| end > bytes.len()) {
            return Err(format!(
                "the attribute table is cut short: its header says {records} records of {record_length} bytes"
            ));
        }
        let fields = fields(&bytes[HEADER..header_length], record_length)?;
        Ok(Dbf {
            bytes,
            fields,
            header_length,
            record_length,
            records,
            language: bytes[29],
        })
    }

    /// The bytes of a record, its deletion mark first.
    pub fn record(&self, record: usize) -> &'a [u8] {
        let start = self.header_length + record * self.record_length;
        &self.bytes[start..start + self.record_length]
    }

    /// Whether a record is marked as deleted.
    pub fn is_deleted(&self, record: usize) -> bool {
        self.record(record)[0] == b'*'
    }

    /// The bytes of the header as far as the columns.
    pub fn header(&self) -> &'a [u8] {
        &self.bytes[..HEADER]
    }

    /// The bytes of the columns' descriptors.
    pub fn descriptors(&self) -> &'a [u8] {
        &self.bytes[HEADER..HEADER + DESCRIPTOR * self.fields.len()]
    }

    /// What stands between the descriptors and the records (the end mark, and what some programs add).
    pub fn after_descriptors(&self) -> &'a [u8] {
        &self.bytes[HEADER + DESCRIPTOR * self.fields.len()..self.header_length]
    }

    /// Bytes of one record.
    pub fn record_length(&self) -> usize {
        self.record_length
    }
}

fn fields(descriptors: &[u8], record_length: usize) -> Result<Vec<Field>, String> {
    let raw: Vec<&[u8]> = descriptors
        .chunks(DESCRIPTOR)
        .take_while(|descriptor| descriptor[0] != END_OF_DESCRIPTORS && descriptor.len() == DESCRIPTOR)
        .collect();
    // Text wider than 255 keeps the high byte of its width where numbers keep their decimals.
    let plain = |d: &[u8]| d[16] as usize;
    let wide = |d: &[u8]| d[16] as usize + if d[11] == b'C' { 256 * d[17] as usize } else { 0 };
    let sum = |width: &dyn Fn(&[u8]) -> usize| 1 + raw.iter().map(|d| width(d)).sum::<usize>();
    let use_wide = sum(&plain) != record_length && sum(&wide) == record_length;
    if !use_wide && sum(&plain) > record_length {
        return Err("the attribute table has columns that are wider than its records".into());
    }
    let mut offset = 1;
    let mut fields = Vec::with_capacity(raw.len());
    for descriptor in raw {
        let name_end = descriptor[..11].iter().position(|byte| *byte == 0).unwrap_or(11);
        let width = if use_wide { wide(descriptor) } else { plain(descriptor) };
        fields.push(Field {
            name: trim(&descriptor[..name_end]).to_vec(),
            kind: descriptor[11].to_ascii_uppercase(),
            offset,
            width,
            decimals: descriptor[17],
        });
        offset += width;
    }
    Ok(fields)
}

/// What a cell holds before its text is decoded.
pub(super) enum Raw<'a> {
    /// Anything but text.
    Cell(Cell),
    /// Text, trailing blanks cut, to be decoded.
    Text(&'a [u8]),
}

impl Field {
    /// A cell of a record.
    pub fn value<'r>(&self, record: &'r [u8]) -> Raw<'r> {
        let bytes = &record[self.offset..self.offset + self.width];
        let trimmed = trim(bytes);
        match self.kind {
            b'I' | b'+' if bytes.len() == 4 => {
                let whole = i32::from_le_bytes([bytes[0], bytes[1], bytes[2], bytes[3]]);
                Raw::Cell(Cell::Whole(whole.into()))
            }
            b'O' | b'B' if bytes.len() == 8 => {
                let mut eight = [0; 8];
                eight.copy_from_slice(bytes);
                let value = f64::from_le_bytes(eight);
                Raw::Cell(if value.is_finite() {
                    Cell::Real(value)
                } else {
                    Cell::Null
                })
            }
            _ if trimmed.is_empty() => Raw::Cell(Cell::Null),
            b'N' | b'F' | b'D' if trimmed.iter().all(|byte| *byte == b'*') => Raw::Cell(Cell::Null),
            b'N' | b'F' => number(trimmed),
            b'D' => date(trimmed),
            b'L' => Raw::Cell(match trimmed[0] {
                b'T' | b't' | b'Y' | b'y' | b'1' => Cell::Bool(true),
                b'F' | b'f' | b'N' | b'n' | b'0' => Cell::Bool(false),
                _ => Cell::Null,
            }),
            // Leading blanks of text are the user's own.
            _ => Raw::Text(trim_end(bytes)),
        }
    }
}

fn is_blank(byte: u8) -> bool {
    byte == b' ' || byte == 0
}

fn trim_end(bytes: &[u8]) -> &[u8] {
    let end = bytes
        .iter()
        .rposition(|byte| !is_blank(*byte))
        .map_or(0, |last| last + 1);
    &bytes[..end]
}

fn trim(bytes: &[u8]) -> &[u8] {
    let bytes = trim_end(bytes);
    let start = bytes.iter().position(|byte| !is_blank(*byte)).unwrap_or(bytes.len());
    &bytes[start..]
}

fn number(bytes: &[u8]) -> Raw<'_> {
    let plain = bytes
        .iter()
        .all(|byte| byte.is_ascii_digit() || b"+-.eE".contains(byte));
    let Some(text) = std::str::from_utf8(bytes).ok().filter(|_| plain) else {
        return Raw::Text(bytes);
    };
    if let Ok(whole) = text.parse::<i64>() {
        return Raw::Cell(Cell::Whole(whole));
    }
    let is_whole = !text.contains(['.', 'e', 'E']);
    match text.parse::<f64>() {
        Ok(value) if value.is_finite() && !is_whole => Raw::Cell(Cell::Real(value)),
        _ => Raw::Text(bytes),
    }
}

/// A date as `1987-03-01`; what is none stays text.
fn date(bytes: &[u8]) -> Raw<'_> {
    if bytes.iter().all(|byte| *byte == b'0') {
        return Raw::Cell(Cell::Null);
    }
    match std::str::from_utf8(bytes) {
        Ok(text) if text.len() == 8 && bytes.iter().all(u8::is_ascii_digit) => {
            let (year, rest) = text.split_at(4);
            let (month, day) = rest.split_at(2);
            Raw::Cell(Cell::Text(format!("{year}-{month}-{day}").into()))
        }
        _ => Raw::Text(bytes),
    }
}

#[cfg(test)]
pub(super) mod tests {
    use super::*;

    /// A table from its columns (name, type, width, decimals) and its records as they stand in the file.
    pub fn table(columns: &[(&str, u8, u8, u8)], records: &[&[u8]]) -> Vec<u8> {
        let record_length = 1 + columns.iter().map(|column| column.2 as usize).sum::<usize>();
        let mut bytes = vec![0; 32];
        bytes[0] = 3;
        bytes[4..8].copy_from_slice(&(records.len() as u32).to_le_bytes());
        bytes[8..10].copy_from_slice(&(33 + 32 * columns.len() as u16).to_le_bytes());
        bytes[10..12].copy_from_slice(&(record_length as u16).to_le_bytes());
        for (name, kind, width, decimals) in columns {
            let mut descriptor = [0; 32];
            descriptor[..name.len()].copy_from_slice(name.as_bytes());
            (descriptor[11], descriptor[16], descriptor[17]) = (*kind, *width, *decimals);
            bytes.extend_from_slice(&descriptor);
        }
        bytes.push(END_OF_DESCRIPTORS);
        for record in records {
            assert_eq!(record.len(), record_length);
            bytes.extend_from_slice(record);
        }
        bytes.push(0x1a);
        bytes
    }

    fn cell(kind: u8, bytes: &[u8]) -> Cell {
        let record = [b" ", bytes].concat();
        let table = table(&[("x", kind, bytes.len() as u8, 0)], &[&record]);
        let dbf = Dbf::new(&table).unwrap();
        match dbf.fields[0].value(dbf.record(0)) {
            Raw::Cell(cell) => cell,
            Raw::Text(text) => Cell::Text(String::from_utf8_lossy(text).into()),
        }
    }

    #[test]
    fn cells_are_exact_and_one_odd_number_is_that_cell_alone() {
        let text = |text: &str| Cell::Text(text.into());
        for (kind, bytes, expected) in [
            (b'N', &b"9007199254740993"[..], Cell::Whole(9_007_199_254_740_993)),
            (b'N', b"  -12 ", Cell::Whole(-12)),
            (b'N', b"99999999999999999999", text("99999999999999999999")),
            (b'N', b"  12.50", Cell::Real(12.5)),
            (b'N', b"      ", Cell::Null),
            (b'N', b"\0\0\0", Cell::Null),
            (b'N', b"******", Cell::Null),
            (b'N', b" 1,234", text("1,234")),
            (b'N', b" nan", text("nan")),
            (b'N', b" inf", text("inf")),
            (b'N', b"1e999", text("1e999")),
            (b'N', b"  -", text("-")),
            (b'F', b"1234.56789012", Cell::Real(1234.56789012)),
            (b'F', b"1.5e-3", Cell::Real(0.0015)),
            (b'C', b"  a b  ", text("  a b")),
            (b'C', b"12  ", text("12")),
            (b'C', b"    ", Cell::Null),
            (b'C', b"ab\0\0", text("ab")),
            (b'L', b"T", Cell::Bool(true)),
            (b'L', b"n", Cell::Bool(false)),
            (b'L', b"?", Cell::Null),
            (b'D', b"19870301", text("1987-03-01")),
            (b'D', b"00000000", Cell::Null),
            (b'D', b"        ", Cell::Null),
            (b'D', b"1 March ", text("1 March")),
            (b'I', &7_i32.to_le_bytes(), Cell::Whole(7)),
            (b'O', &0.25_f64.to_le_bytes(), Cell::Real(0.25)),
        ] {
            assert_eq!(cell(kind, bytes), expected, "{}", String::from_utf8_lossy(bytes));
        }
    }

    #[test]
    fn wide_texts_and_headers_that_lie_are_known() {
        // A text of 300 letters keeps its width as 44 + 256.
        let record = [b" ".to_vec(), vec![b'a'; 300], b"1".to_vec()].concat();
        let mut bytes = table(&[("long", b'C', 44, 1), ("n", b'N', 1, 0)], &[]);
        bytes[4] = 1;
        bytes[10..12].copy_from_slice(&302_u16.to_le_bytes());
        bytes.pop();
        bytes.extend_from_slice(&record);
        let dbf = Dbf::new(&bytes).unwrap();
        assert_eq!((dbf.fields[0].width, dbf.fields[1].offset), (300, 301));
        let mut lying = table(&[("n", b'N', 9, 0)], &[b"         1"]);
        lying[10] = 5;
        assert!(Dbf::new(&lying).unwrap_err().contains("wider"));
    }

    #[test]
    fn a_table_cut_anywhere_is_refused() {
        let whole = table(&[("a", b'C', 3, 0), ("b", b'N', 4, 1)], &[b" abc 1.5", b"*xyz    "]);
        for end in 0..whole.len() - 1 {
            assert!(Dbf::new(&whole[..end]).is_err(), "{end}");
        }
        assert!(Dbf::new(&whole).unwrap().is_deleted(1));
    }
}
