//! The encoding of a `.dbf`: named by a `.cpg`, by a byte in its header, by the study, or found out.

use encoding_rs::{Encoding, UTF_8, WINDOWS_1252};

/// How the text of a table is decoded.
#[derive(Clone, Copy, Debug)]
pub(super) struct TextEncoding {
    encoding: &'static Encoding,
    /// Whether the files name it.
    stated: bool,
}

/// What one text came out as.
pub(super) struct Decoded {
    pub text: String,
    /// Whether it may be misread.
    pub doubtful: bool,
}

impl TextEncoding {
    /// The encoding that the `.cpg`, the language byte of the header, or the caller names, in this order.
    pub fn of(cpg: Option<&str>, language: u8, asked: Option<&str>) -> TextEncoding {
        let stated = cpg
            .and_then(named)
            .or_else(|| of_language(language))
            .or_else(|| asked.and_then(named));
        TextEncoding {
            encoding: stated.unwrap_or(UTF_8),
            stated: stated.is_some(),
        }
    }

    /// Decodes a text. Letters beyond ASCII in a table that names no encoding are taken as UTF-8 if they can be that,
    /// else as Windows-1252, and are doubtful either way.
    pub fn decode(self, bytes: &[u8]) -> Decoded {
        if bytes.is_ascii() {
            return Decoded {
                text: String::from_utf8_lossy(bytes).into_owned(),
                doubtful: false,
            };
        }
        let (text, bad) = self.encoding.decode_without_bom_handling(bytes);
        if bad && !self.stated {
            let (text, _) = WINDOWS_1252.decode_without_bom_handling(bytes);
            return Decoded {
                text: text.into_owned(),
                doubtful: true,
            };
        }
        Decoded {
            text: text.into_owned(),
            doubtful: bad || !self.stated,
        }
    }

    /// The bytes of a text in this encoding, or `None` if it lacks one of the letters.
    pub fn encode(self, text: &str) -> Option<Vec<u8>> {
        let (bytes, _, bad) = self.encoding.encode(text);
        (!bad).then(|| bytes.into_owned())
    }
}

/// The encoding that a name stands for, as programs write it into `.cpg` files.
fn named(name: &str) -> Option<&'static Encoding> {
    let name = name.trim_start_matches('\u{feff}').trim().to_ascii_lowercase();
    if let Some(found) = Encoding::for_label(name.as_bytes()) {
        return Some(found);
    }
    let number: String = name.chars().filter(char::is_ascii_digit).collect();
    let label = match number.as_str() {
        "65001" => "utf-8".to_string(),
        "936" => "gbk".to_string(),
        "950" => "big5".to_string(),
        "932" => "shift_jis".to_string(),
        "949" => "euc-kr".to_string(),
        "866" => "ibm866".to_string(),
        n if n.len() == 4 && n.starts_with("125") => format!("windows-{n}"),
        n if n.starts_with("8859") && n.len() > 4 => format!("iso-8859-{}", &n[4..]),
        _ => return None,
    };
    Encoding::for_label(label.as_bytes())
}

/// The encoding that the language byte of a `.dbf` header stands for, where we can decode it. Code pages 437 and 850 of
/// DOS are not among them.
fn of_language(byte: u8) -> Option<&'static Encoding> {
    let label: &[u8] = match byte {
        0x03 | 0x57..=0x59 => b"windows-1252",
        0xc8 => b"windows-1250",
        0xc9 => b"windows-1251",
        0xca => b"windows-1254",
        0xcb => b"windows-1253",
        0xcc => b"windows-1257",
        0x7d => b"windows-1255",
        0x7e => b"windows-1256",
        0x26 | 0x65 => b"ibm866",
        0x04 => b"macintosh",
        0x13 | 0x7b => b"shift_jis",
        0x4d | 0x7a => b"gbk",
        0x4e | 0x79 => b"euc-kr",
        0x4f | 0x78 => b"big5",
        0x7c => b"windows-874",
        _ => return None,
    };
    Encoding::for_label(label)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_and_bytes_are_understood() {
        for (name, expected) in [
            ("UTF-8", "UTF-8"),
            ("65001", "UTF-8"),
            ("1252", "windows-1252"),
            ("CP1251\r\n", "windows-1251"),
            ("ANSI 1250", "windows-1250"),
            ("88592", "ISO-8859-2"),
            ("ISO 88591", "windows-1252"),
            ("ISO8859-15", "ISO-8859-15"),
        ] {
            assert_eq!(
                TextEncoding::of(Some(name), 0, None).encoding.name(),
                expected,
                "{name}"
            );
        }
        assert_eq!(
            TextEncoding::of(None, 0x57, Some("UTF-8")).encoding.name(),
            "windows-1252"
        );
        assert_eq!(
            TextEncoding::of(None, 0, Some("cp1251")).encoding.name(),
            "windows-1251"
        );
    }

    #[test]
    fn what_names_no_encoding_is_doubtful() {
        let unnamed = TextEncoding::of(None, 0, None);
        assert!(!unnamed.decode(b"plain").doubtful);
        let utf8 = unnamed.decode("Straße".as_bytes());
        assert!(utf8.doubtful && utf8.text == "Straße");
        let ansi = unnamed.decode(b"Stra\xdfe");
        assert!(ansi.doubtful && ansi.text == "Straße");
        let stated = TextEncoding::of(Some("UTF-8"), 0, None);
        assert!(!stated.decode("Straße".as_bytes()).doubtful);
        assert!(stated.decode(b"Stra\xdfe").doubtful);
    }
}
