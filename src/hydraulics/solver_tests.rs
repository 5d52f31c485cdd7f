//! Tests of the solver on small invented networks whose answers are known.

use super::*;
use crate::network::{Basis, Condition, Friction, Network, NodeIx, Part, Source, Valued};

/// Mains of 300 m, 200 mm and C 120, unless changed.
fn main(from: u32, to: u32) -> Part {
    Part {
        from: NodeIx(from),
        to: NodeIx(to),
        length_m: 300.0,
        diameter_m: 0.2,
        friction: Friction::CFactor(120.0),
        minor_loss_k: 0.0,
    }
}

fn network(nodes: usize, sources: &[(u32, f64)], parts: Vec<Part>) -> Network {
    let head = |value| Valued {
        value,
        basis: Basis::Map,
    };
    Network {
        elevation_m: vec![None; nodes],
        parts,
        sources: sources
            .iter()
            .map(|&(node, head_m)| Source {
                node: NodeIx(node),
                head_m: head(head_m),
                tank: false,
                greatest_m3_per_s: None,
                point: 0,
            })
            .collect(),
        served: vec![true; nodes],
        ..Network::default()
    }
}

fn condition(network: &Network, demand_m3_per_s: &[f64]) -> Condition {
    Condition {
        demand_m3_per_s: demand_m3_per_s.to_vec(),
        source_head_m: network.sources.iter().map(|source| source.head_m.value).collect(),
    }
}

/// Solves, and holds the answer against the residuals recomputed from it.
fn solved(network: &Network, demand: &[f64]) -> State {
    let condition = condition(network, demand);
    let settings = Settings::default();
    let state = Solver::new(network, settings.clone()).solve(&condition, None).unwrap();
    let again = residuals(network, &settings, &condition, &state.head_m, &state.flow_m3_per_s);
    assert_eq!(again.head_m, state.residuals.head_m);
    assert!(
        again.within(&settings) && state.residuals.within(&settings),
        "{again:?}"
    );
    state
}

fn close(found: f64, wanted: f64, relative: f64) {
    assert!(
        (found - wanted).abs() <= relative * wanted.abs(),
        "{found} is not {wanted}"
    );
}

#[test]
fn a_dead_end_has_the_head_that_its_law_says() {
    let network = network(3, &[(0, 50.0)], vec![main(0, 1), main(2, 1)]);
    let state = solved(&network, &[0.0, 0.01, 0.004]);
    let law = HeadLoss::new(&network.parts[0], &Settings::default());
    close(state.flow_m3_per_s[0], 0.014, 1e-14);
    close(state.flow_m3_per_s[1], -0.004, 1e-14);
    close(state.head_m[1], 50.0 - law.head_m(0.014), 1e-14);
    close(state.head_m[2], 50.0 - law.head_m(0.014) - law.head_m(0.004), 1e-14);
}

#[test]
fn no_demand_is_no_flow_and_one_head() {
    let mut ring = vec![main(0, 1), main(1, 2), main(2, 3), main(3, 1), main(3, 4)];
    ring[2].friction = Friction::RoughnessM(1e-4);
    let network = network(5, &[(0, 42.0)], ring);
    let state = solved(&network, &[0.0; 5]);
    assert!(state.head_m.iter().all(|&head| (head - 42.0).abs() < 1e-13));
    assert!(state.flow_m3_per_s.iter().all(|&flow| flow.abs() < 1e-15));
}

#[test]
fn parallel_mains_share_by_their_resistance() {
    let mut parts = vec![main(0, 1), main(1, 0), main(0, 1)];
    parts[1].diameter_m = 0.1;
    let network = network(2, &[(0, 50.0)], parts);
    let state = solved(&network, &[0.0, 0.03]);
    let ratio = 0.5_f64.powf(2.63);
    let large = 0.03 / (2.0 + ratio);
    close(state.flow_m3_per_s[0], large, 1e-12);
    close(state.flow_m3_per_s[1], -large * ratio, 1e-12);
}

#[test]
fn two_sources_beside_one_another_feed_by_their_heads_alone() {
    let network = network(3, &[(0, 50.0), (1, 49.0)], vec![main(0, 1), main(1, 2)]);
    // What a source itself draws takes nothing from the mains.
    let state = solved(&network, &[0.5, 0.0, 0.01]);
    let law = HeadLoss::new(&network.parts[0], &Settings::default());
    close(law.head_m(state.flow_m3_per_s[0]), 1.0, 1e-12);
    close(state.flow_m3_per_s[1], 0.01, 1e-14);
}

