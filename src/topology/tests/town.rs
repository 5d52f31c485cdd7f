//! Whole invented towns: a street grid with everything real maps have, and faults planted at random. What connects is known
//! by construction, and is compared with what was inferred.

use std::collections::{BTreeMap, BTreeSet};

use super::draw::{Board, MAINS};
use crate::assets::{Drawing, Point};
use crate::finding::{Code, Severity};

/// A small generator of repeatable random numbers (xorshift).
pub struct Chance(u64);

impl Chance {
    pub fn new(seed: u64) -> Self {
        Chance(seed.wrapping_mul(0x9E37_79B9_7F4A_7C15) | 1)
    }

    /// From 0 to 1.
    pub fn share(&mut self) -> f64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }

    pub fn within(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.share()
    }

    pub fn below(&mut self, n: usize) -> usize {
        ((self.share() * n as f64) as usize).min(n - 1)
    }
}

/// A main under construction: its vertices and the true node at each end and on the way.
#[derive(Clone)]
struct Drawn {
    vertices: Vec<Point>,
    nodes: Vec<usize>,
    /// Whether a fault may be planted at its first and last end.
    faultless: bool,
    diameter_m: f64,
}

/// A town and what is true of it.
pub struct Town {
    pub board: Board,
    pub truth: BTreeSet<(u32, u32)>,
    /// Planted faults: the code that must name the main.
    pub planted: Vec<(Vec<Code>, u32)>,
}

/// What kind of town.
#[derive(Clone, Copy)]
pub struct Plan {
    pub seed: u64,
    /// Corners a side.
    pub size: usize,
    /// How many faults to plant.
    pub faults: usize,
    /// By what angle the town is turned.
    pub turn: f64,
    /// Coordinates are rounded to this, m; 0 for not at all.
    pub rounded_m: f64,
    /// Whether the streets are straight and at right angles.
    pub square: bool,
    /// Whether a node point stands on every true node.
    pub node_points: bool,
}

impl Plan {
    pub fn new(seed: u64, size: usize, faults: usize, turn: f64) -> Self {
        Plan {
            seed,
            size,
            faults,
            turn,
            rounded_m: 0.0,
            square: false,
            node_points: false,
        }
    }
}

/// Kinds of faults that are planted, and the first that befalls a branch.
const KINDS: usize = 11;
const FIRST_BRANCH_KIND: usize = 7;
const SPACING_M: f64 = 90.0;

fn offset(p: Point, dx: f64, dy: f64) -> Point {
    [p[0] + dx, p[1] + dy]
}

fn toward(from: Point, to: Point, m: f64) -> Point {
    let length = (to[0] - from[0]).hypot(to[1] - from[1]);
    [
        from[0] + (to[0] - from[0]) / length * m,
        from[1] + (to[1] - from[1]) / length * m,
    ]
}

