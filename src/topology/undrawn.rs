//! Rows without a usable line: no geometry, another type, a coordinate that is no number, one vertex, no length.
//!
//! They keep no part of the network and are said. Repeated vertices are dropped in passing.

use super::CleanLine;
use super::cleaning::Work;
use super::geometry::distance_m;
use crate::assets::{Drawing, Point};
use crate::finding::{Code, Finding, Sentence};

/// What became of one part of a drawing.
enum Drawn {
    Line(CleanLine),
    Nothing,
    OnePoint,
    ZeroLength,
    NotFinite,
}

/// Makes lines of the rows that are drawn; says which are not. Counts the rows set aside.
pub(super) fn set_aside(work: &mut Work) -> u32 {
    let mut set_aside = 0;
    work.drawn.reserve(work.assets.mains.len());
    for (index, main) in work.assets.mains.iter().enumerate() {
        let (code, said) = match &main.drawing {
            Drawing::Missing => (Code::GeometryMissing, " has no geometry"),
            Drawing::NotFinite => (Code::GeometryNotFinite, " has a coordinate that is not a number"),
            Drawing::OtherType(name) => {
                set_aside += 1;
                let message = Sentence::new()
                    .feature(main.origin)
                    .text(format!(" is drawn as a {name}, not as a line"));
                work.findings
                    .push(Finding::new(Code::GeometryOtherType, message).on(main.origin));
                continue;
            }
            Drawing::Lines(parts) => match lines_of(parts, index as u32, work.settings.touch_m, &mut work.drawn) {
                None => continue,
                Some(trouble) => trouble,
            },
        };
        set_aside += 1;
        let mut finding = Finding::new(code, Sentence::new().feature(main.origin).text(said)).on(main.origin);
        finding.at = first_place(&main.drawing);
        work.findings.push(finding);
    }
    set_aside
}

/// Adds the lines of a main; when there are none, says what is the matter.
fn lines_of(parts: &[Vec<Point>], main: u32, touch_m: f64, drawn: &mut Vec<CleanLine>) -> Option<(Code, &'static str)> {
    let before = drawn.len();
    let mut trouble = (Code::GeometryMissing, " has no geometry");
    for part in parts {
        match clean(part, main, touch_m) {
            Drawn::Line(line) => drawn.push(line),
            Drawn::Nothing => {}
            Drawn::OnePoint if trouble.0 == Code::GeometryMissing => {
                trouble = (Code::GeometryOnePoint, " is drawn with a single vertex");
            }
            Drawn::OnePoint => {}
            Drawn::ZeroLength => trouble = (Code::GeometryZeroLength, " has no length: its vertices lie on one spot"),
            Drawn::NotFinite => {
                drawn.truncate(before);
                return Some((Code::GeometryNotFinite, " has a coordinate that is not a number"));
            }
        }
    }
    (drawn.len() == before).then_some(trouble)
}

fn clean(part: &[Point], main: u32, touch_m: f64) -> Drawn {
    if part.iter().flatten().any(|coordinate| !coordinate.is_finite()) {
        return Drawn::NotFinite;
    }
    let mut vertices: Vec<Point> = Vec::with_capacity(part.len());
    for &[x, y] in part {
        // Adding zero makes the negative zero an ordinary one, so that equal places compare equal bit by bit.
        let vertex = [x + 0.0, y + 0.0];
        if vertices.last() != Some(&vertex) {
            vertices.push(vertex);
        }
    }
    let length_m: f64 = vertices.windows(2).map(|pair| distance_m(pair[0], pair[1])).sum();
    match (part.len(), vertices.len()) {
        (0, _) => Drawn::Nothing,
        (1, _) => Drawn::OnePoint,
        (_, 1) => Drawn::ZeroLength,
        _ if length_m <= touch_m || !length_m.is_finite() => Drawn::ZeroLength,
        _ => Drawn::Line(CleanLine {
            main,
            vertices,
            length_m,
        }),
    }
}

fn first_place(drawing: &Drawing) -> Option<Point> {
    match drawing {
        Drawing::Lines(parts) => parts
            .iter()
            .flatten()
            .copied()
            .find(|p| p[0].is_finite() && p[1].is_finite()),
        _ => None,
    }
}
