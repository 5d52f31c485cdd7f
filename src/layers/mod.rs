//! Layers: files as packed coordinates and the columns asked for; formats and reference systems.
//!
//! A [`Layer`] holds what the calculation needs and nothing more. Writers replay the source file row by row and append
//! our columns: in the same format the user's bytes stay untouched, in another format the values are equal.

mod crs;
mod layer;
pub mod result_columns;

pub use crs::{Crs, LocalPlane};
pub use layer::{Cell, Column, Format, Layer, LayerSet, ReadOptions, Shape, Source};
