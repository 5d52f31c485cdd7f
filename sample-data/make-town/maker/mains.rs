//! Mains: what lies under each street, how old it is, and how the town is fed.

use super::graph::{Edge, Graph};
use super::lcg::Lcg;
use super::plane::{Point, add, direction, distance, left, length, piece, place_along, scale};
use super::terrain::{HILL, KNOLL, elevation};
use super::town::{Drawing, Main, Town};

/// Ground above this is in the upper zone, m.
const UPPER_FROM_M: f64 = 42.0;
/// The middle of the old town.
pub const CENTRE: Point = [-60.0, -260.0];
const WORKS: Point = [1290.0, -610.0];

const WORDS: [&str; 60] = [
    "Alder",
    "Anchor",
    "Ash",
    "Barley",
    "Beacon",
    "Beech",
    "Birch",
    "Blossom",
    "Brewer's",
    "Bridge",
    "Castle",
    "Chapel",
    "Cherry",
    "Church",
    "Clay",
    "Cooper's",
    "Copper",
    "Cross",
    "Daisy",
    "Elder",
    "Elm",
    "Farrier's",
    "Fern",
    "Ferry",
    "Field",
    "Fountain",
    "Garden",
    "Glebe",
    "Granary",
    "Green",
    "Harbour",
    "Hazel",
    "Heron",
    "High",
    "Holly",
    "Ivy",
    "Juniper",
    "Kiln",
    "Lark",
    "Laurel",
    "Lime",
    "Linden",
    "Maple",
    "Market",
    "Meadow",
    "Mill",
    "Orchard",
    "Pear Tree",
    "Poplar",
    "Quarry",
    "River",
    "Rope",
    "Rowan",
    "Sand",
    "Spring",
    "Tanner's",
    "Thorn",
    "Walnut",
    "Weaver's",
    "Willow",
];
const WAYS: [&str; 4] = ["Street", "Road", "Lane", "Way"];

pub fn road_name(street: usize) -> String {
    match street {
        9 => "Café Row".to_string(),
        _ => format!(
            "{} {}",
            WORDS[street % WORDS.len()],
            WAYS[(street * 7 + street / 3) % WAYS.len()]
        ),
    }
}

/// What was laid at a time and place.
#[derive(Clone, Copy)]
pub struct Laid {
    pub material: &'static str,
    pub year: i32,
    pub c_factor: f64,
}

/// What the town laid under a new street at a distance from its middle.
fn laid_at(place: Point, lcg: &mut Lcg) -> Laid {
    let out = distance(place, CENTRE) + lcg.between(-160.0, 160.0);
    let (material, from, to) = match () {
        () if out < 480.0 => ("cast iron", 1904, 1938),
        () if out < 850.0 && lcg.chance(0.5) => ("cast iron", 1946, 1964),
        () if out < 950.0 => ("asbestos cement", 1955, 1976),
        () if lcg.chance(0.45) => ("ductile iron", 1971, 1996),
        () => ("PVC", 1979, 2012),
    };
    of_age(material, lcg.between(f64::from(from), f64::from(to)) as i32, lcg)
}

/// A main of a material and year, with the C-factor such mains have (see `docs/method.md` for the sources).
pub fn of_age(material: &'static str, year: i32, lcg: &mut Lcg) -> Laid {
    let usual = match material {
        "cast iron" if year < 1940 => 62.0,
        "cast iron" => 82.0,
        "asbestos cement" => 134.0,
        "ductile iron" => 128.0,
        "steel" => 125.0,
        _ => 146.0,
    };
    Laid {
        material,
        year,
        c_factor: (usual + lcg.between(-5.0, 5.0)).round(),
    }
}

pub fn distribution(laid: Laid, diameter_in: f64, zone: &'static str, line: Vec<Point>, ends: [usize; 2]) -> Main {
    Main {
        id: None,
        kind: "distribution",
        status: "in use",
        diameter_in: Some(diameter_in),
        material: laid.material,
        year: Some(laid.year),
        c_factor: Some(laid.c_factor),
        zone,
        road: String::new(),
        stored_length_m: None,
        drawing: Drawing::Lines(vec![line]),
        street: usize::MAX,
        ends,
        tees: Vec::new(),
        planted: false,
        is_copy: false,
    }
}

/// Which nodes are in the upper zone. Pockets of a zone that its own streets do not reach go to the other.
fn upper_nodes(graph: &Graph) -> Vec<bool> {
    let mut upper: Vec<bool> = graph.nodes.iter().map(|node| elevation(*node) > UPPER_FROM_M).collect();
    for (side, seed) in [(true, HILL), (false, CENTRE)] {
        let start = graph.nearest(seed, |node| upper[node] == side);
        let of_side: Vec<bool> = upper.iter().map(|is_upper| *is_upper == side).collect();
        let reached = graph.reach(start, |edge| {
            of_side[graph.edges[edge].from] && of_side[graph.edges[edge].to]
        });
        for node in 0..upper.len() {
            if of_side[node] && !reached[node] {
                upper[node] = !side;
            }
        }
    }
    upper
}