/// Builds a town of about `size * size * 2` street mains and what belongs to them.
pub fn build(plan: Plan) -> Town {
    let size = plan.size;
    let mut chance = Chance::new(plan.seed);
    let mut places: Vec<Point> = Vec::new();
    let mut mains: Vec<Drawn> = Vec::new();
    let mut hydrants: Vec<Point> = Vec::new();
    let corner = |i: usize, j: usize| i * size + j;
    for i in 0..size {
        for j in 0..size {
            let crooked_m = if plan.square { 0.0 } else { 12.0 };
            let (dx, dy) = (
                chance.within(-crooked_m, crooked_m),
                chance.within(-crooked_m, crooked_m),
            );
            places.push([i as f64 * SPACING_M + dx, j as f64 * SPACING_M + dy]);
        }
    }
    let main = |vertices: Vec<Point>, nodes: Vec<usize>| Drawn {
        vertices,
        nodes,
        faultless: false,
        diameter_m: 0.15,
    };
    // Streets, most with a bend; some run on over several corners without being split.
    for i in 0..size {
        for j in 0..size {
            for (u, v) in [(i + 1, j), (i, j + 1)] {
                let outermost = i == 0 && u == 0;
                if u >= size || v >= size || (!outermost && chance.share() < 0.08) {
                    continue;
                }
                let (a, b) = (corner(i, j), corner(u, v));
                let (p, q) = (places[a], places[b]);
                let mut vertices = vec![p];
                if chance.share() < 0.5 && !plan.square {
                    let middle = [(p[0] + q[0]) / 2.0, (p[1] + q[1]) / 2.0];
                    vertices.push(offset(middle, chance.within(-6.0, 6.0), chance.within(-6.0, 6.0)));
                }
                vertices.push(q);
                mains.push(main(vertices, vec![a, b]));
            }
        }
    }
    let column: Vec<Vec<Point>> = mains
        .iter()
        .filter(|m| m.nodes[1] == m.nodes[0] + 1 && m.nodes[1] < size)
        .map(|m| m.vertices.clone())
        .collect();
    join_through(&mut mains, &mut chance);
    let streets = mains.len();
    // Side branches off the middle of a street that is not split for them: laterals, stubs, cul-de-sacs, cross fittings.
    for street in 0..streets {
        // Nothing ends in the narrow strip between the outermost street and the main beside it.
        if mains[street].nodes.iter().filter(|&&node| node < size).count() > 1 {
            continue;
        }
        let branches = chance.below(3);
        for branch in 0..branches {
            let segment = chance.below(mains[street].vertices.len() - 1);
            let (p, q) = (mains[street].vertices[segment], mains[street].vertices[segment + 1]);
            let length = (q[0] - p[0]).hypot(q[1] - p[1]);
            let from = if branch == 0 { 0.2 } else { 0.55 };
            let t = chance.within(from, from + 0.25);
            let start = toward(p, q, t * length);
            let (ux, uy) = ((q[0] - p[0]) / length, (q[1] - p[1]) / length);
            let side = if chance.share() < 0.5 { 1.0 } else { -1.0 };
            let slant = chance.within(-0.5, 0.5);
            let (nx, ny) = (-uy * side + ux * slant, ux * side + uy * slant);
            let node = places.len();
            places.push(start);
            mains[street].nodes.push(node);
            let reach = match chance.below(4) {
                0 | 1 => chance.within(1.5, 5.0),
                2 => chance.within(0.5, 1.5),
                _ => chance.within(15.0, 28.0),
            };
            let tip = offset(start, nx * reach, ny * reach);
            let clear = mains
                .iter()
                .enumerate()
                .all(|(other, main)| other == street || is_clear(main, start, tip));
            if !clear || !is_clear_of(&mains[street], toward(start, tip, 1.0), tip, 0.9) {
                mains[street].nodes.pop();
                continue;
            }
            let end = places.len();
            places.push(tip);
            let mut lateral = main(vec![start, places[end]], vec![node, end]);
            lateral.faultless = reach < 3.0;
            lateral.diameter_m = 0.1;
            mains.push(lateral);
            if (1.5..5.0).contains(&reach) && chance.share() < 0.7 {
                hydrants.push(places[end]);
            }
        }
    }
    valve_clusters(&mut mains, &mut places, streets, &mut chance);
    twins(&mut mains, &mut places, &column);
    plant(mains, places, hydrants, streets, plan, &mut chance)
}

/// Whether a branch keeps 3.5 m away from another main.
fn is_clear(main: &Drawn, from: Point, to: Point) -> bool {
    is_clear_of(main, from, to, 3.5)
}

fn is_clear_of(main: &Drawn, from: Point, to: Point, m: f64) -> bool {
    (0..=20).all(|step| {
        let t = f64::from(step) / 20.0;
        let p = [from[0] + (to[0] - from[0]) * t, from[1] + (to[1] - from[1]) * t];
        main.vertices.windows(2).all(|pair| {
            let (a, b) = (pair[0], pair[1]);
            let (ux, uy) = (b[0] - a[0], b[1] - a[1]);
            let share = (((p[0] - a[0]) * ux + (p[1] - a[1]) * uy) / (ux * ux + uy * uy)).clamp(0.0, 1.0);
            (a[0] + ux * share - p[0]).hypot(a[1] + uy * share - p[1]) > m
        })
    })
}

