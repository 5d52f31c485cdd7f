//! Coordinate reference systems: what a layer's file says about its coordinates.

use std::path::Path;

use proj4rs::Proj;
use proj4rs::transform::{Transform, TransformClosure, transform};

use super::wkt;
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
    /// The projection as the transforming library takes it; empty if it knows none.
    pub(crate) projection: String,
    /// Why coordinates cannot be brought to another datum; `None` if they can.
    pub(crate) obstacle: Option<String>,
}

/// What a name of a reference system failed to be, as the middle of a sentence.
pub(super) type Unusable = String;

/// The projection of plain longitude and latitude.
const LON_LAT: &str = "+proj=longlat +datum=WGS84 +no_defs";

/// Codes that vendors use for Web Mercator.
const WEB_MERCATOR_TWINS: [u32; 4] = [102_100, 102_113, 900_913, 3785];

impl Crs {
    /// Longitude and latitude on WGS 84, which is what GeoJSON is in unless it says otherwise (RFC 7946, section 4).
    pub fn lon_lat() -> Crs {
        Crs {
            name: "longitude / latitude (WGS 84)".into(),
            is_lon_lat: true,
            m_per_unit: 1.0,
            wkt: None,
            epsg: Some(4326),
            projection: LON_LAT.into(),
            obstacle: None,
        }
    }

    /// Plain metres in a plane of which nothing else is known, assumed for a file.
    pub(super) fn plain_metres(file: &str) -> Crs {
        Crs {
            name: "plane coordinates in metres (assumed)".into(),
            is_lon_lat: false,
            m_per_unit: 1.0,
            wkt: None,
            epsg: None,
            projection: String::new(),
            obstacle: Some(format!("{file} does not say which system it is in")),
        }
    }

    /// The system that a code names: `EPSG:2264`, `urn:ogc:def:crs:EPSG::2264`, `urn:ogc:def:crs:OGC:1.3:CRS84` or
    /// `http://www.opengis.net/def/crs/EPSG/0/2264`. Coordinates are always taken as x (or longitude) first.
    ///
    /// # Errors
    /// A code that is not known.
    pub fn parse(name: &str) -> Result<Crs, Error> {
        Crs::of_code(name).map_err(|what| {
            Error::input(
                Path::new(name),
                what,
                "Name a system by its EPSG code, for example `EPSG:2264`.",
            )
        })
    }

    /// As [`Crs::parse`], with the reason alone.
    pub(super) fn of_code(name: &str) -> Result<Crs, Unusable> {
        let upper = name.trim().to_ascii_uppercase();
        // With heights (CRS84h, 4979) it is the same in the plane.
        if upper.ends_with("CRS84") || upper.ends_with("CRS84H") {
            return Ok(Crs::lon_lat());
        }
        let code = upper
            .rsplit([':', '/'])
            .next()
            .and_then(|last| last.parse::<u32>().ok())
            .filter(|_| upper.contains("EPSG") || upper.contains("ESRI") || upper.bytes().all(|b| b.is_ascii_digit()))
            .ok_or_else(|| format!("the reference system `{name}` is not one that is known here"))?;
        Crs::of_epsg(code).ok_or_else(|| format!("the reference system `{name}` is not one that is known here"))
    }

    fn of_epsg(code: u32) -> Option<Crs> {
        if code == 4326 || code == 4979 {
            return Some(Crs::lon_lat());
        }
        let code = if WEB_MERCATOR_TWINS.contains(&code) { 3857 } else { code };
        let definition = crs_definitions::from_code(u16::try_from(code).ok()?)?;
        let root = wkt::parse(definition.wkt)?;
        let horizontal = root.horizontal();
        if horizontal.keyword == "GEOCCS" || in_other_angles(horizontal) {
            return None;
        }
        let (projection, obstacle) = with_datum(definition.proj4, None, None);
        let proj = Proj::from_proj_string(&projection).ok()?;
        let is_lon_lat = proj.is_latlong();
        Some(Crs {
            name: format!("EPSG:{code}"),
            is_lon_lat,
            m_per_unit: if is_lon_lat { 1.0 } else { proj.to_meter() },
            wkt: None,
            epsg: Some(code),
            projection,
            obstacle,
        })
    }

