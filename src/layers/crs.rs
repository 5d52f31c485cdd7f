//! Reference systems, and the local metric plane that all work is done in.

use crate::finding::Error;

/// A layer's coordinate reference system, as its file states it.
#[derive(Clone, Debug, PartialEq)]
pub struct Crs {
    /// The name or code to show, for example `EPSG:2264` or `longitude / latitude (WGS 84)`.
    pub name: String,
    /// Whether coordinates are longitude and latitude in degrees.
    pub is_lon_lat: bool,
    /// Metres in one unit of a projected system's coordinates; 1 for lon/lat.
    pub m_per_unit: f64,
    /// The text of the `.prj`, to be copied to outputs byte for byte.
    pub wkt: Option<String>,
    /// The EPSG code, where it is known.
    pub epsg: Option<u32>,
    /// The projection as the transforming library takes it.
    pub(crate) projection: String,
}

/// The plane that all work is done in: metres east and north of the middle of the map.
///
/// For a projected layer it is the layer's own plane in metres, moved to a near origin. For lon/lat (and for systems
/// whose scale is far from true, such as Web Mercator) it is a transverse Mercator projection centred on the map.
/// There and back agrees to better than 1 mm over a city.
#[derive(Clone, Debug)]
pub struct LocalPlane {
    _private: (),
}

impl LocalPlane {
    /// The plane for a map whose mains have this system and these bounds `[min x, min y, max x, max y]`, in the
    /// system's own coordinates.
    ///
    /// # Errors
    /// A system that cannot be transformed, in a sentence.
    pub fn new(_crs: &Crs, _bounds: [f64; 4]) -> Result<Self, Error> {
        unimplemented!()
    }

    /// Coordinates of a layer of another (or the same) system, in the plane, m. Coordinates that are not finite stay so.
    ///
    /// # Errors
    /// A system that cannot be transformed, in a sentence.
    pub fn to_plane(&self, _crs: &Crs, _xy: &[[f64; 2]]) -> Result<Vec<[f64; 2]>, Error> {
        unimplemented!()
    }

    /// Places in the plane, in the coordinates of a system.
    ///
    /// # Errors
    /// A system that cannot be transformed, in a sentence.
    pub fn from_plane(&self, _crs: &Crs, _places: &[[f64; 2]]) -> Result<Vec<[f64; 2]>, Error> {
        unimplemented!()
    }

    /// True length over length in the plane of a line given in a layer's own coordinates: geodesic on the ellipsoid for
    /// lon/lat (Karney 2013) and for systems without true scale, 1 for other projected ones.
    pub fn length_scale(&self, _crs: &Crs, _line: &[[f64; 2]]) -> f64 {
        unimplemented!()
    }
}
