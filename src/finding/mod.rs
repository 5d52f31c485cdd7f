//! Findings: what the program noticed about the map or the results, as numbers and references.
//!
//! Three kinds of trouble are kept apart. An [`Error`] means that the run cannot go on. A [`Finding`] flags something
//! and the run goes on: bad map data is a result, never an abort. An assertion is a bug of ours.
//!
//! A finding holds no user's id and no unit but SI: its [`Sentence`] is a list of pieces that the edges (terminal, layer,
//! page) put into words with the user's own ids and the units asked for.

mod code;
mod error;
mod nearest;
mod sentence;

pub use code::{About, Code, CodeText};
pub use error::Error;
pub use nearest::nearest;
pub use sentence::{Piece, Sentence};

use crate::units::Quantity;

/// One row of one layer that was read: how every finding and number goes home to the user's own feature.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub struct FeatureRef {
    /// Index of the layer in the `LayerSet`.
    pub layer: u16,
    /// Row in that layer, from 0, in file order.
    pub row: u32,
}

/// How much a finding matters. The final one is set in `screening/grading.rs`, by what the fault does to the answer.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Severity {
    /// Worth knowing; nothing to do.
    Note,
    /// To be looked at: an answer may rest on it.
    Warning,
    /// An answer is wrong, missing or unsafe until it is settled.
    Serious,
}

impl Severity {
    /// The word that is written.
    pub fn word(self) -> &'static str {
        match self {
            Severity::Note => "note",
            Severity::Warning => "warning",
            Severity::Serious => "serious",
        }
    }
}

/// A number in SI and what it measures.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Measured {
    /// The value in the SI unit of `quantity`.
    pub value: f64,
    /// What it measures.
    pub quantity: Quantity,
}

/// Something noticed about the map or the results.
#[derive(Clone, Debug, PartialEq)]
pub struct Finding {
    /// What kind of thing it is.
    pub code: Code,
    /// How much it matters.
    pub severity: Severity,
    /// The user's feature it is about; `None` for a whole layer or the study.
    pub feature: Option<FeatureRef>,
    /// Other features that take part, the most telling first.
    pub others: Vec<FeatureRef>,
    /// Where, in the local plane, m.
    pub at: Option<[f64; 2]>,
    /// The number that was looked at.
    pub measured: Option<Measured>,
    /// The limit it was held against (same quantity) and where the limit came from.
    pub limit: Option<(f64, String)>,
    /// What is, in pieces. The hint (what to do) belongs to the code.
    pub message: Sentence,
}

impl Finding {
    /// A finding with its code's usual severity and nothing else yet.
    pub fn new(code: Code, message: Sentence) -> Self {
        Finding {
            code,
            severity: code.text().usual_severity,
            feature: None,
            others: Vec::new(),
            at: None,
            measured: None,
            limit: None,
            message,
        }
    }

    /// Says which feature it is about.
    pub fn on(mut self, feature: FeatureRef) -> Self {
        self.feature = Some(feature);
        self
    }

    /// Adds another feature that takes part.
    pub fn with(mut self, other: FeatureRef) -> Self {
        self.others.push(other);
        self
    }

    /// Says where it is, in the local plane, m.
    pub fn at(mut self, place: [f64; 2]) -> Self {
        self.at = Some(place);
        self
    }

    /// Says what was measured, in the SI unit of `quantity`.
    pub fn measured(mut self, value: f64, quantity: Quantity) -> Self {
        self.measured = Some(Measured { value, quantity });
        self
    }

    /// Says what limit the measured number was held against, and where the limit came from.
    pub fn limit(mut self, value: f64, from: impl Into<String>) -> Self {
        self.limit = Some((value, from.into()));
        self
    }

    /// Sets another severity than the code's usual one.
    pub fn severity(mut self, severity: Severity) -> Self {
        self.severity = severity;
        self
    }
}

/// A value together with what was noticed on the way to it.
#[derive(Clone, Debug)]
pub struct Checked<T> {
    /// The value.
    pub value: T,
    /// What was noticed.
    pub findings: Vec<Finding>,
}

impl<T> Checked<T> {
    /// A value about which nothing was noticed.
    pub fn clean(value: T) -> Self {
        Checked {
            value,
            findings: Vec::new(),
        }
    }

    /// Hands over the value and moves the findings to the end of `all`.
    pub fn into_value(self, all: &mut Vec<Finding>) -> T {
        all.extend(self.findings);
        self.value
    }
}