/// Makes one main of two streets that go straight on, here and there: the main at the corner is then not split.
/// Not two at one corner: two unsplit mains that cross are a bare crossing.
fn join_through(mains: &mut Vec<Drawn>, chance: &mut Chance) {
    let mut passed: BTreeSet<usize> = BTreeSet::new();
    let mut i = 0;
    while i < mains.len() {
        let last = *mains[i].nodes.last().unwrap();
        let next = (i + 1..mains.len()).find(|&j| mains[j].nodes[0] == last && mains[j].nodes.len() == 2);
        if let Some(j) = next
            && chance.share() < 0.15
            && passed.insert(last)
        {
            let other = mains.remove(j);
            let of = &mut mains[i];
            of.vertices.extend(&other.vertices[1..]);
            of.nodes.extend(&other.nodes[1..]);
        }
        i += 1;
    }
}

/// Puts a valve cluster of 0.4 m mains at the start of some streets.
fn valve_clusters(mains: &mut Vec<Drawn>, places: &mut Vec<Point>, streets: usize, chance: &mut Chance) {
    for street in 0..streets {
        if chance.share() > 0.08 {
            continue;
        }
        let (corner, next) = (mains[street].vertices[0], mains[street].vertices[1]);
        let start = toward(corner, next, 0.4);
        let node = places.len();
        places.push(start);
        let at_corner = mains[street].nodes[0];
        mains[street].vertices[0] = start;
        mains[street].nodes[0] = node;
        mains[street].faultless = true;
        mains.push(Drawn {
            vertices: vec![corner, start],
            nodes: vec![at_corner, node],
            faultless: true,
            diameter_m: 0.15,
        });
    }
}

/// Lays a long main beside the outermost street, 1.2 m from it, connected nowhere on the way.
fn twins(mains: &mut Vec<Drawn>, places: &mut Vec<Point>, column: &[Vec<Point>]) {
    let size = column.len() + 1;
    let beside = |p: Point| offset(p, -1.2, 0.0);
    let first = places.len();
    places.push(beside(column[0][0]));
    for street in column {
        let vertices: Vec<Point> = street.iter().map(|&p| beside(p)).collect();
        let node = places.len();
        places.push(vertices[vertices.len() - 1]);
        mains.push(Drawn {
            vertices,
            nodes: vec![node - 1, node],
            faultless: true,
            diameter_m: 0.4,
        });
    }
    // It hangs together with the rest far outside.
    let far = offset(places[0], -60.0, -60.0);
    let node = places.len();
    places.push(far);
    debug_assert_eq!(mains[mains.len() - (size - 1)].nodes[0], first);
    for (start, other) in [(places[first], first), (places[0], 0)] {
        let middle = if other == 0 {
            offset(far, 60.0, 0.0)
        } else {
            offset(far, 0.0, 60.0)
        };
        mains.push(Drawn {
            vertices: vec![start, middle, far],
            nodes: vec![other, node],
            faultless: true,
            diameter_m: 0.4,
        });
    }
}

