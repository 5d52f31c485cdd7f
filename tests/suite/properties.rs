//! What must hold for every network, on random ones.

use std::collections::VecDeque;

use gradeline::hydraulics::{Factoring, HeadLoss, Kept, Residuals, Settings, Solver, State, Tap, residuals};
use gradeline::network::{Condition, Friction, Network, NodeIx, Part};
use nalgebra::{DMatrix, DVector};
use proptest::prelude::*;
use proptest::test_runner::RngSeed;
use proptest::test_runner::TestCaseError;

use super::hydraulic::{network_of, part_of};

/// A network, and what is drawn from it.
#[derive(Clone, Debug)]
struct Given {
    network: Network,
    condition: Condition,
}

impl Given {
    fn solve(&self) -> State {
        self.solve_with(Settings::default())
    }

    fn solve_with(&self, settings: Settings) -> State {
        Solver::new(&self.network, settings)
            .solve(&self.condition, None)
            .unwrap()
    }

    fn laws(&self) -> Vec<HeadLoss> {
        let settings = Settings::default();
        self.network
            .parts
            .iter()
            .map(|part| HeadLoss::new(part, &settings))
            .collect()
    }
}

/// Wildly mixed mains of both laws: 1 mm to 100 km long, 10 mm to 3 m wide.
fn any_main(nodes: u32) -> impl Strategy<Value = Part> {
    let friction = prop_oneof![
        (60.0..150.0).prop_map(Friction::CFactor),
        (0.0..3e-3).prop_map(Friction::RoughnessM),
    ];
    let minor = prop_oneof![Just(0.0), 0.0..20.0];
    (0..nodes, 0..nodes, -3.0..5.0, -2.0..0.47, friction, minor).prop_map(
        |(from, to, length, diameter, friction, minor)| {
            let mut part = part_of(from, to, 10_f64.powf(length), 10_f64.powf(diameter), friction);
            part.minor_loss_k = minor;
            part
        },
    )
}

/// Mains of a street: 5 to 500 m long, 80 to 500 mm wide.
fn street_main(nodes: u32) -> impl Strategy<Value = Part> {
    any_main(nodes).prop_flat_map(|part| {
        (Just(part), 5.0..500.0, 0.08..0.5).prop_map(|(part, length_m, diameter_m)| Part {
            length_m,
            diameter_m,
            ..part
        })
    })
}

/// A connected network: a main from each node to one before it, and more mains besides; one to three sources.
fn given<S: Strategy<Value = Part>>(main: fn(u32) -> S, most_nodes: u32) -> impl Strategy<Value = Given> {
    (2..most_nodes).prop_flat_map(move |nodes| {
        let mains = prop::collection::vec(main(nodes), nodes as usize - 1..2 * nodes as usize);
        let ties = prop::collection::vec(any::<prop::sample::Index>(), nodes as usize - 1);
        let demands = prop::collection::vec(prop_oneof![Just(0.0), 0.0..0.02, 1e-7..1e-4], nodes as usize);
        let levels = prop::collection::vec(40.0..60.0, 1..=3.min(nodes as usize));
        (mains, ties, demands, levels).prop_map(move |(mut mains, ties, demand_m3_per_s, levels)| {
            for (node, tie) in (1..nodes).zip(ties) {
                let main = &mut mains[node as usize - 1];
                (main.from, main.to) = (NodeIx(node), NodeIx(tie.index(node as usize) as u32));
                if node % 2 == 0 {
                    std::mem::swap(&mut main.from, &mut main.to);
                }
            }
            // A loss of more than a thousand kilometres at the whole demand is rounded by too much to be proved.
            let drawn = demand_m3_per_s.iter().sum();
            for main in &mut mains {
                let loss = HeadLoss::new(main, &Settings::default()).head_m(drawn);
                main.length_m *= (1e6 / loss).min(1.0);
            }
            let sources: Vec<(u32, f64)> = (0..).zip(levels).collect();
            Given {
                network: network_of(nodes as usize, &sources, mains),
                condition: Condition {
                    demand_m3_per_s,
                    source_head_m: sources.iter().map(|source| source.1).collect(),
                },
            }
        })
    })
}

