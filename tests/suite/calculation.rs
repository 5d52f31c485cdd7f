//! The job without files, on networks small enough to work out by hand.

use gradeline::assets::{
    Assets, Basis, Customer, Drawing, Friction, Hydrant, Main, MainKind, NamedMain, NodeKind, NodePoint, Point, Reach,
    Valued, Valve, ValveKind,
};
use gradeline::calculation::{Calculation, Settings, calculate};
use gradeline::finding::{Code, FeatureRef, Severity};
use gradeline::hydraulics;
use gradeline::network::{AssemblySettings, Case};
use gradeline::screening::{Fire, Flag, Limit, LimitBy, Limits, Untested};
use gradeline::topology::JoinSettings;
use gradeline::watch::Unwatched;

pub(super) const MAINS: u16 = 0;
pub(super) const NODES: u16 = 1;
pub(super) const HYDRANTS: u16 = 2;
pub(super) const CUSTOMERS: u16 = 3;
pub(super) const VALVES: u16 = 4;

/// Head lost along a main, m, by the velocity form V = 1.318 C R^0.63 S^0.54 (US units, Williams & Hazen 1905) turned
/// into SI by hand: h = 10.66992 L Q^(1/0.54) / (C^(1/0.54) D^(2.63/0.54)).
pub(super) fn hand_loss_m(length_m: f64, flow_m3_per_s: f64, c: f64, diameter_m: f64) -> f64 {
    10.66992 * length_m * (flow_m3_per_s / c).powf(1.0 / 0.54) / diameter_m.powf(2.63 / 0.54)
}

pub(super) fn empty() -> Assets {
    Assets {
        mains: Vec::new(),
        left_out: Vec::new(),
        nodes: Vec::new(),
        hydrants: Vec::new(),
        customers: Vec::new(),
        valves: Vec::new(),
        zones: Vec::new(),
        classes: vec!["shop".into()],
        reach: Reach {
            hydrants_m: 10.0,
            customers_m: 50.0,
            valves_m: 2.0,
        },
    }
}

pub(super) fn add_main(assets: &mut Assets, line: &[Point], diameter_mm: Option<f64>) {
    let row = assets.mains.len() as u32;
    assets.mains.push(Main {
        origin: FeatureRef { layer: MAINS, row },
        drawing: Drawing::Lines(vec![line.to_vec()]),
        length_scale: 1.0,
        stored_length_m: None,
        diameter_m: diameter_mm.map(|mm| Valued {
            value: mm / 1000.0,
            basis: Basis::Map,
        }),
        friction: Valued {
            value: Friction::CFactor(100.0),
            basis: Basis::Map,
        },
        minor_loss_k: 0.0,
        year: None,
        zone: None,
        kind: MainKind::Unknown,
    });
}

pub(super) fn add_node(assets: &mut Assets, at: Point, elevation_m: Option<f64>, head_m: Option<f64>, demand_lps: f64) {
    let row = assets.nodes.len() as u32;
    let valued = |value: f64| Valued {
        value,
        basis: Basis::Map,
    };
    assets.nodes.push(NodePoint {
        origin: Some(FeatureRef { layer: NODES, row }),
        at: Some(at),
        kind: if head_m.is_some() {
            NodeKind::Source
        } else {
            NodeKind::Node
        },
        elevation_m: elevation_m.map(valued),
        head_m: head_m.map(valued),
        demand_m3_per_s: demand_lps / 1000.0,
        greatest_m3_per_s: None,
        zone: None,
    });
}

pub(super) fn add_hydrant(assets: &mut Assets, at: Point, elevation_m: Option<f64>, needed_lps: Option<f64>) {
    let row = assets.hydrants.len() as u32;
    assets.hydrants.push(Hydrant {
        origin: FeatureRef { layer: HYDRANTS, row },
        at: Some(at),
        elevation_m,
        needed_m3_per_s: needed_lps.map(|lps| Valued {
            value: lps / 1000.0,
            basis: Basis::Map,
        }),
        zone: None,
    });
}

pub(super) fn add_customer(assets: &mut Assets, at: Point, demand_lps: f64, class: Option<u32>, lift_m: f64) {
    let row = assets.customers.len() as u32;
    assets.customers.push(Customer {
        origin: FeatureRef { layer: CUSTOMERS, row },
        at: Some(at),
        demand_m3_per_s: demand_lps / 1000.0,
        class,
        elevation_m: None,
        lift_m,
        zone: None,
    });
}