fn plant(
    mut mains: Vec<Drawn>,
    places: Vec<Point>,
    hydrants: Vec<Point>,
    streets: usize,
    plan: Plan,
    chance: &mut Chance,
) -> Town {
    let (faults, size) = (plan.faults, plan.size);
    let mut board = Board::new(1.0);
    let mut planted: Vec<(Vec<Code>, u32)> = Vec::new();
    let mut cut_off: BTreeSet<(usize, usize)> = BTreeSet::new();
    let mut extra: Vec<Drawn> = Vec::new();
    let mut touched: BTreeSet<usize> = BTreeSet::new();
    let mut degree: BTreeMap<usize, usize> = BTreeMap::new();
    for main in &mains {
        for (k, &node) in main.nodes.iter().enumerate() {
            *degree.entry(node).or_default() += if k == 0 || k + 1 == main.nodes.len() { 1 } else { 2 };
        }
    }
    let mut tries = 0;
    while planted.len() < faults && tries < faults * 50 {
        tries += 1;
        let kind = planted.len() % KINDS;
        // The last kinds befall branches off a street, the others streets.
        let branch = kind >= FIRST_BRANCH_KIND;
        let i = if branch {
            streets + chance.below(mains.len() - streets)
        } else {
            chance.below(streets)
        };
        let node = mains[i].nodes[0];
        let length_m = (mains[i].vertices[1][0] - mains[i].vertices[0][0])
            .hypot(mains[i].vertices[1][1] - mains[i].vertices[0][1]);
        if branch && length_m < if kind == FIRST_BRANCH_KIND { 2.5 } else { 6.0 } {
            continue;
        }
        // Beside the twin of the outermost street an end could as well belong to that.
        if node < size
            || mains[i].faultless
            || degree[&node] < 2
            || touched.contains(&node)
            || !touched.insert(1_000_000 + i)
        {
            continue;
        }
        touched.insert(node);
        // A street whose end is moved aside draws its branches off with it: one fault a street is enough then.
        if kind == 4 && mains[i].nodes[1..].iter().any(|other| !touched.insert(*other)) {
            continue;
        }
        let (start, next) = (mains[i].vertices[0], mains[i].vertices[1]);
        // An end moved at random beside a valve cluster could as well belong to a piece of it.
        let cluster = mains.iter().any(|main| main.faultless && main.nodes.contains(&node));
        if kind == 4 && cluster {
            continue;
        }
        match kind {
            0 => {
                mains[i].vertices[0] = toward(start, next, chance.within(0.05, 0.9));
                planted.push((vec![Code::EndJoined, Code::EndJoinedToMiddle], i as u32));
            }
            1 => {
                mains[i].vertices[0] = toward(start, next, -chance.within(0.1, 0.9));
                planted.push((vec![Code::Overshoot, Code::EndJoined], i as u32));
            }
            2 => {
                mains[i].vertices[0] = toward(start, next, chance.within(1.2, 2.8));
                cut_off.insert((i, node));
                planted.push((vec![Code::NearMiss], i as u32));
            }
            3 => {
                let mut copy = mains[i].clone();
                copy.vertices.reverse();
                if chance.share() < 0.5 {
                    let (dx, dy) = (chance.within(-0.3, 0.3), chance.within(-0.3, 0.3));
                    copy.vertices.iter_mut().for_each(|p| *p = offset(*p, dx, dy));
                }
                copy.nodes.clear();
                extra.push(copy);
                planted.push((vec![Code::DuplicateMain], i as u32));
            }
            4 => {
                // Beside a main that is not split here, a farther place could be a tee of its own.
                let unsplit = mains.iter().any(|m| m.nodes.len() > 2 && m.nodes[1..].contains(&node));
                let far = if unsplit { 0.35 } else { 0.6 };
                let (dx, dy) = (chance.within(-far, far), chance.within(-far, far));
                let moved = offset(start, dx, dy);
                // An end that touches a main by chance has a better reason to be joined to it.
                if !mains
                    .iter()
                    .enumerate()
                    .all(|(k, m)| k == i || is_clear_of(m, moved, moved, 0.02))
                {
                    continue;
                }
                mains[i].vertices[0] = moved;
                planted.push((
                    vec![Code::EndJoined, Code::EndJoinedToMiddle, Code::Overshoot],
                    i as u32,
                ));
            }
            5 => {
                // A main of its own across the middle of this one.
                let middle = toward(start, next, 7.3);
                let (ux, uy) = ((next[0] - start[0]) / 40.0, (next[1] - start[1]) / 40.0);
                let (a, b) = (offset(middle, -uy * 4.0, ux * 4.0), offset(middle, uy * 4.0, -ux * 4.0));
                let mut bare = mains[i].clone();
                bare.vertices = vec![toward(middle, a, 4.0), toward(middle, b, 4.0)];
                bare.nodes.clear();
                let others = mains.iter().chain(&extra).enumerate().filter(|(other, _)| *other != i);
                if !others
                    .into_iter()
                    .all(|(_, main)| is_clear(main, bare.vertices[0], bare.vertices[1]))
                {
                    continue;
                }
                extra.push(bare);
                planted.push((vec![Code::CrossingNotJoined], i as u32));
            }
            7 => {
                mains[i].vertices[0] = toward(start, next, chance.within(0.05, 0.9));
                planted.push((
                    vec![Code::EndJoinedToMiddle, Code::EndJoined, Code::Overshoot],
                    i as u32,
                ));
            }
            8 => {
                mains[i].vertices[0] = toward(start, next, -chance.within(0.05, 0.9));
                planted.push((vec![Code::Overshoot, Code::EndJoinedToMiddle], i as u32));
            }
            9 => {
                mains[i].vertices[0] = toward(start, next, chance.within(1.2, 2.8));
                cut_off.insert((i, node));
                planted.push((vec![Code::NearMiss], i as u32));
            }
            10 => {
                mains[i].vertices[0] = toward(start, next, -chance.within(1.2, 2.8));
                cut_off.insert((i, node));
                planted.push((vec![Code::CrossingNotJoined], i as u32));
            }
            _ => {
                let mut ring = mains[i].clone();
                let p = places[node];
                let out = chance.within(0.0, std::f64::consts::TAU);
                let at = |a: f64, r: f64| offset(p, (out + a).cos() * r, (out + a).sin() * r);
                let mut all = mains.iter().chain(&extra);
                if !all.all(|main| {
                    (0..4).all(|k| is_clear_of(main, at(0.1 * k as f64, 3.0), at(0.1 * k as f64, 7.0), 1.0))
                }) {
                    continue;
                }
                ring.vertices = vec![p, at(0.1, 6.0), at(0.3, 6.5), at(0.35, 4.0), p];
                ring.nodes = vec![node];
                extra.push(ring);
                planted.push((vec![Code::SelfLoop], (mains.len() + extra.len() - 1) as u32));
            }
        }
    }
    mains.extend(extra);
    let (sin, cos) = plan.turn.sin_cos();
    let round = |v: f64| {
        if plan.rounded_m > 0.0 {
            (v / plan.rounded_m).round() * plan.rounded_m
        } else {
            v
        }
    };
    let rotate = |p: Point| [round(p[0] * cos - p[1] * sin), round(p[0] * sin + p[1] * cos)];
    for main in &mains {
        let row = board.main(&main.vertices.iter().map(|&p| rotate(p)).collect::<Vec<_>>());
        board.of_diameter(row, main.diameter_m);
    }
    hydrants.iter().for_each(|&p| {
        board.hydrant(rotate(p));
    });
    board.source(rotate(places[places.len() - 1]));
    if plan.node_points {
        places.iter().for_each(|&p| {
            board.node(rotate(p));
        });
    }
    let mut truth = BTreeSet::new();
    let mut at: BTreeMap<usize, Vec<u32>> = BTreeMap::new();
    for (i, main) in mains.iter().enumerate() {
        for &node in main.nodes.iter().filter(|&&node| !cut_off.contains(&(i, node))) {
            at.entry(node).or_default().push(i as u32);
        }
    }
    for of_node in at.values() {
        for &a in of_node {
            truth.extend(of_node.iter().filter(|&&b| a < b).map(|&b| (a, b)));
        }
    }
    Town { board, truth, planted }
}

