//! Mains drawn in several parts. Parts that touch are put together, in whatever order and direction they are drawn; a main
//! that branches becomes several lines. Parts that are apart after all joins are said.

use super::CleanLine;
use super::cleaning::Work;
use super::geometry::distance_m;
use super::lines::End;
use crate::assets::Point;
use crate::finding::{Code, Finding, Sentence};
use crate::units::Quantity;

/// A main of several parts.
#[derive(Clone, Copy, Debug)]
pub(super) struct Multipart {
    pub main: u32,
    pub parts: u32,
}

/// Puts touching parts together. Counts the mains of several parts.
pub(super) fn put_together(work: &mut Work) -> u32 {
    let drawn = std::mem::take(&mut work.drawn);
    let mut out = Vec::with_capacity(drawn.len());
    let mut rest = drawn.into_iter().peekable();
    while let Some(line) = rest.next() {
        let main = line.main;
        let mut parts = vec![line];
        while let Some(next) = rest.next_if(|next| next.main == main) {
            parts.push(next);
        }
        if parts.len() == 1 {
            out.append(&mut parts);
            continue;
        }
        work.multiparts.push(Multipart {
            main,
            parts: parts.len() as u32,
        });
        out.extend(chains(parts, work.settings.touch_m));
    }
    work.drawn = out;
    work.multiparts.len() as u32
}

/// The longest runs of parts that touch end to end with no third end there. Each keeps the direction of its first part.
fn chains(parts: Vec<CleanLine>, touch_m: f64) -> Vec<CleanLine> {
    let ends: Vec<Point> = parts
        .iter()
        .flat_map(|part| [part.vertices[0], part.vertices[part.vertices.len() - 1]])
        .collect();
    // The one other end that lies on the same spot, if it is only one.
    let partner: Vec<Option<usize>> = (0..ends.len())
        .map(|i| {
            let mut others = (0..ends.len()).filter(|&j| j != i && distance_m(ends[i], ends[j]) <= touch_m);
            match (others.next(), others.next()) {
                (Some(j), None) if j / 2 != i / 2 => Some(j),
                _ => None,
            }
        })
        .collect();
    // Closeness is not transitive: only partners that agree are partners.
    let partner: Vec<Option<usize>> = (0..ends.len())
        .map(|i| partner[i].filter(|&j| partner[j] == Some(i)))
        .collect();
    let mut used = vec![false; parts.len()];
    let mut chains = Vec::new();
    for first in 0..parts.len() {
        if used[first] {
            continue;
        }
        // Back to where the chain starts, then along it: (part, drawn backwards).
        let mut at = 2 * first;
        while let Some(previous) = partner[at] {
            at = previous ^ 1;
            if at / 2 == first {
                break;
            }
        }
        let mut order = Vec::new();
        loop {
            let part = at / 2;
            used[part] = true;
            order.push((part, at % 2 == 1));
            match partner[at ^ 1] {
                Some(next) if !used[next / 2] => at = next,
                _ => break,
            }
        }
        chains.push(put_in_line(&parts, &order));
    }
    chains
}

fn put_in_line(parts: &[CleanLine], order: &[(usize, bool)]) -> CleanLine {
    let mut vertices: Vec<Point> = Vec::new();
    for &(part, backwards) in order {
        let of_part = &parts[part].vertices;
        // The first vertex of a later part is where the line already is.
        let skip = usize::from(!vertices.is_empty());
        if backwards {
            vertices.extend(of_part.iter().rev().skip(skip));
        } else {
            vertices.extend(of_part.iter().skip(skip));
        }
    }
    vertices.dedup();
    let length_m = vertices.windows(2).map(|pair| distance_m(pair[0], pair[1])).sum();
    CleanLine {
        main: parts[order[0].0].main,
        vertices,
        length_m,
    }
}

/// Says of every main of several parts whether they hang together. Counts those that do not.
pub(super) fn find_apart(work: &mut Work) -> u32 {
    let multiparts = std::mem::take(&mut work.multiparts);
    let mut apart = 0;
    let mut next = 0;
    for multipart in &multiparts {
        // Lines stand in the order of the mains.
        while next < work.lines.len() && work.lines.main(next as u32) < multipart.main {
            next += 1;
        }
        let first = next;
        while next < work.lines.len() && work.lines.main(next as u32) == multipart.main {
            next += 1;
        }
        let lines: Vec<u32> = (first as u32..next as u32).collect();
        let feature = work.feature(multipart.main);
        let finding = if hang_together(work, &lines) {
            let message = Sentence::new().feature(feature).text(format!(
                " is drawn in {} parts that touch; they were put together",
                multipart.parts
            ));
            Finding::new(Code::MultipartMerged, message)
        } else {
            apart += 1;
            work.apart.insert(multipart.main);
            let (gap_m, at) = gap(work, &lines);
            let message = Sentence::new()
                .feature(feature)
                .text(format!(
                    " is drawn in {} parts, and they do not all touch: the gap is ",
                    multipart.parts
                ))
                .number(gap_m, Quantity::Length);
            Finding::new(Code::MultipartApart, message)
                .at(at)
                .measured(gap_m, Quantity::Length)
        };
        work.findings.push(finding.on(feature));
    }
    work.multiparts = multiparts;
    apart
}

/// Whether lines meet one another, directly or by way of each other.
fn hang_together(work: &Work, lines: &[u32]) -> bool {
    let mut group: Vec<usize> = (0..lines.len()).collect();
    for (i, &line) in lines.iter().enumerate() {
        for (_, spot) in work.web.stops(&work.lines, line) {
            for other in work.web.lines_at(spot) {
                if let Some(j) = lines.iter().position(|&l| l == other) {
                    let (from, to) = (group[j], group[i]);
                    group.iter_mut().filter(|g| **g == from).for_each(|g| *g = to);
                }
            }
        }
    }
    group.windows(2).all(|pair| pair[0] == pair[1])
}

/// The smallest distance from an end of one of the lines to another of them, and where.
fn gap(work: &Work, lines: &[u32]) -> (f64, Point) {
    let mut best = (f64::INFINITY, [0.0, 0.0]);
    for &line in lines {
        for end in [End::new(line, false), End::new(line, true)] {
            let at = work.lines.end_at(end);
            for &other in lines.iter().filter(|&&other| other != line) {
                let distance_m = work.lines.nearest(other, at).distance_m;
                if distance_m > work.settings.touch_m && distance_m < best.0 {
                    best = (distance_m, at);
                }
            }
        }
    }
    if best.0.is_finite() {
        best
    } else {
        (0.0, work.lines.end_at(End::new(lines[0], false)))
    }
}
