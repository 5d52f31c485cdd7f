//! Each fault of drawing beside its innocent twin.

use super::draw::Board;
use crate::assets::{Drawing, MainKind, ValveKind};
use crate::finding::{Code, Severity};
use crate::topology::{JoinKind, ZoneContact};

/// Two streets that meet in the middle of an exact grid: the smallest town.
fn cross(board: &mut Board) -> [u32; 4] {
    [
        board.main(&[[-100.0, 0.0], [0.0, 0.0]]),
        board.main(&[[0.0, 0.0], [100.0, 0.0]]),
        board.main(&[[0.0, -100.0], [0.0, 0.0]]),
        board.main(&[[0.0, 0.0], [0.0, 100.0]]),
    ]
}

#[test]
fn an_exact_drawing_gives_no_finding() {
    let mut board = Board::new(1.0);
    let mains = cross(&mut board);
    board.source([-100.0, 0.0]);
    let seen = board.infer();
    assert!(seen.codes().is_empty(), "{:?}", seen.findings());
    assert_eq!(seen.pairs().len(), 6);
    assert_eq!(seen.map().nodes.len(), 5);
    assert!(mains.iter().all(|&main| seen.parts_of(main) == 1));
    assert_eq!(seen.pieces(), 1);
    assert_eq!(seen.map().joins.len(), 6);
    assert!(
        seen.map()
            .joins
            .iter()
            .all(|join| join.kind == JoinKind::EndOnEnd && join.joined)
    );
}

#[test]
fn rows_that_are_not_drawn_are_said_and_keep_no_part() {
    let mut board = Board::new(1.0);
    cross(&mut board);
    let cases = [
        (Drawing::Missing, Code::GeometryMissing),
        (Drawing::Lines(vec![]), Code::GeometryMissing),
        (Drawing::Lines(vec![vec![]]), Code::GeometryMissing),
        (Drawing::Lines(vec![vec![[5.0, 5.0]]]), Code::GeometryOnePoint),
        (
            Drawing::Lines(vec![vec![[5.0, 5.0], [5.0, 5.0]]]),
            Code::GeometryZeroLength,
        ),
        (
            Drawing::Lines(vec![vec![[5.0, 5.0], [f64::NAN, 5.0]]]),
            Code::GeometryNotFinite,
        ),
        (Drawing::NotFinite, Code::GeometryNotFinite),
        (Drawing::OtherType("Polygon"), Code::GeometryOtherType),
    ];
    let rows: Vec<(u32, Code)> = cases.into_iter().map(|(d, code)| (board.drawing(d), code)).collect();
    let seen = board.infer();
    for (row, code) in rows {
        assert!(seen.names_main(code, row), "{code:?}");
        assert_eq!(seen.parts_of(row), 0);
    }
    assert_eq!(seen.findings().len(), 8);
    assert_eq!(seen.map().steps[0].count, 8);
}

#[test]
fn repeated_vertices_are_dropped_in_silence() {
    let mut board = Board::new(1.0);
    let main = board.main(&[[0.0, 0.0], [0.0, 0.0], [10.0, 0.0], [10.0, 0.0], [20.0, 0.0]]);
    let seen = board.infer();
    assert!(seen.codes().is_empty());
    assert_eq!(seen.map().lines[0].vertices.len(), 3);
    assert_eq!(seen.parts_of(main), 1);
}

#[test]
fn an_empty_map_is_no_trouble() {
    let seen = Board::new(1.0).infer();
    assert!(seen.codes().is_empty() && seen.map().nodes.is_empty());
    assert!(seen.map().tolerance.is_some());
}

#[test]
fn touching_parts_are_put_together_in_any_order_and_direction() {
    let mut board = Board::new(1.0);
    let main = board.parts(&[
        &[[20.0, 0.0], [30.0, 0.0]],
        &[[10.0, 0.0], [0.0, 0.0]],
        &[[10.0, 0.0], [20.0, 0.0]],
    ]);
    let next = board.main(&[[0.0, 0.0], [0.0, 50.0]]);
    let seen = board.infer();
    assert_eq!(seen.codes(), ["multipart-merged"]);
    assert_eq!(seen.parts_of(main), 1);
    assert_eq!(seen.map().lines[0].vertices.len(), 4);
    assert!(seen.joined(main, next));
}

