//! Geometry of a whole layer in three flat arrays: a million features fit, and a row is a slice.

use super::layer::Shape;

/// What a row is drawn as.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) enum Kind {
    /// Null or empty.
    Missing,
    /// One or more points.
    Points,
    /// One or more lines.
    Lines,
    /// Another geometry; its vertices are not kept.
    Other(&'static str),
}

/// The drawing of every row.
#[derive(Clone, Debug)]
pub(super) struct Packed {
    kinds: Vec<Kind>,
    finite: Vec<bool>,
    vertices: Vec<[f64; 2]>,
    /// Heights of the vertices, kept only where they are asked for.
    heights: Option<Vec<f64>>,
    /// Starts of parts, relative to the first vertex of their row.
    starts: Vec<u32>,
    /// Where each row's vertices begin; one more than rows.
    row_vertices: Vec<u32>,
    /// Where each row's part starts begin; one more than rows.
    row_starts: Vec<u32>,
}

impl Default for Packed {
    fn default() -> Self {
        Packed {
            kinds: Vec::new(),
            finite: Vec::new(),
            vertices: Vec::new(),
            heights: None,
            starts: Vec::new(),
            row_vertices: vec![0],
            row_starts: vec![0],
        }
    }
}

impl Packed {
    /// An empty store that keeps heights, or not.
    pub fn new(with_heights: bool) -> Self {
        Packed {
            heights: with_heights.then(Vec::new),
            ..Packed::default()
        }
    }

    /// Number of rows that are closed.
    pub fn rows(&self) -> usize {
        self.kinds.len()
    }

    /// Begins the next part of the open row.
    pub fn start_part(&mut self) {
        self.start_part_at(self.open_vertices());
    }

    /// Begins a part of the open row at one of its vertices, counted from 0.
    pub fn start_part_at(&mut self, vertex: usize) {
        self.starts.push(vertex as u32);
    }

    /// Adds a vertex to the open row.
    pub fn push(&mut self, xy: [f64; 2], height: f64) {
        self.vertices.push(xy);
        if let Some(heights) = &mut self.heights {
            heights.push(height);
        }
    }

    /// Number of vertices in the open row so far.
    pub fn open_vertices(&self) -> usize {
        self.vertices.len() - *self.row_vertices.last().expect("never empty") as usize
    }

    /// Forgets the vertices of the open row.
    pub fn clear_open(&mut self) {
        let vertices = *self.row_vertices.last().expect("never empty") as usize;
        self.vertices.truncate(vertices);
        if let Some(heights) = &mut self.heights {
            heights.truncate(vertices);
        }
        self.starts
            .truncate(*self.row_starts.last().expect("never empty") as usize);
    }

    /// Closes the open row. A row of points or lines without a vertex is `Missing`; empty parts are dropped.
    pub fn close(&mut self, kind: Kind) {
        let kind = match kind {
            Kind::Points | Kind::Lines if self.open_vertices() == 0 => Kind::Missing,
            other => other,
        };
        if matches!(kind, Kind::Missing | Kind::Other(_)) {
            self.clear_open();
        } else {
            self.drop_empty_parts();
        }
        let first = *self.row_vertices.last().expect("never empty") as usize;
        let finite = self.vertices[first..]
            .iter()
            .all(|xy| xy[0].is_finite() && xy[1].is_finite());
        self.kinds.push(kind);
        self.finite.push(finite);
        self.row_vertices.push(self.vertices.len() as u32);
        self.row_starts.push(self.starts.len() as u32);
    }

    fn drop_empty_parts(&mut self) {
        let first = *self.row_starts.last().expect("never empty") as usize;
        let end = self.open_vertices() as u32;
        if self.starts.len() - first < 2 {
            return;
        }
        let old: Vec<u32> = self.starts.drain(first..).collect();
        for (place, &start) in old.iter().enumerate() {
            let next = old.get(place + 1).copied().unwrap_or(end);
            if next > start {
                self.starts.push(start);
            }
        }
    }

    /// The same drawing with only these rows, in this order.
    pub fn only(&self, rows: &[u32]) -> Packed {
        let mut kept = Packed::new(self.heights.is_some());
        for &row in rows {
            let row = row as usize;
            let heights = self.heights(row);
            kept.starts.extend_from_slice(self.starts(row));
            for (place, &xy) in self.vertices(row).iter().enumerate() {
                kept.push(xy, heights.map_or(f64::NAN, |heights| heights[place]));
            }
            kept.close(self.kinds[row]);
        }
        kept
    }