/// Compares one town with the truth; returns the other warnings.
fn judge(plan: Plan) -> (usize, usize) {
    let (town, seed) = (build(plan), plan.seed);
    let seen = town.board.infer();
    let found = seen.pairs();
    // A copy that was left out stands for the one that was kept, and the other way round.
    let same = &seen.map().same_as;
    let as_kept = |m: u32| {
        same.iter()
            .find(|(dropped, _)| *dropped == m)
            .map_or(m, |(_, kept)| *kept)
    };
    let truth: BTreeSet<(u32, u32)> = town
        .truth
        .iter()
        .map(|&(a, b)| (as_kept(a), as_kept(b)))
        .map(|(a, b)| (a.min(b), a.max(b)))
        .collect();
    let describe = |pair: &&(u32, u32)| {
        let at = |m: u32| match &town.board.assets.mains[m as usize].drawing {
            Drawing::Lines(parts) => parts[0].clone(),
            _ => Vec::new(),
        };
        let about = |m: u32| {
            let feature = crate::finding::FeatureRef { layer: MAINS, row: m };
            let named = seen
                .findings()
                .iter()
                .filter(|f| f.feature == Some(feature) || f.others.contains(&feature));
            named
                .map(|f| (f.code, f.feature.map(|f| f.row), f.at))
                .collect::<Vec<_>>()
        };
        let (a, b) = (pair.0, pair.1);
        let joins = seen
            .map()
            .joins
            .iter()
            .filter(|j| [j.main_a, j.main_b].iter().any(|m| [a, b].contains(m)));
        let joins: Vec<_> = joins.map(|j| (j.kind, j.main_a, j.main_b, j.at, j.joined)).collect();
        format!(
            "{pair:?} {:?} {:?} {:?} {:?} {joins:?}",
            at(a),
            at(b),
            about(a),
            about(b)
        )
    };
    if let Some(wrong) = found.difference(&truth).next() {
        panic!("seed {seed}: joined wrongly: {}", describe(&wrong));
    }
    if let Some(missing) = truth.difference(&found).next() {
        panic!("seed {seed}: not joined: {}", describe(&missing));
    }
    for (codes, main) in &town.planted {
        assert!(
            codes.iter().any(|&code| seen.names_main(code, *main)),
            "seed {seed}: {codes:?} of {main} not named: {:?}",
            seen.findings()
                .iter()
                .filter(|f| f.severity > Severity::Note)
                .collect::<Vec<_>>()
        );
    }
    let named = |f: &crate::finding::Finding| {
        town.planted.iter().any(|(codes, main)| {
            let feature = crate::finding::FeatureRef {
                layer: MAINS,
                row: *main,
            };
            codes.contains(&f.code) && (f.feature == Some(feature) || f.others.contains(&feature))
        })
    };
    let others: Vec<_> = seen
        .findings()
        .iter()
        .filter(|f| f.severity > Severity::Note && !named(f))
        .collect();
    if std::env::var("TOWN_WARNINGS").is_ok() {
        for other in &others {
            println!(
                "seed {seed}: {} {:?} {:?}",
                other.code.text().name,
                other.feature,
                other.message.pieces()
            );
        }
    }
    (others.len(), town.board.assets.mains.len())
}

