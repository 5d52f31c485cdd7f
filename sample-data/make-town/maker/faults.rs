//! Faults as real maps have them, planted one at a time on mains that have none yet.

use super::lcg::Lcg;
use super::mains::{distribution, merge, of_age};
use super::plane::{Point, add, direction, distance, left, length, nearest_on, piece, place_along, scale};
use super::town::{Drawing, Fault, Main, Town};

/// Plants every fault.
pub fn plant_all(town: &mut Town, lcg: &mut Lcg) {
    crossings(town, lcg);
    near_misses(town, lcg);
    gaps_and_overshoots(town, lcg);
    zone_contacts(town);
    self_loops(town, lcg);
    multiparts(town, lcg);
    copies(town, lcg);
    left_out(town, lcg);
    islands(town);
    attributes(town, lcg);
    broken_geometry(town);
    drop_stray_valves(town);
}

/// Valves whose main was moved from under them by a fault are not drawn: they would be faults that nobody planted.
fn drop_stray_valves(town: &mut Town) {
    let lines: Vec<Vec<Point>> = town.mains.iter().flat_map(|main| main.lines().to_vec()).collect();
    let stands = |valve: &super::town::Valve| lines.iter().any(|line| nearest_on(line, valve.at).distance < 0.5);
    town.valves.retain(stands);
}

/// A main that fits and that has no fault on or next to it.
pub fn pick(town: &Town, lcg: &mut Lcg, fits: impl Fn(&Main, usize) -> bool) -> usize {
    let start = lcg.below(town.mains.len());
    for step in 0..town.mains.len() {
        let index = (start + 7 * step) % town.mains.len();
        let main = &town.mains[index];
        let clear = |node: usize| town.mains_at(node).iter().all(|other| !town.mains[*other].planted);
        if main.feeds() && main.line().is_some() && !main.planted && fits(main, index) && main.touches().all(clear) {
            return index;
        }
    }
    panic!("no main is left that the fault fits on");
}

/// A street's main with nothing standing on its middle.
pub fn plain(town: &Town, main: &Main) -> bool {
    let line = main.line().expect("drawn");
    let free = |place: Point| nearest_on(line, place).distance > 4.0;
    main.street != usize::MAX
        && main.tees.is_empty()
        && main.length_m() > 60.0
        && main.ends[0] != main.ends[1]
        && town.hydrants.iter().all(|hydrant| free(hydrant.at))
        && main
            .ends
            .iter()
            .all(|node| town.nodes[*node].kind == "node" && town.mains_at(*node).len() > 1)
}

/// Pulls the start of a main back along its line.
fn shorten_start(main: &mut Main, by_m: f64) {
    let line = main.line().expect("drawn").clone();
    main.set_line(piece(&line, by_m, length(&line)));
}

fn reverse(main: &mut Main) {
    let mut line = main.line().expect("drawn").clone();
    line.reverse();
    main.set_line(line);
    main.ends.reverse();
}

/// Two streets cross and nothing says that they connect.
fn crossings(town: &mut Town, lcg: &mut Lcg) {
    let mut made = 0;
    while made < 3 {
        let node = lcg.below(town.nodes.len());
        let here = town.mains_at(node);
        let four_ends = here.len() == 4 && town.ends_and_tees(node) == (4, 0);
        let fits = |main: &usize| {
            town.mains[*main].feeds() && !town.mains[*main].planted && town.mains[*main].street != usize::MAX
        };
        if !four_ends || !here.iter().all(fits) {
            continue;
        }
        let street = town.mains[here[0]].street;
        let (one, other): (Vec<usize>, Vec<usize>) = here.iter().partition(|main| town.mains[**main].street == street);
        if one.len() != 2 || other.len() != 2 {
            continue;
        }
        let far = |main: usize| town.mains[main].ends[0] + town.mains[main].ends[1] - node;
        let ring = town
            .hops(far(one[0]), far(one[1]), &here)
            .zip(town.hops(far(one[0]), far(other[0]), &here));
        if ring.is_none() || town.hops(far(one[0]), far(other[1]), &here).is_none() {
            continue;
        }
        for pair in [&one, &other] {
            if town.mains[pair[0]].ends[1] != node {
                reverse(&mut town.mains[pair[0]]);
            }
            if town.mains[pair[1]].ends[0] != node {
                reverse(&mut town.mains[pair[1]]);
            }
        }
        cross_at(town, node, &one, &other);
        made += 1;
    }
}