    /// The system that the text of a `.prj` describes.
    pub(super) fn of_prj(text: &str) -> Result<Crs, Unusable> {
        let root = wkt::parse(text).ok_or("the text of the reference system is cut short or no such text")?;
        let horizontal = root.horizontal();
        if horizontal.keyword == "GEOCCS" {
            return Err("its reference system is geocentric, which no map is drawn in".into());
        }
        if in_other_angles(horizontal) {
            return Err("its longitudes and latitudes are not in degrees".into());
        }
        let described = proj4wkt::wkt_to_projstring(&horizontal.print()).ok();
        let (projection, obstacle) = match &described {
            Some(projection) => with_datum(projection, datum_name(horizontal), tie_of(horizontal)),
            None => (
                String::new(),
                Some("its projection is not one that is known here".to_string()),
            ),
        };
        let proj = Proj::from_proj_string(&projection).ok();
        let is_lon_lat = horizontal.keyword.starts_with("GEOG") || horizontal.keyword.starts_with("GEOD");
        if is_lon_lat && proj.is_none() {
            return Err("its ellipsoid or datum cannot be read".into());
        }
        let m_per_unit = match (&proj, is_lon_lat) {
            (_, true) => 1.0,
            (Some(proj), false) => proj.to_meter(),
            (None, false) => unit_m(horizontal).ok_or("its unit of length cannot be read")?,
        };
        Ok(Crs {
            name: horizontal.name().unwrap_or("unnamed").to_string(),
            is_lon_lat,
            m_per_unit,
            wkt: Some(text.to_string()),
            epsg: horizontal.epsg(),
            obstacle: obstacle.or_else(|| proj.is_none().then(|| "its projection cannot be used here".to_string())),
            projection: if proj.is_some() { projection } else { String::new() },
        })
    }

    /// Whether coordinates of the two mean the same without any transformation.
    pub fn same_system(&self, other: &Crs) -> bool {
        if self.is_lon_lat != other.is_lon_lat || self.m_per_unit != other.m_per_unit {
            return false;
        }
        if self.projection.is_empty() || other.projection.is_empty() {
            return self.projection == other.projection && self.wkt == other.wkt;
        }
        (self.epsg.is_some() && self.epsg == other.epsg) || self.projection == other.projection
    }

    /// Whether coordinates can be brought to longitude and latitude on WGS 84.
    pub fn reaches_lon_lat(&self) -> bool {
        self.obstacle.is_none()
    }

    /// The text for a `.prj`: the user's own, else the definition of the EPSG code.
    pub fn prj_text(&self) -> Option<&str> {
        self.wkt.as_deref().or_else(|| {
            let code = u16::try_from(self.epsg?).ok()?;
            crs_definitions::from_code(code).map(|definition| definition.wkt)
        })
    }

    /// Whether lengths in its plane are far from lengths on the ground, as in Web Mercator.
    pub(super) fn lacks_true_scale(&self) -> bool {
        const WORLD: [&str; 13] = [
            "merc", "webmerc", "mill", "eqc", "cea", "moll", "robin", "sinu", "eqearth", "gall", "longlat", "latlong",
            "latlon",
        ];
        self.token("+proj=").is_some_and(|kind| WORLD.contains(&kind))
    }

    /// The value of one token of the projection.
    pub(super) fn token(&self, name: &str) -> Option<&str> {
        self.projection
            .split_whitespace()
            .find_map(|token| token.strip_prefix(name))
    }

    /// The projection, made ready.
    pub(super) fn proj(&self) -> Result<Proj, Error> {
        Proj::from_proj_string(&self.projection).map_err(|_| self.refusal())
    }

