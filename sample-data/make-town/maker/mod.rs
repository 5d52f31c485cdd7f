//! How the sample town is made, from the ground up: terrain, streets, the mains under them, what stands on the mains, the
//! faults planted in the map, and the files.

mod build;
mod faults;
mod graph;
mod lcg;
mod mains;
mod place;
mod plane;
mod point_faults;
mod points;
mod short_hydrants;
mod streets;
mod tables;
mod terrain;
mod town;
mod write_geojson;
mod write_shapefile;

pub use build::{NAME, files};