#[test]
fn a_main_that_branches_is_one_main_in_several_lines() {
    let mut board = Board::new(1.0);
    let main = board.parts(&[
        &[[0.0, 0.0], [50.0, 0.0]],
        &[[50.0, 0.0], [100.0, 0.0]],
        &[[50.0, 0.0], [50.0, 40.0]],
    ]);
    let seen = board.infer();
    assert_eq!(seen.codes(), ["multipart-merged"]);
    assert_eq!(seen.parts_of(main), 3);
    assert_eq!(seen.pieces(), 1);
}

#[test]
fn parts_that_do_not_touch_are_said_unless_the_gap_is_within_the_tolerance() {
    let mut board = Board::new(1.0);
    let apart = board.parts(&[&[[0.0, 0.0], [50.0, 0.0]], &[[60.0, 0.0], [100.0, 0.0]]]);
    board.source([0.0, 0.0]);
    let seen = board.infer();
    assert_eq!(seen.warnings(), ["multipart-apart"]);
    assert!(seen.names_main(Code::MultipartApart, apart));
    assert_eq!(seen.finding(Code::MultipartApart).measured.unwrap().value, 10.0);
    let mut board = Board::new(1.0);
    board.parts(&[&[[0.0, 0.0], [50.0, 0.0]], &[[50.4, 0.0], [100.0, 0.0]]]);
    let seen = board.infer();
    assert_eq!(seen.pieces(), 1);
    assert!(seen.warnings().is_empty());
    assert!(seen.codes().contains(&"multipart-merged"));
}

#[test]
fn a_gap_between_parts_is_said_once_however_wide() {
    let mut board = Board::new(1.0);
    board.parts(&[&[[0.0, 0.0], [50.0, 0.0]], &[[52.0, 0.0], [100.0, 0.0]]]);
    board.source([0.0, 0.0]);
    assert_eq!(board.infer().warnings(), ["multipart-apart"]);
}

#[test]
fn a_ring_tied_in_once_is_a_self_loop_and_keeps_its_water() {
    let mut board = Board::new(1.0);
    cross(&mut board);
    let ring = board.main(&[[100.0, 0.0], [130.0, 0.0], [130.0, 30.0], [100.0, 30.0], [100.0, 0.0]]);
    let seen = board.infer();
    assert_eq!(seen.warnings(), ["self-loop"]);
    assert!(seen.names_main(Code::SelfLoop, ring));
    assert_eq!(seen.parts_of(ring), 2);
    assert_eq!(seen.pieces(), 1);
}

#[test]
fn a_ring_main_with_tees_and_a_lollipop_are_innocent() {
    let mut board = Board::new(1.0);
    cross(&mut board);
    let ring = board.main(&[[100.0, 0.0], [200.0, 0.0], [200.0, 100.0], [100.0, 100.0], [100.0, 0.0]]);
    let tee = board.main(&[[200.0, 100.0], [300.0, 100.0]]);
    let lollipop = board.main(&[
        [-100.0, 0.0],
        [-200.0, 0.0],
        [-260.0, 60.0],
        [-260.0, -60.0],
        [-200.0, 0.0],
    ]);
    let seen = board.infer();
    assert!(seen.warnings().is_empty(), "{:?}", seen.findings());
    assert_eq!(seen.finding(Code::SelfLoop).severity, Severity::Note);
    assert!(seen.joined(ring, tee));
    assert_eq!(seen.parts_of(ring), 2);
    assert_eq!(seen.parts_of(lollipop), 3);
}

