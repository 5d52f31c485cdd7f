//! Topology: from a drawing to parts and nodes, by a visible list of named cleaning steps (`cleaning.rs`).
//!
//! Everything works in the local plane, in metres. Nothing here depends on the row a main stands in or on the direction it
//! is drawn in: ties are broken by geometry.

mod cleaning;
mod crossings;
mod customers;
mod cutting;
mod duplicates;
mod exact_ends;
mod geometry;
mod hydrants;
mod invariants;
mod joined;
mod lines;
mod marks;
mod multipart;
mod near_joins;
mod near_misses;
mod node_points;
mod overshoots;
mod pieces;
mod self_loops;
mod short_mains;
mod tolerance;
mod touching;
mod undrawn;
mod valves;
mod web;
mod zones;

#[cfg(test)]
mod tests;

use crate::assets::{Assets, Point};
use crate::finding::{Checked, Sentence};

/// How mains are joined. Every threshold of this room.
#[derive(Clone, Debug, PartialEq)]
pub struct JoinSettings {
    /// Ends no farther apart than this are joined without asking, m.
    pub tolerance_m: f64,
    /// How far to look for near misses, m.
    pub look_m: f64,
    /// An end this close to a main counts as touching it, m.
    pub touch_m: f64,
    /// What happens where mains of two known zones touch.
    pub zones: ZoneContact,
}

impl Default for JoinSettings {
    fn default() -> Self {
        JoinSettings {
            tolerance_m: 0.3,
            look_m: 3.0,
            touch_m: 0.001,
            zones: ZoneContact::Apart,
        }
    }
}

/// What happens where mains of two different known zones touch with nothing drawn between them.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum ZoneContact {
    /// Kept apart, and said.
    #[default]
    Apart,
    /// Joined as if there were no zones.
    Ignore,
}

/// A place where parts meet or end. Its index is its number everywhere downstream.
#[derive(Clone, Debug, PartialEq)]
pub struct MapNode {
    /// Where, local plane, m.
    pub at: Point,
    /// Indices into `Assets::nodes` of the points that stand on it, those with a head first.
    pub points: Vec<u32>,
}

/// A piece of a main between two nodes. Its index is its number everywhere downstream.
#[derive(Clone, Debug, PartialEq)]
pub struct MapPart {
    /// Index into `Assets::mains`.
    pub main: u32,
    /// Index into [`PipeMap::lines`]: the cleaned line that it is a piece of.
    pub line: u32,
    /// Node at its start, in the drawn direction.
    pub from: u32,
    /// Node at its end.
    pub to: u32,
    /// Where it starts along the cleaned line, m in the local plane.
    pub start_m: f64,
    /// Where it ends along the cleaned line, m in the local plane.
    pub end_m: f64,
}

/// A cleaned line: a main, or one of the parts of a main whose parts do not touch.
#[derive(Clone, Debug, PartialEq)]
pub struct CleanLine {
    /// Index into `Assets::mains`.
    pub main: u32,
    /// Vertices, local plane, m: at least two, no two neighbours equal.
    pub vertices: Vec<Point>,
    /// Length in the local plane, m.
    pub length_m: f64,
}

/// How two mains were found to connect, or why they were thought to.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum JoinKind {
    /// Two ends on the same spot.
    EndOnEnd,
    /// Two ends within the tolerance.
    EndNearEnd,
    /// An end on the middle of a main, touching it.
    EndOnMiddle,
    /// An end within the tolerance of the middle of a main.
    EndNearMiddle,
    /// An end that runs past the main it meets by less than the tolerance.
    Overshoot,
    /// Ends brought together by a point feature between them.
    EndOnPoint,
    /// Two mains that cross without a shared end: never joined.
    Crossing,
    /// A free end just outside the tolerance of another main: not joined.
    NearMiss,
    /// Mains of two known zones that touch: kept apart.
    ZonesApart,
}

impl JoinKind {
    /// The words that are written.
    pub fn word(self) -> &'static str {
        match self {
            JoinKind::EndOnEnd => "end on end",
            JoinKind::EndNearEnd => "end near end",
            JoinKind::EndOnMiddle => "end on middle",
            JoinKind::EndNearMiddle => "end near middle",
            JoinKind::Overshoot => "overshoot",
            JoinKind::EndOnPoint => "end on point",
            JoinKind::Crossing => "crossing",
            JoinKind::NearMiss => "near miss",
            JoinKind::ZonesApart => "zones apart",
        }
    }
}