    /// Why it cannot be transformed, as an error.
    pub(super) fn refusal(&self) -> Error {
        let why = self.obstacle.as_deref().unwrap_or("its projection cannot be used here");
        Error::input(
            Path::new(&self.name),
            format!("coordinates cannot be brought to another reference system: {why}"),
            "Give all layers in the same system, or export them in one that is tied to WGS 84 and write shapefiles.",
        )
    }
}

/// Moves coordinates from one system to another, in place. What cannot be moved becomes not-a-number.
///
/// # Errors
/// A system that cannot be transformed.
pub(super) fn convert(from: &Crs, to: &Crs, xy: &mut [[f64; 2]]) -> Result<(), Error> {
    if from.same_system(to) {
        return Ok(());
    }
    // Two systems on one unknown datum need no shift between them; everything else does.
    if from.obstacle != to.obstacle || from.projection.is_empty() {
        let refused = if from.obstacle.is_some() { from } else { to };
        return Err(refused.refusal());
    }
    convert_with(&from.proj()?, &to.proj()?, xy);
    Ok(())
}

/// As [`convert`], with projections made ready; also between systems of one unknown datum.
pub(super) fn convert_with(from: &Proj, to: &Proj, xy: &mut [[f64; 2]]) {
    if from.is_latlong() {
        xy.iter_mut().for_each(|p| *p = p.map(f64::to_radians));
    }
    // Each point's own failure makes that point not-a-number, so the whole never fails but for a missing direction.
    if transform(from, to, &mut Batch(xy)).is_err() {
        xy.fill([f64::NAN; 2]);
    }
    if to.is_latlong() {
        xy.iter_mut().for_each(|p| *p = p.map(f64::to_degrees));
    }
}

/// Coordinates as the transforming library takes them: a point that fails becomes not-a-number and stops nothing.
struct Batch<'a>(&'a mut [[f64; 2]]);

impl Transform for Batch<'_> {
    fn transform_coordinates<F: TransformClosure>(&mut self, step: &mut F) -> proj4rs::errors::Result<()> {
        for p in self.0.iter_mut() {
            let moved = if p[0].is_finite() && p[1].is_finite() {
                step(p[0], p[1], 0.0).ok()
            } else {
                None
            };
            *p = moved.map_or([f64::NAN; 2], |(x, y, _)| [x, y]);
        }
        Ok(())
    }
}

/// Whether a geographic system counts angles in something else than degrees.
fn in_other_angles(horizontal: &wkt::Item) -> bool {
    let geographic = horizontal.keyword.starts_with("GEOG") || horizontal.keyword.starts_with("GEOD");
    let unit = horizontal.child(&["UNIT", "ANGLEUNIT"]).and_then(wkt::Item::number);
    // Printed degrees differ in the last digits; grads differ by a tenth.
    geographic && unit.is_some_and(|factor| (factor.to_degrees() - 1.0).abs() > 1e-6)
}

fn unit_m(horizontal: &wkt::Item) -> Option<f64> {
    let unit = horizontal.child(&["UNIT", "LENGTHUNIT"])?.number()?;
    (unit.is_finite() && unit > 0.0).then_some(unit)
}

fn datum_item(horizontal: &wkt::Item) -> Option<&wkt::Item> {
    const GEOGRAPHIC: [&str; 7] = [
        "GEOGCS",
        "GEOGCRS",
        "GEOGRAPHICCRS",
        "GEODCRS",
        "GEODETICCRS",
        "BASEGEODCRS",
        "BASEGEOGCRS",
    ];
    let geographic = horizontal.child(&GEOGRAPHIC).unwrap_or(horizontal);
    geographic.child(&["DATUM", "GEODETICDATUM", "TRF", "ENSEMBLE"])
}

fn datum_name(horizontal: &wkt::Item) -> Option<&str> {
    datum_item(horizontal)?.name()
}