#[test]
fn a_ring_shorter_than_the_tolerance_is_left_out() {
    let mut board = Board::new(1.0);
    cross(&mut board);
    let speck = board.main(&[[0.0, 0.0], [0.2, 0.0], [0.2, 0.2], [0.0, 0.0]]);
    let seen = board.infer();
    assert!(seen.names_main(Code::SelfLoop, speck));
    assert_eq!(seen.parts_of(speck), 0);
}

#[test]
fn identical_reversed_and_nearly_identical_mains_are_calculated_once() {
    for copy in [
        vec![[0.0, 0.0], [40.0, 5.0], [100.0, 0.0]],
        vec![[100.0, 0.0], [40.0, 5.0], [0.0, 0.0]],
        vec![[0.0, 0.0], [20.0, 2.5], [40.0, 5.0], [100.0, 0.0]],
        vec![[0.2, 0.1], [40.1, 5.2], [100.2, -0.1]],
        vec![[0.0, 0.0], [40.3, 5.3], [100.0, 0.0]],
    ] {
        let mut board = Board::new(1.0);
        cross(&mut board);
        let main = {
            board.assets.mains.remove(1);
            board.main(&[[0.0, 0.0], [40.0, 5.0], [100.0, 0.0]])
        };
        for (row, main) in board.assets.mains.iter_mut().enumerate() {
            main.origin.row = row as u32;
        }
        let twin = board.main(&copy);
        let seen = board.infer();
        assert_eq!(seen.warnings(), ["duplicate-main"], "{copy:?}: {:?}", seen.findings());
        assert!(seen.names_main(Code::DuplicateMain, twin) && seen.names_main(Code::DuplicateMain, main));
        assert_eq!(seen.map().same_as, [(twin, main)]);
        assert_eq!(seen.parts_of(twin), 0);
    }
}

#[test]
fn copies_that_differ_are_serious_and_the_smaller_is_calculated() {
    let mut board = Board::new(1.0);
    cross(&mut board);
    let large = 1;
    let small = board.main(&[[100.0, 0.0], [0.0, 0.0]]);
    board.of_diameter(small, 0.1);
    let seen = board.infer();
    let finding = seen.finding(Code::DuplicateDiffers);
    assert_eq!(finding.severity, Severity::Serious);
    assert!(seen.names_main(Code::DuplicateDiffers, small) && seen.names_main(Code::DuplicateDiffers, large));
    assert_eq!((seen.parts_of(large), seen.parts_of(small)), (0, 1));
    for edit in [
        |b: &mut Board, m: u32| b.edit(m).year = Some(2001),
        |b: &mut Board, m: u32| b.edit(m).zone = Some(1),
    ] {
        let mut board = Board::new(1.0);
        cross(&mut board);
        board.in_zone(1, 0);
        let copy = board.main(&[[0.0, 0.0], [100.0, 0.0]]);
        edit(&mut board, copy);
        assert!(board.infer().codes().contains(&"duplicate-differs"));
    }
}

#[test]
fn two_mains_between_the_same_nodes_and_two_in_one_street_are_no_duplicates() {
    let mut board = Board::new(1.0);
    cross(&mut board);
    // A second main between the same nodes that takes another way.
    board.main(&[[0.0, 0.0], [50.0, 2.0], [100.0, 0.0]]);
    // Mains 0.7 m apart in one street, each going on beyond.
    board.main(&[[-100.0, 60.0], [0.0, 60.0]]);
    board.main(&[[0.0, 60.0], [90.0, 60.0]]);
    board.main(&[[-100.0, 60.7], [0.1, 60.7]]);
    board.main(&[[0.1, 60.7], [90.0, 60.7]]);
    // Services side by side.
    board.main(&[[20.0, 60.0], [20.0, 68.0]]);
    board.main(&[[20.7, 60.0], [20.7, 68.0]]);
    // Short pieces of a valve cluster, end to end.
    board.main(&[[300.0, 0.0], [300.4, 0.0]]);
    board.main(&[[300.4, 0.0], [300.8, 0.0]]);
    let seen = board.infer();
    assert!(
        !seen.codes().iter().any(|code| code.starts_with("duplicate")),
        "{:?}",
        seen.findings()
    );
    assert!(!seen.joined(5, 7) && !seen.joined(6, 8) && !seen.joined(5, 8));
}