pub(super) fn average_day() -> Case {
    Case {
        name: "average day".into(),
        demand_times: 1.0,
        demand_times_by: Vec::new(),
        heads_m: Vec::new(),
    }
}

pub(super) fn settings(cases: Vec<Case>, fire: Option<Fire>) -> Settings {
    Settings {
        joining: JoinSettings::default(),
        assembly: AssemblySettings::default(),
        hydraulics: hydraulics::Settings::default(),
        cases: cases.into_iter().map(|case| (case, Limits::default())).collect(),
        fire,
        limits: Limits::default(),
    }
}

pub(super) fn fire(keep_elsewhere_m: Option<f64>, needed_lps: Option<f64>) -> Fire {
    Fire {
        case: 0,
        residual_m: Limit::of_study(14.0),
        needed_m3_per_s: needed_lps.map(|lps| lps / 1000.0),
        keep_elsewhere_m: keep_elsewhere_m.map(Limit::of_study),
    }
}

pub(super) fn run(assets: &Assets, settings: &Settings) -> Calculation {
    calculate(assets, settings, Vec::new(), &Unwatched).expect("nobody cancels")
}

/// The node nearest to a place.
pub(super) fn node_at(found: &Calculation, at: Point) -> usize {
    let far = |node: &gradeline::topology::MapNode| (node.at[0] - at[0]).hypot(node.at[1] - at[1]);
    let nodes = found.map.nodes.iter().enumerate();
    nodes.min_by(|a, b| far(a.1).total_cmp(&far(b.1))).expect("a node").0
}

pub(super) fn close(a: f64, b: f64, tolerance: f64) {
    assert!((a - b).abs() <= tolerance, "{a} is not {b} to within {tolerance}");
}

/// A source at head 50 m, one main of 1000 m, bore 150 mm, C 100, and 10 l/s drawn at its end.
pub(super) fn one_main() -> Assets {
    let mut assets = empty();
    add_main(&mut assets, &[[0.0, 0.0], [1000.0, 0.0]], Some(150.0));
    add_node(&mut assets, [0.0, 0.0], Some(10.0), Some(50.0), 0.0);
    add_node(&mut assets, [1000.0, 0.0], Some(20.0), None, 10.0);
    assets
}

#[test]
fn one_main_loses_the_head_worked_out_by_hand() {
    let mut assets = one_main();
    assets.nodes[0].head_m = Some(Valued {
        value: 45.0,
        basis: Basis::Map,
    });
    let found = run(&assets, &settings(vec![average_day()], None));
    let (state, end) = (
        found.cases[0].outcome.as_ref().expect("settles"),
        node_at(&found, [1000.0, 0.0]),
    );
    let loss_m = hand_loss_m(1000.0, 0.010, 100.0, 0.150);
    close(state.head_m[end], 45.0 - loss_m, 1e-4);
    let verdict = &found.screened.nodes[end];
    close(verdict.low.value.expect("judged"), 25.0 - loss_m, 1e-4);
    assert_eq!(verdict.low.flag, Flag::Low, "20.7 m is below 30 psi, 21.1 m");
    assert!(found.findings.iter().any(|finding| finding.code == Code::PressureLow));
    assert_eq!(found.screened.coverage.untested_share(), 0.0);
    // Nobody draws at the source and no hydrant stands there.
    assert_eq!(
        found.screened.nodes[node_at(&found, [0.0, 0.0])].low.flag,
        Flag::NotJudged
    );
}

#[test]
fn elevations_between_known_ones_lie_on_the_straight_line() {
    let mut assets = empty();
    add_main(&mut assets, &[[0.0, 0.0], [300.0, 0.0]], Some(100.0));
    add_main(&mut assets, &[[300.0, 0.0], [1000.0, 0.0]], Some(100.0));
    add_main(&mut assets, &[[300.0, 0.0], [300.0, 80.0]], Some(100.0));
    add_node(&mut assets, [0.0, 0.0], Some(10.0), Some(60.0), 0.0);
    add_node(&mut assets, [1000.0, 0.0], Some(110.0), None, 1.0);
    let found = run(&assets, &settings(vec![average_day()], None));
    for place in [[300.0, 0.0], [300.0, 80.0]] {
        let elevation = found.network.elevation_m[node_at(&found, place)].expect("interpolated");
        close(elevation.value, 40.0, 1e-6);
        assert_eq!(elevation.basis, Basis::Interpolated);
    }
}