#[test]
fn a_main_that_ends_where_it_starts_carries_nothing() {
    let network = network(2, &[(0, 50.0)], vec![main(0, 1), main(1, 1)]);
    let state = solved(&network, &[0.0, 0.01]);
    assert_eq!(state.flow_m3_per_s[1], 0.0);
}

#[test]
fn what_is_not_served_stays_out() {
    let mut network = network(4, &[(0, 50.0)], vec![main(0, 1), main(2, 3)]);
    network.served = vec![true, true, false, false];
    let state = solved(&network, &[0.0, 0.01, 0.02, 0.0]);
    assert!(state.head_m[2].is_nan() && state.flow_m3_per_s[1].is_nan());
    close(state.flow_m3_per_s[0], 0.01, 1e-14);
}

#[test]
fn a_network_of_sources_alone_is_solved() {
    let network = network(1, &[(0, 50.0)], Vec::new());
    assert_eq!(solved(&network, &[0.1]).head_m, [50.0]);
}

#[test]
fn extreme_mains_beside_one_another_keep_their_flows() {
    // A 1 mm piece of a 3 m main, twice in parallel, at the end of a large main, and a 100 km hose of 10 mm across.
    let short = |from, to| Part {
        length_m: 1e-3,
        diameter_m: 3.0,
        ..main(from, to)
    };
    let mut large = main(0, 1);
    large.diameter_m = 3.0;
    let mut narrower = short(1, 2);
    narrower.diameter_m = 1.5;
    let hose = Part {
        length_m: 1e5,
        diameter_m: 0.01,
        ..main(0, 2)
    };
    for friction in [Friction::CFactor(120.0), Friction::RoughnessM(1e-4)] {
        let mut parts = vec![large, short(1, 2), narrower, hose];
        parts.iter_mut().for_each(|part| part.friction = friction);
        let network = network(3, &[(0, 50.0)], parts);
        let state = solved(&network, &[0.0, 0.0, 2.0]);
        let laws: Vec<HeadLoss> = network
            .parts
            .iter()
            .map(|part| HeadLoss::new(part, &Settings::default()))
            .collect();
        let flow = &state.flow_m3_per_s;
        // Heads cannot tell the two short mains apart, their flows must.
        close(laws[1].head_m(flow[1]), laws[2].head_m(flow[2]), 1e-10);
        close(flow[1] + flow[2] + flow[3], 2.0, 1e-14);
        close(
            laws[3].head_m(flow[3]),
            laws[0].head_m(flow[0]) + laws[1].head_m(flow[1]),
            1e-10,
        );
    }
}

#[test]
fn a_warm_start_arrives_at_the_same_state() {
    let parts = vec![main(0, 1), main(1, 2), main(2, 3), main(3, 0), main(1, 3)];
    let network = network(4, &[(0, 50.0)], parts);
    let solver = Solver::new(&network, Settings::default());
    let idle = solver.solve(&condition(&network, &[0.0; 4]), None).unwrap();
    let busy = condition(&network, &[0.0, 0.02, 0.05, 0.01]);
    let cold = solver.solve(&busy, None).unwrap();
    let warm = solver.solve(&busy, Some(&idle)).unwrap();
    for (a, b) in cold.flow_m3_per_s.iter().zip(&warm.flow_m3_per_s) {
        close(*a, *b, 1e-12);
    }
    assert!(solver.solve(&busy, Some(&cold)).unwrap().steps <= 2);
}

#[test]
fn what_does_not_settle_names_its_worst_parts() {
    let parts = vec![main(0, 1), main(1, 2), main(2, 3), main(3, 0), main(1, 3)];
    let network = network(4, &[(0, 50.0)], parts);
    let settings = Settings {
        most_steps: 1,
        ..Settings::default()
    };
    let solver = Solver::new(&network, settings);
    let failed = solver
        .solve(&condition(&network, &[0.0, 0.02, 0.05, 0.01]), None)
        .unwrap_err();
    assert_eq!(failed.worst.len(), 3);
    assert!(failed.worst[0].1 > 1e-7 && failed.worst[0].1 >= failed.worst[1].1);
    assert_eq!(failed.residuals.head_at, Some(failed.worst[0].0));
}

#[test]
fn a_demand_that_is_no_number_is_not_settled_and_no_panic() {
    let network = network(2, &[(0, 50.0)], vec![main(0, 1)]);
    let solver = Solver::new(&network, Settings::default());
    for bad in [f64::NAN, f64::INFINITY, 1e300] {
        assert!(solver.solve(&condition(&network, &[0.0, bad]), None).is_err());
    }
}

#[test]
fn a_served_node_that_hangs_on_nothing_is_not_settled_and_no_panic() {
    let network = network(4, &[(0, 50.0)], vec![main(0, 1), main(2, 3)]);
    let solver = Solver::new(&network, Settings::default());
    assert!(
        solver
            .solve(&condition(&network, &[0.0, 0.0, 0.01, 0.0]), None)
            .is_err()
    );
}