fn near(found: f64, wanted: f64, allowed: f64, what: &str) -> Result<(), TestCaseError> {
    prop_assert!(
        (found - wanted).abs() <= allowed,
        "{what}: {found} and {wanted}, allowed {allowed:e}"
    );
    Ok(())
}

/// Sums of flow at each node, and of their sizes, by plain summing.
fn sums(given: &Given, state: &State) -> Vec<(f64, f64)> {
    let mut sums: Vec<(f64, f64)> = given
        .condition
        .demand_m3_per_s
        .iter()
        .map(|&demand| (demand, demand))
        .collect();
    for (part, flow) in given.network.parts.iter().zip(&state.flow_m3_per_s) {
        sums[part.from.at()].0 += flow;
        sums[part.to.at()].0 -= flow;
        sums[part.from.at()].1 += flow.abs();
        sums[part.to.at()].1 += flow.abs();
    }
    sums
}

/// Continuity at every node that is no source: within a share of the flow through it, or of next to nothing.
fn continuity_closes(given: &Given, relative: f64, absolute: f64) -> Result<(), TestCaseError> {
    let state = given.solve();
    let inside = sums(given, &state)
        .into_iter()
        .enumerate()
        .skip(given.network.sources.len());
    for (node, (missing, through)) in inside {
        near(missing, 0.0, relative * through + absolute, &format!("node {node}"))?;
    }
    Ok(())
}

/// For each part that is not in a spanning tree, the sum of head losses round the loop it closes, by the flows alone.
fn loops(given: &Given, state: &State) -> Vec<f64> {
    let laws = given.laws();
    let nodes = given.network.served.len();
    let parts = &given.network.parts;
    let loss = |part: usize| laws[part].head_m(state.flow_m3_per_s[part]);
    let mut fall = vec![f64::NAN; nodes];
    let mut in_tree = vec![false; parts.len()];
    fall[0] = 0.0;
    let mut reached = VecDeque::from([0]);
    while let Some(node) = reached.pop_front() {
        for (at, part) in parts.iter().enumerate() {
            let (next, sign) = match (part.from.at(), part.to.at()) {
                (from, to) if from == node => (to, 1.0),
                (from, to) if to == node => (from, -1.0),
                _ => continue,
            };
            if fall[next].is_nan() {
                fall[next] = fall[node] + sign * loss(at);
                in_tree[at] = true;
                reached.push_back(next);
            }
        }
    }
    let outside = (0..parts.len()).filter(|&part| !in_tree[part]);
    outside
        .map(|part| fall[parts[part].from.at()] + loss(part) - fall[parts[part].to.at()])
        .collect()
}