fn cross_at(town: &mut Town, node: usize, one: &[usize], other: &[usize]) {
    let ids = [one[0], other[0]].map(|index| town.mains[index].id);
    let gone = town.mains[one[1]].id;
    let other_ids = [other[0], other[1]].map(|index| town.mains[index].id);
    merge(town, one[0], one[1], node);
    let now_at = |town: &Town, id: Option<u32>| town.mains.iter().position(|main| main.id == id).expect("kept");
    let (first, second) = (now_at(town, other_ids[0]), now_at(town, other_ids[1]));
    merge(town, first, second, node);
    let crossing = ids.map(|id| now_at(town, id));
    for index in crossing {
        town.mains[index].tees.retain(|tee| *tee != node);
        without_vertex(&mut town.mains[index], town.nodes[node].at);
    }
    town.nodes[node].drawn = false;
    for valve in &mut town.valves {
        if valve.main == gone || valve.main == other_ids[1] {
            valve.main = None;
        }
    }
    town.plant(
        "bare crossing",
        "crossing-not-joined",
        &crossing,
        "two mains cross without a shared end or vertex",
    );
}

/// Takes the vertex at a place out of a line.
fn without_vertex(main: &mut Main, place: Point) {
    let line = main
        .line()
        .expect("drawn")
        .iter()
        .copied()
        .filter(|vertex| distance(*vertex, place) > 1e-6)
        .collect();
    main.set_line(line);
}

/// Whether a small main with one hydrant would be fed from its far end alone, over small mains, if it were cut near its
/// start: so that the hydrant falls short because of the cut.
pub fn rests_on_loop(town: &Town, main: &Main, index: usize) -> bool {
    let inches = |main: usize| town.mains[main].diameter_in.unwrap_or(0.0);
    let line = main.line().expect("drawn");
    let hydrants = town
        .hydrants
        .iter()
        .filter(|hydrant| nearest_on(line, hydrant.at).distance < 6.0)
        .count();
    let far_end = town.mains_at(main.ends[1]);
    let round_about = town.hops(main.ends[0], main.ends[1], &[index]);
    main.street != usize::MAX
        && hydrants == 1
        && main.length_m() > 60.0
        && inches(index) <= 4.0
        && far_end.iter().filter(|main| inches(**main) > 4.0).count() <= 1
        && round_about.is_some_and(|hops| hops >= 3)
}

/// Ends that stop just outside the tolerance, and so break a loop. On mains with a hydrant, whose flow then falls short.
fn near_misses(town: &mut Town, lcg: &mut Lcg) {
    for gap_m in [0.62, 0.95, 1.40] {
        let index = pick(town, lcg, |main, index| {
            let (ends, tees) = town.ends_and_tees(main.ends[0]);
            ends >= 3 && tees == 0 && rests_on_loop(town, main, index)
        });
        let near: Vec<usize> = town
            .mains_at(town.mains[index].ends[0])
            .into_iter()
            .filter(|main| *main != index)
            .collect();
        let zone = town.mains[index].zone;
        shorten_start(&mut town.mains[index], gap_m);
        let stop = town.mains[index].line().expect("drawn")[0];
        let node = town.add_node(stop, zone);
        town.nodes[node].drawn = false;
        town.mains[index].ends[0] = node;
        let named: Vec<usize> = [index].into_iter().chain(near).collect();
        town.plant(
            "near miss",
            "near-miss",
            &named,
            format!("stops {gap_m} m short of the node of the others"),
        );
    }
}

fn gaps_and_overshoots(town: &mut Town, lcg: &mut Lcg) {
    for gap_m in [0.08, 0.15, 0.24] {
        let index = pick(town, lcg, |main, _| {
            plain(town, main) && town.ends_and_tees(main.ends[0]).1 == 0
        });
        let near: Vec<usize> = town
            .mains_at(town.mains[index].ends[0])
            .into_iter()
            .filter(|main| *main != index)
            .collect();
        shorten_start(&mut town.mains[index], gap_m);
        let named: Vec<usize> = [index].into_iter().chain(near).collect();
        town.plant(
            "gap, end to end",
            "end-joined",
            &named,
            format!("stops {gap_m} m short of their shared end"),
        );
    }
    let off_the_middle = |town: &Town, main: &Main| {
        main.street == usize::MAX && main.length_m() > 30.0 && town.ends_and_tees(main.ends[0]) == (1, 1)
    };
    for gap_m in [0.07, 0.16, 0.25] {
        let index = pick(town, lcg, |main, _| off_the_middle(town, main));
        let parent = parent_of(town, index);
        shorten_start(&mut town.mains[index], gap_m);
        let note = format!("stops {gap_m} m short of the middle of the other");
        town.plant("gap, end to middle", "end-joined-to-middle", &[index, parent], note);
    }
    for tail_m in [0.09, 0.17, 0.23] {
        let index = pick(town, lcg, |main, _| off_the_middle(town, main));
        let parent = parent_of(town, index);
        let mut line = town.mains[index].line().expect("drawn").clone();
        line[0] = add(line[0], scale(direction(line[1], line[0]), tail_m));
        town.mains[index].set_line(line);
        let note = format!("runs {tail_m} m past the middle of the other");
        town.plant("overshoot", "overshoot", &[index, parent], note);
    }
}

