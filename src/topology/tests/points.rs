//! Node points, valves, hydrants and customers on their mains.

use super::draw::{Board, HYDRANTS, VALVES};
use crate::assets::{MainKind, NamedMain, ValveKind};
use crate::finding::{Code, FeatureRef};
use crate::topology::ValvePlace;

fn street(board: &mut Board) -> [u32; 3] {
    board.source([0.0, 0.0]);
    [
        board.main(&[[0.0, 0.0], [100.0, 0.0]]),
        board.main(&[[100.0, 0.0], [200.0, 0.0]]),
        board.main(&[[100.0, 0.0], [100.0, 80.0]]),
    ]
}

#[test]
fn node_points_stand_on_nodes_and_cut_mains_they_lie_on() {
    let mut board = Board::new(0.3);
    let [west, ..] = street(&mut board);
    let on_node = board.node([100.1, 0.0]);
    let on_main = board.node([50.0, 0.0]);
    let far = board.node([50.0, 20.0]);
    let drawing = board.node([30.0, 20.0]);
    board.assets.nodes[drawing as usize].demand_m3_per_s = 0.001;
    let seen = board.infer();
    let node = |point: u32| seen.map().node_of_point[point as usize];
    assert_eq!(seen.map().nodes[node(on_node).unwrap() as usize].at, [100.0, 0.0]);
    assert_eq!(seen.map().nodes[node(on_main).unwrap() as usize].at, [50.0, 0.0]);
    assert_eq!(seen.map().nodes[node(on_main).unwrap() as usize].points, [on_main]);
    assert_eq!(node(far), None);
    assert_eq!(seen.parts_of(west), 2);
    assert_eq!(seen.codes(), ["node-off-main"]);
}

#[test]
fn a_source_comes_first_among_the_points_of_a_node() {
    let mut board = Board::new(0.3);
    board.main(&[[0.0, 0.0], [100.0, 0.0]]);
    let plain = board.node([0.0, 0.0]);
    let source = board.source([0.0, 0.0]);
    let seen = board.infer();
    let node = seen.map().node_of_point[plain as usize].unwrap();
    assert_eq!(seen.map().nodes[node as usize].points, [source, plain]);
}

#[test]
fn a_closed_valve_cuts_its_main_at_its_own_point() {
    let mut board = Board::new(0.3);
    let [west, ..] = street(&mut board);
    board.closed_valve([60.0, 0.5]);
    board.valve([30.0, 0.0], ValveKind::Gate, false);
    let hydrant = board.hydrant([59.0, 1.0]);
    let seen = board.infer();
    let Some(ValvePlace::Cut { main, node_a, node_b }) = seen.map().valves[0] else {
        panic!("not cut: {:?}", seen.map().valves);
    };
    assert_eq!(main, west);
    assert_eq!(seen.map().valves[1], Some(ValvePlace::NoEffect));
    let nodes = &seen.map().nodes;
    assert_eq!(nodes[node_a as usize].at, nodes[node_b as usize].at);
    let pieces = &seen.map().piece_of_node;
    assert_ne!(pieces[node_a as usize], pieces[node_b as usize]);
    // The tap keeps to its side of the valve.
    let tap = seen.map().hydrants[hydrant as usize].unwrap();
    assert_eq!(pieces[tap.node as usize], pieces[node_a as usize]);
    // What is shut off is named with the valve.
    assert!(seen.names(Code::Island, FeatureRef { layer: VALVES, row: 0 }));
}

#[test]
fn a_closed_valve_on_a_node_of_two_mains_cuts_between_them() {
    let mut board = Board::new(0.3);
    let a = board.main(&[[0.0, 0.0], [100.0, 0.0]]);
    let b = board.main(&[[100.0, 0.0], [200.0, 0.0]]);
    board.closed_valve([100.0, 0.0]);
    let seen = board.infer();
    assert!(matches!(seen.map().valves[0], Some(ValvePlace::Cut { .. })));
    assert!(!seen.joined(a, b));
}

