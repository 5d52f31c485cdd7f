//! Layers: files as packed coordinates and the columns asked for; formats and reference systems.
//!
//! A [`Layer`] holds what the calculation needs and nothing more. Writers replay the source file row by row and append
//! our columns: in the same format the user's bytes stay untouched, in another format the values are equal.

#![allow(dead_code)] // The writers, which follow, use the rest.

mod crs;
mod files;
mod geojson;
mod layer;
mod packed;
mod plane;
pub mod result_columns;
mod shapefile;
mod where_on_earth;
mod wkt;

pub use crs::Crs;
pub use layer::{Cell, Column, Format, Layer, LayerSet, ReadOptions, Shape, Source};
pub use plane::LocalPlane;
