//! What the town is made of, before it is written in one format or another. Metres, inches (mains were laid in inch
//! sizes) and litres a second.

use super::plane::{Point, length};

/// How a row is drawn.
#[derive(Clone, PartialEq)]
pub enum Drawing {
    Lines(Vec<Vec<Point>>),
    /// No geometry at all.
    Null,
    /// A geometry without coordinates.
    Empty,
}

#[derive(Clone)]
pub struct Main {
    pub id: Option<u32>,
    pub kind: &'static str,
    pub status: &'static str,
    pub diameter_in: Option<f64>,
    pub material: &'static str,
    pub year: Option<i32>,
    pub c_factor: Option<f64>,
    pub zone: &'static str,
    pub road: String,
    pub stored_length_m: Option<f64>,
    pub drawing: Drawing,
    /// Index of the street it lies in; those of closes and laterals are `usize::MAX`.
    pub street: usize,
    /// The nodes its two ends lie on.
    pub ends: [usize; 2],
    /// The nodes that stand on its middle.
    pub tees: Vec<usize>,
    /// Whether a fault was planted on it, so that no second one is.
    pub planted: bool,
    /// Copies of a main: which of the two is kept is the reader's choice, so they have no place in `connected.csv`.
    pub is_copy: bool,
}

impl Main {
    /// The only line it is drawn by, if it is drawn by one.
    pub fn line(&self) -> Option<&Vec<Point>> {
        match &self.drawing {
            Drawing::Lines(lines) if lines.len() == 1 && lines[0].len() > 1 => Some(&lines[0]),
            _ => None,
        }
    }

    /// The lines it is drawn by that have a length.
    pub fn lines(&self) -> &[Vec<Point>] {
        match &self.drawing {
            Drawing::Lines(lines) if length(&lines[0]) > 0.0 => lines,
            _ => &[],
        }
    }

    pub fn length_m(&self) -> f64 {
        self.line().map_or(0.0, |line| length(line))
    }

    /// Whether the study calculates with it.
    pub fn in_use(&self) -> bool {
        self.status == "in use" && self.kind != "raw water"
    }

    /// Whether customers and hydrants may be on it.
    pub fn feeds(&self) -> bool {
        self.in_use() && self.kind == "distribution"
    }

    pub fn touches(&self) -> impl Iterator<Item = usize> + '_ {
        self.ends.iter().chain(&self.tees).copied()
    }

    pub fn set_line(&mut self, line: Vec<Point>) {
        self.drawing = Drawing::Lines(vec![line]);
    }
}

/// A place where mains end or meet.
#[derive(Clone)]
pub struct Node {
    pub at: Point,
    pub zone: &'static str,
    pub kind: &'static str,
    pub head_m: Option<f64>,
    pub demand_lps: f64,
    pub elevation_m: Option<f64>,
    /// Whether the nodes layer has it.
    pub drawn: bool,
}

pub struct Hydrant {
    pub at: Point,
    pub elevation_m: Option<f64>,
    pub needed_gpm: f64,
    pub zone: &'static str,
}

pub struct Customer {
    pub at: Point,
    pub demand_lps: f64,
    pub class: &'static str,
}

pub struct Valve {
    pub at: Point,
    pub kind: &'static str,
    pub status: &'static str,
    pub main: Option<u32>,
}

/// A fault that was planted.
pub struct Fault {
    /// In plain words.
    pub fault: &'static str,
    /// The code of the finding that should name it.
    pub code: &'static str,
    pub layer: &'static str,
    /// The user's id, or `row 12` (from 1) where it has none.
    pub feature: String,
    /// Other ids, apart by spaces.
    pub other: String,
    pub note: String,
}

#[derive(Default)]
pub struct Town {
    pub nodes: Vec<Node>,
    pub mains: Vec<Main>,
    pub hydrants: Vec<Hydrant>,
    pub customers: Vec<Customer>,
    pub valves: Vec<Valve>,
    pub faults: Vec<Fault>,
}

/// Ids of the layers start here, so that no two layers share one.
pub const FIRST_MAIN_ID: u32 = 1001;
pub const FIRST_NODE_ID: u32 = 1;
pub const FIRST_HYDRANT_ID: u32 = 5001;
pub const FIRST_CUSTOMER_ID: u32 = 20001;
pub const FIRST_VALVE_ID: u32 = 8001;

impl Town {
    pub fn add_node(&mut self, at: Point, zone: &'static str) -> usize {
        self.nodes.push(Node {
            at,
            zone,
            kind: "node",
            head_m: None,
            demand_lps: 0.0,
            elevation_m: Some(super::terrain::elevation(at)),
            drawn: true,
        });
        self.nodes.len() - 1
    }

    /// Adds a main under the next id and returns its index.
    pub fn add_main(&mut self, mut main: Main) -> usize {
        let last = self.mains.iter().filter_map(|other| other.id).max();
        main.id = Some(last.map_or(FIRST_MAIN_ID, |id| id + 1));
        self.mains.push(main);
        self.mains.len() - 1
    }

    /// Mains in use that end on a node or have it on their middle.
    pub fn mains_at(&self, node: usize) -> Vec<usize> {
        (0..self.mains.len())
            .filter(|index| self.mains[*index].in_use() && self.mains[*index].touches().any(|its| its == node))
            .collect()
    }

    /// How many mains' ends lie on a node, and how many mains it is on the middle of.
    pub fn ends_and_tees(&self, node: usize) -> (usize, usize) {
        let in_use = || self.mains.iter().filter(|main| main.in_use());
        let ends = in_use()
            .map(|main| main.ends.iter().filter(|end| **end == node).count())
            .sum();
        (ends, in_use().filter(|main| main.tees.contains(&node)).count())
    }

    /// How many mains one passes from node to node without `left_out`; `None` if there is no way.
    pub fn hops(&self, from: usize, to: usize, left_out: &[usize]) -> Option<usize> {
        let mut hops = vec![usize::MAX; self.nodes.len()];
        let mut queue = std::collections::VecDeque::from([from]);
        hops[from] = 0;
        while let Some(node) = queue.pop_front() {
            if node == to {
                return Some(hops[node]);
            }
            for index in self
                .mains_at(node)
                .into_iter()
                .filter(|index| !left_out.contains(index))
            {
                for other in self.mains[index].touches() {
                    if hops[other] == usize::MAX {
                        hops[other] = hops[node] + 1;
                        queue.push_back(other);
                    }
                }
            }
        }
        None
    }

    /// Distance from a place to the nearest main that is drawn, leaving some out, m.
    pub fn clearance(&self, place: Point, left_out: &[usize]) -> f64 {
        let mains = self
            .mains
            .iter()
            .enumerate()
            .filter(|(index, _)| !left_out.contains(index));
        mains
            .filter_map(|(_, main)| main.line())
            .map(|line| super::plane::nearest_on(line, place).distance)
            .fold(f64::INFINITY, f64::min)
    }

    pub fn main_name(&self, index: usize) -> String {
        self.mains[index]
            .id
            .map_or(format!("row {}", index + 1), |id| id.to_string())
    }

    pub fn plant(&mut self, fault: &'static str, code: &'static str, mains: &[usize], note: impl Into<String>) {
        for index in mains {
            self.mains[*index].planted = true;
        }
        let others: Vec<String> = mains[1..].iter().map(|index| self.main_name(*index)).collect();
        self.faults.push(Fault {
            fault,
            code,
            layer: "mains",
            feature: self.main_name(mains[0]),
            other: others.join(" "),
            note: note.into(),
        });
    }
}