#[test]
fn what_has_no_source_no_demand_or_no_elevation_is_untested() {
    let mut assets = one_main();
    add_main(&mut assets, &[[0.0, 500.0], [1000.0, 500.0]], Some(150.0));
    add_node(&mut assets, [1000.0, 500.0], Some(20.0), None, 1.0);
    let found = run(&assets, &settings(vec![average_day()], None));
    let island = node_at(&found, [1000.0, 500.0]);
    assert_eq!(found.screened.nodes[island].low.flag, Flag::Untested);
    assert_eq!(found.screened.coverage.reason[island], Some(Untested::NoSource));
    close(found.screened.coverage.untested_share(), 0.5, 1e-12);

    let mut assets = one_main();
    assets.nodes[1].demand_m3_per_s = 0.0;
    add_hydrant(&mut assets, [1000.0, 0.0], None, None);
    let found = run(&assets, &settings(vec![average_day()], None));
    assert_eq!(
        found.screened.nodes[node_at(&found, [1000.0, 0.0])].low.flag,
        Flag::Untested
    );
    assert!(found.findings.iter().any(|finding| finding.code == Code::NoDemand));

    let mut assets = one_main();
    assets.nodes.iter_mut().for_each(|node| node.elevation_m = None);
    let found = run(&assets, &settings(vec![average_day()], None));
    let end = node_at(&found, [1000.0, 0.0]);
    assert_eq!(found.screened.nodes[end].low.flag, Flag::Untested);
    assert!(
        found.screened.nodes[end].head_m.is_some(),
        "the head is known all the same"
    );
    close(found.screened.coverage.untested_share(), 1.0, 0.0);
}

#[test]
fn no_source_at_all_is_serious_and_nothing_is_ok() {
    let mut assets = one_main();
    assets.nodes[0].head_m = None;
    let found = run(&assets, &settings(vec![average_day()], None));
    let said = found
        .findings
        .iter()
        .find(|finding| finding.code == Code::NoSource)
        .expect("said");
    assert_eq!(said.severity, Severity::Serious);
    assert!(found.screened.nodes.iter().all(|node| node.low.flag == Flag::Untested));
}

#[test]
fn a_hydrant_gives_the_flow_worked_out_by_hand() {
    let mut assets = one_main();
    assets.nodes[1].demand_m3_per_s = 0.002;
    assets.nodes[0].head_m = Some(Valued {
        value: 60.0,
        basis: Basis::Map,
    });
    add_hydrant(&mut assets, [1000.0, 0.0], Some(21.0), Some(30.0));
    let found = run(&assets, &settings(vec![average_day()], Some(fire(None, None))));
    let verdict = &found.screened.fire.verdicts().expect("run")[0];
    // The head at the hydrant may fall to 21 + 14 m: 25 m are there to lose, and 2 l/s are drawn besides.
    let whole = 100.0 * (25.0 * 0.150_f64.powf(2.63 / 0.54) / (10.66992 * 1000.0)).powf(0.54);
    let available = verdict.available_m3_per_s.expect("finite");
    assert!(
        ((available + 0.002) / whole - 1.0).abs() < 2e-6,
        "{available} + 0.002 is not {whole}"
    );
    assert_eq!(verdict.limit_by, Some(LimitBy::OwnPressure));
    assert_eq!(verdict.flag, Flag::Short);
    close(
        verdict.short_m3_per_s().expect("needed is known"),
        0.030 - available,
        1e-12,
    );
    close(
        verdict.at_need_m.expect("solved"),
        60.0 - 21.0 - hand_loss_m(1000.0, 0.032, 100.0, 0.150),
        1e-3,
    );
    assert_eq!(verdict.safe_m3_per_s, None, "it was not asked for");
}

#[test]
fn safe_flow_stops_where_a_customer_elsewhere_would_go_low() {
    let mut assets = one_main();
    assets.nodes[0].head_m = Some(Valued {
        value: 60.0,
        basis: Basis::Map,
    });
    assets.nodes[1].demand_m3_per_s = 0.001;
    // The hydrant stands low, half way; the customer at the end stands on a hill.
    add_hydrant(&mut assets, [500.0, 0.0], Some(5.0), Some(10.0));
    assets.nodes[1].elevation_m = Some(Valued {
        value: 40.0,
        basis: Basis::Map,
    });
    let found = run(&assets, &settings(vec![average_day()], Some(fire(Some(14.0), None))));
    let verdict = &found.screened.fire.verdicts().expect("run")[0];
    let (available, safe) = (
        verdict.available_m3_per_s.expect("finite"),
        verdict.safe_m3_per_s.expect("asked for"),
    );
    assert!(safe < available);
    assert!(matches!(verdict.limit_by, Some(LimitBy::Elsewhere(node)) if node.at() == node_at(&found, [1000.0, 0.0])));
    // At that flow the head at the end is 54 m: what is lost on both halves is 6 m.
    let lost = hand_loss_m(500.0, 0.001 + safe, 100.0, 0.150) + hand_loss_m(500.0, 0.001, 100.0, 0.150);
    close(lost, 6.0, 1e-4);
}