/// Inches under each street edge by the way water takes: transmission, trunk distribution, the rest.
struct Sizes {
    transmission: Vec<bool>,
    trunk_in: Vec<f64>,
}

fn sizes(graph: &Graph, upper: &[bool]) -> Sizes {
    let mut sizes = Sizes {
        transmission: vec![false; graph.edges.len()],
        trunk_in: vec![0.0; graph.edges.len()],
    };
    let low = |node: usize| !upper[node] && graph.at(node).len() > 1;
    let inside = |edge: &Edge, side: bool| upper[edge.from] == side && upper[edge.to] == side;
    let node = |place: Point| graph.nearest(place, low);
    let works = node(WORKS);
    let tank = node(KNOLL);
    let centre = node(CENTRE);
    for (from, to) in [(works, centre), (centre, tank)] {
        let cost = |edge: usize| {
            if inside(&graph.edges[edge], false) {
                length(&graph.edges[edge].line)
            } else {
                f64::INFINITY
            }
        };
        for edge in graph.way(from, to, cost) {
            sizes.transmission[edge] = true;
        }
    }
    let stops = [
        (node([1350.0, 300.0]), node([620.0, 640.0]), 8.0),
        (node([620.0, 640.0]), node([0.0, 980.0]), 6.0),
        (works, node([1350.0, 300.0]), 8.0),
        (centre, node([150.0, 430.0]), 8.0),
        (node([150.0, 430.0]), node([620.0, 640.0]), 8.0),
        (centre, node([-300.0, -800.0]), 8.0),
        (tank, node([-900.0, -550.0]), 8.0),
        (node([-900.0, -550.0]), node([-300.0, -800.0]), 8.0),
        (node([-300.0, -800.0]), node([560.0, -600.0]), 8.0),
        (node([560.0, -600.0]), node([600.0, 250.0]), 8.0),
    ];
    for (from, to, inches) in stops {
        let cost = |edge: usize| match (inside(&graph.edges[edge], false), sizes.transmission[edge]) {
            (false, _) => f64::INFINITY,
            (true, true) => 3.0 * length(&graph.edges[edge].line),
            (true, false) => length(&graph.edges[edge].line),
        };
        for edge in graph.way(from, to, cost) {
            sizes.trunk_in[edge] = sizes.trunk_in[edge].max(inches);
        }
    }
    sizes
}

/// One main an edge of the street graph; at the edge of the zones a street is cut in its middle, or has no main.
pub fn under_streets(graph: &Graph, lcg: &mut Lcg) -> Town {
    let mut town = Town::default();
    let upper = upper_nodes(graph);
    for (node, place) in graph.nodes.iter().enumerate() {
        town.add_node(*place, if upper[node] { "upper" } else { "low" });
    }
    let sizes = sizes(graph, &upper);
    let streets = graph.edges.iter().map(|edge| edge.street).max().unwrap_or(0) + 1;
    let usual: Vec<(Laid, f64)> = (0..streets)
        .map(|street| {
            let edge = graph.edges.iter().find(|edge| edge.street == street);
            let middle = edge.map_or(CENTRE, |edge| edge.line[edge.line.len() / 2]);
            (laid_at(middle, lcg), [3.0, 4.0, 4.0, 4.0, 4.0, 6.0, 6.0][lcg.below(7)])
        })
        .collect();
    let mut across = 0;
    for (index, edge) in graph.edges.iter().enumerate() {
        let (laid, inches) = under_edge(graph, edge, usual[edge.street], lcg);
        let zone = |node: usize| if upper[node] { "upper" } else { "low" };
        let mut main = distribution(laid, inches, zone(edge.from), edge.line.clone(), [edge.from, edge.to]);
        (main.street, main.road) = (edge.street, road_name(edge.street));
        if sizes.transmission[index] {
            (main.kind, main.diameter_in) = ("transmission", Some(12.0));
            (main.material, main.year, main.c_factor) = ("steel", Some(1968), Some(122.0));
        } else if sizes.trunk_in[index] > inches {
            main.diameter_in = Some(sizes.trunk_in[index]);
        }
        if upper[edge.from] == upper[edge.to] {
            town.add_main(main);
            continue;
        }
        across += 1;
        if across % 3 == 1 {
            add_boundary(&mut town, &main, zone(edge.to));
        }
    }
    town
}