#[test]
fn a_closed_valve_on_a_node_of_three_must_name_its_main() {
    let mut board = Board::new(0.3);
    let [west, east, north] = street(&mut board);
    let valve = board.closed_valve([100.0, 0.0]);
    let seen = board.infer();
    assert_eq!(seen.codes(), ["valve-on-node"]);
    assert_eq!(seen.map().valves[0], Some(ValvePlace::Unplaced));
    board.names(valve, NamedMain::Known(vec![north]));
    let seen = board.infer();
    assert!(seen.joined(west, east) && !seen.joined(west, north));
    let Some(ValvePlace::Cut { main, node_a, node_b }) = seen.map().valves[0] else {
        panic!("not cut");
    };
    assert_eq!(main, north);
    // The main starts at the valve: its own node is on the side of its end.
    let part = seen.map().parts.iter().find(|part| part.main == north).unwrap();
    assert_eq!(part.from, node_b);
    assert_ne!(node_a, node_b);
}

#[test]
fn a_closed_valve_whose_main_runs_through_a_node_does_not_say_its_side() {
    let mut board = Board::new(0.3);
    let through = board.main(&[[0.0, 0.0], [100.0, 0.0], [200.0, 0.0]]);
    board.main(&[[100.0, 0.0], [100.0, 50.0]]);
    let valve = board.closed_valve([100.0, 0.0]);
    board.names(valve, NamedMain::Known(vec![through]));
    let seen = board.infer();
    assert_eq!(seen.codes(), ["valve-on-node"]);
    assert_eq!(seen.map().valves[0], Some(ValvePlace::Unplaced));
    let said = format!("{:?}", seen.findings()[0].message);
    assert!(
        said.contains("runs through") && !said.contains("was not said"),
        "{said}"
    );
}

#[test]
fn a_valve_that_names_a_wrong_main_or_lies_off_all_mains_is_said() {
    let mut board = Board::new(0.3);
    let [west, _, north] = street(&mut board);
    let wrong = board.closed_valve([30.0, 0.0]);
    board.names(wrong, NamedMain::Unknown("M-77".into()));
    let far = board.closed_valve([40.0, 0.0]);
    board.names(far, NamedMain::Known(vec![north]));
    let off = board.closed_valve([40.0, 30.0]);
    let seen = board.infer();
    for valve in [wrong, far] {
        assert!(seen.names(
            Code::ValveMainUnknown,
            FeatureRef {
                layer: VALVES,
                row: valve
            }
        ));
        assert!(matches!(seen.map().valves[valve as usize], Some(ValvePlace::Cut { main, .. }) if main == west));
    }
    assert!(seen.names(
        Code::ValveOffMain,
        FeatureRef {
            layer: VALVES,
            row: off
        }
    ));
}

#[test]
fn a_closed_valve_on_a_dead_end_shuts_nothing() {
    let mut board = Board::new(0.3);
    street(&mut board);
    board.closed_valve([200.0, 0.0]);
    let seen = board.infer();
    assert_eq!(seen.map().valves[0], Some(ValvePlace::NoEffect));
    assert!(seen.codes().is_empty());
}

#[test]
fn a_closed_zone_valve_where_two_zones_touch_stands_between_their_nodes() {
    let mut board = Board::new(0.3);
    let a = board.main(&[[0.0, 0.0], [100.0, 0.0]]);
    let b = board.main(&[[100.0, 0.0], [200.0, 0.0]]);
    board.in_zone(a, 0);
    board.in_zone(b, 1);
    board.source([0.0, 0.0]);
    board.source([200.0, 0.0]);
    board.valve([100.0, 0.0], ValveKind::Zone, true);
    let seen = board.infer();
    assert!(seen.codes().is_empty(), "{:?}", seen.findings());
    assert!(!seen.joined(a, b));
    assert!(matches!(seen.map().valves[0], Some(ValvePlace::Cut { .. })));
}

#[test]
fn hydrants_tap_the_main_beside_them_or_the_end_of_their_lateral() {
    let mut board = Board::new(1.0);
    let [west, east, _] = street(&mut board);
    let lateral = board.main(&[[150.0, 0.0], [150.0, 4.0]]);
    let beside = board.hydrant([40.0, 2.0]);
    let at_end = board.hydrant([150.0, 4.3]);
    let on_main = board.hydrant([20.0, 0.0]);
    let off = board.hydrant([60.0, 9.0]);
    let seen = board.infer();
    let tap = |hydrant: u32| seen.map().hydrants[hydrant as usize].unwrap();
    assert_eq!((tap(beside).main, tap(beside).distance_m), (west, 2.0));
    assert_eq!(seen.map().nodes[tap(beside).node as usize].at, [40.0, 0.0]);
    assert_eq!(tap(at_end).main, lateral);
    assert_eq!(seen.map().nodes[tap(at_end).node as usize].at, [150.0, 4.0]);
    assert_eq!(tap(on_main).main, west);
    assert_eq!(seen.map().hydrants[off as usize], None);
    assert_eq!(seen.warnings(), ["hydrant-off-main"]);
    assert!(seen.names(
        Code::HydrantOffMain,
        FeatureRef {
            layer: HYDRANTS,
            row: off
        }
    ));
    assert_eq!((seen.parts_of(west), seen.parts_of(east)), (3, 2));
}

