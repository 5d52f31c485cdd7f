//! The town from the ground up, and its files.

use std::path::PathBuf;

use super::lcg::Lcg;
use super::place::Place;
use super::town::{FIRST_HYDRANT_ID, Town};
use super::{faults, graph, mains, point_faults, points, streets, tables, write_geojson, write_shapefile};

/// The town's name, and that of its folder. There is no such place.
pub const NAME: &str = "quenlow";

pub fn town() -> Town {
    let mut lcg = Lcg::new(7);
    let graph = graph::from_streets(&streets::lay_out(), &mut lcg);
    let mut town = mains::under_streets(&graph, &mut lcg);
    mains::run_through(&mut town, 26);
    mains::add_closes(&mut town, 52, &mut lcg);
    mains::add_supply(&mut town);
    points::add_hydrants(&mut town, 178.0, &mut lcg);
    points::add_customers(&mut town, 90.0, &mut lcg);
    points::add_valves(&mut town, &mut lcg);
    records(&mut town, &mut lcg);
    faults::plant_all(&mut town, &mut lcg);
    point_faults::plant_all(&mut town, &mut lcg);
    town
}

/// What the records say besides: lengths as once measured, and a C-factor for nine mains in ten.
fn records(town: &mut Town, lcg: &mut Lcg) {
    for main in &mut town.mains {
        let measured = (main.length_m() * lcg.between(0.985, 1.015) * 10.0).round() / 10.0;
        main.stored_length_m = (lcg.chance(0.95) && main.length_m() > 20.0).then_some(measured);
        if lcg.chance(0.1) {
            main.c_factor = None;
        }
    }
}

fn csv_field(words: &str) -> String {
    if words.contains([',', '"']) {
        format!("\"{}\"", words.replace('"', "\"\""))
    } else {
        words.to_string()
    }
}

fn faults_csv(town: &Town) -> String {
    let mut out = String::from("fault,code,layer,feature,other,note\n");
    for fault in &town.faults {
        let fields = [
            fault.fault,
            fault.code,
            fault.layer,
            &fault.feature,
            &fault.other,
            &fault.note,
        ]
        .map(csv_field);
        out.push_str(&fields.join(","));
        out.push('\n');
    }
    out
}

/// Pairs of mains that share a node, by row from 1 and by id. Copies of a main are left out.
fn connected_csv(town: &Town) -> String {
    let in_use = |index: usize| town.mains[index].in_use() && !town.mains[index].is_copy;
    let mut pairs = std::collections::BTreeSet::new();
    for node in 0..town.nodes.len() {
        let here: Vec<usize> = town.mains_at(node).into_iter().filter(|index| in_use(*index)).collect();
        for (position, a) in here.iter().enumerate() {
            for b in &here[position + 1..] {
                if town.mains[*a].zone == town.mains[*b].zone {
                    pairs.insert((*a, *b));
                }
            }
        }
    }
    let id = |index: usize| town.mains[index].id.map_or(String::new(), |id| id.to_string());
    let mut out = String::from("row_a,row_b,id_a,id_b\n");
    for (a, b) in pairs {
        out.push_str(&format!("{},{},{},{}\n", a + 1, b + 1, id(a), id(b)));
    }
    out
}

/// Hydrants that fall short and why, as an independent solve of the same network found them.
fn short_hydrants_csv() -> String {
    let mut out = String::from("hydrant,reason,note\n");
    for (hydrant, reason, note) in super::short_hydrants::SHORT {
        assert!(*hydrant >= FIRST_HYDRANT_ID);
        out.push_str(&format!("{hydrant},{reason},{}\n", csv_field(note)));
    }
    out
}

/// Every file of the town, under the folder that holds both forms.
pub fn files() -> Vec<(PathBuf, Vec<u8>)> {
    let (town, place) = (town(), Place::new());
    let si = PathBuf::from(NAME);
    let us = PathBuf::from(format!("{NAME}-us"));
    let mut files = Vec::new();
    for table in tables::of(&town) {
        let text = write_geojson::text(&table, &place);
        files.push((si.join(format!("{}.geojson", table.name)), text.into_bytes()));
        for (ending, bytes) in write_shapefile::files(&table, &place) {
            files.push((us.join(format!("{}.{ending}", table.name)), bytes));
        }
    }
    files.push((si.join("study.toml"), include_bytes!("study-si.toml").to_vec()));
    files.push((us.join("study.toml"), include_bytes!("study-us.toml").to_vec()));
    for folder in [si, us] {
        files.push((folder.join("planted-faults.csv"), faults_csv(&town).into_bytes()));
        files.push((folder.join("connected.csv"), connected_csv(&town).into_bytes()));
        files.push((folder.join("short-hydrants.csv"), short_hydrants_csv().into_bytes()));
    }
    files
}
