//! Streets: lines drawn along a field of directions, evenly apart, in two families that meet at right angles.
//!
//! The field is a sum of simple ones, each strong near its own place (Chen et al. 2008, Interactive procedural street
//! modeling); the lines are spaced as Jobard and Lefer (1997) space streamlines.

use super::plane::{Point, add, crossing, distance, dot, left, scale};
use super::terrain::{HILL, in_town, river_y};

const STEP_M: f64 = 10.0;

/// One street's line.
pub struct Street {
    pub line: Vec<Point>,
}

/// The direction that the first family of streets takes at a place.
fn heading(place: Point) -> Point {
    let mut sum = [0.0, 0.0];
    let mut blend = |angle: f64, weight: f64| {
        sum[0] += weight * (2.0 * angle).cos();
        sum[1] += weight * (2.0 * angle).sin();
    };
    let near = |middle: Point, width: f64| {
        let off = distance(place, middle) / width;
        (-off * off).exp()
    };
    let bank = (river_y(place[0] + 5.0) - river_y(place[0] - 5.0)) / 10.0;
    let from_river = (place[1] - river_y(place[0])) / 430.0;
    blend(bank.atan(), 1.3 * (-from_river * from_river).exp());
    let (east, north) = (place[0] - HILL[0], place[1] - HILL[1]);
    let round_hill = (1.9 * north + 0.7 * east).atan2(0.8 * east + 0.7 * north) + std::f64::consts::FRAC_PI_2;
    blend(round_hill, 1.5 * near(HILL, 470.0));
    blend(0.32, 1.2 * near([-60.0, -260.0], 420.0));
    blend(-0.48, 1.1 * near([930.0, -80.0], 560.0));
    blend(0.20, 1.0 * near([520.0, 700.0], 560.0));
    blend(-0.25, 0.9 * near([-1000.0, -250.0], 520.0));
    let wander = 0.20 * (place[0] / 330.0 + 0.4).sin()
        + 0.18 * (place[1] / 290.0 - place[0] / 700.0).sin()
        + 0.12 * (place[0] / 120.0 + place[1] / 170.0).sin();
    let angle = 0.5 * sum[1].atan2(sum[0]) + wander;
    [angle.cos(), angle.sin()]
}

/// How far apart the streets of a family lie: closer in the old town.
fn spacing(place: Point, family: usize) -> f64 {
    let off = distance(place, [-60.0, -260.0]) / 900.0;
    let wide = 1.0 - (-off * off).exp();
    [92.0, 118.0][family] + [36.0, 62.0][family] * wide
}

/// A family's direction at a place, turned so that it goes on from `before`.
fn ahead(place: Point, family: usize, before: Point) -> Point {
    let across = heading(place);
    let along = if family == 0 { across } else { left(across) };
    if dot(along, before) < 0.0 {
        scale(along, -1.0)
    } else {
        along
    }
}

fn crowded(family_lines: &[Street], place: Point, least: f64) -> bool {
    family_lines
        .iter()
        .any(|street| street.line.iter().any(|other| distance(*other, place) < least))
}

/// One line from `seed` in one sense, until it leaves the town, comes too near another of its family, or meets itself.
fn follow(seed: Point, family: usize, sense: f64, others: &[Street]) -> Vec<Point> {
    let mut line = vec![seed];
    let mut before = scale(ahead(seed, family, [1.0, 0.01]), sense);
    for _ in 0..260 {
        let here = line[line.len() - 1];
        let half_way = add(here, scale(ahead(here, family, before), 0.5 * STEP_M));
        before = ahead(half_way, family, before);
        let next = add(here, scale(before, STEP_M));
        let apart = spacing(next, family);
        let settled = line.len().saturating_sub((1.6 * apart / STEP_M) as usize);
        let meets_itself = line[..settled].iter().any(|old| distance(*old, next) < 0.6 * apart);
        if !in_town(next) || crowded(others, next, 0.62 * apart) || meets_itself {
            break;
        }
        line.push(next);
    }
    line
}

/// Lets an end run on until it meets a street, if one is near enough; so most streets end in a tee.
fn run_on(line: &mut Vec<Point>, all: &[Vec<Point>], own: usize, family: usize) {
    let last = line[line.len() - 1];
    let mut before = scale(super::plane::sub(last, line[line.len() - 2]), 1.0 / STEP_M);
    let mut more = Vec::new();
    let mut here = last;
    for _ in 0..((1.15 * spacing(last, family) / STEP_M) as usize) {
        before = ahead(here, family, before);
        let next = add(here, scale(before, STEP_M));
        more.push(next);
        for (index, other) in all.iter().enumerate() {
            let met = other
                .windows(2)
                .any(|pair| crossing([here, next], [pair[0], pair[1]]).is_some());
            if met && index != own {
                line.extend(more);
                return;
            }
        }
        here = next;
    }
}

fn family_of_streets(family: usize, first: &[Point]) -> Vec<Street> {
    let mut streets: Vec<Street> = Vec::new();
    let mut seeds: Vec<Point> = first.to_vec();
    let mut next_seed = 0;
    while next_seed < seeds.len() {
        let seed = seeds[next_seed];
        next_seed += 1;
        if !in_town(seed) || crowded(&streets, seed, 0.95 * spacing(seed, family)) {
            continue;
        }
        let mut line = follow(seed, family, -1.0, &streets);
        line.reverse();
        line.pop();
        line.extend(follow(seed, family, 1.0, &streets));
        if line.len() < 9 {
            continue;
        }
        for index in (0..line.len()).step_by(4) {
            let aside = left(ahead(line[index], family, [1.0, 0.01]));
            let apart = 1.02 * spacing(line[index], family);
            seeds.push(add(line[index], scale(aside, apart)));
            seeds.push(add(line[index], scale(aside, -apart)));
        }
        streets.push(Street { line });
    }
    streets
}

/// All streets of the town.
pub fn lay_out() -> Vec<Street> {
    let mut families = [
        family_of_streets(0, &[[-60.0, -260.0], [900.0, 100.0], [-900.0, -200.0], [-520.0, 420.0]]),
        family_of_streets(1, &[[-60.0, -260.0], [900.0, 100.0], [-900.0, -200.0], [-520.0, 380.0]]),
    ];
    let first_count = families[0].len();
    let all: Vec<Vec<Point>> = families.iter().flatten().map(|street| street.line.clone()).collect();
    for (family, streets) in families.iter_mut().enumerate() {
        for (index, street) in streets.iter_mut().enumerate() {
            let own = index + family * first_count;
            run_on(&mut street.line, &all, own, family);
            street.line.reverse();
            run_on(&mut street.line, &all, own, family);
            street.line.reverse();
        }
    }
    families.into_iter().flatten().collect()
}