/// Judges many towns; no more than one other warning in a hundred mains.
fn judge_all(plans: impl Iterator<Item = Plan>) {
    let (mut others, mut mains) = (0, 0);
    for plan in plans {
        let (o, m) = judge(plan);
        others += o;
        mains += m;
    }
    assert!(others * 100 <= mains, "{others} other warnings of {mains} mains");
}

fn seeds(first: u64) -> std::ops::Range<u64> {
    let count = std::env::var("TOWNS").ok().and_then(|n| n.parse().ok()).unwrap_or(12);
    first..first + count
}

#[test]
fn towns_without_faults_give_no_warning() {
    judge_all(seeds(1).map(|seed| Plan::new(seed, 10, 0, 0.0)));
}

#[test]
fn towns_with_faults_are_joined_as_they_were_before_and_every_fault_is_named() {
    judge_all(seeds(100).map(|seed| Plan::new(seed, 10, 22, seed as f64 * 0.1)));
}

#[test]
fn coordinates_rounded_to_a_centimetre_make_no_difference() {
    judge_all(seeds(1000).map(|seed| Plan {
        rounded_m: 0.01,
        ..Plan::new(seed, 10, 22, seed as f64 * 0.1)
    }));
}

#[test]
fn node_points_on_the_true_nodes_make_no_difference() {
    judge_all(seeds(2000).map(|seed| Plan {
        node_points: true,
        rounded_m: 0.001,
        ..Plan::new(seed, 10, 22, seed as f64 * 0.1)
    }));
}

#[test]
fn straight_streets_at_right_angles_make_no_difference() {
    judge_all(seeds(3000).map(|seed| Plan {
        square: true,
        ..Plan::new(seed, 10, 22, 0.0)
    }));
}
