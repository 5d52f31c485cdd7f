//! The local metric plane that all work is done in.

use std::fmt;
use std::sync::Arc;

use geo::{Geodesic, Length, LineString};
use proj4rs::Proj;
use rayon::prelude::*;

use super::crs::{Crs, convert, convert_with};
use super::layer::Layer;
use crate::finding::Error;

/// Points are moved in blocks of this many, each on one thread.
const BLOCK: usize = 16_384;

/// The plane that all work is done in: metres east and north of the middle of the map.
///
/// For a projected layer it is the layer's own plane in metres, moved to a near origin. For lon/lat (and for systems
/// whose scale is far from true, such as Web Mercator) it is a transverse Mercator projection centred on the map.
/// There and back agrees to better than 1 mm over a city.
#[derive(Clone)]
pub struct LocalPlane {
    /// The plane as a reference system: the layer's own, or the one centred on the map.
    plane: Crs,
    /// Metres from the plane's own origin to ours.
    origin_m: [f64; 2],
    ready: Option<Arc<Ready>>,
}

/// Projections made ready once, for work line by line.
struct Ready {
    lon_lat: Proj,
    plane: Proj,
}

impl fmt::Debug for LocalPlane {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        out.debug_struct("LocalPlane")
            .field("plane", &self.plane)
            .field("origin_m", &self.origin_m)
            .finish_non_exhaustive()
    }
}

impl LocalPlane {
    /// The plane for a map whose mains have this system and these bounds `[min x, min y, max x, max y]`, in the
    /// system's own coordinates. Where a stray feature may stretch the bounds, [`LocalPlane::for_layer`] is better.
    ///
    /// # Errors
    /// A system that cannot be transformed, in a sentence.
    pub fn new(crs: &Crs, bounds: [f64; 4]) -> Result<Self, Error> {
        let [min_x, min_y, max_x, max_y] = bounds;
        let mut middle = [(min_x + max_x) / 2.0, (min_y + max_y) / 2.0];
        // A map that seems to go round the earth lies on both sides of the 180th meridian.
        if crs.is_lon_lat && max_x - min_x > 180.0 {
            middle[0] = 180.0;
        }
        Self::centred(crs, middle)
    }

    /// The plane for a layer of mains, centred on the median of its coordinates, so that one stray feature does not
    /// move it. An empty layer gets a plane about the origin of its system.
    ///
    /// # Errors
    /// A system that cannot be transformed, in a sentence.
    pub fn for_layer(mains: &Layer) -> Result<Self, Error> {
        Self::centred(&mains.crs, mains.middle().unwrap_or([0.0, 0.0]))
    }

    fn centred(crs: &Crs, middle: [f64; 2]) -> Result<Self, Error> {
        if !crs.is_lon_lat && !crs.lacks_true_scale() {
            return Ok(LocalPlane {
                plane: crs.clone(),
                // Whole metres keep the shifted coordinates exact to more digits.
                origin_m: middle.map(|value| (value * crs.m_per_unit).round()),
                ready: None,
            });
        }
        let base = lon_lat_of(crs);
        let mut centre = [middle];
        convert(crs, &base, &mut centre)?;
        let [lon, lat] = centre[0];
        let plane = Crs {
            name: "local plane".into(),
            is_lon_lat: false,
            m_per_unit: 1.0,
            wkt: None,
            epsg: None,
            projection: format!(
                "+proj=etmerc +lat_0={lat} +lon_0={lon} +k=1 +x_0=0 +y_0=0 +units=m {}",
                datum_of(&base)
            ),
            obstacle: base.obstacle.clone(),
        };
        let ready = Ready {
            lon_lat: base.proj()?,
            plane: plane.proj()?,
        };
        Ok(LocalPlane {
            plane,
            origin_m: [0.0, 0.0],
            ready: Some(Arc::new(ready)),
        })
    }

    /// Coordinates of a layer of another (or the same) system, in the plane, m. Coordinates that are not finite stay so.
    ///
    /// # Errors
    /// A system that cannot be transformed, in a sentence.
    pub fn to_plane(&self, crs: &Crs, xy: &[[f64; 2]]) -> Result<Vec<[f64; 2]>, Error> {
        let mut places = xy.to_vec();
        places
            .par_chunks_mut(BLOCK)
            .try_for_each(|block| convert(crs, &self.plane, block))?;
        let [east, north] = self.origin_m;
        let m = self.plane.m_per_unit;
        for p in &mut places {
            *p = [p[0] * m - east, p[1] * m - north];
        }
        Ok(places)
    }