/// Size and age of one piece of a street: that of the street as a rule, a newer length here and there.
fn under_edge(graph: &Graph, edge: &Edge, usual: (Laid, f64), lcg: &mut Lcg) -> (Laid, f64) {
    let (mut laid, mut inches) = usual;
    let dead_end = graph.at(edge.from).len() == 1 || graph.at(edge.to).len() == 1;
    if lcg.chance(0.16) {
        laid = of_age(
            ["PVC", "PE", "ductile iron"][lcg.below(3)],
            lcg.between(1994.0, 2021.0) as i32,
            lcg,
        );
        inches = inches.max(if lcg.chance(0.5) { 6.0 } else { 4.0 });
    } else if dead_end {
        inches = if lcg.chance(0.4) { 3.0 } else { 4.0 };
    }
    (laid, inches)
}

/// A street across the edge of the zones: two mains that meet at a shut zone valve in its middle.
fn add_boundary(town: &mut Town, main: &Main, other_zone: &'static str) {
    let line = main.line().expect("a street has a line").clone();
    let middle = 0.5 * length(&line);
    let meet = town.add_node(place_along(&line, middle).0, main.zone);
    let mut first = main.clone();
    first.set_line(piece(&line, 0.0, middle));
    first.ends[1] = meet;
    let mut second = main.clone();
    second.set_line(piece(&line, middle, length(&line)));
    second.ends[0] = meet;
    second.zone = other_zone;
    town.add_main(first);
    town.add_main(second);
}

/// Some streets have one main past a crossing where the others end on its middle.
pub fn run_through(town: &mut Town, wanted: usize) {
    let mut left = wanted;
    for node in (0..town.nodes.len()).step_by(3) {
        let here = town.mains_at(node);
        if left == 0 || here.len() != 4 {
            continue;
        }
        let pair = here
            .iter()
            .flat_map(|a| here.iter().map(move |b| (*a, *b)))
            .find(|(a, b)| {
                let (first, second) = (&town.mains[*a], &town.mains[*b]);
                first.ends[1] == node
                    && second.ends[0] == node
                    && (first.street, first.diameter_in, first.kind, first.year, first.zone)
                        == (second.street, second.diameter_in, second.kind, second.year, second.zone)
            });
        if let Some((first, second)) = pair {
            merge(town, first, second, node);
            left -= 1;
        }
    }
    for (index, main) in town.mains.iter_mut().enumerate() {
        main.id = Some(super::town::FIRST_MAIN_ID + index as u32);
    }
}

/// Makes one main of two that meet at a node; the node then stands on its middle.
pub fn merge(town: &mut Town, first: usize, second: usize, node: usize) {
    let more = town.mains[second].line().expect("drawn").clone();
    let tees = town.mains[second].tees.clone();
    let (end, its_length) = (town.mains[second].ends[1], town.mains[second].stored_length_m);
    let main = &mut town.mains[first];
    let mut line = main.line().expect("drawn").clone();
    line.pop();
    line.extend(more);
    main.set_line(line);
    main.ends[1] = end;
    main.tees.push(node);
    main.tees.extend(tees);
    main.stored_length_m = main.stored_length_m.zip(its_length).map(|(one, other)| one + other);
    town.mains.remove(second);
}

/// Closes: short streets with one way in, off the middle of a main.
pub fn add_closes(town: &mut Town, wanted: usize, lcg: &mut Lcg) {
    let mut made = 0;
    for try_no in 0..6000 {
        if made == wanted {
            return;
        }
        let parent = lcg.below(town.mains.len());
        let main = town.mains[parent].clone();
        if !main.feeds() || main.street == usize::MAX || main.length_m() < 95.0 || main.tees.len() > 1 {
            continue;
        }
        let along = (main.length_m() * lcg.between(0.32, 0.68) * 10.0).round() / 10.0;
        let on = main.line().expect("drawn");
        let (start, ahead) = place_along(on, along);
        let line = close_line(start, scale(left(ahead), if try_no % 2 == 0 { 1.0 } else { -1.0 }), lcg);
        let free = line[1..].iter().enumerate().all(|(index, place)| {
            town.clearance(*place, &[parent]) > 30.0
                && super::plane::nearest_on(on, *place).distance > 12.0 + 6.0 * index as f64
        });
        let near_others = main.touches().any(|node| distance(town.nodes[node].at, start) < 24.0);
        if !free || near_others || !super::terrain::in_town(line[line.len() - 1]) {
            continue;
        }
        made += 1;
        let tee = town.add_node(start, main.zone);
        let end = town.add_node(line[line.len() - 1], main.zone);
        let laid = of_age(
            ["PVC", "PE", "ductile iron", "cast iron"][lcg.below(4)],
            1952 + lcg.below(66) as i32,
            lcg,
        );
        let inches = if lcg.chance(0.3) {
            3.0
        } else if lcg.chance(0.7) {
            4.0
        } else {
            6.0
        };
        let mut close = distribution(laid, inches, main.zone, line, [tee, end]);
        close.road = format!("{} Close", WORDS[(made * 7 + 3) % WORDS.len()]);
        town.add_main(close);
        if made % 2 == 0 {
            split(town, parent, along, tee);
        } else {
            town.nodes[tee].drawn = false;
            town.mains[parent].tees.push(tee);
        }
    }
}

