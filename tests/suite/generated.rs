//! Docs that are made from the code: a test fails when they are stale. `GRADELINE_UPDATE_DOCS=1` writes them anew.

use std::path::Path;

/// Holds a page in `docs/` against what the program makes of itself.
fn check(name: &str, made: &str) {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("docs").join(name);
    if std::env::var_os("GRADELINE_UPDATE_DOCS").is_some() {
        std::fs::write(&path, made).unwrap();
    }
    let written = std::fs::read_to_string(&path).unwrap_or_default();
    assert!(
        written == made,
        "docs/{name} is stale: run `GRADELINE_UPDATE_DOCS=1 cargo test --release generated` and commit it"
    );
}

#[test]
fn the_study_file_page_is_that_of_the_key_list() {
    check("study-file.md", &gradeline::study::study_file_page());
}
