//! The drawing of every main in the local plane.

use rayon::prelude::*;

use super::desk::Desk;
use super::{Drawing, Point};
use crate::finding::Error;
use crate::layers::{Layer, LocalPlane, Shape};

/// How a main is drawn, and how much longer it truly is than in the plane.
pub(super) struct Drawn {
    pub drawing: Drawing,
    pub length_scale: f64,
}

impl Drawn {
    /// True length, m; `None` where there is none to speak of.
    pub fn length_m(&self) -> Option<f64> {
        let Drawing::Lines(parts) = &self.drawing else {
            return None;
        };
        let length_m = parts.iter().map(|part| plane_length_m(part)).sum::<f64>() * self.length_scale;
        (length_m > 0.0).then_some(length_m)
    }
}

fn plane_length_m(part: &[Point]) -> f64 {
    part.windows(2)
        .map(|pair| (pair[1][0] - pair[0][0]).hypot(pair[1][1] - pair[0][1]))
        .sum()
}

impl Desk<'_> {
    /// The drawing of every row of a mains layer.
    pub fn read_drawings(&self, layer: u16) -> Result<Vec<Drawn>, Error> {
        let layer = self.layer(layer);
        let mut drawn: Vec<Point> = Vec::new();
        let mut first = Vec::with_capacity(layer.rows() as usize);
        for row in 0..layer.rows() {
            first.push(drawn.len());
            if let Shape::Lines { vertices, .. } = layer.shape(row) {
                drawn.extend_from_slice(vertices);
            }
        }
        // One call for the whole layer: setting up a projection costs more than a thousand points.
        let in_plane = self.plane.to_plane(&layer.crs, &drawn)?;
        drop(drawn);
        let drawings = first
            .into_par_iter()
            .enumerate()
            .map(|(row, first)| match layer.shape(row as u32) {
                Shape::Missing => without_lines(Drawing::Missing),
                Shape::NotFinite => without_lines(Drawing::NotFinite),
                Shape::Other(kind) => without_lines(Drawing::OtherType(kind)),
                Shape::Point(_) => without_lines(Drawing::OtherType("Point")),
                Shape::Lines { vertices, starts } => lines(
                    self.plane,
                    layer,
                    vertices,
                    &in_plane[first..first + vertices.len()],
                    starts,
                ),
            });
        Ok(drawings.collect())
    }
}

/// The lines of one row, as drawn and in the plane.
fn lines(plane: &LocalPlane, layer: &Layer, drawn: &[Point], in_plane: &[Point], starts: &[u32]) -> Drawn {
    // A transformation may find no place in the plane for a coordinate that is far outside its system.
    if in_plane.iter().flatten().any(|axis| !axis.is_finite()) {
        return without_lines(Drawing::NotFinite);
    }
    let mut parts = Vec::with_capacity(starts.len());
    let (mut plane_m, mut true_m) = (0.0, 0.0);
    for (part, start) in starts.iter().enumerate() {
        let end = starts.get(part + 1).map_or(in_plane.len(), |next| *next as usize);
        let range = *start as usize..end;
        if range.is_empty() {
            continue;
        }
        let length_m = plane_length_m(&in_plane[range.clone()]);
        if length_m > 0.0 {
            plane_m += length_m;
            true_m += length_m * plane.length_scale(&layer.crs, &drawn[range.clone()]);
        }
        parts.push(in_plane[range].to_vec());
    }
    if parts.is_empty() {
        return without_lines(Drawing::Missing);
    }
    let ratio = true_m / plane_m;
    Drawn {
        drawing: Drawing::Lines(parts),
        length_scale: if ratio.is_finite() && ratio > 0.0 { ratio } else { 1.0 },
    }
}

fn without_lines(drawing: Drawing) -> Drawn {
    Drawn {
        drawing,
        length_scale: 1.0,
    }
}