/// A projection whose datum is tied to WGS 84 as well as is known without grids, or the reason why it is not.
///
/// A datum on the ellipsoids GRS 1980 or WGS 84 (NAD83, ETRS89, GDA94, NZGD2000 …) of which no tie is published is taken
/// to agree with WGS 84, as is usual without grids: 1 to 2 m on the ground, and nothing between layers of one datum.
fn with_datum(projection: &str, datum: Option<&str>, tie: Option<String>) -> (String, Option<String>) {
    let mut tokens: Vec<String> = projection.split_whitespace().map(String::from).collect();
    let has = |tokens: &[String], start: &str| tokens.iter().any(|token| token.starts_with(start));
    let nad27 = datum.is_some_and(|name| plain(name).contains("northamerican") && name.contains("1927"))
        || tokens.iter().any(|token| token == "+datum=NAD27");
    if nad27 {
        tokens.retain(|token| !token.starts_with("+datum=") && !token.starts_with("+nadgrids="));
        if !has(&tokens, "+a=") && !has(&tokens, "+ellps=") {
            tokens.push("+ellps=clrk66".into());
        }
        let why =
            "it is on the 1927 North American datum, which needs a grid of shifts that is not part of this program";
        return (tokens.join(" "), Some(why.into()));
    }
    if let Some(tie) = tie {
        tokens.retain(|token| !token.starts_with("+towgs84="));
        tokens.push(tie);
    }
    // New Zealand's grid file ties NZGD49 more closely than its seven parameters; without grids they have to do.
    for token in tokens.iter_mut().filter(|token| token.contains("nzgd2kgrid")) {
        *token = "+towgs84=59.47,-5.04,187.44,0.47,-0.1,1.024,-4.5993".into();
    }
    if has(&tokens, "+towgs84=") || has(&tokens, "+datum=") || has(&tokens, "+nadgrids=@null") {
        return (tokens.join(" "), None);
    }
    if has(&tokens, "+ellps=GRS80") || has(&tokens, "+ellps=WGS84") {
        tokens.push("+towgs84=0,0,0".into());
        return (tokens.join(" "), None);
    }
    let name = datum.unwrap_or("its datum").replace('_', " ");
    (
        tokens.join(" "),
        Some(format!("how {name} lies on the earth is not known here")),
    )
}

/// Datums that vendors name otherwise than the definitions by code do.
const OTHER_NAMES: [(&str, &str); 6] = [
    ("belge1972", "reseaunationalbelge1972"),
    ("ggrs1987", "greekgeodeticreferencesystem1987"),
    ("hungarian1972", "hungariandatum1972"),
    ("mgi", "militargeographischeinstitute"),
    ("ordnancesurveyofgreatbritain1936", "osgb1936"),
    ("sjtsk", "systemjednotnetrigonometrickesitekatastralni"),
];

/// The published tie of a system's datum to WGS 84, where its own text has none: found by the system's code, else by the
/// datum's name among the definitions by code.
fn tie_of(horizontal: &wkt::Item) -> Option<String> {
    if datum_item(horizontal)?.child(&["TOWGS84"]).is_some() {
        return None;
    }
    if let Some(code) = horizontal.epsg().and_then(|code| u16::try_from(code).ok()) {
        let root = wkt::parse(crs_definitions::from_code(code)?.wkt)?;
        return shift_of(root.horizontal());
    }
    let name = plain(datum_name(horizontal)?);
    let wanted = OTHER_NAMES
        .iter()
        .find(|(other, _)| *other == name)
        .map_or(name.as_str(), |(_, own)| own);
    // Geographic systems have the codes 4001 to 4999.
    (4001..5000).find_map(|code| {
        let root = wkt::parse(crs_definitions::from_code(code)?.wkt)?;
        let is_it = datum_name(root.horizontal()).is_some_and(|name| plain(name) == wanted);
        is_it.then(|| shift_of(root.horizontal())).flatten()
    })
}

/// The shift to WGS 84 that a text states, as the transforming library takes it.
fn shift_of(horizontal: &wkt::Item) -> Option<String> {
    let shift = datum_item(horizontal)?.child(&["TOWGS84"])?;
    let numbers: Vec<&str> = shift
        .values
        .iter()
        .filter_map(|value| match value {
            wkt::Value::Word(word) => Some(word.as_str()),
            _ => None,
        })
        .collect();
    Some(format!("+towgs84={}", numbers.join(",")))
}