#[test]
fn a_hydrant_between_two_mains_takes_the_smaller_and_says_so() {
    let draw = |small_m: f64, y: f64| {
        let mut board = Board::new(0.3);
        street(&mut board);
        let small = board.main(&[[0.0, 4.0], [90.0, 4.0]]);
        board.of_diameter(small, small_m);
        board.source([0.0, 4.0]);
        board.hydrant([45.0, y]);
        (board.infer(), small)
    };
    let (seen, small) = draw(0.1, 1.9);
    assert_eq!(seen.codes(), ["hydrant-between-mains"]);
    assert_eq!(seen.map().hydrants[0].unwrap().main, small);
    // Clearly nearer to one, or of the same size: no question.
    let (seen, _) = draw(0.1, 1.2);
    assert!(seen.codes().is_empty());
    assert_eq!(seen.map().hydrants[0].unwrap().main, 0);
    let (seen, _) = draw(0.15, 1.9);
    assert!(seen.codes().is_empty());
}

#[test]
fn at_a_corner_of_joined_mains_a_hydrant_is_no_question() {
    let mut board = Board::new(0.3);
    let [west, _, north] = street(&mut board);
    board.of_diameter(north, 0.1);
    board.hydrant([98.0, 2.1]);
    let seen = board.infer();
    assert!(seen.codes().is_empty());
    assert_eq!(seen.map().hydrants[0].unwrap().main, north);
    assert_eq!(seen.parts_of(west), 1);
}

#[test]
fn a_transmission_main_or_another_zone_does_not_fit() {
    let mut board = Board::new(0.3);
    let [west, ..] = street(&mut board);
    let big = board.main(&[[0.0, 1.0], [90.0, 1.0]]);
    board.of_kind(big, MainKind::Transmission);
    board.source([0.0, 1.0]);
    let hydrant = board.hydrant([45.0, 1.5]);
    let customer = board.customer([45.0, 8.0]);
    let seen = board.infer();
    assert_eq!(seen.map().hydrants[hydrant as usize].unwrap().main, west);
    assert_eq!(seen.map().customers[customer as usize].unwrap().main, west);
    board.in_zone(west, 0);
    board.assets.hydrants[0].zone = Some(1);
    let seen = board.infer();
    assert_eq!(seen.map().hydrants[0], None);
}

#[test]
fn a_customer_draws_at_the_nearer_end_of_the_part_it_meets() {
    let mut board = Board::new(0.3);
    let [west, ..] = street(&mut board);
    board.hydrant([60.0, 0.0]);
    let near_start = board.customer([10.0, 15.0]);
    let near_hydrant = board.customer([40.0, 15.0]);
    let off = board.customer([40.0, 200.0]);
    let seen = board.infer();
    let tap = |customer: u32| seen.map().customers[customer as usize];
    assert_eq!(tap(near_start).unwrap().main, west);
    assert_eq!(seen.map().nodes[tap(near_start).unwrap().node as usize].at, [0.0, 0.0]);
    assert_eq!(
        seen.map().nodes[tap(near_hydrant).unwrap().node as usize].at,
        [60.0, 0.0]
    );
    assert_eq!(tap(off), None);
    assert_eq!(seen.codes(), ["customer-off-main"]);
    assert_eq!(seen.parts_of(west), 2);
}

#[test]
fn a_customer_goes_round_a_closed_valve_to_its_own_side() {
    let mut board = Board::new(0.3);
    street(&mut board);
    board.closed_valve([60.0, 0.0]);
    let customer = board.customer([55.0, 10.0]);
    let seen = board.infer();
    let Some(ValvePlace::Cut { node_a, .. }) = seen.map().valves[0] else {
        panic!("not cut");
    };
    assert_eq!(seen.map().customers[customer as usize].unwrap().node, node_a);
}