#[test]
fn a_main_along_part_of_another_is_said() {
    let mut board = Board::new(1.0);
    let long = board.main(&[[0.0, 0.0], [100.0, 0.0]]);
    let over = board.main(&[[60.0, 0.0], [160.0, 0.0]]);
    let seen = board.infer();
    assert_eq!(seen.warnings(), ["mains-overlap"]);
    assert!(seen.names_main(Code::MainsOverlap, long) && seen.names_main(Code::MainsOverlap, over));
}

#[test]
fn a_gap_within_the_tolerance_is_joined_to_all_that_meet_there() {
    for (dx, dy) in [(0.5, 0.0), (0.1, 0.8), (0.3, -0.3)] {
        let mut board = Board::new(1.0);
        let [west, east, south, north] = cross(&mut board);
        board.edit(east).drawing = Drawing::Lines(vec![vec![[dx, dy], [100.0, 0.0]]]);
        let seen = board.infer();
        assert_eq!(seen.codes(), ["end-joined"], "{:?}", seen.findings());
        assert!(seen.names_main(Code::EndJoined, east));
        assert_eq!(seen.finding(Code::EndJoined).feature.unwrap().row, east);
        for other in [west, south, north] {
            assert!(seen.joined(east, other));
            assert_eq!(seen.kinds(east, other), [JoinKind::EndNearEnd]);
        }
        assert_eq!(seen.map().nodes.len(), 5);
    }
}

#[test]
fn a_gap_beyond_the_tolerance_is_a_near_miss() {
    let mut board = Board::new(1.0);
    let [west, east, ..] = cross(&mut board);
    board.edit(east).drawing = Drawing::Lines(vec![vec![[1.7, 0.0], [100.0, 0.0]]]);
    board.source([-100.0, 0.0]);
    let seen = board.infer();
    assert_eq!(seen.warnings(), ["near-miss"], "{:?}", seen.findings());
    assert_eq!(seen.finding(Code::NearMiss).feature.unwrap().row, east);
    assert!(!seen.joined(east, west));
    // The piece that hangs off it is a note beside it.
    assert_eq!(seen.finding(Code::Island).severity, Severity::Note);
}

#[test]
fn an_end_on_the_middle_of_a_main_cuts_it() {
    let mut board = Board::new(1.0);
    let through = board.main(&[[0.0, 0.0], [100.0, 0.0]]);
    let tee = board.main(&[[40.0, 0.0005], [40.0, 50.0]]);
    let near = board.main(&[[70.0, 0.6], [70.0, 50.0]]);
    let seen = board.infer();
    assert_eq!(seen.codes(), ["end-joined-to-middle"]);
    assert_eq!(seen.finding(Code::EndJoinedToMiddle).feature.unwrap().row, near);
    assert_eq!(seen.parts_of(through), 3);
    assert_eq!(seen.kinds(tee, through), [JoinKind::EndOnMiddle]);
    assert_eq!(seen.kinds(near, through), [JoinKind::EndNearMiddle]);
    assert_eq!(seen.pieces(), 1);
}

#[test]
fn a_cross_fitting_on_an_unsplit_main_joins_all_three() {
    let mut board = Board::new(1.0);
    let through = board.main(&[[0.0, 0.0], [100.0, 0.0]]);
    let north = board.main(&[[40.0, 0.0], [40.0, 50.0]]);
    let south = board.main(&[[40.0, 0.0], [40.0, -50.0]]);
    let seen = board.infer();
    assert!(seen.codes().is_empty());
    assert!(seen.joined(north, south) && seen.joined(north, through) && seen.joined(south, through));
    assert_eq!(seen.parts_of(through), 2);
}