#[test]
fn threads_share_a_solver() {
    fn shared<T: Send + Sync>() {}
    shared::<Solver>();
}

mod held {
    use super::*;

    /// A street grid with a hill in it: 5 by 5 nodes, a source at one corner.
    fn grid() -> (Network, Condition) {
        let mut parts = Vec::new();
        for row in 0..5 {
            for column in 0..5 {
                let node = 5 * row + column;
                if column < 4 {
                    parts.push(main(node, node + 1));
                }
                if row < 4 {
                    parts.push(main(node + 5, node));
                }
            }
        }
        for (at, part) in parts.iter_mut().enumerate() {
            part.diameter_m = [0.1, 0.15, 0.2, 0.3][at * 7 % 4];
            part.length_m = 60.0 + 37.0 * (at * 5 % 9) as f64;
            if at % 3 == 0 {
                part.friction = Friction::RoughnessM(5e-4);
            }
        }
        let network = network(25, &[(0, 60.0)], parts);
        let demand: Vec<f64> = (0..25).map(|node| 1e-3 * f64::from(node % 4)).collect();
        let condition = condition(&network, &demand);
        (network, condition)
    }

    fn kept(node: u32, head_m: f64) -> Kept {
        Kept {
            node: NodeIx(node),
            head_m,
        }
    }

    fn agree(found: &Held, wanted: &Held) {
        assert_eq!(found.limit, wanted.limit);
        close(found.flow_m3_per_s, wanted.flow_m3_per_s, 1e-9);
    }

    #[test]
    fn at_the_end_of_one_main_the_flow_follows_from_the_law() {
        let network = network(2, &[(0, 50.0)], vec![main(0, 1)]);
        let idle = condition(&network, &[0.0, 0.0]);
        let solver = Solver::new(&network, Settings::default());
        let base = solver.solve(&idle, None).unwrap();
        let held = solver.flow_at_held_head(&idle, &base, kept(1, 14.0), &[]).unwrap();
        assert_eq!(held.limit, Limit::Head(NodeIx(1)));
        let law = HeadLoss::new(&network.parts[0], &Settings::default());
        close(law.head_m(held.flow_m3_per_s), 36.0, 1e-12);
        close(held.state.unwrap().head_m[1], 14.0, 1e-13);
    }

    #[test]
    fn every_node_of_a_grid_agrees_with_bracketing() {
        let (network, condition) = grid();
        let solver = Solver::new(&network, Settings::default());
        let base = solver.solve(&condition, None).unwrap();
        let mut elsewhere = 0;
        let mut steps = 0;
        for node in 1..25 {
            let own = kept(node, 20.0);
            for keep in [
                Vec::new(),
                (1..25).map(|other| kept(other, 32.0 + f64::from(other % 7))).collect(),
            ] {
                let held = solver.flow_at_held_head(&condition, &base, own, &keep).unwrap();
                let slow = solver.flow_by_bracketing(&condition, &base, own, &keep).unwrap();
                agree(&held, &slow);
                elsewhere += u32::from(held.limit != Limit::Head(own.node));
                let state = held.state.unwrap();
                steps += state.steps;
                for one in keep.iter().filter(|one| base.head_m[one.node.at()] >= one.head_m) {
                    assert!(state.head_m[one.node.at()] >= one.head_m - 1e-9);
                }
                assert!(state.residuals.within(&Settings::default()));
            }
        }
        assert!(elsewhere > 5 && elsewhere < 40, "{elsewhere} limits elsewhere");
        assert!(steps < 48 * 12, "{steps} steps for 48 hydrants");
    }

    #[test]
    fn from_a_network_at_rest_the_flow_is_found_too() {
        let (network, mut condition) = grid();
        condition.demand_m3_per_s.fill(0.0);
        let solver = Solver::new(&network, Settings::default());
        let base = solver.solve(&condition, None).unwrap();
        for node in 1..25 {
            let keep = [kept(24, 40.0), kept(7, 50.0)];
            let held = solver
                .flow_at_held_head(&condition, &base, kept(node, 20.0), &keep)
                .unwrap();
            agree(
                &held,
                &solver
                    .flow_by_bracketing(&condition, &base, kept(node, 20.0), &keep)
                    .unwrap(),
            );
        }
    }

