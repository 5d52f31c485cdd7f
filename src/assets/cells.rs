//! One attribute value as a number, a year, a word or an id, however it is written.

use crate::layers::Cell;
use crate::units::{Quantity, Unit};

/// A cell read as a number.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum Number {
    /// Null, blank, or a word for "not known"; the text as it stands, empty for null and blank.
    Empty(String),
    /// A number, in the cell's own unit if it is written beside it.
    Value(f64, Option<Unit>),
    /// Anything else, as it stands.
    Unreadable(String),
}

/// Words for "not known" that stand in number and text columns alike, in lower case.
const NOT_KNOWN: &[&str] = &[
    "",
    "<null>",
    "null",
    "(null)",
    "none",
    "nil",
    "nan",
    "n/a",
    "na",
    "#n/a",
    "unknown",
    "unk",
    "not known",
    "?",
    "-",
    "--",
    "tbd",
    "tbc",
    "missing",
];

/// Whether a text stands for "not known".
pub(super) fn is_not_known(text: &str) -> bool {
    NOT_KNOWN.contains(&text.trim().to_lowercase().as_str())
}

/// A cell as a number of a quantity.
pub(super) fn number(cell: &Cell, quantity: Quantity) -> Number {
    match cell {
        Cell::Null => Number::Empty(String::new()),
        Cell::Bool(value) => Number::Unreadable(value.to_string()),
        Cell::Whole(value) => Number::Value(*value as f64, None),
        Cell::Real(value) if value.is_finite() => Number::Value(*value, None),
        Cell::Real(value) => Number::Empty(value.to_string()),
        Cell::Text(text) if is_not_known(text) => Number::Empty(text.trim().to_string()),
        Cell::Text(text) => match number_in(text.trim(), quantity) {
            Some((value, unit)) => Number::Value(value, unit),
            None => Number::Unreadable(text.trim().to_string()),
        },
    }
}

/// The number in a text such as `150`, `150 mm`, `DN150`, `6"`, `1 1/2 in` or `12,5`, and its unit if it has one.
fn number_in(text: &str, quantity: Quantity) -> Option<(f64, Option<Unit>)> {
    let lower = text.to_lowercase();
    let mut unit = None;
    let mut rest = lower.as_str();
    if quantity == Quantity::Diameter {
        if let Some(after) = rest.strip_prefix("dn") {
            unit = Unit::parse("mm", quantity);
            rest = after.trim_start();
        }
        rest = rest.trim_start_matches(['ø', 'Ø', '⌀']).trim_start();
    }
    let digits_end = rest
        .find(|c: char| !(c.is_ascii_digit() || " .,+-/eE".contains(c)))
        .unwrap_or(rest.len());
    // An `e` belongs to the number only between digits; a word such as `ea` does not.
    let (mut digits, mut words) = rest.split_at(digits_end);
    if let Some(cut) = digits.find('e')
        && !digits[cut + 1..].starts_with(|c: char| c.is_ascii_digit() || c == '-' || c == '+')
    {
        (digits, words) = rest.split_at(cut);
    }
    let words = words.trim().trim_end_matches('.');
    if !words.is_empty() {
        let named = unit_named(words, quantity)?;
        if unit.is_some_and(|first: Unit| first != named) {
            return None;
        }
        unit = Some(named);
    }
    let value = plain_number(digits.trim().trim_end_matches('-').trim_end())?;
    value.is_finite().then_some((value, unit))
}

/// A unit as people write it beside a number.
fn unit_named(words: &str, quantity: Quantity) -> Option<Unit> {
    let usual = match words {
        "\"" | "''" | "″" | "”" | "inch" | "inches" | "ins" => "in",
        "'" | "′" | "feet" | "foot" => "ft",
        "metre" | "metres" | "meter" | "meters" | "mtr" => "m",
        "millimetre" | "millimetres" | "millimeter" | "millimeters" => "mm",
        other => other,
    };
    Unit::parse(usual, quantity)
}

/// A number with a decimal point or comma, thousands marks, or a fraction (`1 1/2`, `2-1/2`, `3/4`).
fn plain_number(text: &str) -> Option<f64> {
    if let Some((before, below)) = text.split_once('/') {
        let below: f64 = below.trim().parse().ok()?;
        let (whole, above) = match before.trim().rsplit_once([' ', '-']) {
            Some((whole, above)) => (whole.trim().parse::<f64>().ok()?, above),
            None => (0.0, before),
        };
        let above: f64 = above.trim().parse().ok()?;
        return Some(whole + above / below);
    }
    if text.contains(' ') {
        return None;
    }
    match (text.matches(',').count(), text.rfind('.')) {
        (0, _) => text.parse().ok(),
        // A comma before three digits may mark thousands or decimals: not for us to say.
        (1, None) if text.len() - text.find(',')? == 4 => None,
        (1, None) => text.replace(',', ".").parse().ok(),
        (_, Some(point)) if text.rfind(',')? < point => text.replace(',', "").parse().ok(),
        _ => None,
    }
}