#[test]
fn an_end_on_the_line_between_is_joined_to_it_and_not_to_the_lateral_beside() {
    let mut board = Board::new(1.0);
    let through = board.main(&[[0.0, 0.0], [100.0, 0.0]]);
    let lateral = board.main(&[[40.0, 0.0], [40.0, 3.0]]);
    let tee = board.main(&[[40.7, -0.3], [40.7, -50.0]]);
    let seen = board.infer();
    assert!(seen.joined(tee, through) && seen.joined(lateral, through));
    assert!(!seen.joined(tee, lateral), "{:?}", seen.map().joins);
}

#[test]
fn a_hydrant_lateral_shorter_than_the_tolerance_keeps_its_end() {
    let mut board = Board::new(1.0);
    let through = board.main(&[[0.0, 0.0], [100.0, 0.0]]);
    let lateral = board.main(&[[40.0, 0.0], [40.0, 0.7]]);
    let slanting = board.main(&[[60.0, 0.0], [63.0, 0.6]]);
    let seen = board.infer();
    assert_eq!(seen.codes(), ["short-main"]);
    assert_eq!(seen.parts_of(through), 3);
    assert_eq!((seen.parts_of(lateral), seen.parts_of(slanting)), (1, 1));
    assert_eq!(seen.map().nodes.len(), 6);
}

#[test]
fn a_valve_cluster_of_short_mains_keeps_its_nodes() {
    let mut board = Board::new(1.0);
    let west = board.main(&[[-100.0, 0.0], [-0.4, 0.0]]);
    let stub_w = board.main(&[[-0.4, 0.0], [0.0, 0.0]]);
    let stub_e = board.main(&[[0.0, 0.0], [0.4, 0.0]]);
    let east = board.main(&[[0.4, 0.0], [100.0, 0.0]]);
    let stub_n = board.main(&[[0.0, 0.0], [0.0, 0.4]]);
    let north = board.main(&[[0.0, 0.4], [0.0, 100.0]]);
    let seen = board.infer();
    assert!(seen.warnings().is_empty());
    assert_eq!(seen.map().nodes.len(), 7);
    assert!(seen.joined(west, stub_w) && seen.joined(stub_w, stub_e) && seen.joined(stub_n, north));
    assert!(!seen.joined(west, east) && !seen.joined(west, stub_e) && !seen.joined(north, east));
    assert_eq!(seen.codes(), ["short-main", "short-main", "short-main"]);
}

#[test]
fn mains_side_by_side_nearer_than_the_tolerance_are_not_stitched_together() {
    let mut board = Board::new(1.0);
    let [west, east, ..] = cross(&mut board);
    // A twin 0.8 m away with its own nodes, a lateral each, and one that is not split at all.
    let twin_w = board.main(&[[-100.0, 0.8], [-0.5, 0.8]]);
    let twin_e = board.main(&[[-0.5, 0.8], [100.0, 0.8]]);
    let whole = board.main(&[[-100.0, -0.7], [100.0, -0.7]]);
    let lateral = board.main(&[[30.0, 0.0], [30.0, -4.0]]);
    let other = board.main(&[[30.2, 0.8], [30.2, 4.0]]);
    let seen = board.infer();
    for a in [west, east, lateral] {
        for b in [twin_w, twin_e, whole, other] {
            assert!(!seen.joined(a, b), "{a} {b}: {:?}", seen.map().joins);
        }
    }
    assert!(seen.joined(east, lateral) && seen.joined(twin_e, other));
}

