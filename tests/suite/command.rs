//! Command runs: what is printed where, and the exit code.
//!
//! Each file `tests/command/*.txt` is one run: the command line after `$`, the exit code, and what stands on stdout and
//! stderr, to the letter. `{sample}` stands for the folder `sample-data`, `{here}` for `tests/command`, `{out}` for a folder of
//! the run's own, and `(tiny)` for a number such as `1.4e-14`, which another machine may round otherwise. To add a run,
//! write a file with the first line alone; `GRADELINE_UPDATE_SNAPSHOTS=1 cargo test --test suite command` fills it in, and
//! rewrites the others: look at what changed before you keep it.

use std::path::{Path, PathBuf};

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

/// What was printed, with what differs from machine to machine put into placeholders.
fn masked(text: &str, places: &[(&str, PathBuf)]) -> String {
    let mut text = text.to_string();
    for (name, path) in places {
        text = text.replace(path.to_str().unwrap(), name);
    }
    let mask = |word: &str| match word.contains("e-") && word.parse::<f64>().is_ok() {
        true => "(tiny)".to_string(),
        false => word.to_string(),
    };
    let lines = text
        .split('\n')
        .map(|line| line.split(' ').map(mask).collect::<Vec<_>>().join(" "));
    lines.collect::<Vec<_>>().join("\n")
}

/// A run as its file should read.
fn told(command_line: &str) -> String {
    let root = Path::new(env!("CARGO_MANIFEST_DIR"));
    let folder = tempfile::tempdir().unwrap();
    let places = [
        ("{sample}", root.join("sample-data")),
        ("{here}", root.join("tests/command")),
        ("{out}", folder.path().join("results")),
    ];
    let filled = |word: &str| {
        let fill = |word: String, (name, path): &(&str, PathBuf)| word.replace(name, path.to_str().unwrap());
        places.iter().fold(word.to_string(), fill)
    };
    let words: Vec<String> = command_line.split(' ').map(filled).collect();
    assert_eq!(words[0], "gradeline", "{command_line}");
    let (code, out, err) = run(&words[1..].iter().map(String::as_str).collect::<Vec<_>>());
    let [out, err] = [out, err].map(|text| masked(&text, &places));
    format!("$ {command_line}\nexit code {code}\n--- stdout\n{out}--- stderr\n{err}")
}

