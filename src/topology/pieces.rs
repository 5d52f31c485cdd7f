//! Pieces: what hangs together once everything is cut, and the pieces that have no source.
//!
//! A map without any source is judged by its largest piece: the others are said to be apart from it.

use std::collections::{HashMap, HashSet};

use petgraph::unionfind::UnionFind;

use super::ValvePlace;
use super::cleaning::Work;
use super::near_misses::Missed;
use super::node_points::feeds;
use crate::assets::{MainKind, Point};
use crate::finding::{Code, FeatureRef, Finding, Sentence, Severity};
use crate::units::Quantity;

/// A finding names no more mains than this.
const MOST_NAMED: usize = 50;
/// The nearest other main is looked for from no more nodes than this.
const MOST_LOOKED_FROM: usize = 50;
/// From each no more segments are looked at than this.
const MOST_LOOKED_AT: usize = 300;

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
    let about = About::new(work, &fed);
    let mut count = 0;
    for piece in 0..pieces {
        if !fed[piece] && !mains[piece].is_empty() {
            count += 1;
            say(work, &about, piece as u32, &mains[piece], no_source);
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

fn say(work: &mut Work, about: &About, piece: u32, mains: &[u32], no_source: bool) {
    let feature = work.feature(mains[0]);
    let what = if no_source {
        "does not hang together with the largest part"
    } else {
        "has no source"
    };
    let message = Sentence::new().text("a piece of ");
    let message = message.number(work.map.piece_length_m[piece as usize], Quantity::Length);
    let of_mains = match mains.len() {
        1 => " (".to_string(),
        many => format!(" ({many} mains, among them "),
    };
    let message = message.text(of_mains).feature(feature);
    let mut message = message.text(format!(") {what}"));
    let mut finding = Finding::new(Code::Island, Sentence::new()).on(feature);
    if let Some((apart_m, line, at)) = nearest_other(work, about, piece) {
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
    let valves = about.valves.get(&piece).map_or(&[][..], Vec::as_slice);
    if let Some(&valve) = valves.first() {
        message = message.text("; it is shut off by ").feature(valve);
        finding.others.extend(valves.iter().take(MOST_NAMED));
    }
    if let Some(why) = said_already(work, about, piece, mains) {
        message = message.text(why);
        finding = finding.severity(Severity::Note);
    }
    finding.message = message;
    work.findings.push(finding);
}

/// What there is to say about pieces, gathered once for all of them.
struct About {
    /// Where some of each piece's nodes lie.
    places: HashMap<u32, Vec<Point>>,
    /// The closed valves between each piece and others.
    valves: HashMap<u32, Vec<FeatureRef>>,
    /// The pieces that a near miss or a bare crossing would join to another.
    missed: HashSet<u32>,
}

impl About {
    fn new(work: &Work, fed: &[bool]) -> Self {
        let pieces = &work.map.piece_of_node;
        let mut places: HashMap<u32, Vec<Point>> = HashMap::new();
        for (node, &piece) in work
            .map
            .nodes
            .iter()
            .zip(pieces)
            .filter(|(_, piece)| !fed[**piece as usize])
        {
            let of_piece = places.entry(piece).or_default();
            if of_piece.len() < MOST_LOOKED_FROM {
                of_piece.push(node.at);
            }
        }
        let mut valves: HashMap<u32, Vec<FeatureRef>> = HashMap::new();
        for (place, valve) in work.map.valves.iter().zip(&work.assets.valves) {
            if let Some(ValvePlace::Cut { node_a, node_b, .. }) = place {
                let (a, b) = (pieces[*node_a as usize], pieces[*node_b as usize]);
                if a != b {
                    valves.entry(a).or_default().push(valve.origin);
                    valves.entry(b).or_default().push(valve.origin);
                }
            }
        }
        let mut missed = HashSet::new();
        for &Missed { line, s, other } in &work.missed {
            if work.cuts.stops[line as usize].is_empty() || work.cuts.stops[other as usize].is_empty() {
                continue;
            }
            let there = work.lines.nearest(other, work.lines.place(line, s)).s;
            let (a, b) = (work.piece_at(line, s), work.piece_at(other, there));
            if a != b {
                missed.extend([a, b]);
            }
        }
        About { places, valves, missed }
    }
}

/// The main of another piece that is nearest to a node of this one, where the node lies and how far it is.
fn nearest_other(work: &Work, about: &About, piece: u32) -> Option<(f64, u32, Point)> {
    let mut best: Option<(f64, u32, Point)> = None;
    for &at in about.places.get(&piece)? {
        let near = work.index.nearest_neighbor_iter_with_distance_2(at);
        for (stretch, d_2) in near.take(MOST_LOOKED_AT) {
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

/// Whether another finding says already why this piece is apart: then one warning is enough.
fn said_already(work: &Work, about: &About, piece: u32, mains: &[u32]) -> Option<&'static str> {
    let all = |test: &dyn Fn(u32) -> bool| mains.iter().all(|&main| test(main));
    if all(&|main| work.assets.mains[main as usize].kind == MainKind::RawWater) {
        return Some("; it carries raw water, which is not calculated");
    }
    if about.missed.contains(&piece) {
        return Some("; a near miss or a bare crossing of one of them was found, see there");
    }
    let apart = mains.iter().any(|main| work.apart.contains(main));
    apart.then_some("; one of them is drawn in parts that do not touch, see there")
}