fn parent_of(town: &Town, index: usize) -> usize {
    let node = town.mains[index].ends[0];
    town.mains
        .iter()
        .position(|main| main.tees.contains(&node))
        .expect("it stands on a main")
}

/// Two zones touch and no valve is drawn.
fn zone_contacts(town: &mut Town) {
    for node in super::points::boundary_nodes(town).into_iter().step_by(2).take(2) {
        let place = town.nodes[node].at;
        town.valves.retain(|valve| distance(valve.at, place) > 0.1);
        let here = town.mains_at(node);
        town.plant(
            "zones touch without a valve",
            "zones-kept-apart",
            &here,
            "their ends are one point; the zone valve is not drawn",
        );
    }
}

/// A ring at the end of a close, joined at one place only.
fn self_loops(town: &mut Town, lcg: &mut Lcg) {
    for _ in 0..2 {
        let close = pick(town, lcg, |main, index| {
            let end = town.nodes[main.ends[1]].at;
            let road = main.street == usize::MAX && main.length_m() > 30.0;
            road && town.mains_at(main.ends[1]).len() == 1 && town.clearance(end, &[index]) > 42.0
        });
        let line = town.mains[close].line().expect("drawn").clone();
        let end = line[line.len() - 1];
        let ahead = direction(line[line.len() - 2], end);
        let middle = add(end, scale(ahead, 11.0));
        let ring: Vec<Point> = (0..=10)
            .map(|step| {
                let turn = f64::from(step % 10) * std::f64::consts::TAU / 10.0;
                let out = add(scale(ahead, -11.0 * turn.cos()), scale(left(ahead), 11.0 * turn.sin()));
                if step % 10 == 0 { end } else { add(middle, out) }
            })
            .collect();
        let mut main = town.mains[close].clone();
        main.set_line(ring);
        main.ends = [main.ends[1], main.ends[1]];
        main.stored_length_m = None;
        town.mains[close].planted = true;
        let index = town.add_main(main);
        town.plant(
            "self-loop",
            "self-loop",
            &[index],
            "a ring whose two ends are one point",
        );
    }
}

fn multiparts(town: &mut Town, lcg: &mut Lcg) {
    for swapped in [false, true] {
        let index = pick(town, lcg, |main, _| {
            plain(town, main) && main.line().expect("drawn").len() > 3
        });
        let line = town.mains[index].line().expect("drawn").clone();
        let at = line.len() / 2;
        let mut parts = vec![line[..=at].to_vec(), line[at..].to_vec()];
        if swapped {
            parts.swap(0, 1);
        }
        town.mains[index].drawing = Drawing::Lines(parts);
        let note = if swapped {
            "two parts that touch, the second half first"
        } else {
            "two parts that touch"
        };
        town.plant("multipart, touching", "multipart-merged", &[index], note);
    }
    for gap_m in [5.0, 8.0] {
        let index = pick(town, lcg, |main, index| {
            let round_about = town.hops(main.ends[0], main.ends[1], &[index]);
            plain(town, main) && main.length_m() > 90.0 && round_about.is_some_and(|hops| hops >= 3)
        });
        let line = town.mains[index].line().expect("drawn").clone();
        let middle = 0.5 * length(&line);
        let parts = vec![piece(&line, 0.0, middle), piece(&line, middle + gap_m, length(&line))];
        town.mains[index].drawing = Drawing::Lines(parts);
        town.plant(
            "multipart, apart",
            "multipart-apart",
            &[index],
            format!("two parts, {gap_m} m apart"),
        );
    }
}