/// A short line that bends once or twice.
fn close_line(start: Point, away: Point, lcg: &mut Lcg) -> Vec<Point> {
    let mut line = vec![start];
    let mut ahead = away;
    let bend = lcg.between(-0.45, 0.45);
    for _ in 0..(2 + lcg.below(3)) {
        let last = line[line.len() - 1];
        line.push(add(last, scale(ahead, lcg.between(19.0, 29.0))));
        ahead = [
            ahead[0] * bend.cos() - ahead[1] * bend.sin(),
            ahead[0] * bend.sin() + ahead[1] * bend.cos(),
        ];
    }
    line
}

/// Cuts a main in two at a node on its middle. The second half takes the next id.
pub fn split(town: &mut Town, index: usize, along: f64, node: usize) {
    let whole = town.mains[index].clone();
    let line = whole.line().expect("drawn").clone();
    let measure = |tee: &usize| super::plane::nearest_on(&line, town.nodes[*tee].at).along;
    let (before, after): (Vec<usize>, Vec<usize>) = whole.tees.iter().partition(|tee| measure(tee) < along);
    let mut second = whole.clone();
    second.set_line(piece(&line, along, length(&line)));
    second.ends[0] = node;
    second.tees = after;
    let first = &mut town.mains[index];
    first.set_line(piece(&line, 0.0, along));
    first.ends[1] = node;
    first.tees = before;
    town.add_main(second);
}

/// The works by the river, the service tank on the knoll, the tower on the hill; and the raw water mains to the works.
pub fn add_supply(town: &mut Town) {
    let steel = Laid {
        material: "steel",
        year: 1968,
        c_factor: 122.0,
    };
    let feeds = [
        ("source", WORKS, 64.0, 12.0, "low", "Waterworks Lane"),
        ("tank", KNOLL, 62.5, 12.0, "low", "Tank Lane"),
        (
            "tank",
            [HILL[0] + 18.0, HILL[1] + 24.0],
            92.0,
            6.0,
            "upper",
            "Tower Path",
        ),
    ];
    for (kind, place, head_m, inches, zone, road) in feeds {
        let near =
            |a: &usize, b: &usize| distance(town.nodes[*a].at, place).total_cmp(&distance(town.nodes[*b].at, place));
        let on_trunk = |node: usize| {
            zone == "upper"
                || town
                    .mains_at(node)
                    .iter()
                    .any(|main| town.mains[*main].kind == "transmission")
        };
        let joined = |node: &usize| town.nodes[*node].zone == zone && town.mains_at(*node).len() > 1 && on_trunk(*node);
        let to = (0..town.nodes.len())
            .filter(joined)
            .min_by(near)
            .expect("the town has nodes");
        let end = town.nodes[to].at;
        let from = town.add_node(place, zone);
        (town.nodes[from].kind, town.nodes[from].head_m) = (kind, Some(head_m));
        let aside = scale(left(direction(place, end)), 0.06 * distance(place, end));
        let bend = add(scale(add(place, end), 0.5), aside);
        let mut main = distribution(steel, inches, zone, vec![place, bend, end], [from, to]);
        (main.kind, main.road) = ("transmission", road.to_string());
        town.add_main(main);
    }
    let intake = [WORKS[0] + 95.0, WORKS[1] - 210.0];
    let screen = [WORKS[0] + 40.0, WORKS[1] - 95.0];
    let beside = [WORKS[0] + 9.0, WORKS[1] - 16.0];
    let spots = [intake, screen, beside].map(|place| {
        let node = town.add_node(place, "");
        town.nodes[node].drawn = false;
        node
    });
    for pair in [[0, 1], [1, 2]] {
        let ends = [spots[pair[0]], spots[pair[1]]];
        let line = vec![town.nodes[ends[0]].at, town.nodes[ends[1]].at];
        let mut main = distribution(steel, 18.0, "", line, ends);
        (main.kind, main.road) = ("raw water", "Waterworks Lane".to_string());
        town.add_main(main);
    }
}