#[test]
fn every_run_reads_as_it_is_kept() {
    let update = std::env::var("GRADELINE_UPDATE_SNAPSHOTS").is_ok_and(|value| value == "1");
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/command");
    let files = std::fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().path());
    let mut files: Vec<PathBuf> = files
        .filter(|path| path.extension().is_some_and(|ending| ending == "txt"))
        .collect();
    files.sort();
    assert!(files.len() >= 10, "{} runs are kept", files.len());
    let mut wrong = Vec::new();
    for file in files {
        let kept = std::fs::read_to_string(&file).unwrap();
        let first = kept.lines().next().unwrap_or_default();
        let command_line = first
            .strip_prefix("$ ")
            .unwrap_or_else(|| panic!("{}: no command", file.display()));
        let told = told(command_line);
        if update {
            std::fs::write(&file, told).unwrap();
        } else if let Some(difference) = first_difference(&kept, &told) {
            wrong.push(format!("{}, {difference}", file.display()));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

fn first_difference(kept: &str, told: &str) -> Option<String> {
    if kept == told {
        return None;
    }
    let (kept, told): (Vec<&str>, Vec<&str>) = (kept.split('\n').collect(), told.split('\n').collect());
    let at = (0..kept.len().max(told.len())).find(|at| kept.get(*at) != told.get(*at))?;
    let line = |lines: &[&str]| lines.get(at).map_or("(nothing)".to_string(), ToString::to_string);
    Some(format!(
        "line {}:\n  kept: {}\n  now:  {}",
        at + 1,
        line(&kept),
        line(&told)
    ))
}

#[test]
fn what_differs_by_machine_is_masked_and_nothing_else() {
    let places = [("{out}", PathBuf::from("/some/where"))];
    let text = "to 1.4e-14 m, 3e-5\n/some/where/a.shp e-mail 0.25 near-e-1";
    assert_eq!(
        masked(text, &places),
        "to (tiny) m, (tiny)\n{out}/a.shp e-mail 0.25 near-e-1"
    );
    assert_eq!(first_difference("a\nb\n", "a\nb\n"), None);
    assert_eq!(
        first_difference("a\nb", "a\nc").unwrap(),
        "line 2:\n  kept: b\n  now:  c"
    );
    assert!(first_difference("a", "a\n").is_some());
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

/// A study of the sample town and a folder for its results.
fn sample() -> (String, tempfile::TempDir) {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("sample-data/quenlow/study.toml");
    (path.to_str().unwrap().to_string(), tempfile::tempdir().unwrap())
}

#[test]
fn check_prints_a_summary_and_writes_layers() {
    let (study, folder) = sample();
    let out = folder.path().join("results");
    let (code, text, err) = run(&["check", &study, "--out", out.to_str().unwrap()]);
    assert_eq!((code, err.as_str()), (0, ""));
    let first = text.lines().next().unwrap();
    assert!(
        first.starts_with("Quenlow, existing network: ") && first.contains("of mains was tested"),
        "{first}"
    );
    for heading in [
        "Read\n",
        "Joined, with a tolerance of",
        "Doubtful in the map:",
        "Pressure and velocity",
        "Fire flow:",
        "Cautions\n",
    ] {
        assert!(text.contains(heading), "{heading}");
    }
    for layer in [
        "mains",
        "parts",
        "nodes",
        "hydrants",
        "customers",
        "joins",
        "findings",
        "node_cases",
        "part_cases",
    ] {
        assert!(out.join(format!("{layer}.geojson")).is_file(), "{layer}");
    }
    assert!(out.join("summary.json").is_file());
}

#[test]
fn the_same_run_gives_the_same_files() {
    let (study, folder) = sample();
    let [a, b] = ["a", "b"].map(|name| folder.path().join(name));
    for out in [&a, &b] {
        assert_eq!(
            run(&["check", &study, "--quiet", "--out", out.to_str().unwrap()]),
            (0, String::new(), String::new())
        );
    }
    for file in std::fs::read_dir(&a).unwrap() {
        let name = file.unwrap().file_name();
        assert!(
            std::fs::read(a.join(&name)).unwrap() == std::fs::read(b.join(&name)).unwrap(),
            "{name:?}"
        );
    }
}

#[test]
fn findings_at_or_above_a_severity_give_exit_code_one() {
    let (study, folder) = sample();
    let out = folder.path().join("results");
    let out = out.to_str().unwrap();
    for severity in ["note", "warning", "serious"] {
        assert_eq!(
            run(&["map", &study, "--quiet", "--fail-at", severity, "--out", out]),
            (1, String::new(), String::new())
        );
    }
}

#[test]
fn map_needs_no_hydraulics_and_json_is_the_summary() {
    let (study, folder) = sample();
    let out = folder.path().join("results");
    let (code, text, err) = run(&[
        "map",
        &study,
        "--json",
        "--format",
        "shapefile",
        "--out",
        out.to_str().unwrap(),
    ]);
    assert_eq!((code, err.as_str()), (0, ""));
    let summary: serde_json::Value = serde_json::from_str(&text).unwrap();
    assert_eq!(summary["schema"], 1);
    let files: Vec<&str> = summary["files"]
        .as_array()
        .unwrap()
        .iter()
        .map(|file| file.as_str().unwrap())
        .collect();
    assert!(
        files.contains(&"mains.shp") && files.contains(&"summary.json"),
        "{files:?}"
    );
    assert!(files.iter().all(|file| out.join(file).is_file()));
    assert!(!out.join("part_cases.dbf").exists());
}

#[test]
fn results_lie_beside_the_study_unless_told_otherwise() {
    let folder = tempfile::tempdir().unwrap();
    let mains = r#"{"type":"FeatureCollection","features":[{"type":"Feature","properties":{},
        "geometry":{"type":"LineString","coordinates":[[10,50],[10.001,50]]}}]}"#;
    std::fs::write(folder.path().join("mains.geojson"), mains).unwrap();
    let path = study(folder.path(), "[mains]\nfrom = \"mains.geojson\"\n");
    let (code, text, err) = run(&["check", &path]);
    assert_eq!((code, err.as_str()), (0, ""), "{text}");
    assert!(folder.path().join("gradeline-results/mains.geojson").is_file());
    assert!(text.contains("untested"), "{text}");
}

#[test]
fn a_reader_that_goes_away_is_no_trouble() {
    use std::process::{Command, Stdio};
    let mut child = Command::new(assert_cmd::cargo::cargo_bin!("gradeline"))
        .arg("explain")
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let ended = child.wait_with_output().unwrap();
    assert_eq!((ended.status.code(), ended.stderr.as_slice()), (Some(0), &b""[..]));
}