#[test]
fn an_overshoot_within_the_tolerance_is_joined_where_the_two_meet() {
    // Past an unsplit main, past a node, and along the street that goes on beyond the node.
    let mut board = Board::new(1.0);
    let through = board.main(&[[0.0, 0.0], [100.0, 0.0]]);
    let over = board.main(&[[40.0, 50.0], [40.0, -0.6]]);
    let seen = board.infer();
    assert_eq!(seen.codes(), ["overshoot"]);
    assert_eq!(seen.finding(Code::Overshoot).feature.unwrap().row, over);
    assert_eq!(seen.kinds(over, through), [JoinKind::Overshoot]);
    assert_eq!((seen.parts_of(through), seen.parts_of(over)), (2, 1));
    let part = seen.map().parts.iter().find(|part| part.main == over).unwrap();
    assert!((part.end_m - 50.0).abs() < 1e-9);

    let mut board = Board::new(1.0);
    let [west, east, south, north] = cross(&mut board);
    board.edit(west).drawing = Drawing::Lines(vec![vec![[-100.0, 0.0], [0.7, 0.0]]]);
    let seen = board.infer();
    assert_eq!(seen.codes(), ["overshoot"], "{:?}", seen.findings());
    assert!(seen.joined(west, east) && seen.joined(west, south) && seen.joined(west, north));
    assert_eq!(seen.parts_of(east), 1);
    assert_eq!(seen.map().nodes.len(), 5);

    let mut board = Board::new(1.0);
    let [west, east, south, north] = cross(&mut board);
    board.edit(north).drawing = Drawing::Lines(vec![vec![[0.2, 100.0], [0.015, 0.0], [0.0, -0.5]]]);
    board.assets.mains.remove(south as usize);
    let north = north - 1;
    let seen = board.infer();
    assert!(seen.joined(west, north) && seen.joined(east, north));
    assert_eq!(seen.codes(), ["overshoot"], "{:?}", seen.findings());
}

#[test]
fn an_overshoot_along_a_main_that_turns_off_there_is_trimmed() {
    let mut board = Board::new(1.0);
    // The other main comes from the south and turns west, where this one comes from the east.
    let turning = board.main(&[[0.0, -100.0], [0.0, 0.0], [-100.0, 0.0]]);
    let over = board.main(&[[100.0, 0.0], [-0.6, 0.0]]);
    let seen = board.infer();
    assert_eq!(seen.codes(), ["overshoot"], "{:?}", seen.findings());
    assert_eq!(seen.finding(Code::Overshoot).feature.unwrap().row, over);
    assert!(seen.joined(turning, over));
    assert_eq!((seen.parts_of(turning), seen.parts_of(over)), (2, 1));
    assert!(seen.map().nodes.iter().any(|node| node.at == [0.0, 0.0]));
}

#[test]
fn an_overshoot_beyond_the_tolerance_is_a_crossing_with_its_tail() {
    let mut board = Board::new(1.0);
    let through = board.main(&[[0.0, 0.0], [100.0, 0.0]]);
    let over = board.main(&[[40.0, 50.0], [40.0, -1.8]]);
    board.main(&[[0.0, 0.0], [0.0, 80.0], [40.0, 50.0]]);
    let seen = board.infer();
    assert_eq!(seen.warnings(), ["crossing-not-joined"], "{:?}", seen.findings());
    let finding = seen.finding(Code::CrossingNotJoined);
    assert_eq!(finding.feature.unwrap().row, over);
    assert!((finding.measured.unwrap().value - 1.8).abs() < 1e-9);
    assert!(!seen.joined(over, through));
}

#[test]
fn a_lateral_to_its_hydrant_across_another_main_is_no_overshoot() {
    let mut board = Board::new(1.0);
    let feeder = board.main(&[[0.0, 0.0], [100.0, 0.0]]);
    let beside = board.main(&[[0.0, 2.0], [100.0, 2.0]]);
    let lateral = board.main(&[[40.0, 0.0], [40.0, 2.6]]);
    board.main(&[[0.0, 0.0], [0.0, -50.0], [-50.0, -50.0], [-50.0, 2.0], [0.0, 2.0]]);
    board.hydrant([40.0, 2.6]);
    let seen = board.infer();
    assert!(seen.joined(feeder, lateral) && !seen.joined(lateral, beside));
    assert!(seen.warnings().is_empty(), "{:?}", seen.findings());
    assert!(seen.names_main(Code::CrossingNotJoined, lateral));
}