    /// Places in the plane, in the coordinates of a system.
    ///
    /// # Errors
    /// A system that cannot be transformed, in a sentence.
    pub fn from_plane(&self, crs: &Crs, places: &[[f64; 2]]) -> Result<Vec<[f64; 2]>, Error> {
        let [east, north] = self.origin_m;
        let m = self.plane.m_per_unit;
        let mut xy: Vec<[f64; 2]> = places.iter().map(|p| [(p[0] + east) / m, (p[1] + north) / m]).collect();
        xy.par_chunks_mut(BLOCK)
            .try_for_each(|block| convert(&self.plane, crs, block))?;
        Ok(xy)
    }

    /// True length over length in the plane of a line given in a layer's own coordinates: geodesic on the ellipsoid of
    /// WGS 84 for lon/lat (Karney 2013) and for systems without true scale, 1 for other projected ones.
    pub fn length_scale(&self, crs: &Crs, line: &[[f64; 2]]) -> f64 {
        if line.len() < 2 || !(crs.is_lon_lat || crs.lacks_true_scale()) {
            return 1.0;
        }
        let (Some(lon_lat), Some(in_plane)) = (self.to_lon_lat(crs, line), self.line_in_plane(crs, line)) else {
            return 1.0;
        };
        let plane_m: f64 = in_plane
            .windows(2)
            .map(|w| (w[1][0] - w[0][0]).hypot(w[1][1] - w[0][1]))
            .sum();
        let true_m = Geodesic.length(&LineString::from(lon_lat));
        let scale = true_m / plane_m;
        if scale.is_finite() && scale > 0.0 { scale } else { 1.0 }
    }

    fn to_lon_lat(&self, crs: &Crs, line: &[[f64; 2]]) -> Option<Vec<[f64; 2]>> {
        let mut lon_lat = line.to_vec();
        if !crs.is_lon_lat {
            convert(crs, &lon_lat_of(crs), &mut lon_lat).ok()?;
        }
        Some(lon_lat)
    }

    /// A line in the plane, in metres. Projections made ready are used where the line is on the plane's own datum.
    fn line_in_plane(&self, crs: &Crs, line: &[[f64; 2]]) -> Option<Vec<[f64; 2]>> {
        if let Some(ready) = self
            .ready
            .as_deref()
            .filter(|_| crs.is_lon_lat && datum_of(crs) == datum_of(&self.plane))
        {
            let mut places = line.to_vec();
            convert_with(&ready.lon_lat, &ready.plane, &mut places);
            return Some(places);
        }
        self.to_plane(crs, line).ok()
    }
}

/// Longitude and latitude on a system's own datum.
fn lon_lat_of(crs: &Crs) -> Crs {
    // Web Mercator is computed on a sphere, but its longitudes and latitudes are those of WGS 84.
    if crs.projection.contains("@null") || crs.token("+proj=") == Some("webmerc") {
        return Crs::lon_lat();
    }
    Crs {
        name: format!("longitude / latitude of {}", crs.name),
        is_lon_lat: true,
        m_per_unit: 1.0,
        wkt: None,
        epsg: None,
        projection: format!("+proj=longlat {}", datum_of(crs)),
        obstacle: crs.obstacle.clone(),
    }
}

