//! A sentence in pieces: words of ours, features and quantities. Put together at the edges, where ids and units are known.

use super::FeatureRef;
use crate::units::Quantity;

/// One piece of a [`Sentence`].
#[derive(Clone, Debug, PartialEq)]
pub enum Piece {
    /// Words as they are (ours, or text out of the user's data).
    Text(String),
    /// A feature: printed as what it is and the user's own id, for example `main 1047`.
    Feature(FeatureRef),
    /// A number with its unit: printed in the units asked for.
    Number(f64, Quantity),
}

/// What is said, in pieces.
///
/// ```
/// use gradeline::finding::{FeatureRef, Sentence};
/// use gradeline::units::Quantity;
/// let main = FeatureRef { layer: 0, row: 7 };
/// let said = Sentence::new().feature(main).text(" ends ").number(0.21, Quantity::Length).text(" from it");
/// assert_eq!(said.pieces().len(), 4);
/// ```
#[derive(Clone, Debug, PartialEq, Default)]
pub struct Sentence(Vec<Piece>);

impl Sentence {
    /// An empty sentence.
    pub fn new() -> Self {
        Sentence(Vec::new())
    }

    /// Adds words.
    pub fn text(mut self, words: impl Into<String>) -> Self {
        self.0.push(Piece::Text(words.into()));
        self
    }

    /// Adds a feature.
    pub fn feature(mut self, feature: FeatureRef) -> Self {
        self.0.push(Piece::Feature(feature));
        self
    }

    /// Adds a number in SI.
    pub fn number(mut self, value: f64, quantity: Quantity) -> Self {
        self.0.push(Piece::Number(value, quantity));
        self
    }

    /// The pieces in order.
    pub fn pieces(&self) -> &[Piece] {
        &self.0
    }
}

impl From<&str> for Sentence {
    fn from(words: &str) -> Self {
        Sentence::new().text(words)
    }
}

impl From<String> for Sentence {
    fn from(words: String) -> Self {
        Sentence::new().text(words)
    }
}
