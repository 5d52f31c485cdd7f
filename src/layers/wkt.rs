//! The text of a `.prj` as a tree: enough to clean it for the library that turns it into a projection, and to read off
//! its names, codes and units.
//!
//! Texts met in practice carry a byte order mark, lower-case keywords, or a vertical system appended after a comma
//! (`PROJCS[…],VERTCS[…]`). Only the first root is kept.

/// One bracketed item: `KEYWORD["text", 1.5, OTHER[…]]`.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Item {
    /// The keyword, in upper case.
    pub keyword: String,
    /// What stands between its brackets.
    pub values: Vec<Value>,
}

/// What stands between brackets.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum Value {
    /// Quoted text.
    Text(String),
    /// A number, or a word without quotes, as written.
    Word(String),
    /// Another item.
    Item(Item),
}

/// Deeper nesting than any real text has is refused, so that no text can exhaust the stack.
const DEEPEST: usize = 40;

/// Parses the first root of a text; `None` if it is cut short or no such text at all.
pub(super) fn parse(text: &str) -> Option<Item> {
    let mut reader = Reader {
        rest: text.trim_start_matches('\u{feff}').trim(),
    };
    reader.item(0)
}

struct Reader<'a> {
    rest: &'a str,
}

impl Reader<'_> {
    fn skip_blank(&mut self) {
        self.rest = self.rest.trim_start();
    }

    fn take(&mut self, any_of: &[char]) -> bool {
        self.skip_blank();
        match self.rest.chars().next() {
            Some(first) if any_of.contains(&first) => {
                self.rest = &self.rest[first.len_utf8()..];
                true
            }
            _ => false,
        }
    }

    fn word(&mut self) -> String {
        self.skip_blank();
        let end = self
            .rest
            .find(|c: char| c.is_whitespace() || "[](),\"".contains(c))
            .unwrap_or(self.rest.len());
        let (word, rest) = self.rest.split_at(end);
        self.rest = rest;
        word.to_string()
    }

    fn quoted(&mut self) -> Option<String> {
        let mut text = String::new();
        loop {
            let end = self.rest.find('"')?;
            text.push_str(&self.rest[..end]);
            self.rest = &self.rest[end + 1..];
            // A doubled quote stands for one quote.
            if let Some(rest) = self.rest.strip_prefix('"') {
                text.push('"');
                self.rest = rest;
            } else {
                return Some(text);
            }
        }
    }

    fn item(&mut self, depth: usize) -> Option<Item> {
        let keyword = self.word().to_ascii_uppercase();
        if keyword.is_empty() || depth > DEEPEST || !self.take(&['[', '(']) {
            return None;
        }
        self.after_bracket(keyword, depth)
    }

    fn after_bracket(&mut self, keyword: String, depth: usize) -> Option<Item> {
        let mut values = Vec::new();
        loop {
            if self.take(&['"']) {
                values.push(Value::Text(self.quoted()?));
            } else {
                let word = self.word();
                if self.take(&['[', '(']) {
                    if depth >= DEEPEST {
                        return None;
                    }
                    values.push(Value::Item(self.after_bracket(word.to_ascii_uppercase(), depth + 1)?));
                } else if !word.is_empty() {
                    values.push(Value::Word(word));
                }
            }
            if self.take(&[']', ')']) {
                return Some(Item { keyword, values });
            }
            if !self.take(&[',']) {
                return None;
            }
        }
    }
}

impl Item {
    /// The first item inside this one whose keyword is one of these.
    pub fn child(&self, keywords: &[&str]) -> Option<&Item> {
        self.values.iter().find_map(|value| match value {
            Value::Item(item) if keywords.contains(&item.keyword.as_str()) => Some(item),
            _ => None,
        })
    }

    /// The first quoted text: the item's name.
    pub fn name(&self) -> Option<&str> {
        self.values.iter().find_map(|value| match value {
            Value::Text(text) => Some(text.as_str()),
            _ => None,
        })
    }

    /// The first number after the name: a unit's factor.
    pub fn number(&self) -> Option<f64> {
        self.values.iter().find_map(|value| match value {
            Value::Word(word) => word.parse().ok(),
            _ => None,
        })
    }

    /// The horizontal system itself: inside a compound or a bound one, its first member.
    pub fn horizontal(&self) -> &Item {
        const WRAPPERS: [&str; 5] = ["COMPD_CS", "COMPOUNDCRS", "BOUNDCRS", "SOURCECRS", "FITTED_CS"];
        if !WRAPPERS.contains(&self.keyword.as_str()) {
            return self;
        }
        self.values
            .iter()
            .find_map(|value| match value {
                Value::Item(item) => Some(item.horizontal()),
                _ => None,
            })
            .unwrap_or(self)
    }

    /// The EPSG code the item itself carries.
    pub fn epsg(&self) -> Option<u32> {
        let tag = self.child(&["AUTHORITY", "ID"])?;
        if !tag.name()?.eq_ignore_ascii_case("EPSG") {
            return None;
        }
        tag.values[1..].iter().find_map(|value| match value {
            Value::Text(code) | Value::Word(code) => code.trim().parse().ok(),
            Value::Item(_) => None,
        })
    }

    /// The text again, in one line, keywords in upper case.
    pub fn print(&self) -> String {
        let mut text = String::new();
        self.print_into(&mut text);
        text
    }

    fn print_into(&self, text: &mut String) {
        text.push_str(&self.keyword);
        text.push('[');
        for (place, value) in self.values.iter().enumerate() {
            if place > 0 {
                text.push(',');
            }
            match value {
                Value::Text(quoted) => {
                    text.push('"');
                    text.push_str(&quoted.replace('"', "\"\""));
                    text.push('"');
                }
                Value::Word(word) => text.push_str(word),
                Value::Item(item) => item.print_into(text),
            }
        }
        text.push(']');
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_text_with_every_trap_is_cleaned() {
        let text =
            "\u{feff} projcs[\"A \"\"b\"\"\", unit [\"Foot_US\", 0.3048], AUTHORITY(\"EPSG\",\"2264\") ],VERTCS[\"x\"";
        let item = parse(text).unwrap();
        assert_eq!(item.name(), Some("A \"b\""));
        assert_eq!(item.epsg(), Some(2264));
        assert_eq!(item.child(&["UNIT"]).unwrap().number(), Some(0.3048));
        assert_eq!(
            item.print(),
            "PROJCS[\"A \"\"b\"\"\",UNIT[\"Foot_US\",0.3048],AUTHORITY[\"EPSG\",\"2264\"]]"
        );
    }

    #[test]
    fn a_text_cut_anywhere_is_refused_without_panic() {
        let whole = crs_definitions::EPSG_2264.wkt;
        for end in 0..whole.len() {
            assert_eq!(parse(&whole[..end]), None);
        }
        assert!(parse(whole).is_some());
        assert_eq!(parse(&"A[".repeat(100_000)), None);
        assert_eq!(parse("ID[EPSG]").unwrap().epsg(), None);
    }
}