/// The tokens of a projection that say which ellipsoid, datum and prime meridian it is on.
fn datum_of(crs: &Crs) -> String {
    const DATUM: [&str; 9] = [
        "+datum=",
        "+ellps=",
        "+a=",
        "+b=",
        "+rf=",
        "+R=",
        "+towgs84=",
        "+pm=",
        "+nadgrids=",
    ];
    let tokens: Vec<&str> = crs
        .projection
        .split_whitespace()
        .filter(|token| DATUM.iter().any(|start| token.starts_with(start)))
        .collect();
    tokens.join(" ")
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::{M_PER_FOOT, M_PER_US_SURVEY_FOOT};

    fn near(a: [f64; 2], b: [f64; 2], within: f64) {
        assert!((a[0] - b[0]).hypot(a[1] - b[1]) < within, "{a:?} is not {b:?}");
    }

    #[test]
    fn places_agree_with_an_independent_implementation() {
        // PROJ 9.5.1: transverse Mercator at 15.5 E 48.2 N, k = 1, WGS 84, printed to 1e-10 m.
        let plane = LocalPlane::new(&Crs::lon_lat(), [15.0, 48.0, 16.0, 48.4]).unwrap();
        let truth = [
            ([15.5, 48.2], [0.0, 0.0]),
            ([15.7, 48.3], [14_838.330_962_653_9, 11_138.854_653_836_4]),
            ([15.3, 48.05], [-14_910.640_063_123_6, -16_659.558_221_202_1]),
            ([15.9, 48.2], [29_734.557_761_374_6, 77.375_926_208_3]),
        ];
        for (lon_lat, place) in truth {
            near(plane.to_plane(&Crs::lon_lat(), &[lon_lat]).unwrap()[0], place, 1e-5);
        }
    }

    #[test]
    fn layers_of_other_systems_come_to_the_same_plane() {
        // PROJ 9.5.1: one place in longitude and latitude (NAD83 or WGS 84) and in a projected system.
        let truth = [
            (
                "EPSG:2264",
                [-80.84, 35.22],
                [1_450_498.108_012_027_6, 540_088.335_230_140_8],
            ),
            (
                "EPSG:2225",
                [-122.5, 40.5],
                [6_422_625.255_795_221, 2_065_824.321_027_114_3],
            ),
            (
                "EPSG:2222",
                [-110.5, 33.5],
                [598_388.606_776_564_4, 909_613.452_450_306_6],
            ),
            (
                "EPSG:32633",
                [15.5, 48.2],
                [537_153.311_221_933_7, 5_338_650.634_532_387],
            ),
            ("EPSG:3857", [15.5, 48.2], [1_725_452.107_295_7, 6_140_192.439_289_727]),
        ];
        for (code, lon_lat, xy) in truth {
            let crs = Crs::parse(code).unwrap();
            let plane = LocalPlane::new(&crs, [xy[0] - 100.0, xy[1] - 100.0, xy[0] + 100.0, xy[1] + 100.0]).unwrap();
            let own = plane.to_plane(&crs, &[xy]).unwrap()[0];
            let other = plane.to_plane(&Crs::lon_lat(), &[lon_lat]).unwrap()[0];
            near(own, other, 1e-4);
            near(own, [0.0, 0.0], 1.5);
            near(plane.from_plane(&Crs::lon_lat(), &[own]).unwrap()[0], lon_lat, 1e-9);
            near(plane.from_plane(&crs, &[own]).unwrap()[0], xy, 1e-4);
        }
    }

    #[test]
    fn there_and_back_agrees_over_thirty_kilometres() {
        for crs in [
            Crs::lon_lat(),
            Crs::parse("EPSG:2264").unwrap(),
            Crs::parse("EPSG:3857").unwrap(),
        ] {
            let middle = match crs.is_lon_lat {
                true => [15.5, 48.2],
                false => [1_450_498.0, 540_088.0],
            };
            let plane = LocalPlane::new(&crs, [middle[0], middle[1], middle[0], middle[1]]).unwrap();
            let places: Vec<[f64; 2]> = (-15..=15)
                .map(|i| [f64::from(i) * 1000.3, f64::from(-i * i) * 66.7])
                .collect();
            let back = plane.to_plane(&crs, &plane.from_plane(&crs, &places).unwrap()).unwrap();
            for (place, back) in places.iter().zip(back) {
                near(*place, back, 1e-4);
            }
        }
    }

    #[test]
    fn the_two_feet_are_told_apart() {
        let survey = Crs::parse("EPSG:2264").unwrap();
        let international = Crs::parse("EPSG:2222").unwrap();
        assert!((survey.m_per_unit - M_PER_US_SURVEY_FOOT).abs() < 1e-15);
        assert_eq!(international.m_per_unit, M_PER_FOOT);
        for crs in [survey, international] {
            let plane = LocalPlane::new(&crs, [1e6, 1e6, 1e6, 1e6]).unwrap();
            let places = plane.to_plane(&crs, &[[1e6, 1e6], [1e6 + 5280.0, 1e6]]).unwrap();
            let mile = places[1][0] - places[0][0];
            assert!((mile - 5280.0 * crs.m_per_unit).abs() < 1e-8, "{mile}");
        }
    }

    #[test]
    fn lengths_are_geodesic_where_the_plane_is_not_true() {
        // GeographicLib by way of PROJ 9.5.1: 15.5 E 48.2 N to 15.9 E 48.2 N is 29,734.550808 m on WGS 84.
        let crs = Crs::lon_lat();
        let plane = LocalPlane::new(&crs, [15.5, 48.2, 15.5, 48.2]).unwrap();
        let line = [[15.5, 48.2], [15.9, 48.2]];
        let in_plane = plane.to_plane(&crs, &line).unwrap();
        let length =
            plane.length_scale(&crs, &line) * (in_plane[1][0] - in_plane[0][0]).hypot(in_plane[1][1] - in_plane[0][1]);
        assert!((length - 29_734.550_808).abs() < 1e-5, "{length}");
        let web = Crs::parse("EPSG:3857").unwrap();
        let web_line = plane.from_plane(&web, &in_plane).unwrap();
        let web_plane =
            LocalPlane::new(&web, [web_line[0][0], web_line[0][1], web_line[0][0], web_line[0][1]]).unwrap();
        assert!((web_plane.length_scale(&web, &web_line) - plane.length_scale(&crs, &line)).abs() < 1e-9);
        let projected = Crs::parse("EPSG:32633").unwrap();
        assert_eq!(plane.length_scale(&projected, &[[0.0, 0.0], [1.0, 1.0]]), 1.0);
        assert_eq!(plane.length_scale(&crs, &[[15.5, 48.2], [15.5, 48.2]]), 1.0);
    }

    #[test]
    fn what_is_not_finite_stays_so_and_stops_nothing() {
        for code in ["EPSG:4326", "EPSG:2264", "EPSG:3857"] {
            let crs = Crs::parse(code).unwrap();
            let plane = LocalPlane::new(&crs, [15.0, 48.0, 16.0, 48.4]).unwrap();
            let xy = [[f64::NAN, 1.0], [f64::INFINITY, 2.0], [15.5, 48.2]];
            for from in [&crs, &Crs::lon_lat()] {
                let places = plane.to_plane(from, &xy).unwrap();
                assert!(!places[0][0].is_finite() && !places[1][0].is_finite(), "{code}");
                assert!(places[2][0].is_finite(), "{code}");
            }
        }
    }

    #[test]
    fn systems_without_a_way_to_wgs_84_work_alone_and_are_refused_with_others() {
        let nad27 = Crs::parse("EPSG:2204").unwrap();
        let plane = LocalPlane::new(&nad27, [2e6, 1e5, 2e6, 1e5]).unwrap();
        near(plane.to_plane(&nad27, &[[2e6, 1e5]]).unwrap()[0], [0.0, 0.0], 1.0);
        let error = plane.to_plane(&Crs::lon_lat(), &[[-86.0, 35.0]]).unwrap_err();
        assert!(error.to_string().contains("1927"), "{error}");
        let unknown = Crs::plain_metres("town.shp");
        let plane = LocalPlane::new(&unknown, [0.0, 0.0, 10.0, 10.0]).unwrap();
        assert_eq!(plane.to_plane(&unknown, &[[7.0, 8.0]]).unwrap()[0], [2.0, 3.0]);
        assert!(plane.from_plane(&Crs::lon_lat(), &[[0.0, 0.0]]).is_err());
    }

    #[test]
    fn a_map_across_the_date_line_has_its_plane_there() {
        let crs = Crs::lon_lat();
        let plane = LocalPlane::new(&crs, [-179.99, -17.0, 179.99, -16.9]).unwrap();
        let places = plane.to_plane(&crs, &[[179.99, -16.95], [-179.99, -16.95]]).unwrap();
        assert!((places[1][0] - places[0][0]).abs() < 3000.0, "{places:?}");
    }
}
