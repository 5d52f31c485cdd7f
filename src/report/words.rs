//! Words: sentences and numbers as they are read, with the user's own ids and the units asked for.

use crate::finding::{FeatureRef, Piece, Sentence};
use crate::units::{M_PER_KM, M_PER_MILE, Quantity, Unit, UnitSystem};

/// Puts findings into words.
#[derive(Clone, Copy)]
pub struct Words<'a> {
    /// What a feature is called, for example `main 1047`.
    pub called: &'a dyn Fn(FeatureRef) -> String,
    /// The units asked for.
    pub units: UnitSystem,
}

impl Words<'_> {
    /// A sentence, whole.
    pub fn sentence(&self, sentence: &Sentence) -> String {
        let of_piece = |piece: &Piece| match piece {
            Piece::Text(words) => words.clone(),
            Piece::Feature(feature) => (self.called)(*feature),
            Piece::Number(value, quantity) => self.number(*value, *quantity),
        };
        sentence.pieces().iter().map(of_piece).collect()
    }

    /// A long length, m, as kilometres or miles.
    pub fn distance(&self, length_m: f64) -> String {
        match self.units {
            UnitSystem::Si => format!("{:.1} km", length_m / M_PER_KM),
            UnitSystem::Us => format!("{:.1} miles", length_m / M_PER_MILE),
        }
    }

    /// A number in SI, with its unit, to a reader's digits.
    pub fn number(&self, value: f64, quantity: Quantity) -> String {
        let unit = Unit::written(quantity, self.units);
        let digits = reader_digits(unit.from_si(value));
        if unit.name.is_empty() {
            digits
        } else {
            format!("{digits} {unit}")
        }
    }
}

/// A number to three or four significant digits, as a person would write it.
pub fn reader_digits(value: f64) -> String {
    let size = value.abs();
    let decimals = match size {
        size if size >= 100.0 || size == 0.0 => 0,
        size if size >= 10.0 => 1,
        size if size >= 1.0 => 2,
        _ => 3,
    };
    let text = format!("{value:.decimals$}");
    if text.trim_start_matches(['-', '0', '.']).is_empty() {
        "0".into()
    } else {
        text
    }
}

/// A count with its word, in the plural where it is one: `1 main`, `2 mains`.
pub fn counted(count: usize, one: &str) -> String {
    let many = match one {
        word if word.ends_with("ss") || word.ends_with("sh") => format!("{word}es"),
        word => format!("{word}s"),
    };
    format!("{} {}", thousands(count), if count == 1 { one } else { &many })
}

/// A whole number with a comma at the thousands: `12,345`.
pub fn thousands(count: usize) -> String {
    let digits = count.to_string();
    let mut out = String::with_capacity(digits.len() + digits.len() / 3);
    for (at, digit) in digits.chars().enumerate() {
        if at > 0 && (digits.len() - at).is_multiple_of(3) {
            out.push(',');
        }
        out.push(digit);
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_written_as_a_person_would() {
        let called = |_: FeatureRef| "main 7".to_string();
        let words = Words {
            called: &called,
            units: UnitSystem::Us,
        };
        assert_eq!(words.number(14.061392, Quantity::Pressure), "20.0 psi");
        assert_eq!(words.number(0.063, Quantity::Flow), "999 gpm");
        assert_eq!(reader_digits(0.0004), "0");
        assert_eq!(reader_digits(-0.05), "-0.050");
        assert_eq!(thousands(1_234_567), "1,234,567");
        assert_eq!(counted(1, "main"), "1 main");
        assert_eq!(counted(2, "near miss"), "2 near misses");
    }
}
