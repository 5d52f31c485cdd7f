//! Docs that are made from the code: a test fails when they are stale. `GRADELINE_UPDATE_DOCS=1` writes them anew.

use std::path::Path;

use gradeline::finding::{About, Code};
use gradeline::layers::result_columns::LAYERS;
use gradeline::study::Study;
use gradeline::units::UnitSystem;

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

#[test]
fn the_findings_page_is_that_of_the_codes() {
    check("findings.md", &findings_page());
}

/// Every kind of finding, in the order of the table of codes.
fn findings_page() -> String {
    let mut page = String::from(
        "# Findings\n\nEvery kind of finding: what it means, why it matters, what to do. `gradeline explain CODE` says the same. A \
         finding is about the\n`map` (the drawing or its attributes) or about the `water` (pressure, velocity, fire flow). Its usual severity \
         is given here; the final\none is set after the hydraulics, by what the fault does to the answer.\n\n- `note`: worth knowing, nothing to \
         do\n- `warning`: to be looked at, an answer may rest on it\n- `serious`: an answer is wrong, missing or unsafe until it is settled\n\n\
         This page is made from the program's own table of codes.\n",
    );
    for about in [About::Map, About::Water] {
        page.push_str(&format!("\n## About the {}\n", about.word()));
        for code in Code::ALL.iter().filter(|code| code.text().about == about) {
            let text = code.text();
            page.push_str(&format!(
                "\n### `{}`\n\n{} *Usually {}.*\n\n- Why it matters: {}\n- What to do: {}\n",
                text.name,
                text.means,
                text.usual_severity.word(),
                text.matters,
                text.todo
            ));
        }
    }
    page
}

#[test]
fn the_columns_page_is_that_of_the_list_of_written_columns() {
    check("result-columns.md", &columns_page());
}

/// Every column that is written, with its name in both systems of units.
fn columns_page() -> String {
    let mut page = String::from(
        "# Result columns\n\nEvery column that is written, the same in every format. A name ends in its unit and fits the ten characters of a \
         shapefile.\nLayers of yours (mains, hydrants, customers) keep all their own columns, and these stand after them; where one of \
         yours has the\nsame name, yours stays and ours gets a number, and the finding `column-renamed` says so.\n\nThis page is made from \
         the program's own list of columns.\n",
    );
    for (layer, columns) in LAYERS {
        page.push_str(&format!(
            "\n## `{layer}`\n\n| in SI | in US units | meaning |\n|---|---|---|\n"
        ));
        for column in *columns {
            let [si, us] = [UnitSystem::Si, UnitSystem::Us].map(|system| column.name(system));
            page.push_str(&format!("| `{si}` | `{us}` | {} |\n", column.means));
        }
    }
    page
}

#[test]
fn the_studies_in_the_docs_are_understood() {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    for page in ["README.md", "docs/guide.md"] {
        let text = std::fs::read_to_string(root.join(page)).unwrap();
        let blocks = text
            .split("```toml\n")
            .skip(1)
            .filter_map(|rest| rest.split("```").next());
        let study: String = blocks.collect();
        assert!(study.contains("[mains]"), "{page} shows a study");
        if let Err(error) = Study::parse(&root.join("study.toml"), &study) {
            panic!("{page}: {error}");
        }
    }
}
