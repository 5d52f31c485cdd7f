//! Where the town is put: in the open ocean, where no town is.

use proj4rs::Proj;
use proj4rs::transform::transform;

use super::plane::Point;

/// A projected system in US survey feet. The ocean off its zone is as good a place as any for an invented town.
const FEET_EPSG: u16 = 2264;

pub struct Place {
    plane: Proj,
    lon_lat: Proj,
    feet: Proj,
}

fn rounded(value: f64, parts: f64) -> f64 {
    (value * parts).round() / parts
}

impl Place {
    pub fn new() -> Self {
        let proj = |text: &str| Proj::from_proj_string(text).expect("the projections are known");
        let feet = crs_definitions::from_code(FEET_EPSG).expect("the system is known");
        Place {
            plane: proj("+proj=tmerc +lat_0=34.34 +lon_0=-75.2 +k=1 +x_0=0 +y_0=0 +datum=WGS84 +units=m +no_defs"),
            lon_lat: proj("+proj=longlat +datum=WGS84 +no_defs"),
            feet: proj(feet.proj4),
        }
    }

    /// Longitude and latitude to a tenth of a millimetre.
    pub fn lon_lat(&self, place: Point) -> [f64; 2] {
        let mut at = (place[0], place[1], 0.0);
        transform(&self.plane, &self.lon_lat, &mut at).expect("the town lies on the globe");
        [rounded(at.0.to_degrees(), 1e9), rounded(at.1.to_degrees(), 1e9)]
    }

    /// US survey feet to a ten-thousandth.
    pub fn feet(&self, place: Point) -> [f64; 2] {
        let mut at = (place[0], place[1], 0.0);
        transform(&self.plane, &self.feet, &mut at).expect("the town lies in the zone");
        [rounded(at.0, 1e4), rounded(at.1, 1e4)]
    }

    /// The text of the `.prj` files.
    pub fn wkt(&self) -> &'static str {
        crs_definitions::from_code(FEET_EPSG).expect("the system is known").wkt
    }
}
