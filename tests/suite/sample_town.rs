//! The sample town: it is what its maker makes, to the byte; every fault planted in it is found, and nothing else; the mains
//! that connect are those that were meant to; the hydrants that are short are those an independent solve found; and its
//! two forms, in SI and US units, give the same answer.

#[path = "../../sample-data/make-town/maker/mod.rs"]
mod maker;

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};

use gradeline::calculation::Calculation;
use gradeline::finding::{About, Code, FeatureRef, Finding, Severity};
use gradeline::screening::{FireRun, Flag, HydrantVerdict};
use gradeline::study::{Outcome, RunOptions, Study, Worked, run};
use gradeline::watch::Unwatched;

/// Findings of the map at warning or above that nobody planted.
const OTHER_WARNINGS: usize = 0;

fn root() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("sample-data")
}

fn forms() -> [String; 2] {
    [maker::NAME.to_string(), format!("{}-us", maker::NAME)]
}

fn outcome(form: &str) -> Outcome {
    let study = Study::read(&root().join(form).join("study.toml")).expect("the study is understood");
    run(&study, &RunOptions::default(), &Unwatched).expect("the study runs")
}

fn calculation(outcome: &Outcome) -> &Calculation {
    match &outcome.worked {
        Worked::Full(calculation) => calculation,
        Worked::Map(_) => panic!("the whole job was asked for"),
    }
}

fn hydrants(outcome: &Outcome) -> &[HydrantVerdict] {
    match &calculation(outcome).screened.fire {
        FireRun::Run(verdicts) => verdicts,
        FireRun::NotRun(why) => panic!("fire flow was not run: {why}"),
    }
}

/// Rows of a CSV file without its header; fields may be quoted.
fn csv(form: &str, name: &str) -> Vec<Vec<String>> {
    let text = std::fs::read_to_string(root().join(form).join(name)).expect("the file can be read");
    text.lines().skip(1).map(fields).collect()
}

fn fields(line: &str) -> Vec<String> {
    let mut fields = vec![String::new()];
    let mut quoted = false;
    for letter in line.chars() {
        match letter {
            '"' => quoted = !quoted,
            ',' if !quoted => fields.push(String::new()),
            _ => fields.last_mut().expect("there is one").push(letter),
        }
    }
    fields
}

/// Whether a feature is the one that a layer's name and an id (or `row 12`) mean.
fn is(outcome: &Outcome, feature: FeatureRef, layer: &str, id: &str) -> bool {
    let its_layer = &outcome.set.layers[usize::from(feature.layer)].name;
    let row = format!("row {}", feature.row + 1);
    its_layer == layer && outcome.reading.names.id(feature).map_or(row == id, |its| its == id)
}

fn names(outcome: &Outcome, finding: &Finding, layer: &str, id: &str) -> bool {
    let mut features = finding.feature.iter().chain(&finding.others);
    features.any(|feature| is(outcome, *feature, layer, id))
}

#[test]
fn the_sample_town_is_what_its_maker_makes() {
    for (path, made) in maker::files() {
        let kept = std::fs::read(root().join(&path)).unwrap_or_default();
        assert!(
            kept == made,
            "sample-data/{} is not what its maker makes: run `cargo run --example make-town`",
            path.display()
        );
    }
}

#[test]
fn every_kind_of_fault_is_planted_twice() {
    let planted = csv(maker::NAME, "planted-faults.csv");
    let codes: Vec<&String> = planted
        .iter()
        .map(|row| &row[1])
        .filter(|code| !code.is_empty())
        .collect();
    for code in &codes {
        assert!(Code::by_name(code).is_some(), "{code} is no code");
        let count = codes.iter().filter(|other| other == &code).count();
        assert!(count >= 2, "{code} is planted {count} times");
    }
}

#[test]
fn every_planted_fault_is_found_and_nothing_else() {
    for form in forms() {
        let outcome = outcome(&form);
        let planted = csv(&form, "planted-faults.csv");
        let planted: Vec<&Vec<String>> = planted.iter().filter(|row| !row[1].is_empty()).collect();
        let told = |finding: &Finding, row: &[String]| {
            finding.code.text().name == row[1] && names(&outcome, finding, &row[2], &row[3])
        };
        for row in &planted {
            let found = outcome.findings.iter().any(|finding| told(finding, row));
            assert!(found, "{form}: not found: {}", row.join(", "));
        }
        let loud = outcome
            .findings
            .iter()
            .filter(|finding| finding.severity >= Severity::Warning && finding.code.text().about == About::Map);
        let others: Vec<&Finding> = loud
            .filter(|finding| !planted.iter().any(|row| told(finding, row)))
            .collect();
        assert_eq!(others.len(), OTHER_WARNINGS, "{form}: {others:?}");
    }
}

