//! How long the hydraulics take on street-like networks: `cargo bench --bench solver`.
//!
//! Trust ratios inside one run, not seconds. The networks are made by a generator of our own, always the same: 1.25 mains a
//! node, 44 % of nodes with two mains, 14 % dead ends, a grid of trunk mains, one source for each 10,000 nodes.

use std::sync::LazyLock;

use divan::{Bencher, black_box};
use gradeline::hydraulics::{Factoring, Kept, Settings, Solver, State};
use gradeline::network::{Basis, Condition, Friction, Network, NodeIx, Part, Source, Valued};
use rayon::prelude::*;

fn main() {
    divan::main();
}

const SIZES: [usize; 2] = [10_000, 100_000];

/// A network with its average day and the solver for it.
struct Town {
    network: Network,
    condition: Condition,
    solver: Solver,
    base: State,
}

static TOWNS: LazyLock<Vec<Town>> = LazyLock::new(|| SIZES.iter().map(|&nodes| town(nodes, c_factor)).collect());
static ROUGH_TOWNS: LazyLock<Vec<Town>> = LazyLock::new(|| SIZES.iter().map(|&nodes| town(nodes, roughness)).collect());

fn of(towns: &[Town], nodes: usize) -> &Town {
    &towns[SIZES.iter().position(|&size| size == nodes).unwrap()]
}

#[divan::bench(args = SIZES, sample_count = 20)]
fn prepare(bencher: Bencher, nodes: usize) {
    let town = of(&TOWNS, nodes);
    bencher.bench(|| Solver::new(black_box(&town.network), Settings::default()));
}

#[divan::bench(args = SIZES, sample_count = 20)]
fn cold_solve(bencher: Bencher, nodes: usize) {
    let town = of(&TOWNS, nodes);
    bencher.bench(|| town.solver.solve(black_box(&town.condition), None).unwrap());
}

#[divan::bench(args = SIZES, sample_count = 20)]
fn cold_solve_darcy_weisbach(bencher: Bencher, nodes: usize) {
    let town = of(&ROUGH_TOWNS, nodes);
    bencher.bench(|| town.solver.solve(black_box(&town.condition), None).unwrap());
}

#[divan::bench(args = SIZES, sample_count = 20)]
fn cold_solve_with_faer_numbers(bencher: Bencher, nodes: usize) {
    let town = of(&TOWNS, nodes);
    let settings = Settings {
        factoring: Factoring::Faer,
        ..Settings::default()
    };
    let solver = Solver::new(&town.network, settings);
    bencher.bench(|| solver.solve(black_box(&town.condition), None).unwrap());
}

#[divan::bench(args = SIZES, sample_count = 20)]
fn warm_solve_with_a_tenth_more_demand(bencher: Bencher, nodes: usize) {
    let town = of(&TOWNS, nodes);
    let mut more = town.condition.clone();
    more.demand_m3_per_s.iter_mut().for_each(|demand| *demand *= 1.1);
    bencher.bench(|| town.solver.solve(black_box(&more), Some(&town.base)).unwrap());
}

/// The mean over 16 hydrants spread over the town.
#[divan::bench(args = SIZES, sample_count = 3)]
fn sixteen_held_hydrants(bencher: Bencher, nodes: usize) {
    let town = of(&TOWNS, nodes);
    bencher.bench(|| hydrants(town, 16).map(|own| held(town, own, &[])).sum::<f64>());
}

#[divan::bench(args = SIZES, sample_count = 3)]
fn sixteen_held_hydrants_keeping_every_node(bencher: Bencher, nodes: usize) {
    let town = of(&TOWNS, nodes);
    let keep: Vec<Kept> = (0..nodes).map(|node| kept(node, 20.0)).collect();
    bencher.bench(|| hydrants(town, 16).map(|own| held(town, own, &keep)).sum::<f64>());
}

#[divan::bench(args = SIZES, sample_count = 3)]
fn sixteen_held_hydrants_on_all_cores(bencher: Bencher, nodes: usize) {
    let town = of(&TOWNS, nodes);
    let all: Vec<Kept> = hydrants(town, 16).collect();
    bencher.bench(|| all.par_iter().map(|&own| held(town, own, &[])).sum::<f64>());
}

fn held(town: &Town, own: Kept, keep: &[Kept]) -> f64 {
    town.solver
        .flow_at_held_head(&town.condition, &town.base, own, keep)
        .unwrap()
        .flow_m3_per_s
}

fn hydrants(town: &Town, count: usize) -> impl Iterator<Item = Kept> {
    let nodes = town.network.served.len();
    (0..count).map(move |hydrant| kept((hydrant * 7919 + 123) % nodes, 14.0))
}