/// A connection inferred, or considered and left apart.
#[derive(Clone, Debug, PartialEq)]
pub struct Join {
    /// What kind.
    pub kind: JoinKind,
    /// The main whose end it is (for a crossing: either).
    pub main_a: u32,
    /// The main it meets.
    pub main_b: u32,
    /// The end, or the place of a crossing, local plane, m.
    pub at: Point,
    /// The place on the other main, local plane, m.
    pub to: Point,
    /// Distance between the two, m.
    pub distance_m: f64,
    /// Whether the two were joined.
    pub joined: bool,
    /// What speaks for it and against it, in words.
    pub why: String,
}

/// Where a hydrant, a valve or a customer meets the network.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Tap {
    /// Index into `Assets::mains`.
    pub main: u32,
    /// The node: that of the hydrant; for a customer the nearer end, along the main, of the part it meets.
    pub node: u32,
    /// Distance from the point to the main, m.
    pub distance_m: f64,
}

/// What became of a valve.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum ValvePlace {
    /// Open, or off the line: it changes nothing.
    NoEffect,
    /// Closed: it cuts its main between two nodes on one spot.
    Cut {
        /// Index into `Assets::mains`.
        main: u32,
        /// The node on the side of the main's start.
        node_a: u32,
        /// The node on the side of the main's end.
        node_b: u32,
    },
    /// Closed, but it could not be said what it shuts (a finding says why).
    Unplaced,
}

/// What one tolerance would do to this map.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ToleranceRow {
    /// The tolerance, m.
    pub tolerance_m: f64,
    /// Joins it would make beyond exact contact.
    pub joins: u32,
    /// Parts of the network that would hang together, counted.
    pub islands: u32,
    /// Share of the drawn length in the largest of them, 0 to 1.
    pub largest_share: f64,
    /// Mains no longer than it, whose ends it would bring together.
    pub swallowed: u32,
}

/// The tolerance table, with a suggestion and the reason for it.
#[derive(Clone, Debug, PartialEq)]
pub struct ToleranceTable {
    /// One row a tolerance, rising.
    pub rows: Vec<ToleranceRow>,
    /// The tolerance this map asks for, m.
    pub suggested_m: f64,
    /// Why, in a sentence.
    pub reason: Sentence,
}

/// How many rows each cleaning step touched.
#[derive(Clone, Debug, PartialEq)]
pub struct StepCount {
    /// The step's name, as written in `cleaning.rs`.
    pub step: &'static str,
    /// How many mains, ends or joins it dealt with.
    pub count: u32,
}

/// Cleans the drawing step by step, says which mains connect, and cuts them into parts between nodes. Bad drawing is never
/// an error: it becomes a finding on the user's own feature.
pub fn infer(assets: &Assets, settings: &JoinSettings) -> Checked<PipeMap> {
    cleaning::clean(assets, settings)
}

/// Which mains connect, and where everything stands on them.
#[derive(Clone, Debug, Default)]
pub struct PipeMap {
    /// Nodes.
    pub nodes: Vec<MapNode>,
    /// Parts: those of one main stand together, in the drawn order.
    pub parts: Vec<MapPart>,
    /// Cleaned lines.
    pub lines: Vec<CleanLine>,
    /// Mains left out as copies of another: the copy, and the main that is calculated for both.
    pub same_as: Vec<(u32, u32)>,
    /// Every join made or considered.
    pub joins: Vec<Join>,
    /// The node each of `Assets::nodes` stands on.
    pub node_of_point: Vec<Option<u32>>,
    /// Where each hydrant taps its main.
    pub hydrants: Vec<Option<Tap>>,
    /// Where each customer draws.
    pub customers: Vec<Option<Tap>>,
    /// What became of each valve.
    pub valves: Vec<Option<ValvePlace>>,
    /// The connected piece each node belongs to, from 0, the longest first.
    pub piece_of_node: Vec<u32>,
    /// Drawn length of each connected piece, m.
    pub piece_length_m: Vec<f64>,
    /// The tolerance table.
    pub tolerance: Option<ToleranceTable>,
    /// What each cleaning step did, in order.
    pub steps: Vec<StepCount>,
}
