//! Pieces: what hangs together once everything is cut, and the pieces that have no source.
//!
//! A map without any source is judged by its largest piece: the others are said to be apart from it.

use petgraph::unionfind::UnionFind;

use super::ValvePlace;
use super::cleaning::Work;
use super::near_misses::Missed;
use super::node_points::feeds;
use crate::assets::MainKind;
use crate::finding::{Code, FeatureRef, Finding, Sentence, Severity};
use crate::units::Quantity;

/// A finding names no more mains than this.
const MOST_NAMED: usize = 50;
/// The nearest other main is looked for from no more nodes than this.
const MOST_LOOKED_FROM: usize = 200;

/// Finds the pieces, and says which have no source. Counts those.
pub(super) fn find(work: &mut Work) -> u32 {
    number(work);
    let pieces = work.map.piece_length_m.len();
    let mut fed = vec![false; pieces];
    for (index, node) in work.map.node_of_point.iter().enumerate() {
        if let Some(node) = node
            && feeds(&work.assets.nodes[index])
        {
            fed[work.map.piece_of_node[*node as usize] as usize] = true;
        }
    }
    let no_source = !work.assets.nodes.iter().any(feeds);
    if no_source && pieces > 0 {
        fed[0] = true;
    }
    if fed.iter().all(|fed| *fed) {
        return 0;
    }
    let mains = mains_of_pieces(work, &fed);
    let mut count = 0;
    for piece in 0..pieces {
        if !fed[piece] && !mains[piece].is_empty() {
            count += 1;
            say(work, piece as u32, &mains[piece], no_source);
        }
    }
    count
}

/// Numbers the pieces, the longest first.
fn number(work: &mut Work) {
    let nodes = &work.map.nodes;
    let mut joined: UnionFind<u32> = UnionFind::new(nodes.len());
    for part in &work.map.parts {
        joined.union(part.from, part.to);
    }
    let label = joined.into_labeling();
    let mut length_m = vec![0.0; nodes.len()];
    let mut first: Vec<[f64; 2]> = vec![[f64::INFINITY; 2]; nodes.len()];
    for part in &work.map.parts {
        length_m[label[part.from as usize] as usize] += part.end_m - part.start_m;
    }
    for (node, &label) in nodes.iter().zip(&label) {
        let known = &mut first[label as usize];
        if (node.at[0], node.at[1]) < (known[0], known[1]) {
            *known = node.at;
        }
    }
    let mut order: Vec<u32> = (0..nodes.len() as u32)
        .filter(|&node| label[node as usize] == node)
        .collect();
    order.sort_by(|&a, &b| {
        let (p, q) = (first[a as usize], first[b as usize]);
        (length_m[b as usize].total_cmp(&length_m[a as usize]))
            .then(p[0].total_cmp(&q[0]))
            .then(p[1].total_cmp(&q[1]))
    });
    let mut place = vec![0; nodes.len()];
    for (piece, &label) in order.iter().enumerate() {
        place[label as usize] = piece as u32;
    }
    work.map.piece_length_m = order.iter().map(|&label| length_m[label as usize]).collect();
    work.map.piece_of_node = label.iter().map(|&label| place[label as usize]).collect();
}

/// The mains of the pieces without a source, the longest first.
fn mains_of_pieces(work: &Work, fed: &[bool]) -> Vec<Vec<u32>> {
    let mut mains: Vec<Vec<(f64, u32, u32)>> = vec![Vec::new(); fed.len()];
    for part in &work.map.parts {
        let piece = work.map.piece_of_node[part.from as usize] as usize;
        if fed[piece] {
            continue;
        }
        let length_m = part.end_m - part.start_m;
        match mains[piece].last_mut() {
            // Parts of one main stand together.
            Some((known, _, main)) if *main == part.main => *known += length_m,
            _ => mains[piece].push((length_m, work.lines.rank(part.line), part.main)),
        }
    }
    mains
        .into_iter()
        .map(|mut of_piece| {
            of_piece.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
            of_piece.into_iter().map(|(_, _, main)| main).collect()
        })
        .collect()
}

impl Work<'_> {
    /// The piece that a place on a line belongs to.
    fn piece_at(&self, line: u32, s: f64) -> u32 {
        let stops = &self.cuts.stops[line as usize];
        let after = stops.partition_point(|stop| stop.s <= s);
        let node = match after {
            0 => stops[0].after,
            _ => stops[after - 1].after,
        };
        let node = if after == stops.len() {
            stops[after - 1].before
        } else {
            node
        };
        self.map.piece_of_node[node as usize]
    }
}