/// Newton's method with a dense matrix for all flows and heads at once, started from guesses and damped by halving: slow,
/// and nothing in common with the solver but the laws. `None` where it comes to no answer of its own.
fn dense(given: &Given) -> Option<(Vec<f64>, Vec<f64>)> {
    let laws = given.laws();
    let (parts, nodes) = (&given.network.parts, given.network.served.len());
    let size = parts.len() + nodes;
    let mut x = DVector::from_element(size, 0.01);
    x.rows_mut(parts.len(), nodes).fill(50.0);
    let equations = |x: &DVector<f64>| {
        let mut value = DVector::zeros(size);
        let mut slope = DMatrix::zeros(size, size);
        for (at, (part, law)) in parts.iter().zip(&laws).enumerate() {
            let (from, to) = (parts.len() + part.from.at(), parts.len() + part.to.at());
            let loss = law.at(x[at]);
            value[at] = x[from] - x[to] - loss.head_m;
            slope[(at, at)] -= loss.slope;
            slope[(at, from)] += 1.0;
            slope[(at, to)] -= 1.0;
            value[from] += x[at];
            value[to] -= x[at];
            slope[(from, at)] += 1.0;
            slope[(to, at)] -= 1.0;
        }
        for (node, demand) in given.condition.demand_m3_per_s.iter().enumerate() {
            value[parts.len() + node] += demand;
        }
        for (source, head) in given.network.sources.iter().zip(&given.condition.source_head_m) {
            let row = parts.len() + source.node.at();
            value[row] = x[row] - head;
            slope.row_mut(row).fill(0.0);
            slope[(row, row)] = 1.0;
        }
        (value, slope)
    };
    for _ in 0..400 {
        let (value, slope) = equations(&x);
        let step = slope.lu().solve(&-&value).expect("the equations have one solution");
        let mut share = 1.0;
        while share > 1e-3 && equations(&(&x + share * &step)).0.norm() > value.norm() * (1.0 - 0.1 * share) {
            share *= 0.5;
        }
        x += share * &step;
        if step.amax() < 1e-13 {
            break;
        }
    }
    let (flow, head) = x.as_slice().split_at(parts.len());
    (equations(&x).0.amax() < 1e-9).then(|| (flow.to_vec(), head.to_vec()))
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, rng_seed: RngSeed::Fixed(1984), ..ProptestConfig::default() })]

    #[test]
    fn continuity_closes_at_every_node_of_streets(given in given(street_main, 40)) {
        continuity_closes(&given, 1e-12, 1e-16)?;
    }

    #[test]
    fn continuity_closes_at_every_node_of_anything(given in given(any_main, 40)) {
        continuity_closes(&given, 1e-10, 1e-13)?;
    }

    #[test]
    fn head_closes_round_every_loop(given in given(any_main, 40)) {
        let state = given.solve();
        // Between sources the fall is known and not closed by flow alone: only loops of a network with one source count.
        if given.network.sources.len() == 1 {
            for open in loops(&given, &state) {
                near(open, 0.0, 1e-7, "loop")?;
            }
        }
    }

    #[test]
    fn the_residuals_are_those_of_the_written_values(given in given(any_main, 20), part in any::<prop::sample::Index>()) {
        let settings = Settings::default();
        let mut state = given.solve();
        let of = |state: &State| {
            residuals(&given.network, &settings, &given.condition, &state.head_m, &state.flow_m3_per_s)
        };
        prop_assert!(of(&state).within(&settings));
        prop_assert!(of(&state).continuity_m3_per_s <= 2.0 * state.residuals.continuity_m3_per_s + 1e-12);
        // One written flow changed: the residuals must see it, unless the part hangs between two sources or on itself.
        let part = part.index(given.network.parts.len());
        let ends = [given.network.parts[part].from, given.network.parts[part].to];
        state.flow_m3_per_s[part] += 1e-6;
        let seen: Residuals = of(&state);
        if ends[0] != ends[1] && ends.iter().any(|end| end.at() >= given.network.sources.len()) {
            near(seen.continuity_m3_per_s, 1e-6, 1e-12, "a wrong flow")?;
        }
    }

    #[test]
    fn reversing_mains_changes_nothing_but_signs(
        given in given(street_main, 40), turned in prop::collection::vec(any::<bool>(), 80)
    ) {
        let mut other = given.clone();
        for (part, _) in other.network.parts.iter_mut().zip(&turned).filter(|(_, turned)| **turned) {
            std::mem::swap(&mut part.from, &mut part.to);
        }
        let (a, b) = (given.solve(), other.solve());
        for (at, (a, b)) in a.flow_m3_per_s.iter().zip(&b.flow_m3_per_s).enumerate() {
            near(*a, if turned[at] { -b } else { *b }, 1e-12, "flow")?;
        }
        for (a, b) in a.head_m.iter().zip(&b.head_m) {
            near(*a, *b, 1e-10, "head")?;
        }
    }

    #[test]
    fn shuffling_changes_nothing_but_order(
        given in given(street_main, 40),
        keys in prop::collection::vec(any::<u64>(), 80),
        names in prop::collection::vec(any::<u64>(), 40),
    ) {
        let nodes = given.network.served.len();
        let mut part_order: Vec<usize> = (0..given.network.parts.len()).collect();
        part_order.sort_by_key(|&part| keys[part]);
        let mut name: Vec<usize> = (0..nodes).collect();
        name.sort_by_key(|&node| names[node]);
        let mut other = given.clone();
        other.network.parts = part_order.iter().map(|&part| {
            let part = given.network.parts[part];
            Part {
                from: NodeIx(name[part.from.at()] as u32),
                to: NodeIx(name[part.to.at()] as u32),
                ..part
            }
        }).collect();
        other.network.sources.iter_mut().for_each(|source| source.node = NodeIx(name[source.node.at()] as u32));
        for (node, &new) in name.iter().enumerate() {
            other.condition.demand_m3_per_s[new] = given.condition.demand_m3_per_s[node];
        }
        let (a, b) = (given.solve(), other.solve());
        for (at, &part) in part_order.iter().enumerate() {
            near(b.flow_m3_per_s[at], a.flow_m3_per_s[part], 1e-12, "flow")?;
        }
        for (node, &new) in name.iter().enumerate() {
            near(b.head_m[new], a.head_m[node], 1e-10, "head")?;
        }
    }

    #[test]
    fn a_dense_solve_agrees(given in given(street_main, 12)) {
        let state = given.solve();
        let Some((flow, head)) = dense(&given) else {
            return Err(TestCaseError::reject("the plain method comes to no answer"));
        };
        for (at, wanted) in flow.iter().enumerate() {
            let part = &given.network.parts[at];
            if part.from != part.to {
                near(state.flow_m3_per_s[at], *wanted, 1e-8, "flow")?;
            }
        }
        for (found, wanted) in state.head_m.iter().zip(&head) {
            near(*found, *wanted, 1e-6, "head")?;
        }
    }

    /// Flows are made up and heads follow along a tree; the solver must find both again from the demands. A main beyond
    /// the tree gets the length that its flow needs between heads that are there already.
    #[test]
    fn a_manufactured_solution_is_found(
        given in given(any_main, 30), velocities in prop::collection::vec(0.05..1.0, 60)
    ) {
        let mut given = given;
        given.network.sources.truncate(1);
        given.condition.source_head_m = vec![50.0];
        given.network.parts.retain(|part| part.from != part.to);
        let (head, flow) = manufacture(&mut given, &velocities);
        let state = given.solve();
        // A demand is rounded by the largest flow at its node, and the smallest main there must carry it.
        let rounding = 1e-15 * flow.iter().map(|flow| flow.abs()).sum::<f64>();
        let slopes: Vec<f64> = given.laws().iter().zip(&flow).map(|(law, &flow)| law.at(flow).slope).collect();
        let head_rounding = rounding * slopes.iter().sum::<f64>();
        for (found, wanted) in state.head_m.iter().zip(&head) {
            near(*found, *wanted, 1e-11 + head_rounding, "head")?;
        }
        for ((found, wanted), slope) in state.flow_m3_per_s.iter().zip(&flow).zip(&slopes) {
            // The made-up heads are rounded too; a flow can be asked back only as sharply as they say it.
            near(*found, *wanted, 1e-11 * wanted.abs() + 10.0 * rounding + 1e-12 / slope, "flow")?;
        }
    }

    #[test]
    fn the_reference_factorisation_gives_the_same_state(given in given(street_main, 40)) {
        let ours = given.solve();
        let reference = given.solve_with(Settings { factoring: Factoring::Faer, ..Settings::default() });
        for (a, b) in ours.head_m.iter().zip(&reference.head_m) {
            near(*a, *b, 1e-7, "head")?;
        }
    }

    /// Every tap gets what its law says at the head it has, and there is one such answer.
    #[test]
    fn pressure_driven_taps_get_what_their_heads_give(
        given in given(street_main, 30), times in 1.0..1000.0, rises in prop::collection::vec(5.0..30.0, 30)
    ) {
        let mut given = given;
        given.condition.demand_m3_per_s.iter_mut().for_each(|demand| *demand *= times);
        let taps: Vec<Tap> = rises.iter().enumerate().take(given.network.served.len()).map(|(node, rise)| Tap {
            node: NodeIx(node as u32),
            least_m: 10.0 + rise,
            full_m: 12.0 + 2.0 * rise,
        }).collect();
        let found = Solver::new(&given.network, Settings::default()).solve_pressure_driven(&given.condition, &taps).unwrap();
        for tap in &taps[given.network.sources.len()..] {
            let wanted = given.condition.demand_m3_per_s[tap.node.at()];
            let got = found.delivered_m3_per_s[tap.node.at()];
            let head = found.state.head_m[tap.node.at()];
            prop_assert!((0.0..=wanted).contains(&got));
            if wanted > 0.0 {
                // As heads, so that the root law's steep start is no matter.
                let share = got / wanted;
                let asked = tap.least_m + (tap.full_m - tap.least_m) * share * share;
                let right = (head - asked).abs() < 1e-6
                    || (share < 1e-4 && head < tap.least_m)
                    || (share > 1.0 - 1e-6 && head > tap.full_m);
                prop_assert!(right, "head {head}, {share} of {wanted} for {tap:?}");
            }
        }
        let settings = Settings::default();
        let delivered = Condition { demand_m3_per_s: found.delivered_m3_per_s, ..given.condition.clone() };
        let state = &found.state;
        let seen = residuals(&given.network, &settings, &delivered, &state.head_m, &state.flow_m3_per_s);
        prop_assert!(seen.within(&settings), "{seen:?}");
    }

    #[test]
    fn a_hydrant_held_at_its_head_gives_what_bracketing_finds(
        given in given(street_main, 20), at in any::<prop::sample::Index>(),
        limits in prop::collection::vec(0.0..30.0, 20), all in any::<bool>()
    ) {
        let sources = given.network.sources.len();
        let nodes = given.network.served.len();
        prop_assume!(nodes > sources);
        let solver = Solver::new(&given.network, Settings::default());
        let base = given.solve();
        let kept = |node: usize| Kept { node: NodeIx(node as u32), head_m: base.head_m[node] - limits[node] };
        let own = kept(sources + at.index(nodes - sources));
        let keep: Vec<Kept> = if all { (sources..nodes).map(kept).collect() } else { Vec::new() };
        let held = solver.flow_at_held_head(&given.condition, &base, own, &keep).unwrap();
        let slow = solver.flow_by_bracketing(&given.condition, &base, own, &keep).unwrap();
        near(held.flow_m3_per_s, slow.flow_m3_per_s, 1e-9 * slow.flow_m3_per_s + 1e-12, "flow")?;
        let state = held.state.unwrap();
        for one in &keep {
            prop_assert!(state.head_m[one.node.at()] >= one.head_m - 1e-9);
        }
    }
}

