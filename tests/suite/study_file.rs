//! Study files: cut short or garbled they are refused or understood, never a panic; and what a case asks for reaches the
//! network that is solved.

use std::fs;
use std::path::Path;

use gradeline::network::Basis;
use gradeline::study::{Outcome, RunOptions, Study, Worked, run};
use gradeline::watch::Unwatched;
use proptest::prelude::*;
use proptest::test_runner::RngSeed;

const SAMPLES: &[&str] = &[
    include_str!("../../sample-data/quenlow/study.toml"),
    include_str!("../../sample-data/quenlow-us/study.toml"),
];

#[test]
fn a_study_cut_short_anywhere_is_refused_or_understood() {
    for text in SAMPLES {
        for end in 0..text.len() {
            if let (true, Err(error)) = (
                text.is_char_boundary(end),
                Study::parse(Path::new("study.toml"), &text[..end]),
            ) {
                assert!(error.to_string().starts_with("study.toml: "), "{error}");
            }
        }
    }
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, cases: 300, rng_seed: RngSeed::Fixed(1905), ..ProptestConfig::default() })]

    #[test]
    fn a_garbled_study_is_refused_or_understood(sample in 0..SAMPLES.len(), at in 0..2_000_usize, put in "[ -~\n]{1,3}") {
        let mut letters: Vec<char> = SAMPLES[sample].chars().collect();
        let at = at % letters.len();
        letters.splice(at..(at + put.len()).min(letters.len()), put.chars());
        let text: String = letters.into_iter().collect();
        // What matters is that it returns.
        let _ = Study::parse(Path::new("study.toml"), &text);
    }
}

#[test]
fn the_sample_studies_are_understood() {
    for name in ["quenlow", "quenlow-us"] {
        let path = Path::new(env!("CARGO_MANIFEST_DIR"))
            .join("sample-data")
            .join(name)
            .join("study.toml");
        let study = Study::read(&path).unwrap();
        assert!(study.cases.len() > 1 && study.fire.is_some());
    }
}

#[test]
fn bytes_that_are_no_text_are_refused() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("study.toml");
    fs::write(&path, [0xff, 0xfe, 0x00]).unwrap();
    assert!(
        Study::read(&path)
            .unwrap_err()
            .to_string()
            .contains("is not UTF-8 text")
    );
}

/// Two mains in a row from a tank, with a customer of each class at the end of the second.
fn small_network(more: &str) -> Result<Outcome, String> {
    let line = |id: &str, from: f64, to: f64| {
        format!(
            r#"{{"type":"Feature","properties":{{"id":"{id}","d_mm":150,"c":120}},"geometry":{{"type":"LineString","coordinates":[[{from},5000000],[{to},5000000]]}}}}"#
        )
    };
    let point = |properties: &str, x: f64| {
        format!(
            r#"{{"type":"Feature","properties":{properties},"geometry":{{"type":"Point","coordinates":[{x},5000000]}}}}"#
        )
    };
    let layer = |features: &[String]| {
        format!(
            r#"{{"type":"FeatureCollection","crs":{{"type":"name","properties":{{"name":"urn:ogc:def:crs:EPSG::32633"}}}},"features":[{}]}}"#,
            features.join(",")
        )
    };
    let folder = tempfile::tempdir().unwrap();
    let put = |name: &str, text: String| fs::write(folder.path().join(name), text).unwrap();
    put(
        "m.geojson",
        layer(&[line("M1", 500_000.0, 500_300.0), line("M2", 500_300.0, 500_500.0)]),
    );
    put(
        "n.geojson",
        layer(&[
            point(r#"{"id":"T1","kind":"tank","z_m":50,"h_m":null}"#, 500_000.0),
            point(r#"{"id":"N2","kind":"node","z_m":40,"h_m":null}"#, 500_500.0),
        ]),
    );
    put(
        "c.geojson",
        layer(&[
            point(r#"{"id":"C1","q_lps":2,"class":"home"}"#, 500_500.0),
            point(r#"{"id":"C2","q_lps":3,"class":"works"}"#, 500_500.0),
        ]),
    );
    put(
        "study.toml",
        format!(
            "[mains]\nfrom = \"m.geojson\"\nid = \"id\"\ndiameter = \"d_mm\"\nc_factor = \"c\"\n\
         [nodes]\nfrom = \"n.geojson\"\nid = \"id\"\nkind = \"kind\"\nelevation = \"z_m\"\nhead = \"h_m\"\n\
         [customers]\nfrom = \"c.geojson\"\nid = \"id\"\ndemand = \"q_lps\"\nclass = \"class\"\n{more}"
        ),
    );
    let study = Study::read(&folder.path().join("study.toml")).map_err(|error| error.to_string())?;
    run(&study, &RunOptions::default(), &Unwatched).map_err(|error| error.to_string())
}

#[test]
fn a_case_sets_factors_by_class_and_the_levels_of_tanks() {
    let outcome = small_network(
        "[[case]]\nname = \"low tank\"\ndemand_times = 2\ndemand_times_by = { WORKS = 1 }\ntank_levels_m = { T1 = 90 }\n\
         [[case]]\nname = \"full tank\"\ntank_levels_ft = { T1 = 328.0839895 }\n",
    )
    .unwrap();
    let Worked::Full(calculation) = &outcome.worked else {
        panic!()
    };
    assert_eq!(calculation.network.sources.len(), 1);
    assert_eq!(calculation.network.sources[0].head_m.basis, Basis::Study);
    let state = |case: usize| calculation.cases[case].outcome.as_ref().unwrap();
    let (low, full) = (state(0), state(1));
    // Homes draw twice 2 l/s and works once 3 l/s; then each its own once.
    let drawn = |state: &gradeline::hydraulics::State| state.flow_m3_per_s[0];
    assert!((drawn(low) - 0.007).abs() < 1e-9, "{}", drawn(low));
    assert!((drawn(full) - 0.005).abs() < 1e-9, "{}", drawn(full));
    let tank = calculation.network.sources[0].node.at();
    assert_eq!(low.head_m[tank], 90.0);
    assert!((full.head_m[tank] - 100.0).abs() < 1e-6);
}

#[test]
fn classes_and_tanks_that_are_not_on_the_map_are_refused() {
    let case = |keys: &str| small_network(&format!("[[case]]\nname = \"a\"\n{keys}\n")).unwrap_err();
    assert!(
        case("demand_times_by = { work = 1 }")
            .contains("names the class `work`, which no customer has. The nearest is `works`")
    );
    assert!(case("tank_levels_m = { T9 = 90 }").contains("names `T9`, which is no node's id. The nearest is `T1`"));
}

#[test]
fn a_head_of_the_study_counts_where_the_map_has_none() {
    let outcome = small_network("[[source]]\nat = \"T1\"\nelevation_m = 50\npressure_m = 35").unwrap();
    let Worked::Full(calculation) = &outcome.worked else {
        panic!()
    };
    assert_eq!(calculation.network.sources.len(), 1);
    let source = calculation.network.sources[0];
    assert_eq!((source.head_m.value, source.tank), (85.0, true));
}
