//! The sample town is what its maker makes, to the byte.

#[path = "../../sample-data/make-town/maker/mod.rs"]
mod maker;

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};

fn root() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("sample-data")
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
fn every_planted_fault_has_a_code_and_every_kind_stands_twice() {
    let text = std::fs::read_to_string(root().join(maker::NAME).join("planted-faults.csv")).expect("the list is there");
    let codes: Vec<&str> = text.lines().skip(1).filter_map(fault_code).collect();
    for code in &codes {
        assert!(gradeline::finding::Code::by_name(code).is_some(), "{code} is no code");
    }
    for code in codes.iter().collect::<BTreeSet<_>>() {
        let count = codes.iter().filter(|other| *other == code).count();
        assert!(count >= 2, "{code} is planted {count} times");
    }
}

/// The second field of a line; its first may be quoted. `None` where no finding is to be made.
fn fault_code(line: &str) -> Option<&str> {
    let after = match line.strip_prefix('"') {
        Some(quoted) => quoted.split_once("\",")?.1,
        None => line.split_once(',')?.1,
    };
    after.split(',').next().filter(|code| !code.is_empty())
}