/// Heads and flows made up for a network with one source, its demands set to fit. Changes lengths, minor losses and demands.
fn manufacture(given: &mut Given, velocities: &[f64]) -> (Vec<f64>, Vec<f64>) {
    let settings = Settings::default();
    let mut head = vec![f64::NAN; given.network.served.len()];
    head[0] = given.condition.source_head_m[0];
    let mut flows = Vec::new();
    given.condition.demand_m3_per_s.fill(0.0);
    for (part, velocity) in given.network.parts.iter_mut().zip(velocities) {
        part.minor_loss_k = 0.0;
        let mut flow = velocity * std::f64::consts::PI / 4.0 * part.diameter_m * part.diameter_m;
        let (from, to) = (part.from.at(), part.to.at());
        let known = [from, to].map(|node| !head[node].is_nan());
        let loss = HeadLoss::new(part, &settings).head_m(flow);
        let wanted = if known == [true, true] {
            (head[from] - head[to]).abs()
        } else {
            loss.min(20.0)
        };
        part.length_m *= (wanted / loss).max(1e-12);
        let law = HeadLoss::new(part, &settings);
        match known {
            [true, false] => head[to] = head[from] - law.head_m(flow),
            [false, true] => head[from] = head[to] + law.head_m(flow),
            _ => flow = flow_for(&law, head[from] - head[to]),
        }
        given.condition.demand_m3_per_s[from] -= flow;
        given.condition.demand_m3_per_s[to] += flow;
        flows.push(flow);
    }
    (head, flows)
}

/// The flow that loses a head, by bisection.
fn flow_for(law: &HeadLoss, head_m: f64) -> f64 {
    let (mut low, mut high) = (-1e9, 1e9);
    for _ in 0..200 {
        let middle = 0.5 * (low + high);
        if law.head_m(middle) < head_m {
            low = middle
        } else {
            high = middle
        }
    }
    0.5 * (low + high)
}
