//! The street graph: the streets cut where they meet, short stubs trimmed, some links left out.

use super::lcg::Lcg;
use super::plane::{Point, crossing, distance, length, piece, simplify};
use super::streets::Street;

/// A piece of street between two meeting places.
#[derive(Clone)]
pub struct Edge {
    pub from: usize,
    pub to: usize,
    pub line: Vec<Point>,
    pub street: usize,
}

/// Meeting places and the pieces of street between them.
pub struct Graph {
    pub nodes: Vec<Point>,
    pub edges: Vec<Edge>,
}

/// Meeting places nearer than this are one.
const MERGE_M: f64 = 26.0;

impl Graph {
    fn node_at(&mut self, place: Point) -> usize {
        if let Some(found) = self.nodes.iter().position(|node| distance(*node, place) < MERGE_M) {
            return found;
        }
        self.nodes.push(place);
        self.nodes.len() - 1
    }

    /// The edges that meet at a node.
    pub fn at(&self, node: usize) -> Vec<usize> {
        (0..self.edges.len())
            .filter(|edge| self.edges[*edge].from == node || self.edges[*edge].to == node)
            .collect()
    }

    /// Which nodes can be reached from `start` over edges that `pass`.
    pub fn reach(&self, start: usize, pass: impl Fn(usize) -> bool) -> Vec<bool> {
        let mut seen = vec![false; self.nodes.len()];
        let mut stack = vec![start];
        seen[start] = true;
        while let Some(node) = stack.pop() {
            for edge in self.at(node).into_iter().filter(|edge| pass(*edge)) {
                let other = self.edges[edge].from + self.edges[edge].to - node;
                if !seen[other] {
                    seen[other] = true;
                    stack.push(other);
                }
            }
        }
        seen
    }

    /// The node nearest to a place.
    pub fn nearest(&self, place: Point, fits: impl Fn(usize) -> bool) -> usize {
        let by_distance =
            |a: &usize, b: &usize| distance(self.nodes[*a], place).total_cmp(&distance(self.nodes[*b], place));
        (0..self.nodes.len())
            .filter(|node| fits(*node) && !self.at(*node).is_empty())
            .min_by(by_distance)
            .expect("the town has nodes")
    }

    /// The cheapest way between two nodes, as edges; `cost` may forbid an edge with infinity.
    pub fn way(&self, from: usize, to: usize, cost: impl Fn(usize) -> f64) -> Vec<usize> {
        let mut best = vec![f64::INFINITY; self.nodes.len()];
        let mut came_by = vec![usize::MAX; self.nodes.len()];
        let mut done = vec![false; self.nodes.len()];
        best[from] = 0.0;
        while let Some(node) = (0..self.nodes.len())
            .filter(|node| !done[*node] && best[*node].is_finite())
            .min_by(|a, b| best[*a].total_cmp(&best[*b]))
        {
            done[node] = true;
            for edge in self.at(node) {
                let other = self.edges[edge].from + self.edges[edge].to - node;
                let reached = best[node] + cost(edge);
                if reached < best[other] {
                    best[other] = reached;
                    came_by[other] = edge;
                }
            }
        }
        let mut way = Vec::new();
        let mut here = to;
        while here != from && came_by[here] != usize::MAX {
            way.push(came_by[here]);
            here = self.edges[came_by[here]].from + self.edges[came_by[here]].to - here;
        }
        way
    }

    fn trim_stubs(&mut self, shortest_m: f64) {
        loop {
            let stub = (0..self.edges.len()).find(|edge| {
                let Edge { from, to, line, .. } = &self.edges[*edge];
                length(line) < shortest_m && (self.at(*from).len() == 1 || self.at(*to).len() == 1)
            });
            match stub {
                Some(edge) => self.edges.swap_remove(edge),
                None => return,
            };
        }
    }

    fn leave_out_links(&mut self, share: f64, lcg: &mut Lcg) {
        let mut wanted = (share * self.edges.len() as f64) as usize;
        let mut tries = 0;
        while wanted > 0 && tries < 4000 {
            tries += 1;
            let pick = lcg.below(self.edges.len());
            let Edge { from, to, line, .. } = &self.edges[pick];
            let (from, to) = (*from, *to);
            if self.at(from).len() < 3 || self.at(to).len() < 3 || length(line) > 260.0 {
                continue;
            }
            if self.reach(from, |edge| edge != pick)[to] {
                self.edges.swap_remove(pick);
                wanted -= 1;
            }
        }
    }

    fn keep_largest_piece(&mut self) {
        let mut largest = vec![false; self.nodes.len()];
        for start in 0..self.nodes.len() {
            let piece = self.reach(start, |_| true);
            if piece.iter().filter(|in_it| **in_it).count() > largest.iter().filter(|in_it| **in_it).count() {
                largest = piece;
            }
        }
        self.edges.retain(|edge| largest[edge.from]);
    }
}

/// Distances along a street at which it meets others, with the places.
fn meetings(streets: &[Street], own: usize) -> Vec<(f64, Point)> {
    let line = &streets[own].line;
    let mut found = vec![(0.0, line[0]), (length(line), line[line.len() - 1])];
    let mut start = 0.0;
    for pair in line.windows(2) {
        let run = distance(pair[0], pair[1]);
        for (index, other) in streets.iter().enumerate().filter(|(index, _)| *index != own) {
            let _ = index;
            for its in other.line.windows(2) {
                if distance(its[0], pair[0]) > 40.0 {
                    continue;
                }
                if let Some((share, _)) = crossing([pair[0], pair[1]], [its[0], its[1]]) {
                    let along = start + share * run;
                    found.push((along, super::plane::place_along(line, along).0));
                }
            }
        }
        start += run;
    }
    found.sort_by(|a, b| a.0.total_cmp(&b.0));
    found
}

/// Cuts the streets where they meet and tidies the result.
pub fn from_streets(streets: &[Street], lcg: &mut Lcg) -> Graph {
    let mut graph = Graph {
        nodes: Vec::new(),
        edges: Vec::new(),
    };
    for (index, street) in streets.iter().enumerate() {
        let met = meetings(streets, index);
        let cuts: Vec<(f64, usize)> = met
            .iter()
            .map(|(along, place)| (*along, graph.node_at(*place)))
            .collect();
        for pair in cuts.windows(2) {
            let ((start, from), (end, to)) = (pair[0], pair[1]);
            let known = graph.edges.iter().any(|edge| {
                ((edge.from, edge.to) == (from, to) || (edge.to, edge.from) == (from, to))
                    && (length(&edge.line) - (end - start)).abs() < 40.0
            });
            if from == to || end - start < MERGE_M || known {
                continue;
            }
            let mut line = piece(&street.line, start, end);
            let last = line.len() - 1;
            line[0] = graph.nodes[from];
            line[last] = graph.nodes[to];
            graph.edges.push(Edge {
                from,
                to,
                line: simplify(&line, 0.9),
                street: index,
            });
        }
    }
    graph.trim_stubs(48.0);
    graph.leave_out_links(0.09, lcg);
    graph.keep_largest_piece();
    graph
}