/// The same main twice.
fn copies(town: &mut Town, lcg: &mut Lcg) {
    let kinds = [
        "identical",
        "reversed",
        "nearly identical",
        "other diameter",
        "other year",
    ];
    for kind in kinds.into_iter().flat_map(|kind| [kind, kind]) {
        let index = pick(town, lcg, |main, _| plain(town, main) && main.diameter_in == Some(6.0));
        town.mains[index].is_copy = true;
        let mut copy = town.mains[index].clone();
        let (fault, code) = match kind {
            "identical" => ("duplicate, identical", "duplicate-main"),
            "reversed" => {
                reverse(&mut copy);
                ("duplicate, reversed", "duplicate-main")
            }
            "nearly identical" => {
                let moved = copy.line().expect("drawn").iter();
                let moved = moved
                    .map(|vertex| add(*vertex, [lcg.between(-0.03, 0.03), lcg.between(-0.03, 0.03)]))
                    .collect();
                copy.set_line(moved);
                ("duplicate, nearly identical", "duplicate-main")
            }
            "other diameter" => {
                copy.diameter_in = Some(4.0);
                ("duplicate, other diameter", "duplicate-differs")
            }
            _ => {
                copy.year = copy.year.map(|year| year - 38);
                ("duplicate, other year", "duplicate-differs")
            }
        };
        let copy = town.add_main(copy);
        town.plant(fault, code, &[copy, index], "lies on the other");
    }
}

/// Old mains left in the ground, and mains not yet laid.
fn left_out(town: &mut Town, lcg: &mut Lcg) {
    for _ in 0..4 {
        let index = pick(town, lcg, |main, _| {
            plain(town, main) && main.line().expect("drawn").len() < 9
        });
        let mut old = town.mains[index].clone();
        let beside = piece(old.line().expect("drawn"), 9.0, old.length_m() - 9.0);
        let aside = scale(left(direction(beside[0], beside[beside.len() - 1])), 4.5);
        old.set_line(beside.into_iter().map(|vertex| add(vertex, aside)).collect());
        (old.status, old.material, old.year) = ("abandoned", "cast iron", Some(1911));
        old.stored_length_m = None;
        let nodes = [0, 1].map(|end| {
            let line = old.line().expect("drawn");
            let at = if end == 0 { line[0] } else { line[line.len() - 1] };
            let node = town.add_node(at, "");
            town.nodes[node].drawn = false;
            node
        });
        old.ends = nodes;
        let old = town.add_main(old);
        town.mains[index].planted = true;
        town.plant("left out by status", "mains-left-out", &[old], "abandoned");
    }
}

/// Estates that no water reaches: one waits for a main not yet laid, one for a main that nobody drew.
fn islands(town: &mut Town) {
    let sites: [(Point, bool); 2] = [([1560.0, -330.0], true), ([-1250.0, -620.0], false)];
    for (site, has_link) in sites {
        let offsets: [Point; 5] = [[0.0, 0.0], [66.0, 22.0], [120.0, -28.0], [61.0, -70.0], [104.0, 78.0]];
        let nodes = offsets.map(|offset| town.add_node(add(site, offset), "low"));
        let laid = of_age("PE", 2019, &mut Lcg::new(3));
        let mut estate = Vec::new();
        for (from, to, bulge) in [(0, 1, 6.0), (1, 2, -9.0), (1, 3, 5.0), (3, 2, 7.0), (1, 4, -6.0)] {
            let (a, b) = (town.nodes[nodes[from]].at, town.nodes[nodes[to]].at);
            let bend = add(scale(add(a, b), 0.5), scale(left(direction(a, b)), bulge));
            let mut main = distribution(laid, 4.0, "low", vec![a, bend, b], [nodes[from], nodes[to]]);
            main.road = if has_link { "Fallow End" } else { "Reed Bank" }.to_string();
            estate.push(town.add_main(main));
        }
        for (index, main) in estate.iter().enumerate() {
            let (place, ahead) = place_along(town.mains[*main].line().expect("drawn"), 24.0);
            let at = add(place, scale(left(ahead), if index % 2 == 0 { 9.0 } else { -9.0 }));
            town.customers.push(super::town::Customer {
                at,
                demand_lps: 0.0412,
                class: "terrace",
            });
        }
        let note = if has_link {
            "its only link is a proposed main"
        } else {
            "no main leads to it"
        };
        town.plant("island without source", "island", &estate, note);
        if has_link {
            let near =
                |a: &usize, b: &usize| distance(town.nodes[*a].at, site).total_cmp(&distance(town.nodes[*b].at, site));
            let served = |node: &usize| !nodes.contains(node) && town.mains_at(*node).len() > 1;
            let from = (0..town.nodes.len())
                .filter(served)
                .min_by(near)
                .expect("the town has nodes");
            let middle = add(scale(add(town.nodes[from].at, site), 0.5), [0.0, 14.0]);
            let line = vec![town.nodes[from].at, middle, site];
            let mut lane = distribution(laid, 6.0, "low", line, [from, nodes[0]]);
            (lane.status, lane.road) = ("proposed", "Fallow End".to_string());
            let lane = town.add_main(lane);
            town.plant("left out by status", "mains-left-out", &[lane], "proposed");
        }
    }
}

