//! Layers: files as packed coordinates and the columns asked for; formats and reference systems.
//!
//! A [`Layer`] holds what the calculation needs and nothing more. Writers replay the source file row by row and append
//! our columns: in the same format the user's bytes stay untouched, in another format the values are equal.

mod crs;
mod files;
mod geojson;
mod layer;
mod names;
mod output;
mod packed;
mod plane;
pub mod result_columns;
mod shapefile;
mod where_on_earth;
mod wkt;
mod write;

pub use crs::Crs;
pub use layer::{Cell, Column, Format, Layer, LayerSet, ReadOptions, Shape, Source};
pub use names::settle_names;
pub use output::{Disk, OutputDir, SUMMARY, Store};
pub use plane::LocalPlane;
pub use write::{Field, Geometry, NewLayer, Table, names_beside, output_crs, write_marked, write_new};