fn say(work: &mut Work, piece: u32, mains: &[u32], no_source: bool) {
    let feature = work.feature(mains[0]);
    let what = if no_source {
        "does not hang together with the largest part"
    } else {
        "has no source"
    };
    let message = Sentence::new().text("A piece of ");
    let message = message.number(work.map.piece_length_m[piece as usize], Quantity::Length);
    let message = message
        .text(format!(" ({} mains, among them ", mains.len()))
        .feature(feature);
    let mut message = message.text(format!(") {what}"));
    let mut finding = Finding::new(Code::Island, Sentence::new()).on(feature);
    if let Some((apart_m, line, at)) = nearest_other(work, piece) {
        message = message
            .text("; the nearest other main, ")
            .feature(work.feature_of_line(line));
        message = message.text(", is ").number(apart_m, Quantity::Length).text(" away");
        finding = finding.at(at).measured(apart_m, Quantity::Length);
    }
    finding.others = mains
        .iter()
        .skip(1)
        .take(MOST_NAMED)
        .map(|&main| work.feature(main))
        .collect();
    let valves = closed_valves(work, piece);
    if let Some(&valve) = valves.first() {
        message = message.text("; it is shut off by ").feature(valve);
        finding.others.extend(valves.iter().take(MOST_NAMED));
    }
    if let Some(why) = said_already(work, piece, mains) {
        message = message.text(why);
        finding = finding.severity(Severity::Note);
    }
    finding.message = message;
    work.findings.push(finding);
}

/// The main of another piece that is nearest to a node of this one, where the node lies and how far it is.
fn nearest_other(work: &Work, piece: u32) -> Option<(f64, u32, [f64; 2])> {
    let nodes = work.map.nodes.iter().zip(&work.map.piece_of_node);
    let nodes = nodes.filter(|(_, of)| **of == piece).map(|(node, _)| node.at);
    let mut best: Option<(f64, u32, [f64; 2])> = None;
    for at in nodes.take(MOST_LOOKED_FROM) {
        for (stretch, d_2) in work.index.nearest_neighbor_iter_with_distance_2(at) {
            if best.is_some_and(|(known, ..)| d_2 >= known * known) {
                break;
            }
            let hit = work.lines.hit(stretch, at);
            if !work.cuts.stops[hit.line as usize].is_empty() && work.piece_at(hit.line, hit.s) != piece {
                best = Some((hit.distance_m, hit.line, at));
                break;
            }
        }
    }
    best
}

/// The closed valves between this piece and others.
fn closed_valves(work: &Work, piece: u32) -> Vec<FeatureRef> {
    let pieces = &work.map.piece_of_node;
    let valves = work.map.valves.iter().zip(&work.assets.valves);
    valves
        .filter_map(|(place, valve)| match place {
            Some(ValvePlace::Cut { node_a, node_b, .. }) => {
                let (a, b) = (pieces[*node_a as usize], pieces[*node_b as usize]);
                (a != b && (a == piece || b == piece)).then_some(valve.origin)
            }
            _ => None,
        })
        .collect()
}

/// Whether another finding says already why this piece is apart: then one warning is enough.
fn said_already(work: &Work, piece: u32, mains: &[u32]) -> Option<&'static str> {
    let all = |test: &dyn Fn(u32) -> bool| mains.iter().all(|&main| test(main));
    if all(&|main| work.assets.mains[main as usize].kind == MainKind::RawWater) {
        return Some("; it carries raw water, which is not calculated");
    }
    let missed = work.missed.iter().any(|missed| {
        let Missed { line, s, other } = *missed;
        if work.cuts.stops[line as usize].is_empty() || work.cuts.stops[other as usize].is_empty() {
            return false;
        }
        let at = work.lines.place(line, s);
        let (own, other) = (
            work.piece_at(line, s),
            work.piece_at(other, work.lines.nearest(other, at).s),
        );
        own != other && (own == piece || other == piece)
    });
    if missed {
        return Some("; a near miss or a bare crossing of one of them was found, see there");
    }
    let apart = mains.iter().any(|main| work.apart.contains(main));
    apart.then_some("; one of them is drawn in parts that do not touch, see there")
}
