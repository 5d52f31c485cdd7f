//! Faults of hydrants, customers, valves and node points.

use super::faults::{on, pick, plain, rests_on_loop};
use super::lcg::Lcg;
use super::plane::{Point, add, distance, left, length, place_along, scale};
use super::town::{
    Customer, FIRST_CUSTOMER_ID, FIRST_HYDRANT_ID, FIRST_NODE_ID, FIRST_VALVE_ID, Hydrant, Node, Town, Valve,
};

/// Plants every fault of the point layers. Comes last: ids of points follow their rows.
pub fn plant_all(town: &mut Town, lcg: &mut Lcg) {
    closed_valves(town, lcg);
    valves(town, lcg);
    hydrants_between(town, lcg);
    off_main(town);
    node_points(town);
}

fn add_valve(town: &mut Town, at: Point, kind: &'static str, status: &'static str, main: Option<u32>) -> u32 {
    town.valves.push(Valve { at, kind, status, main });
    FIRST_VALVE_ID + town.valves.len() as u32 - 1
}

/// Valves found shut: in the middle of a main whose hydrant then has one way to draw from; and where three mains meet.
fn closed_valves(town: &mut Town, lcg: &mut Lcg) {
    for _ in 0..3 {
        let index = pick(town, lcg, |main, index| rests_on_loop(town, main, index));
        let main = &mut town.mains[index];
        main.planted = true;
        let at = place_along(main.line().expect("drawn"), 0.18 * main.length_m()).0;
        let (id, name) = (main.id, town.main_name(index));
        let valve = add_valve(town, at, "gate", "closed", id);
        on(
            town,
            "valves",
            valve,
            ["closed valve", "valve-closed"],
            name,
            "shut in the middle of a main of a loop",
        );
    }
    let mut made = 0;
    for node in (11..town.nodes.len()).step_by(3) {
        let here = town.mains_at(node);
        let fits = here
            .iter()
            .all(|main| town.mains[*main].feeds() && !town.mains[*main].planted);
        if made == 2 || here.len() != 3 || !fits || town.ends_and_tees(node) != (3, 0) {
            continue;
        }
        made += 1;
        let names: Vec<String> = here.iter().map(|main| town.main_name(*main)).collect();
        for main in here {
            town.mains[main].planted = true;
        }
        let valve = add_valve(town, town.nodes[node].at, "gate", "closed", None);
        on(
            town,
            "valves",
            valve,
            ["closed valve on a three-way node", "valve-on-node"],
            names.join(" "),
            "names no main",
        );
    }
}

fn valves(town: &mut Town, lcg: &mut Lcg) {
    for status in ["stuck?", "see file"] {
        let index = pick(town, lcg, |main, _| main.length_m() > 60.0);
        town.mains[index].planted = true;
        let at = place_along(town.mains[index].line().expect("drawn"), 21.0).0;
        let valve = add_valve(town, at, "gate", status, None);
        on(
            town,
            "valves",
            valve,
            ["unknown valve status", "valve-status-unknown"],
            String::new(),
            status,
        );
    }
    for wrong in [990_001, 990_002] {
        let index = pick(town, lcg, |main, _| main.length_m() > 60.0);
        town.mains[index].planted = true;
        let at = place_along(town.mains[index].line().expect("drawn"), 18.0).0;
        let name = town.main_name(index);
        let valve = add_valve(town, at, "gate", "open", Some(wrong));
        on(
            town,
            "valves",
            valve,
            ["valve names an unknown main", "valve-main-unknown"],
            name,
            "stands on the main named under other",
        );
    }
}

/// An old main and a larger new one in the same street, and a hydrant half way between them.
fn hydrants_between(town: &mut Town, lcg: &mut Lcg) {
    const APART_M: f64 = 2.4;
    for _ in 0..2 {
        let index = pick(town, lcg, |main, _| {
            plain(town, main) && main.diameter_in == Some(4.0) && main.length_m() > 90.0
        });
        let old = town.mains[index].line().expect("drawn").clone();
        let mut new = town.mains[index].clone();
        let beside: Vec<Point> = (1..=9)
            .map(|tenth| {
                let (at, ahead) = place_along(&old, 0.1 * f64::from(tenth) * length(&old));
                add(at, scale(left(ahead), APART_M))
            })
            .collect();
        let ends = [&old[..1], &beside, &old[old.len() - 1..]];
        new.set_line(ends.concat());
        (new.diameter_in, new.material, new.year, new.c_factor) = (Some(8.0), "PVC", Some(2011), Some(147.0));
        new.stored_length_m = None;
        let new = town.add_main(new);
        for main in [index, new] {
            town.mains[main].planted = true;
        }
        let (at, ahead) = place_along(&old, 0.55 * length(&old));
        let at = add(at, scale(left(ahead), 0.5 * APART_M));
        let names = format!("{} {}", town.main_name(index), town.main_name(new));
        let zone = town.mains[index].zone;
        let id = add_hydrant(town, at, zone);
        let note = "as near to a smaller main as to a larger";
        on(
            town,
            "hydrants",
            id,
            ["hydrant between two mains", "hydrant-between-mains"],
            names,
            note,
        );
    }
}

