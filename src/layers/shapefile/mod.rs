//! Shapefiles: `.shp` with `.shx`, `.dbf`, `.prj` and `.cpg` beside it.
//!
//! Shapes are read with the `shapefile` crate; attributes with code of our own ([`dbf`]), so that every digit and every
//! byte of the user's stays as it is. The crate cannot write null shapes and panics on lines with one vertex, which real
//! maps have, so shapes are written by our own code too.

mod dbf;
mod encoding;
mod print;
mod read;
mod shapes;
mod write;

pub(super) use read::{read, read_again};
pub(super) use write::{write_converted, write_marked, write_new};