/// A cell as an id: text as it stands without blanks at the ends, whole numbers without decimals.
pub(super) fn id(cell: &Cell) -> Option<Box<str>> {
    let text = match cell {
        Cell::Text(text) => text.trim().to_string(),
        other => text(other)?,
    };
    (!is_not_known(&text)).then(|| text.into())
}

/// A cell as words; `None` where it stands for "not known".
pub(super) fn text(cell: &Cell) -> Option<String> {
    let text = match cell {
        Cell::Null => return None,
        Cell::Bool(value) => value.to_string(),
        Cell::Whole(value) => value.to_string(),
        Cell::Real(value) => value.to_string(),
        Cell::Text(text) => text.trim().to_string(),
    };
    (!is_not_known(&text)).then_some(text)
}

/// A cell as a year: a number, or the year in a date such as `1987-03-01`, `19870301` or `03/1987`.
pub(super) fn year(cell: &Cell) -> Number {
    let dated = match cell {
        Cell::Text(text) => year_in(text),
        Cell::Whole(value) if value.to_string().len() == DATE_DIGITS => year_in(&value.to_string()),
        _ => None,
    };
    dated.map_or_else(|| number(cell, Quantity::Plain), |year| Number::Value(year, None))
}

/// Digits of a date written as one number: year, month and day.
const DATE_DIGITS: usize = 8;

fn year_in(text: &str) -> Option<f64> {
    let mut groups = text.split(|letter: char| !letter.is_ascii_digit());
    let group = groups.find(|group| group.len() == 4 || group.len() == DATE_DIGITS)?;
    group[..4].parse().ok()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(text: &str) -> Option<(f64, &'static str)> {
        match number(&Cell::Text(text.into()), Quantity::Diameter) {
            Number::Value(value, unit) => Some((value, unit.map_or("", |unit| unit.name))),
            _ => None,
        }
    }

    #[test]
    fn numbers_are_read_however_they_are_written() {
        assert_eq!(read("150"), Some((150.0, "")));
        assert_eq!(read(" 150 mm "), Some((150.0, "mm")));
        assert_eq!(read("150MM"), Some((150.0, "mm")));
        assert_eq!(read("6\""), Some((6.0, "in")));
        assert_eq!(read("6-inch"), Some((6.0, "in")));
        assert_eq!(read("6 in."), Some((6.0, "in")));
        assert_eq!(read("DN150"), Some((150.0, "mm")));
        assert_eq!(read("DN 150 mm"), Some((150.0, "mm")));
        assert_eq!(read("DN 6 in"), None);
        assert_eq!(read("1 1/2\""), Some((1.5, "in")));
        assert_eq!(read("2-1/2 in"), Some((2.5, "in")));
        assert_eq!(read("3/4"), Some((0.75, "")));
        assert_eq!(read("12,5"), Some((12.5, "")));
        assert_eq!(read("1,234.5"), Some((1234.5, "")));
        assert_eq!(read("1,234"), None);
        assert_eq!(read("1.5e2"), Some((150.0, "")));
        assert_eq!(read("six"), None);
        assert_eq!(read("150 ea"), None);
        assert_eq!(read("150/"), None);
        assert_eq!(read("1/0"), None);
    }

    #[test]
    fn words_for_not_known_are_empty() {
        for text in ["", " ", "<Null>", "unknown", "N/A", "?"] {
            assert!(
                matches!(number(&Cell::Text(text.into()), Quantity::Flow), Number::Empty(_)),
                "{text}"
            );
            assert_eq!(id(&Cell::Text(text.into())), None);
        }
        assert!(matches!(
            number(&Cell::Real(f64::NAN), Quantity::Flow),
            Number::Empty(_)
        ));
    }

    #[test]
    fn years_are_found_in_dates() {
        let year_of = |text: &str| year(&Cell::Text(text.into()));
        assert_eq!(year_of("1987-03-01"), Number::Value(1987.0, None));
        assert_eq!(year_of("03/1987"), Number::Value(1987.0, None));
        assert_eq!(year(&Cell::Whole(19_870_301)), Number::Value(1987.0, None));
        assert_eq!(year_of("before the war"), Number::Unreadable("before the war".into()));
    }

    #[test]
    fn ids_keep_their_letters_and_lose_empty_decimals() {
        assert_eq!(id(&Cell::Text(" M-7 ".into())).as_deref(), Some("M-7"));
        assert_eq!(
            id(&Cell::Whole(9_007_199_254_740_993)).as_deref(),
            Some("9007199254740993")
        );
        assert_eq!(id(&Cell::Real(1047.0)).as_deref(), Some("1047"));
    }
}
