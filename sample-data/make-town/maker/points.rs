//! Hydrants, customers and valves.

use super::lcg::Lcg;
use super::mains::{CENTRE, distribution, of_age};
use super::plane::{Point, add, distance, left, place_along, scale};
use super::terrain::elevation;
use super::town::{Customer, Hydrant, Town, Valve};

/// Hydrants about evenly over the town: on laterals, on mains, and beside them.
pub fn add_hydrants(town: &mut Town, apart_m: f64, lcg: &mut Lcg) {
    let mut order: Vec<usize> = (0..town.mains.len())
        .filter(|index| town.mains[*index].feeds())
        .collect();
    for last in (1..order.len()).rev() {
        order.swap(last, lcg.below(last + 1));
    }
    for parent in order {
        let main = town.mains[parent].clone();
        let along = (main.length_m() * lcg.between(0.35, 0.65) * 10.0).round() / 10.0;
        let (on_main, ahead) = place_along(main.line().expect("drawn"), along);
        let crowded = town
            .hydrants
            .iter()
            .any(|hydrant| distance(hydrant.at, on_main) < apart_m);
        let at_node = main.touches().any(|node| distance(town.nodes[node].at, on_main) < 14.0);
        if crowded || at_node || main.length_m() < 45.0 {
            continue;
        }
        let side = scale(left(ahead), if lcg.chance(0.5) { 1.0 } else { -1.0 });
        let place = match town.hydrants.len() % 5 {
            0 | 1 => add_lateral(town, parent, on_main, side, lcg),
            2 | 3 => on_main,
            _ => add(on_main, scale(side, lcg.between(0.3, 0.8))),
        };
        let inner = distance(on_main, CENTRE) < 520.0;
        town.hydrants.push(Hydrant {
            at: place,
            elevation_m: lcg.chance(0.5).then(|| elevation(place)),
            needed_gpm: if inner { 750.0 } else { 500.0 },
            zone: main.zone,
        });
    }
}

/// A lateral off the middle of a main; one in eight is shorter than any tolerance.
fn add_lateral(town: &mut Town, parent: usize, on_main: Point, side: Point, lcg: &mut Lcg) -> Point {
    let short = town.hydrants.len() % 20 == 1;
    let reach = if short {
        lcg.between(0.18, 0.26)
    } else {
        lcg.between(2.4, 5.5)
    };
    let end = add(on_main, scale(side, reach));
    let zone = town.mains[parent].zone;
    let nodes = [on_main, end].map(|place| {
        let node = town.add_node(place, zone);
        town.nodes[node].drawn = false;
        node
    });
    let laid = of_age("ductile iron", town.mains[parent].year.unwrap_or(1980).max(1965), lcg);
    let mut lateral = distribution(laid, 6.0, zone, vec![on_main, end], nodes);
    (lateral.kind, lateral.road) = ("hydrant lateral", town.mains[parent].road.clone());
    town.mains[parent].tees.push(nodes[0]);
    town.add_main(lateral);
    end
}

const CLASSES: [(&str, f64, f64, f64); 6] = [
    ("terrace", 0.55, 0.060, 0.120),
    ("house", 0.20, 0.010, 0.022),
    ("flats", 0.12, 0.120, 0.280),
    ("shop", 0.10, 0.015, 0.040),
    ("school", 0.02, 0.150, 0.300),
    ("works", 0.01, 0.700, 1.200),
];

/// Customers along both sides of the distribution mains.
pub fn add_customers(town: &mut Town, every_m: f64, lcg: &mut Lcg) {
    let mut walked = 0.0;
    for index in 0..town.mains.len() {
        let main = town.mains[index].clone();
        if !main.feeds() || main.length_m() < 30.0 {
            continue;
        }
        let mut along = every_m - walked;
        while along < main.length_m() {
            let (on_main, ahead) = place_along(main.line().expect("drawn"), along);
            let side = scale(left(ahead), if lcg.chance(0.5) { 1.0 } else { -1.0 });
            let at = add(on_main, scale(side, lcg.between(7.0, 17.0)));
            let (class, demand_lps) = customer_kind(lcg);
            town.customers.push(Customer { at, demand_lps, class });
            along += every_m * lcg.between(0.7, 1.3);
        }
        walked = (main.length_m() - (along - every_m)).clamp(0.0, every_m);
    }
}

fn customer_kind(lcg: &mut Lcg) -> (&'static str, f64) {
    let mut draw = lcg.unit();
    for (class, share, low, high) in CLASSES {
        if draw < share {
            return (class, (lcg.between(low, high) * 1e4).round() / 1e4);
        }
        draw -= share;
    }
    ("house", 0.01)
}

/// Gate valves near the ends of mains, zone valves where the zones meet, air valves on transmission mains.
pub fn add_valves(town: &mut Town, lcg: &mut Lcg) {
    for index in 0..town.mains.len() {
        let main = town.mains[index].clone();
        let line = main.line().expect("drawn");
        let usual = main.in_use() && main.kind != "hydrant lateral" && main.length_m() > 40.0;
        if usual && lcg.chance(0.38) {
            let along = (lcg.between(4.0, 9.0) * 10.0).round() / 10.0;
            let from_start = lcg.chance(0.5);
            let at = place_along(line, if from_start { along } else { main.length_m() - along }).0;
            town.valves.push(Valve {
                at,
                kind: "gate",
                status: "open",
                main: lcg.chance(0.5).then_some(main.id).flatten(),
            });
        } else if main.kind == "transmission" && lcg.chance(0.2) {
            town.valves.push(Valve {
                at: place_along(line, 0.5 * main.length_m()).0,
                kind: "air",
                status: "open",
                main: main.id,
            });
        }
    }
    for node in boundary_nodes(town) {
        town.valves.push(Valve {
            at: town.nodes[node].at,
            kind: "zone",
            status: "closed",
            main: None,
        });
    }
}

/// Nodes where mains of the two zones meet.
pub fn boundary_nodes(town: &Town) -> Vec<usize> {
    let zones_at = |node: usize| {
        let here = town.mains_at(node);
        here.iter().any(|main| town.mains[*main].zone == "low")
            && here.iter().any(|main| town.mains[*main].zone == "upper")
    };
    (0..town.nodes.len()).filter(|node| zones_at(*node)).collect()
}
