//! Command runs: what is printed where, and the exit code.

use std::path::Path;

use assert_cmd::cargo::cargo_bin_cmd;

/// A run of the command: exit code, stdout, stderr.
fn run(words: &[&str]) -> (i32, String, String) {
    let ran = cargo_bin_cmd!("gradeline").args(words).output().unwrap();
    let text = |bytes: Vec<u8>| String::from_utf8(bytes).unwrap();
    (ran.status.code().unwrap(), text(ran.stdout), text(ran.stderr))
}

/// A study in a folder of its own.
fn study(folder: &Path, text: &str) -> String {
    let path = folder.join("study.toml");
    std::fs::write(&path, text).unwrap();
    path.to_str().unwrap().to_string()
}

#[test]
fn explain_says_what_a_finding_means() {
    let (code, out, err) = run(&["explain", "near-miss"]);
    assert_eq!((code, err.as_str()), (0, ""));
    assert_eq!(
        out,
        "near-miss  (about the map; usually warning)\n\n  \
         A free end stops just outside the tolerance of another main.\n\n  \
         Why it matters: If they are really connected, the network is missing a feed: pressure and fire flow are shown too low.\n\n  \
         What to do: Zoom in: join them in the map if they connect, or leave them if they do not.\n"
    );
    assert_eq!(run(&["explain", "Near-Miss"]).1, out);
}

#[test]
fn explain_without_a_code_lists_them_all() {
    let (code, out, _) = run(&["explain"]);
    assert_eq!(code, 0);
    for finding in gradeline::finding::Code::ALL {
        assert!(out.contains(finding.text().name) && out.contains(finding.text().means));
    }
}

#[test]
fn a_code_that_is_not_known_is_refused_with_the_nearest() {
    let (code, out, err) = run(&["explain", "near-mis"]);
    assert_eq!((code, out.as_str()), (2, ""));
    assert_eq!(
        err,
        "error: no finding has the code `near-mis`. The nearest is `near-miss`.\n"
    );
}

#[test]
fn help_is_no_trouble_and_bad_usage_is() {
    let (code, out, err) = run(&["--help"]);
    assert_eq!((code, err.as_str()), (0, ""));
    assert!(out.contains("check") && out.contains("map") && out.contains("explain"));
    let (code, out, _) = run(&["check", "--help"]);
    assert!(code == 0 && out.contains("Exit codes:") && out.contains("--fail-at"));
    for words in [
        &["chekc"][..],
        &["check"],
        &["check", "study.toml", "--fail-at", "awful"],
        &[],
        &["map", "a", "--quiet", "--json"],
    ] {
        let (code, out, err) = run(words);
        assert_eq!((code, out.as_str()), (2, ""), "{words:?}");
        assert!(!err.is_empty(), "{words:?}");
    }
}

#[test]
fn a_study_that_cannot_be_done_is_one_sentence_on_stderr() {
    let folder = tempfile::tempdir().unwrap();
    let missing = folder.path().join("none.toml");
    let (code, out, err) = run(&["check", missing.to_str().unwrap()]);
    assert_eq!((code, out.as_str()), (2, ""));
    assert!(
        err.starts_with(&format!("error: {}: cannot read: ", missing.display())),
        "{err}"
    );

    let path = study(folder.path(), "[mains]\nfrom = \"mains.geojson\"\ndiamter = \"d\"\n");
    for command in ["check", "map"] {
        let (code, out, err) = run(&[command, &path]);
        assert_eq!((code, out.as_str()), (2, ""));
        assert_eq!(
            err,
            format!("error: {path}: line 3: there is no key `diamter` in [mains]. The nearest is `diameter`.\n")
        );
    }

    let path = study(folder.path(), "[mains]\nfrom = \"mains.geojson\"\n");
    let (code, _, err) = run(&["check", &path]);
    assert_eq!(code, 2);
    assert!(err.contains("mains.geojson: cannot read"), "{err}");
    assert!(!folder.path().join("gradeline-results").exists());
}