#[test]
fn the_mains_that_connect_are_those_that_were_meant_to() {
    for form in forms() {
        let outcome = outcome(&form);
        let meant: BTreeSet<[u32; 2]> = csv(&form, "connected.csv")
            .iter()
            .map(|row| [row[0].parse().expect("a row"), row[1].parse().expect("a row")])
            .collect();
        let mut rows_of_copies: BTreeSet<u32> = BTreeSet::new();
        for row in csv(&form, "planted-faults.csv")
            .iter()
            .filter(|row| row[0].starts_with("duplicate"))
        {
            for main in &outcome.reading.assets.mains {
                if [&row[3], &row[4]]
                    .into_iter()
                    .any(|id| is(&outcome, main.origin, "mains", id))
                {
                    rows_of_copies.insert(main.origin.row + 1);
                }
            }
        }
        let mut found = connected(&outcome);
        found.retain(|pair| !pair.iter().any(|row| rows_of_copies.contains(row)));
        let extra: Vec<_> = found.difference(&meant).collect();
        let missing: Vec<_> = meant.difference(&found).collect();
        assert!(
            extra.is_empty() && missing.is_empty(),
            "{form}: too many {extra:?}, too few {missing:?}"
        );
    }
}

/// Pairs of mains that share a node, by row from 1.
fn connected(outcome: &Outcome) -> BTreeSet<[u32; 2]> {
    let map = &calculation(outcome).map;
    let mut at_node: Vec<BTreeSet<u32>> = vec![BTreeSet::new(); map.nodes.len()];
    for part in &map.parts {
        let row = outcome.reading.assets.mains[part.main as usize].origin.row + 1;
        at_node[part.from as usize].insert(row);
        at_node[part.to as usize].insert(row);
    }
    let pairs = at_node.iter().flat_map(|rows| {
        rows.iter()
            .flat_map(move |a| rows.range(a + 1..).map(move |b| [*a, *b]))
    });
    pairs.collect()
}

#[test]
fn the_hydrants_that_are_short_are_those_an_independent_solve_found() {
    for form in forms() {
        let outcome = outcome(&form);
        let meant: BTreeSet<String> = csv(&form, "short-hydrants.csv")
            .iter()
            .map(|row| row[0].clone())
            .collect();
        let verdicts = hydrants(&outcome).iter().zip(&outcome.reading.assets.hydrants);
        let short = verdicts.filter(|(verdict, _)| verdict.flag == Flag::Short);
        let short: BTreeSet<String> = short
            .map(|(_, hydrant)| outcome.reading.names.id(hydrant.origin).expect("an id").to_string())
            .collect();
        assert_eq!(short, meant, "{form}");
    }
}

/// A map fault behind a shortfall is named on the hydrant: the one that was planted, and none where the main is too small.
#[test]
fn a_hydrant_that_is_short_by_a_map_fault_names_the_fault() {
    for form in forms() {
        let outcome = outcome(&form);
        let verdicts = hydrants(&outcome).iter().zip(&outcome.reading.assets.hydrants);
        for (verdict, hydrant) in verdicts.filter(|(verdict, _)| verdict.flag == Flag::Short) {
            let id = outcome.reading.names.id(hydrant.origin).expect("an id");
            let rows = csv(&form, "short-hydrants.csv");
            let row = rows.iter().find(|row| row[0] == id).expect("a row for each");
            match (row[1].as_str(), verdict.suspect) {
                ("map fault", Some((features, _))) => {
                    let named = features.map(|feature| outcome.reading.names.id(feature).expect("an id").to_string());
                    assert!(
                        named.iter().any(|id| row[2].contains(id.as_str())),
                        "{form}: {id}: {named:?}"
                    );
                }
                ("map fault", None) => panic!("{form}: {id} names no fault"),
                (_, suspect) => assert_eq!(suspect, None, "{form}: {id}"),
            }
        }
    }
}

/// The two forms hold the same numbers rounded in their own units: a hundredth of a foot is 3 mm.
#[test]
fn both_forms_of_the_town_give_the_same_answer() {
    let [si, us] = forms().map(|form| outcome(&form));
    assert_eq!(si.findings.len(), us.findings.len());
    for (a, b) in hydrants(&si).iter().zip(hydrants(&us)) {
        let (Some(a), Some(b)) = (a.available_m3_per_s, b.available_m3_per_s) else {
            assert_eq!(a.flag, b.flag);
            continue;
        };
        assert!((a - b).abs() < 2e-4 * a, "{a} m3/s in SI, {b} m3/s in US units");
    }
}
