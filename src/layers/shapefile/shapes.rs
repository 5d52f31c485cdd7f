//! The geometry of a shapefile, through the `shapefile` crate, with what it passes over in silence checked around it.

use std::io::Cursor;

use shapefile::{PointM, PointZ, Shape, ShapeReader};

use crate::layers::packed::{Kind, Packed};

/// Reads every shape into a new store; the reason as the middle of a sentence if the files are damaged.
///
/// Shapes are read one after another; the index is asked only where that fails, since it is often missing or stale.
pub(super) fn read(shp: &[u8], shx: Option<&[u8]>, heights: bool) -> Result<Packed, String> {
    let in_order = check_length(shp).and_then(|()| {
        let reader = ShapeReader::new(Cursor::new(shp)).map_err(|error| say(&error))?;
        collect(reader, heights)
    });
    match (in_order, shx) {
        (Ok(packed), _) => Ok(packed),
        (Err(why), None) => Err(why),
        (Err(why), Some(shx)) => {
            check_length(shp)?;
            let reader = ShapeReader::with_shx(Cursor::new(shp), Cursor::new(shx)).map_err(|_| why.clone())?;
            collect(reader, heights).map_err(|_| why)
        }
    }
}

/// A file shorter than its header says is cut; the crate would tell only where a shape is.
fn check_length(shp: &[u8]) -> Result<(), String> {
    if shp.len() < 100 {
        return Err("the shapes are cut short in their header".into());
    }
    let words = i32::from_be_bytes([shp[24], shp[25], shp[26], shp[27]]);
    match usize::try_from(words) {
        Ok(words) if words.saturating_mul(2) > shp.len() => Err(format!(
            "the shapes are cut short: the header says {} bytes, the file has {}",
            words.saturating_mul(2),
            shp.len()
        )),
        Ok(words) if words >= 50 => Ok(()),
        _ => Err("the shapes have a header that makes no sense".into()),
    }
}

fn say(error: &shapefile::Error) -> String {
    format!("the shapes cannot be read: {error:?}")
}

fn collect(mut reader: ShapeReader<Cursor<&[u8]>>, heights: bool) -> Result<Packed, String> {
    let mut packed = Packed::new(heights);
    for shape in reader.iter_shapes() {
        let number = packed.rows() + 1;
        let shape = shape.map_err(|error| format!("shape {number} is damaged or cut short ({error:?})"))?;
        let kind = store(&shape, &mut packed);
        packed.close(kind);
    }
    Ok(packed)
}

fn store(shape: &Shape, packed: &mut Packed) -> Kind {
    match shape {
        Shape::NullShape => Kind::Missing,
        Shape::Point(p) => points(std::slice::from_ref(p), packed),
        Shape::PointM(p) => points(std::slice::from_ref(p), packed),
        Shape::PointZ(p) => points(std::slice::from_ref(p), packed),
        Shape::Multipoint(all) => points(all.points(), packed),
        Shape::MultipointM(all) => points(all.points(), packed),
        Shape::MultipointZ(all) => points(all.points(), packed),
        Shape::Polyline(line) => lines(line.parts(), packed),
        Shape::PolylineM(line) => lines(line.parts(), packed),
        Shape::PolylineZ(line) => lines(line.parts(), packed),
        Shape::Polygon(_) | Shape::PolygonM(_) | Shape::PolygonZ(_) => Kind::Other("Polygon"),
        Shape::Multipatch(_) => Kind::Other("MultiPatch"),
    }
}

/// The coordinates of any of the crate's points.
trait Place {
    fn xyz(&self) -> ([f64; 2], f64);
}

impl Place for shapefile::Point {
    fn xyz(&self) -> ([f64; 2], f64) {
        ([self.x, self.y], f64::NAN)
    }
}

impl Place for PointM {
    fn xyz(&self) -> ([f64; 2], f64) {
        ([self.x, self.y], f64::NAN)
    }
}

impl Place for PointZ {
    fn xyz(&self) -> ([f64; 2], f64) {
        ([self.x, self.y], self.z)
    }
}

fn points<P: Place>(all: &[P], packed: &mut Packed) -> Kind {
    for point in all {
        let (xy, z) = point.xyz();
        packed.push(xy, z);
    }
    Kind::Points
}

fn lines<P: Place>(parts: &[Vec<P>], packed: &mut Packed) -> Kind {
    for part in parts {
        packed.start_part();
        for point in part {
            let (xy, z) = point.xyz();
            packed.push(xy, z);
        }
    }
    Kind::Lines
}