fn kept(node: usize, head_m: f64) -> Kept {
    Kept {
        node: NodeIx(node as u32),
        head_m,
    }
}

fn c_factor(wear: f64) -> Friction {
    Friction::CFactor(90.0 + 50.0 * wear)
}

fn roughness(wear: f64) -> Friction {
    Friction::RoughnessM(1e-4 + 1e-3 * (1.0 - wear))
}

/// Numbers between 0 and 1 from a linear congruence (Knuth's MMIX constants).
struct Chance(u64);

impl Chance {
    fn next(&mut self) -> f64 {
        self.0 = self
            .0
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }

    fn below(&mut self, bound: usize) -> usize {
        ((self.next() * bound as f64) as usize).min(bound - 1)
    }
}

fn town(nodes: usize, friction: fn(f64) -> Friction) -> Town {
    let mut chance = Chance(42);
    let side = (0.42 * nodes as f64).sqrt() as usize;
    let crossings = side * side;
    let mut streets = streets(side, &mut chance);
    // Bends and dead ends make up the rest of the nodes.
    let dead_ends = (0.14 * nodes as f64) as usize;
    let mut next = crossings;
    while next < nodes - dead_ends {
        let street = chance.below(streets.len());
        let (from, to, wide) = streets[street];
        streets[street] = (from, next, wide);
        streets.push((next, to, wide));
        next += 1;
    }
    while next < nodes {
        streets.push((chance.below(nodes - dead_ends), next, false));
        next += 1;
    }
    let parts = streets.iter().map(|&(from, to, wide)| {
        let size = chance.next();
        Part {
            from: NodeIx(from as u32),
            to: NodeIx(to as u32),
            length_m: 2.0 + 120.0 * chance.next() * chance.next(),
            diameter_m: if wide {
                0.3 + 0.3 * size
            } else {
                [0.1, 0.15, 0.2][(3.0 * size) as usize]
            },
            friction: friction(chance.next()),
            minor_loss_k: if size < 0.2 { 0.5 } else { 0.0 },
        }
    });
    let parts: Vec<Part> = parts.collect();
    let sources: Vec<Source> = (0..nodes / 10_000)
        .map(|source| source_at(source * crossings * 10_000 / nodes + 8))
        .collect();
    let network = Network {
        elevation_m: vec![None; nodes],
        parts,
        served: vec![true; nodes],
        sources,
        ..Network::default()
    };
    let condition = Condition {
        demand_m3_per_s: (0..nodes)
            .map(|_| if chance.next() < 0.6 { 2e-4 * chance.next() } else { 0.0 })
            .collect(),
        source_head_m: network.sources.iter().map(|source| source.head_m.value).collect(),
    };
    let solver = Solver::new(&network, Settings::default());
    let base = solver.solve(&condition, None).unwrap();
    println!(
        "{nodes} nodes, {} mains: {} steps, {:?}",
        network.parts.len(),
        base.steps,
        base.residuals
    );
    Town {
        network,
        condition,
        solver,
        base,
    }
}

fn source_at(node: usize) -> Source {
    Source {
        node: NodeIx(node as u32),
        point: 0,
        head_m: Valued {
            value: 60.0,
            basis: Basis::Map,
        },
        tank: false,
        greatest_m3_per_s: None,
    }
}

/// Four fifths of the streets of a square grid, connected; every eighth row and column is a trunk main.
fn streets(side: usize, chance: &mut Chance) -> Vec<(usize, usize, bool)> {
    let mut all = Vec::new();
    for row in 0..side {
        for column in 0..side {
            let here = row * side + column;
            if column + 1 < side {
                all.push((here, here + 1, row % 8 == 0));
            }
            if row + 1 < side {
                all.push((here, here + side, column % 8 == 0));
            }
        }
    }
    for last in (1..all.len()).rev() {
        all.swap(last, chance.below(last + 1));
    }
    // Trunk mains first, then streets that reach something new, then others until there are enough.
    all.sort_by_key(|street| !street.2);
    let mut leader: Vec<usize> = (0..side * side).collect();
    let enough = side * side * 8 / 5;
    let (tree, others): (Vec<_>, Vec<_>) = all.into_iter().partition(|&(from, to, _)| {
        let (a, b) = (find(&mut leader, from), find(&mut leader, to));
        leader[a] = b;
        a != b
    });
    let spare = enough.saturating_sub(tree.len());
    tree.into_iter().chain(others.into_iter().take(spare)).collect()
}

fn find(leader: &mut [usize], mut node: usize) -> usize {
    while leader[node] != node {
        leader[node] = leader[leader[node]];
        node = leader[node];
    }
    node
}