fn add_hydrant(town: &mut Town, at: Point, zone: &'static str) -> u32 {
    town.hydrants.push(Hydrant {
        at,
        elevation_m: None,
        needed_gpm: 500.0,
        zone,
    });
    FIRST_HYDRANT_ID + town.hydrants.len() as u32 - 1
}

/// A place at least `least_m` from every main, near a start.
fn clear_place(town: &Town, start: Point, least_m: f64) -> Point {
    let mut place = start;
    while town.clearance(place, &[]) < least_m {
        place = add(place, [-3.0, 5.0]);
    }
    place
}

fn off_main(town: &mut Town) {
    for start in [[420.0, 60.0], [-640.0, -330.0]] {
        let at = clear_place(town, start, 24.0);
        let id = add_hydrant(town, at, "low");
        on(
            town,
            "hydrants",
            id,
            ["hydrant off main", "hydrant-off-main"],
            String::new(),
            "over 20 m from any main",
        );
    }
    for start in [[-1500.0, 900.0], [1250.0, 1000.0], [80.0, 1150.0]] {
        let at = clear_place(town, start, 140.0);
        town.customers.push(Customer {
            at,
            demand_lps: 0.0105,
            class: "house",
        });
        let id = FIRST_CUSTOMER_ID + town.customers.len() as u32 - 1;
        on(
            town,
            "customers",
            id,
            ["customer off main", "customer-off-main"],
            String::new(),
            "over 100 m from any main",
        );
    }
    for start in [[250.0, -380.0], [960.0, 250.0]] {
        let at = clear_place(town, start, 9.0);
        let id = add_valve(town, at, "gate", "closed", None);
        on(
            town,
            "valves",
            id,
            ["valve off main", "valve-off-main"],
            String::new(),
            "closed, over 8 m from any main",
        );
    }
}

fn node_points(town: &mut Town) {
    nodes_off_mains(town);
    let fits = |node: &Node| {
        node.drawn && node.kind == "node" && node.elevation_m.is_some_and(|metres| metres > 11.0 && metres < 20.0)
    };
    let corners: Vec<usize> = (0..town.nodes.len())
        .filter(|node| fits(&town.nodes[*node]) && town.mains_at(*node).len() >= 3)
        .collect();
    elevations_never_surveyed(town);
    for node in corners.iter().skip(7).step_by(23).take(6) {
        town.nodes[*node].elevation_m = None;
        let id = node_id(town, *node);
        on(
            town,
            "nodes",
            id,
            ["missing elevation", "elevation-missing"],
            String::new(),
            "",
        );
    }
    for (node, demand_lps) in corners.iter().skip(3).step_by(31).take(4).zip([1.8, 0.9, 2.4, 0.7]) {
        town.nodes[*node].demand_lps = demand_lps;
    }
}

fn nodes_off_mains(town: &mut Town) {
    for start in [[-330.0, -250.0], [700.0, -250.0]] {
        let at = clear_place(town, start, 16.0);
        let node = town.add_node(at, "low");
        town.nodes[node].demand_lps = 0.35;
        let id = node_id(town, node);
        on(
            town,
            "nodes",
            id,
            ["node off main", "node-off-main"],
            String::new(),
            "has a demand, lies over 15 m from any main",
        );
    }
}

/// Two nodes high on the hill, where a filler of 0 digs a pit.
fn elevations_never_surveyed(town: &mut Town) {
    let stands_out = |node: &usize| {
        let here = town.mains_at(*node);
        let far_end = |main: &usize| town.mains[*main].ends[0] + town.mains[*main].ends[1] - *node;
        let level = |main: &usize| town.nodes[far_end(main)].elevation_m.unwrap_or(0.0);
        let short = |main: &usize| {
            let (length_m, bare) = (town.mains[*main].length_m(), town.mains[*main].tees.is_empty());
            bare && length_m > 1.0 && level(main) > (0.52 * length_m).max(31.0)
        };
        let lowest = here.iter().map(level).fold(f64::INFINITY, f64::min);
        let highest = here.iter().map(level).fold(0.0, f64::max);
        here.len() >= 2 && here.iter().all(short) && highest - lowest < 14.0
    };
    let on_hill =
        |node: &Node| node.drawn && node.kind == "node" && node.elevation_m.is_some_and(|metres| metres > 38.0);
    let high = (0..town.nodes.len()).filter(|node| on_hill(&town.nodes[*node]) && stands_out(node));
    let pits: Vec<usize> = high.collect();
    let apart = |node: &&usize| distance(town.nodes[**node].at, town.nodes[pits[0]].at) > 200.0;
    let second = *pits.iter().find(apart).expect("the hill has corners apart");
    for node in [pits[0], second] {
        let node = &node;
        town.nodes[*node].elevation_m = Some(0.0);
        let id = node_id(town, *node);
        on(
            town,
            "nodes",
            id,
            ["elevation never surveyed", "elevation-doubtful"],
            String::new(),
            "0 on the hill",
        );
    }
}

/// The id a node point is written with.
fn node_id(town: &Town, node: usize) -> u32 {
    FIRST_NODE_ID + town.nodes[..node].iter().filter(|before| before.drawn).count() as u32
}