    #[test]
    fn a_source_with_a_greatest_flow_is_a_limit() {
        let (mut network, condition) = grid();
        let drawn: f64 = condition.demand_m3_per_s.iter().sum();
        network.sources[0].greatest_m3_per_s = Some(drawn + 0.005);
        let solver = Solver::new(&network, Settings::default());
        let base = solver.solve(&condition, None).unwrap();
        let held = solver
            .flow_at_held_head(&condition, &base, kept(13, 20.0), &[])
            .unwrap();
        assert_eq!(held.limit, Limit::Source(0));
        close(held.flow_m3_per_s, 0.005, 1e-9);
        agree(
            &held,
            &solver
                .flow_by_bracketing(&condition, &base, kept(13, 20.0), &[])
                .unwrap(),
        );
        // On the source itself only its greatest flow counts.
        let held = solver.flow_at_held_head(&condition, &base, kept(0, 20.0), &[]).unwrap();
        assert_eq!(held.limit, Limit::Source(0));
        close(held.flow_m3_per_s, 0.005, 1e-9);
    }

    #[test]
    fn too_low_already_is_no_flow() {
        let (network, condition) = grid();
        let solver = Solver::new(&network, Settings::default());
        let base = solver.solve(&condition, None).unwrap();
        let held = solver
            .flow_at_held_head(&condition, &base, kept(13, 60.0), &[])
            .unwrap();
        assert_eq!((held.flow_m3_per_s, held.limit), (0.0, Limit::AlreadyLow(NodeIx(13))));
    }

    #[test]
    fn on_a_source_nothing_limits_the_flow() {
        let (network, condition) = grid();
        let solver = Solver::new(&network, Settings::default());
        let base = solver.solve(&condition, None).unwrap();
        let held = solver.flow_at_held_head(&condition, &base, kept(0, 20.0), &[]).unwrap();
        assert_eq!((held.flow_m3_per_s, held.limit), (f64::INFINITY, Limit::Nothing));
    }

    #[test]
    fn a_kept_node_behind_a_source_or_too_low_before_does_not_count() {
        let mut parts = vec![main(0, 1), main(0, 2)];
        parts[1].diameter_m = 0.05;
        let network = network(3, &[(0, 50.0)], parts);
        let condition = condition(&network, &[0.0, 0.0, 2e-3]);
        let solver = Solver::new(&network, Settings::default());
        let base = solver.solve(&condition, None).unwrap();
        let alone = solver.flow_at_held_head(&condition, &base, kept(1, 20.0), &[]).unwrap();
        for keep in [kept(2, base.head_m[2]), kept(2, base.head_m[2] + 1.0), kept(0, 50.0)] {
            let held = solver
                .flow_at_held_head(&condition, &base, kept(1, 20.0), &[keep])
                .unwrap();
            agree(&held, &alone);
        }
    }
}

mod pressure_driven {
    use super::*;

    /// Source head, delivered flow and node head of one main of loss 5000 q^2 to a tap of 0.02 m3/s between 10 and 30 m: the
    /// closed form q = sqrt((Hs - Hmin) / (r + (Hreq - Hmin)/qd^2)) of the law of Wagner, Shamir & Marks (1988).
    const ONE_MAIN: [(f64, f64, f64); 8] = [
        (8.0, 0.0, 8.0),
        (10.0, 0.0, 10.0),
        (15.0, 0.009_534_625_892_455_923, 14.545_454_545_454_545),
        (20.0, 0.013_483_997_249_264_84, 19.090_909_090_909_09),
        (25.0, 0.016_514_456_476_895_41, 23.636_363_636_363_637),
        (30.0, 0.019_069_251_784_911_846, 28.181_818_181_818_18),
        (32.0, 0.02, 30.0),
        (40.0, 0.02, 38.0),
    ];

    #[test]
    fn one_main_follows_the_closed_form() {
        let settings = Settings {
            hazen_williams: HazenWilliams {
                constant: 5000.0,
                flow_exponent: 2.0,
                diameter_exponent: 5.0,
            },
            ..Settings::default()
        };
        let unit = Part {
            length_m: 1.0,
            diameter_m: 1.0,
            friction: Friction::CFactor(1.0),
            ..main(0, 1)
        };
        for (source, delivered, head) in ONE_MAIN {
            let network = network(2, &[(0, source)], vec![unit]);
            let tap = Tap {
                node: NodeIx(1),
                least_m: 10.0,
                full_m: 30.0,
            };
            let solver = Solver::new(&network, settings.clone());
            let found = solver
                .solve_pressure_driven(&condition(&network, &[0.0, 0.02]), &[tap])
                .unwrap();
            // At the least head itself the root law turns a rounding of head into the root of it as flow.
            assert!(
                (found.delivered_m3_per_s[1] - delivered).abs() < 1e-8,
                "{source}: {found:?}"
            );
            assert!((found.state.head_m[1] - head).abs() < 1e-6, "{source}: {found:?}");
        }
    }
}