#[test]
fn a_bare_crossing_is_said_once_and_never_joined() {
    let mut board = Board::new(1.0);
    let a = board.main(&[[0.0, 0.0], [50.0, 0.0], [100.0, 0.0]]);
    let b = board.main(&[[50.0, -50.0], [50.0, 0.0], [50.0, 50.0]]);
    let c = board.main(&[[20.0, -50.0], [20.0, 50.0]]);
    board.main(&[[0.0, 0.0], [0.0, -50.0], [20.0, -50.0], [50.0, -50.0]]);
    let seen = board.infer();
    assert_eq!(
        seen.warnings(),
        ["crossing-not-joined", "crossing-not-joined"],
        "{:?}",
        seen.findings()
    );
    assert!(!seen.joined(a, b) && !seen.joined(a, c));
    let shared = seen
        .map()
        .joins
        .iter()
        .find(|j| j.kind == JoinKind::Crossing && j.at == [50.0, 0.0])
        .unwrap();
    assert!(shared.why.contains("both have a vertex at the crossing") && !shared.joined);
}

#[test]
fn a_transmission_main_across_a_distribution_main_is_only_noted() {
    let mut board = Board::new(1.0);
    let a = board.main(&[[0.0, 0.0], [100.0, 0.0]]);
    let b = board.main(&[[50.0, -50.0], [50.0, 50.0]]);
    board.of_kind(a, MainKind::Distribution);
    board.of_kind(b, MainKind::Transmission);
    board.main(&[[0.0, 0.0], [0.0, -50.0], [50.0, -50.0]]);
    let seen = board.infer();
    assert_eq!(seen.codes(), ["crossing-not-joined"]);
    assert!(seen.warnings().is_empty());
}

#[test]
fn a_dead_end_is_no_near_miss_where_something_explains_it() {
    let mut board = Board::new(1.0);
    // A cul-de-sac that comes back to near its own start, a lateral near the corner, a stub.
    board.main(&[[0.0, 0.0], [100.0, 0.0]]);
    board.main(&[[0.0, 0.0], [0.0, 100.0]]);
    board.main(&[[3.0, 0.0], [3.0, 3.0], [2.5, 3.0]]);
    board.main(&[[20.0, 0.0], [20.0, 2.5]]);
    // A dead end with its node point, beside another street's main.
    board.main(&[[0.0, 100.0], [97.5, 100.0]]);
    board.main(&[[100.0, 0.0], [100.0, 200.0]]);
    board.node([97.5, 100.0]);
    let seen = board.infer();
    assert!(seen.warnings().is_empty(), "{:?}", seen.findings());
    assert_eq!(seen.codes(), ["near-miss"]);
}

#[test]
fn zones_that_touch_are_kept_apart_unless_an_open_zone_valve_stands_there() {
    let draw = |valve: Option<bool>| {
        let mut board = Board::new(1.0);
        let mains = cross(&mut board);
        for &main in &mains[..2] {
            board.in_zone(main, 0);
        }
        board.in_zone(mains[2], 1);
        if let Some(closed) = valve {
            board.valve([0.0, 0.3], ValveKind::Zone, closed);
        }
        board
    };
    let seen = draw(None).infer();
    assert!(seen.codes().contains(&"zones-kept-apart"));
    assert!(seen.joined(0, 1) && !seen.joined(0, 2) && seen.joined(0, 3) && !seen.joined(2, 3));
    let seen = draw(Some(false)).infer();
    assert!(seen.codes().is_empty());
    assert!(seen.joined(0, 2));
    let seen = draw(Some(true)).infer();
    assert!(!seen.codes().contains(&"zones-kept-apart"));
    assert!(!seen.joined(0, 2));
    let mut board = draw(None);
    board.settings.zones = ZoneContact::Ignore;
    let seen = board.infer();
    assert!(seen.codes().is_empty() && seen.joined(0, 2));
}