#[test]
fn fire_flow_without_a_needed_flow_or_a_case_is_not_run_and_said() {
    let mut assets = one_main();
    add_hydrant(&mut assets, [1000.0, 0.0], None, None);
    for asked in [None, Some(fire(None, None))] {
        let found = run(&assets, &settings(vec![average_day()], asked));
        assert!(found.screened.fire.verdicts().is_none());
        assert!(found.findings.iter().any(|finding| finding.code == Code::FireNotRun));
    }
}

#[test]
fn a_closed_valve_leaves_what_is_behind_it_without_a_source() {
    let mut assets = one_main();
    assets.nodes[0].demand_m3_per_s = 0.001;
    assets.valves.push(Valve {
        origin: FeatureRef { layer: VALVES, row: 0 },
        at: Some([400.0, 0.2]),
        kind: ValveKind::Gate,
        closed: Valued {
            value: true,
            basis: Basis::Map,
        },
        main: Some(NamedMain::Known(vec![0])),
    });
    let found = run(&assets, &settings(vec![average_day()], None));
    assert!(!found.network.served[node_at(&found, [1000.0, 0.0])]);
    close(found.screened.coverage.untested_share(), 0.6, 1e-9);
    assert_eq!(
        found.screened.coverage.reason[node_at(&found, [1000.0, 0.0])],
        Some(Untested::NoSource)
    );
}

#[test]
fn a_missing_diameter_takes_the_smallest_it_meets() {
    let mut assets = empty();
    add_main(&mut assets, &[[0.0, 0.0], [100.0, 0.0]], Some(200.0));
    add_main(&mut assets, &[[100.0, 0.0], [200.0, 0.0]], None);
    add_main(&mut assets, &[[200.0, 0.0], [300.0, 0.0]], Some(100.0));
    add_node(&mut assets, [0.0, 0.0], Some(0.0), Some(40.0), 0.0);
    add_node(&mut assets, [300.0, 0.0], Some(0.0), None, 1.0);
    let found = run(&assets, &settings(vec![average_day()], None));
    assert_eq!(
        found.network.main_diameter_m[1],
        Valued {
            value: 0.1,
            basis: Basis::Assumed
        }
    );
}

#[test]
fn customers_draw_by_class_at_the_nearer_end_and_are_judged_at_their_tap() {
    let mut assets = one_main();
    assets.nodes[1].demand_m3_per_s = 0.0;
    add_customer(&mut assets, [900.0, 10.0], 1.0, None, 5.0);
    add_customer(&mut assets, [100.0, 10.0], 2.0, Some(0), 0.0);
    let peak = Case {
        demand_times: 2.0,
        demand_times_by: vec![(0, 3.0)],
        name: "peak hour".into(),
        ..average_day()
    };
    let found = run(&assets, &settings(vec![average_day(), peak], None));
    let (end, start) = (node_at(&found, [1000.0, 0.0]), node_at(&found, [0.0, 0.0]));
    close(found.cases[1].demand_m3_per_s[end], 0.002, 1e-15);
    close(found.cases[1].demand_m3_per_s[start], 0.006, 1e-15);
    let verdict = &found.screened.customers[0];
    assert_eq!(verdict.case, Some(1));
    close(
        verdict.value.expect("judged"),
        50.0 - hand_loss_m(1000.0, 0.002, 100.0, 0.15) - 20.0 - 5.0,
        1e-4,
    );
}

#[test]
fn a_demand_that_cannot_be_met_is_said_to_be_so() {
    let mut assets = one_main();
    assets.nodes[1].demand_m3_per_s = 0.040;
    let found = run(&assets, &settings(vec![average_day()], None));
    let said = found
        .findings
        .iter()
        .find(|finding| finding.code == Code::CannotBeSupplied)
        .expect("said");
    assert_eq!(said.severity, Severity::Serious);
    assert_eq!(said.feature, Some(FeatureRef { layer: NODES, row: 1 }));
}