    /// What a row is drawn as.
    pub fn kind(&self, row: usize) -> Kind {
        self.kinds[row]
    }

    /// Whether all coordinates of a row are finite.
    pub fn is_finite(&self, row: usize) -> bool {
        self.finite[row]
    }

    /// Vertices of a row.
    pub fn vertices(&self, row: usize) -> &[[f64; 2]] {
        &self.vertices[self.row_vertices[row] as usize..self.row_vertices[row + 1] as usize]
    }

    /// Heights of a row's vertices; `None` where heights are not kept.
    pub fn heights(&self, row: usize) -> Option<&[f64]> {
        let range = self.row_vertices[row] as usize..self.row_vertices[row + 1] as usize;
        self.heights.as_ref().map(|heights| &heights[range])
    }

    /// Starts of a row's parts.
    pub fn starts(&self, row: usize) -> &[u32] {
        &self.starts[self.row_starts[row] as usize..self.row_starts[row + 1] as usize]
    }

    /// Every vertex of every row.
    pub fn all_vertices(&self) -> &[[f64; 2]] {
        &self.vertices
    }

    /// Every vertex, to be moved.
    pub fn all_vertices_mut(&mut self) -> &mut [[f64; 2]] {
        &mut self.vertices
    }

    /// Whether any height is kept that is neither zero nor missing.
    pub fn has_heights(&self) -> bool {
        self.heights
            .as_ref()
            .is_some_and(|heights| heights.iter().any(|height| height.is_finite()))
    }

    /// How a row is drawn.
    pub fn shape(&self, row: usize) -> Shape<'_> {
        match self.kinds[row] {
            Kind::Missing => Shape::Missing,
            Kind::Other(name) => Shape::Other(name),
            _ if !self.finite[row] => Shape::NotFinite,
            Kind::Points => Shape::Point(self.vertices(row)[0]),
            Kind::Lines => Shape::Lines {
                vertices: self.vertices(row),
                starts: self.starts(row),
            },
        }
    }

    /// Bounds of all finite vertices.
    pub fn bounds(&self) -> Option<[f64; 4]> {
        let mut found: Option<[f64; 4]> = None;
        for &[x, y] in &self.vertices {
            if x.is_finite() && y.is_finite() {
                let b = found.get_or_insert([x, y, x, y]);
                *b = [b[0].min(x), b[1].min(y), b[2].max(x), b[3].max(y)];
            }
        }
        found
    }

    /// The middle of the map by medians, so that one stray feature does not move it.
    pub fn middle(&self) -> Option<[f64; 2]> {
        let median = |axis: usize| {
            let mut values: Vec<f64> = self
                .vertices
                .iter()
                .filter(|xy| xy[0].is_finite() && xy[1].is_finite())
                .map(|xy| xy[axis])
                .collect();
            let half = values.len() / 2;
            (!values.is_empty()).then(|| *values.select_nth_unstable_by(half, f64::total_cmp).1)
        };
        Some([median(0)?, median(1)?])
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rows_keep_their_parts() {
        let mut packed = Packed::default();
        packed.close(Kind::Missing);
        packed.start_part();
        packed.push([1.0, 2.0], 0.0);
        packed.push([3.0, 4.0], 0.0);
        packed.start_part();
        packed.start_part();
        packed.push([5.0, 6.0], 0.0);
        packed.start_part();
        packed.close(Kind::Lines);
        packed.start_part();
        packed.close(Kind::Lines);
        packed.push([f64::NAN, 0.0], 0.0);
        packed.close(Kind::Points);
        assert_eq!(packed.shape(0), Shape::Missing);
        let Shape::Lines { vertices, starts } = packed.shape(1) else {
            panic!("lines")
        };
        assert_eq!((vertices.len(), starts), (3, &[0, 2][..]));
        assert_eq!(packed.shape(2), Shape::Missing);
        assert_eq!(packed.shape(3), Shape::NotFinite);
        assert_eq!(packed.bounds(), Some([1.0, 2.0, 5.0, 6.0]));
    }
}