fn attributes(town: &mut Town, lcg: &mut Lcg) {
    // Values as they are stored: the same filler in millimetres and in inches.
    for (value, note) in [(None, "empty"), (None, "empty"), (Some(0.0), "0"), (Some(-1.0), "-1")] {
        let index = pick(town, lcg, |main, _| plain(town, main));
        town.mains[index].diameter_in = value;
        town.plant("missing diameter", "diameter-missing", &[index], note);
    }
    for (value, note) in [(590.0, "590 in (14986 mm)"), (0.1, "0.1 in (2.54 mm)")] {
        let index = pick(town, lcg, |main, _| plain(town, main));
        town.mains[index].diameter_in = Some(value);
        town.plant("impossible diameter", "diameter-impossible", &[index], note);
    }
    for times in [3.2808, 3.2808, 0.45] {
        let index = pick(town, lcg, |main, _| plain(town, main));
        town.mains[index].stored_length_m = Some((town.mains[index].length_m() * times * 10.0).round() / 10.0);
        town.plant(
            "length that disagrees",
            "length-disagrees",
            &[index],
            format!("stored is {times} times the drawn length"),
        );
    }
    for _ in 0..2 {
        let index = pick(town, lcg, |main, _| plain(town, main));
        (town.mains[index].material, town.mains[index].c_factor) = ("type 4", None);
        town.plant("unknown material", "material-unknown", &[index], "and no C-factor");
    }
    for _ in 0..2 {
        let index = pick(town, lcg, |main, _| plain(town, main));
        town.mains[index].planted = true;
        let other = pick(town, lcg, |main, _| plain(town, main));
        town.mains[other].id = town.mains[index].id;
        town.plant(
            "repeated id",
            "id-repeated",
            &[index, other],
            format!("rows {} and {}", index + 1, other + 1),
        );
    }
    for _ in 0..2 {
        let index = pick(town, lcg, |main, _| plain(town, main));
        for valve in &mut town.valves {
            if valve.main == town.mains[index].id {
                valve.main = None;
            }
        }
        town.mains[index].id = None;
        town.plant("missing id", "id-missing", &[index], "");
    }
}

/// Rows that draw nothing.
fn broken_geometry(town: &mut Town) {
    let usual = town
        .mains
        .iter()
        .rfind(|main| main.feeds())
        .expect("the town has mains")
        .clone();
    let places: Vec<Point> = town
        .nodes
        .iter()
        .skip(40)
        .step_by(37)
        .map(|node| add(node.at, [9.0, 7.0]))
        .collect();
    let rows = [
        ("no geometry", "geometry-missing", Drawing::Null),
        ("empty geometry", "geometry-missing", Drawing::Empty),
        (
            "one vertex",
            "geometry-one-point",
            Drawing::Lines(vec![vec![places[0]]]),
        ),
        (
            "one vertex",
            "geometry-one-point",
            Drawing::Lines(vec![vec![places[1]]]),
        ),
        (
            "zero length",
            "geometry-zero-length",
            Drawing::Lines(vec![vec![places[2]; 2]]),
        ),
        (
            "zero length",
            "geometry-zero-length",
            Drawing::Lines(vec![vec![places[3]; 3]]),
        ),
    ];
    for (fault, code, drawing) in rows {
        let node = town.add_node(places[4], "low");
        town.nodes[node].drawn = false;
        let mut main = usual.clone();
        (main.drawing, main.ends, main.tees, main.stored_length_m) = (drawing, [node, node], Vec::new(), None);
        (main.planted, main.is_copy, main.c_factor) = (true, true, Some(120.0));
        let index = town.add_main(main);
        town.plant(fault, code, &[index], "");
    }
}

/// Adds a fault on a feature of another layer than the mains.
pub fn on(town: &mut Town, layer: &'static str, id: u32, [fault, code]: [&'static str; 2], other: String, note: &str) {
    town.faults.push(Fault {
        fault,
        code,
        layer,
        feature: id.to_string(),
        other,
        note: note.to_string(),
    });
}