/// A datum's name without the prefix, case and marks that vendors spell differently.
fn plain(name: &str) -> String {
    let name = name.strip_prefix("D_").unwrap_or(name);
    name.chars()
        .filter(char::is_ascii_alphanumeric)
        .collect::<String>()
        .to_ascii_lowercase()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::{M_PER_FOOT, M_PER_US_SURVEY_FOOT};

    /// As a desktop program writes it: no codes, its own names.
    const VENDOR_FEET: &str = r#"PROJCS["NAD_1983_StatePlane_North_Carolina_FIPS_3200_Feet",GEOGCS["GCS_North_American_1983",DATUM["D_North_American_1983",SPHEROID["GRS_1980",6378137.0,298.257222101]],PRIMEM["Greenwich",0.0],UNIT["Degree",0.0174532925199433]],PROJECTION["Lambert_Conformal_Conic"],PARAMETER["False_Easting",2000000.0],PARAMETER["False_Northing",0.0],PARAMETER["Central_Meridian",-79.0],PARAMETER["Standard_Parallel_1",34.33333333333334],PARAMETER["Standard_Parallel_2",36.16666666666666],PARAMETER["Latitude_Of_Origin",33.75],UNIT["Foot_US",0.3048006096012192]]"#;

    #[test]
    fn codes_are_read_in_every_spelling() {
        for name in [
            "EPSG:2264",
            "epsg:2264",
            "urn:ogc:def:crs:EPSG::2264",
            "urn:ogc:def:crs:EPSG:9.8:2264",
            "http://www.opengis.net/def/crs/EPSG/0/2264",
        ] {
            assert_eq!(Crs::parse(name).unwrap().epsg, Some(2264), "{name}");
        }
        for name in [
            "urn:ogc:def:crs:OGC:1.3:CRS84",
            "OGC:CRS84",
            "EPSG:4326",
            "urn:ogc:def:crs:EPSG::4326",
        ] {
            assert_eq!(Crs::parse(name).unwrap(), Crs::lon_lat(), "{name}");
        }
        assert_eq!(Crs::parse("ESRI:102100").unwrap().epsg, Some(3857));
        for name in ["", "EPSG:", "EPSG:1", "EPSG:999999", "my own grid 2264 b", "EPSG:4978"] {
            assert!(Crs::parse(name).is_err(), "{name}");
        }
    }

    #[test]
    fn a_vendor_prj_means_the_same_as_the_code() {
        let code = Crs::parse("EPSG:2264").unwrap();
        for text in [
            VENDOR_FEET.to_string(),
            format!("\u{feff}{VENDOR_FEET}\r\n"),
            format!("{VENDOR_FEET},VERTCS[\"NAVD_1988\",VDATUM[\"x\"],UNIT[\"Foot_US\",0.3048006096012192]]"),
            VENDOR_FEET
                .replace("PROJCS", "projcs")
                .replace("UNIT", "unit")
                .replace("PARAMETER", "Parameter"),
        ] {
            let prj = Crs::of_prj(&text).unwrap();
            assert!((prj.m_per_unit - M_PER_US_SURVEY_FOOT).abs() < 1e-15);
            assert_eq!(prj.wkt.as_deref(), Some(&*text));
            let mut xy = [[1_450_498.108_012_027_6, 540_088.335_230_140_8]];
            convert(&prj, &code, &mut xy).unwrap();
            assert!(
                (xy[0][0] - 1_450_498.108_012).abs() < 1e-4 && (xy[0][1] - 540_088.335_230).abs() < 1e-4,
                "{xy:?}"
            );
        }
        let international = VENDOR_FEET
            .replace("0.3048006096012192", "0.3048")
            .replace("Foot_US", "Foot");
        assert_eq!(Crs::of_prj(&international).unwrap().m_per_unit, M_PER_FOOT);
    }

    #[test]
    fn a_definition_by_code_is_read_back_from_its_own_text() {
        for code in [2264_u16, 32633, 27700, 28992, 3857, 4326, 4269, 31370, 2056, 5514] {
            let definition = crs_definitions::from_code(code).unwrap();
            let prj = Crs::of_prj(definition.wkt).unwrap();
            assert_eq!(prj.epsg, Some(code.into()));
            assert!(prj.reaches_lon_lat(), "{code}: {:?}", prj.obstacle);
        }
    }

    #[test]
    fn a_datum_is_tied_by_its_name_or_refused() {
        let bare = r#"PROJCS["British_National_Grid",GEOGCS["GCS_OSGB_1936",DATUM["D_OSGB_1936",SPHEROID["Airy_1830",6377563.396,299.3249646]],PRIMEM["Greenwich",0.0],UNIT["Degree",0.0174532925199433]],PROJECTION["Transverse_Mercator"],PARAMETER["False_Easting",400000.0],PARAMETER["False_Northing",-100000.0],PARAMETER["Central_Meridian",-2.0],PARAMETER["Scale_Factor",0.9996012717],PARAMETER["Latitude_Of_Origin",49.0],UNIT["Meter",1.0]]"#;
        let mut by_name = [[530_000.0, 180_000.0]];
        let mut by_code = by_name;
        convert(&Crs::of_prj(bare).unwrap(), &Crs::lon_lat(), &mut by_name).unwrap();
        convert(&Crs::parse("EPSG:27700").unwrap(), &Crs::lon_lat(), &mut by_code).unwrap();
        assert!((by_name[0][0] - by_code[0][0]).abs() < 1e-6 && (by_name[0][1] - by_code[0][1]).abs() < 1e-6);
        let unknown = bare.replace("D_OSGB_1936", "D_Nowhere_1901");
        let unknown = Crs::of_prj(&unknown).unwrap();
        assert!(!unknown.reaches_lon_lat());
        assert!(
            convert(&unknown, &Crs::lon_lat(), &mut by_name)
                .unwrap_err()
                .to_string()
                .contains("Nowhere")
        );
        let nad27 = bare.replace("D_OSGB_1936", "D_North_American_1927");
        assert!(Crs::of_prj(&nad27).unwrap().obstacle.unwrap().contains("1927"));
    }

    #[test]
    fn systems_by_code_and_by_text_agree_with_an_independent_implementation() {
        // PROJ 9.5.1 without grids: a place in each system and its longitude and latitude on WGS 84.
        let truth: [(u16, [f64; 2], [f64; 2]); 17] = [
            (
                2264,
                [1_744_617.995_9, 532_455.953_9],
                [-79.855_000_000, 35.210_000_000],
            ), // NAD83 / North Carolina (ftUS)
            (
                2225,
                [6_500_762.569_6, 2_174_791.409_1],
                [-122.220_000_000, 40.800_000_000],
            ), // NAD83 / California zone 1 (ftUS)
            (
                2222,
                [636_986.550_8, 1_153_309.196_4],
                [-110.375_000_000, 34.170_000_000],
            ), // NAD83 / Arizona East (ft)
            (
                2272,
                [2_003_290.567_0, 404_990.811_4],
                [-77.625_000_000, 40.445_000_000],
            ), // NAD83 / Pennsylvania South (ftUS)
            (
                26931,
                [709_022.227_6, 630_020.600_4],
                [-135.495_000_000, 57.480_000_000],
            ), // NAD83 / Alaska zone 1
            (
                3338,
                [1_707_621.285_2, 7_905_795.526_0],
                [21.215_000_000, 61.350_000_000],
            ), // NAD83 / Alaska Albers
            (
                32633,
                [500_000.000_0, 4_649_776.224_8],
                [15.000_000_000, 42.000_000_000],
            ), // WGS 84 / UTM zone 33N
            (
                32755,
                [500_000.000_0, 5_572_242.781_3],
                [147.000_000_000, -40.000_000_000],
            ), // WGS 84 / UTM zone 55S
            (3857, [0.000_0, 0.000_0], [0.000_000_000, 0.000_000_000]), // WGS 84 / Pseudo-Mercator
            (27700, [304_969.207_4, 610_584.993_7], [-3.501_360_742, 55.380_006_168]), // OSGB36 / British National Grid
            (28992, [142_863.978_8, 470_673.112_5], [5.209_591_047, 52.224_003_945]), // Amersfoort / RD New
            (31370, [155_853.553_4, 132_631.754_8], [4.451_263_097, 50.504_445_060]), // BD72 / Belgian Lambert 72
            (
                2056,
                [2_659_933.418_7, 1_185_026.714_1],
                [8.223_931_148, 46.813_700_555],
            ), // CH1903+ / LV95
            (2100, [494_317.670_4, 4_240_767.862_1], [23.936_708_874, 38.317_594_060]), // GGRS87 / Greek Grid
            (
                2193,
                [1_557_768.544_8, 5_492_759.657_4],
                [172.500_000_000, -40.715_000_000],
            ), // NZGD2000 / New Zealand Transverse Mercator 2000
            (
                31983,
                [500_000.000_0, 8_431_813.455_3],
                [-45.000_000_000, -14.185_000_000],
            ), // SIRGAS 2000 / UTM zone 23S
            (2046, [53_858.502_9, 2_535_220.466_8], [14.475_000_000, -22.915_000_000]), // Hartebeesthoek94 / Lo15
        ];
        for (code, xy, [lon, lat]) in truth {
            let definition = crs_definitions::from_code(code).unwrap();
            let by_code = Crs::parse(&format!("EPSG:{code}")).unwrap();
            for crs in [by_code, Crs::of_prj(definition.wkt).unwrap()] {
                let mut place = [xy];
                convert(&crs, &Crs::lon_lat(), &mut place).unwrap();
                // A degree of latitude is 111 km.
                let east = (place[0][0] - lon) * 111e3 * lat.to_radians().cos();
                let north = (place[0][1] - lat) * 111e3;
                assert!(east.hypot(north) < 0.01, "{code}: {} m", east.hypot(north));
            }
        }
    }

    #[test]
    fn a_datum_is_known_by_its_vendors_name_too() {
        let definition = crs_definitions::from_code(2100).unwrap().wkt;
        let bare = definition
            .replace("TOWGS84[-199.87,74.79,246.62,0,0,0,0],", "")
            .replace("Greek_Geodetic_Reference_System_1987", "D_GGRS_1987")
            .replace("AUTHORITY[\"EPSG\",\"2100\"]", "AUTHORITY[\"NONE\",\"1\"]");
        assert!(!bare.contains("TOWGS84") && bare.contains("D_GGRS_1987"));
        let mut places = [[500_000.0, 4_200_000.0]; 2];
        convert(&Crs::of_prj(definition).unwrap(), &Crs::lon_lat(), &mut places[..1]).unwrap();
        convert(&Crs::of_prj(&bare).unwrap(), &Crs::lon_lat(), &mut places[1..]).unwrap();
        assert_eq!(places[0], places[1]);
    }

    #[test]
    fn a_local_system_gives_its_unit_and_a_cut_text_is_refused() {
        let site = Crs::of_prj(r#"LOCAL_CS["site grid",LOCAL_DATUM["x",0],UNIT["US survey foot",0.3048006096012192]]"#)
            .unwrap();
        assert!((site.m_per_unit - M_PER_US_SURVEY_FOOT).abs() < 1e-15 && !site.reaches_lon_lat());
        for end in (0..VENDOR_FEET.len()).step_by(7) {
            assert!(Crs::of_prj(&VENDOR_FEET[..end]).is_err());
        }
        let grads = r#"GEOGCS["NTF (Paris)",DATUM["NTF",SPHEROID["x",6378249.2,293.46602]],PRIMEM["Paris",2.5969213],UNIT["grad",0.01570796326794897]]"#;
        assert!(Crs::of_prj(grads).unwrap_err().contains("degrees"));
    }
}