#[test]
fn a_snap_or_tee_between_two_zones_is_kept_apart() {
    let mut board = Board::new(1.0);
    let through = board.main(&[[0.0, 0.0], [100.0, 0.0]]);
    let tee = board.main(&[[40.0, 0.0], [40.0, 50.0]]);
    let near = board.main(&[[60.0, 0.4], [60.0, 50.0]]);
    let end = board.main(&[[100.5, 0.0], [150.0, 0.0]]);
    board.in_zone(through, 0);
    for main in [tee, near, end] {
        board.in_zone(main, 1);
    }
    let seen = board.infer();
    assert!(seen.pairs().is_empty());
    for main in [tee, near, end] {
        assert!(seen.names_main(Code::ZonesKeptApart, main), "{main}");
    }
}

#[test]
fn raw_water_never_joins_the_rest() {
    let mut board = Board::new(1.0);
    let mains = cross(&mut board);
    board.of_kind(mains[0], MainKind::RawWater);
    board.source([100.0, 0.0]);
    let seen = board.infer();
    assert!(!seen.joined(mains[0], mains[1]) && seen.joined(mains[1], mains[2]));
    assert!(seen.warnings().is_empty());
}

#[test]
fn a_piece_without_a_source_is_named_with_the_nearest_other_main() {
    let mut board = Board::new(1.0);
    let mains = cross(&mut board);
    let far = board.main(&[[0.0, 120.0], [200.0, 120.0]]);
    let next = board.main(&[[200.0, 120.0], [200.0, 150.0]]);
    board.source([-100.0, 0.0]);
    let seen = board.infer();
    assert_eq!(seen.codes(), ["island"]);
    let finding = seen.finding(Code::Island);
    assert_eq!(finding.feature.unwrap().row, far);
    assert_eq!(finding.others.iter().map(|f| f.row).collect::<Vec<_>>(), [next]);
    assert_eq!(finding.measured.unwrap().value, 20.0);
    assert!(!finding.others.iter().any(|f| f.row == mains[3]));
}

#[test]
fn without_any_source_the_smaller_pieces_are_named() {
    let mut board = Board::new(1.0);
    cross(&mut board);
    let far = board.main(&[[0.0, 120.0], [200.0, 120.0]]);
    let seen = board.infer();
    assert_eq!(seen.codes(), ["island"]);
    assert!(seen.names_main(Code::Island, far));
}

#[test]
fn a_cluster_is_never_wider_than_the_tolerance() {
    let mut board = Board::new(1.0);
    for i in 0..6 {
        let angle = f64::from(i);
        board.main(&[[f64::from(i) * 0.6, 0.0], [angle.cos() * 100.0, 50.0 + 20.0 * angle]]);
    }
    let seen = board.infer();
    for join in seen.map().joins.iter().filter(|j| j.joined) {
        assert!(join.distance_m <= 1.0 + 1e-9);
    }
}

#[test]
fn the_tolerance_table_finds_the_empty_stretch() {
    let mut board = Board::new(0.3);
    let mut x = 0.0;
    for gap in [0.02, 0.05, 0.08, 0.03, 0.06, 0.0, 0.9, 1.4, 0.04] {
        board.main(&[[x, 0.0], [x + 50.0, 0.0]]);
        x += 50.0 + gap;
    }
    board.main(&[[x, 0.0], [x + 50.0, 0.0]]);
    let seen = board.infer();
    let table = seen.map().tolerance.clone().unwrap();
    assert!(table.suggested_m > 0.08 && table.suggested_m < 0.9, "{table:?}");
    assert_eq!(table.rows.len(), 10, "nine and the one in use");
    assert!(table.rows.windows(2).all(|rows| rows[0].joins <= rows[1].joins));
    assert!(table.rows.windows(2).all(|rows| rows[0].islands >= rows[1].islands));
    let at = |m: f64| *table.rows.iter().find(|row| row.tolerance_m == m).unwrap();
    assert_eq!((at(0.0).joins, at(0.0).islands), (0, 9));
    assert_eq!((at(0.1).joins, at(0.1).islands), (6, 3));
    assert_eq!((at(2.0).joins, at(2.0).islands), (8, 1));
    assert_eq!(at(5.0).largest_share, 1.0);
}
