//! Rules about the source that matter, as tests: who may import whom, no conversion factor outside `units.rs`, no serde
//! attribute whose messages help nobody, module docs everywhere, files of one subject, and complete map cases.

use std::path::{Path, PathBuf};

/// The rooms in order: each may use those before it. `watch` may be used by all.
const ROOMS: [&str; 14] = [
    "units",
    "finding",
    "watch",
    "layers",
    "assets",
    "topology",
    "network",
    "hydraulics",
    "screening",
    "calculation",
    "hookup",
    "report",
    "study",
    "cli",
];

/// Rooms that see less than those before them.
const SEES_ONLY: [(&str, &[&str]); 1] = [("hydraulics", &["units", "finding", "network"])];

/// All that `report` may name of `hydraulics`: what comes out of a solve. How it is solved, its laws and its settings are none
/// of its business.
const SEEN_BY_REPORT: [&str; 3] = ["State", "Residuals", "NotSettled"];

/// How a path on somebody's own machine begins. In two pieces each, so that this file holds none.
const OWN_MACHINES: [[&str; 2]; 6] = [
    ["/ho", "me/"],
    ["/ro", "ot/"],
    ["/Us", "ers/"],
    ["\\Us", "ers\\"],
    ["/wo", "rk/"],
    ["/tm", "p/"],
];

/// Folders of the project that hold what was made and not what was written.
const MADE: [&str; 4] = ["target", ".git", "gradeline-results", "results"];

/// Numbers that convert one unit to another, or are made of such. Written without underscores.
const CONVERSIONS: [&str; 32] = [
    "0.3048",
    "3.28084",
    "3.2808",
    "3.281",
    "0.0254",
    "25.4",
    "39.37",
    "3937.0",
    "3937",
    "1609.344",
    "3.785411784",
    "0.003785411784",
    "3.7854",
    "3.785",
    "4.54609",
    "0.00454609",
    "0.0630902",
    "15.8503",
    "15850.3",
    "448.831",
    "28.3168",
    "0.0283168",
    "9.80665",
    "9.81",
    "9806.65",
    "6894.757",
    "6.894757",
    "0.70307",
    "2.30666",
    "2.31",
    "0.4335",
    "86400",
];

/// A file has one subject: no more lines than this above its tests.
const MOST_LINES: usize = 625;

/// A function fits a screen: no more lines than this, from its name to its closing brace.
const MOST_LINES_OF_A_FUNCTION: usize = 65;

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// Every source file under a folder, with its text.
fn sources(folder: &str) -> Vec<(PathBuf, String)> {
    let mut found = Vec::new();
    let mut folders = vec![root().join(folder)];
    while let Some(folder) = folders.pop() {
        for entry in std::fs::read_dir(&folder).expect("the folder can be read") {
            let path = entry.expect("an entry").path();
            if path.is_dir() {
                folders.push(path);
            } else if path.extension().is_some_and(|ending| ending == "rs") {
                let text = std::fs::read_to_string(&path).expect("the file can be read");
                found.push((
                    path.strip_prefix(root()).expect("it lies in the project").to_path_buf(),
                    text,
                ));
            }
        }
    }
    found.sort();
    assert!(!found.is_empty(), "no source under {folder}");
    found
}

/// The program without its unit tests, which stand below the code or in files of their own.
fn program() -> Vec<(PathBuf, String)> {
    let is_test = |path: &Path| {
        let text = path.to_string_lossy();
        text.contains("/tests/") || text.ends_with("tests.rs")
    };
    let cut = |text: String| {
        text.split("\n#[cfg(test)]\nmod ")
            .next()
            .unwrap_or_default()
            .to_string()
    };
    let all = sources("src").into_iter().filter(|(path, _)| !is_test(path));
    all.map(|(path, text)| (path, cut(text))).collect()
}

/// Text with comments and what stands in string quotes blanked out, line by line.
fn code_alone(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    let mut letters = text.chars().peekable();
    let (mut in_string, mut in_comment) = (false, false);
    while let Some(letter) = letters.next() {
        let next = letters.peek().copied();
        match letter {
            '\n' => {
                in_comment = false;
                out.push('\n');
            }
            _ if in_comment => {}
            '\\' if in_string => drop(letters.next()),
            '"' => in_string = !in_string,
            '\'' if !in_string && next == Some('"') => drop(letters.next()),
            _ if in_string => {}
            '/' if next == Some('/') => in_comment = true,
            _ => out.push(letter),
        }
    }
    out
}

/// The room a source file belongs to; none for `lib.rs` and `main.rs`.
fn room_of(path: &Path) -> Option<&'static str> {
    let first = path.components().nth(1)?.as_os_str().to_string_lossy().into_owned();
    let name = first.trim_end_matches(".rs");
    ROOMS.into_iter().find(|room| *room == name)
}

fn assert_none(wrong: &[String]) {
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn every_room_is_in_the_order() {
    for (path, _) in program() {
        let outside = ["src/lib.rs", "src/main.rs"].iter().any(|file| path == Path::new(file));
        assert!(
            outside || room_of(&path).is_some(),
            "{} belongs to no room",
            path.display()
        );
    }
}

#[test]
fn a_room_imports_only_rooms_before_it() {
    let mut wrong = Vec::new();
    for (path, text) in program() {
        let Some(room) = room_of(&path) else { continue };
        let own = ROOMS.iter().position(|other| *other == room).expect("it is a room");
        let code = code_alone(&text);
        for (at, used) in ROOMS.iter().enumerate() {
            let may = match SEES_ONLY.iter().find(|(of, _)| *of == room) {
                Some((_, seen)) => seen.contains(used) || *used == room,
                None => at <= own || *used == "watch",
            };
            if !may && uses(&code, used) {
                wrong.push(format!("{}: {room} uses {used}", path.display()));
            }
        }
    }
    assert_none(&wrong);
}

#[test]
fn the_report_takes_results_and_not_the_inside_of_the_solver() {
    let mut wrong = Vec::new();
    let mut used = 0;
    for (path, text) in program()
        .into_iter()
        .filter(|(path, _)| room_of(path) == Some("report"))
    {
        let named = named_of(&code_alone(&text), "hydraulics");
        used += named.len();
        let hidden = named.iter().filter(|name| !SEEN_BY_REPORT.contains(&name.as_str()));
        wrong.extend(hidden.map(|name| format!("{}: names hydraulics::{name}", path.display())));
    }
    assert_none(&wrong);
    assert!(used > 0, "the rule sees nothing");
}

/// What code names of a room: `State` of `room::State`, each of `room::{…}`, and `(itself)` where the room is named alone.
fn named_of(code: &str, room: &str) -> Vec<String> {
    let is_letter = |letter: char| letter.is_alphanumeric() || letter == '_';
    let mut named = Vec::new();
    for (at, _) in code.match_indices(room) {
        let after = &code[at + room.len()..];
        if code[..at].ends_with(is_letter) || after.starts_with(is_letter) {
            continue;
        }
        match after.strip_prefix("::") {
            None => named.push("(itself)".to_string()),
            Some(list) if list.starts_with('{') => {
                let list = list[1..].split('}').next().unwrap_or_default();
                let names = list.split(',').map(str::trim).filter(|name| !name.is_empty());
                named.extend(names.map(str::to_string));
            }
            Some(name) => named.push(
                name.split(|letter| !is_letter(letter))
                    .next()
                    .unwrap_or_default()
                    .to_string(),
            ),
        }
    }
    named
}

#[test]
fn no_file_holds_a_path_of_somebodys_machine() {
    let mut wrong = Vec::new();
    let mut folders = vec![root().to_path_buf()];
    let mut files = 0;
    while let Some(folder) = folders.pop() {
        for entry in std::fs::read_dir(&folder).expect("the folder can be read") {
            let path = entry.expect("an entry").path();
            let name = path.file_name().unwrap_or_default().to_string_lossy().into_owned();
            if MADE.contains(&name.as_str()) {
                continue;
            }
            if path.is_dir() {
                folders.push(path);
                continue;
            }
            files += 1;
            let bytes = std::fs::read(&path).expect("the file can be read");
            let found = own_machine(&bytes);
            wrong.extend(found.map(|start| format!("{}: {start}", path.display())));
        }
    }
    assert_none(&wrong);
    assert!(files > 200, "{files} files were looked at");
}

/// The start of a path on somebody's machine that stands in a file.
fn own_machine(bytes: &[u8]) -> Option<String> {
    let begins = |at: usize| at == 0 || !(bytes[at - 1].is_ascii_alphanumeric() || b".-_})".contains(&bytes[at - 1]));
    let holds = |start: &String| {
        let mut windows = bytes.windows(start.len()).enumerate();
        windows.any(|(at, window)| window == start.as_bytes() && begins(at))
    };
    OWN_MACHINES.iter().map(|pieces| pieces.concat()).find(holds)
}

/// Whether code names a room, by `crate::room` or in a list `crate::{…}`.
fn uses(code: &str, room: &str) -> bool {
    let named = |after: &str| {
        after
            .strip_prefix(room)
            .is_some_and(|rest| !rest.starts_with(|next: char| next.is_alphanumeric() || next == '_'))
    };
    ["crate::", "gradeline::"].iter().any(|start| {
        code.match_indices(start).any(|(at, _)| {
            let after = &code[at + start.len()..];
            let list = after.strip_prefix('{').and_then(|list| list.split_once('}'));
            named(after) || list.is_some_and(|(list, _)| list.split(',').any(|name| named(name.trim())))
        })
    })
}

#[test]
fn conversion_factors_stand_in_units_alone() {
    let mut wrong = Vec::new();
    for (path, text) in program() {
        if path == Path::new("src/units.rs") {
            continue;
        }
        for (number, line) in code_alone(&text).lines().enumerate() {
            let plain = line.replace('_', "");
            let literals = plain.split(|letter: char| !letter.is_alphanumeric() && letter != '.');
            for literal in literals.filter(|literal| CONVERSIONS.contains(literal)) {
                wrong.push(format!("{}:{}: {literal}", path.display(), number + 1));
            }
        }
    }
    assert_none(&wrong);
}

#[test]
fn nothing_is_left_undone_and_no_message_helps_nobody() {
    let words = [
        "todo!",
        "unimplemented!",
        "dbg!",
        "untagged",
        "flatten)",
        "flatten,",
        "println!",
        "process::exit",
    ];
    let mut wrong = Vec::new();
    for (path, text) in program() {
        let speaks = path.starts_with("src/cli") || path == Path::new("src/main.rs");
        for (number, line) in code_alone(&text).lines().enumerate() {
            let serde_alone =
                |word: &str| !matches!(word, "flatten)" | "flatten," | "untagged") || line.contains("serde(");
            let spoken = |word: &str| speaks && matches!(word, "println!" | "process::exit");
            for word in words
                .iter()
                .filter(|word| line.contains(*word) && serde_alone(word) && !spoken(word))
            {
                wrong.push(format!("{}:{}: {word}", path.display(), number + 1));
            }
        }
    }
    assert_none(&wrong);
}

#[test]
fn every_source_file_says_what_it_is_about() {
    let all = ["src", "tests", "sample-data"].into_iter().flat_map(sources);
    let silent = all.filter(|(_, text)| !text.starts_with("//! "));
    assert_none(
        &silent
            .map(|(path, _)| format!("{} has no module docs", path.display()))
            .collect::<Vec<_>>(),
    );
}

#[test]
fn a_file_has_one_subject() {
    let long = program()
        .into_iter()
        .filter(|(_, text)| text.lines().count() > MOST_LINES);
    assert_none(
        &long
            .map(|(path, text)| format!("{}: {} lines", path.display(), text.lines().count()))
            .collect::<Vec<_>>(),
    );
}

#[test]
fn a_function_fits_a_screen() {
    let mut wrong = Vec::new();
    for (path, text) in program().into_iter().chain(sources("sample-data")) {
        for (name, lines) in functions(&text) {
            if lines > MOST_LINES_OF_A_FUNCTION {
                wrong.push(format!("{}: {name} has {lines} lines", path.display()));
            }
        }
    }
    assert_none(&wrong);
}

/// The functions of a formatted source file with their lengths. One without a body, or in a line, is none.
fn functions(text: &str) -> Vec<(String, usize)> {
    let lines: Vec<&str> = text.lines().collect();
    let mut found = Vec::new();
    for (at, line) in lines.iter().enumerate() {
        let code = line.trim_start();
        let mut words = code
            .split(' ')
            .skip_while(|word| word.starts_with("pub") || *word == "const");
        if words.next() != Some("fn") || line.ends_with(';') || line.ends_with('}') {
            continue;
        }
        let name = words.next().unwrap_or_default();
        let name = name.split(['(', '<']).next().unwrap_or_default();
        let end = format!("{}}}", &line[..line.len() - code.len()]);
        if let Some(last) = lines[at..].iter().position(|line| *line == end) {
            found.push((name.to_string(), last + 1));
        }
    }
    found
}

#[test]
fn every_map_case_is_complete() {
    for folder in super::cases::folders() {
        for file in ["mains.geojson", "study.toml", "expected.toml", "note.md"] {
            assert!(folder.join(file).is_file(), "{} has no {file}", folder.display());
        }
    }
}

#[test]
fn the_rules_see_what_they_should() {
    assert!(uses("use crate::report::Report;", "report"));
    assert!(uses("use crate::{assets, report};", "report"));
    assert!(!uses("use crate::reporting::X;", "report"));
    assert_eq!(code_alone("let a = \"25.4 // x\"; // 25.4\nb"), "let a = ; \nb");
    assert_eq!(code_alone("'\"' 9.81"), "' 9.81");
    let code = "use crate::hydraulics::{self, State}; hydraulics::residuals(x); let hydraulics = 1; my_hydraulics::X";
    assert_eq!(named_of(code, "hydraulics"), ["self", "State", "residuals", "(itself)"]);
    assert_eq!(
        named_of("crate::{hydraulics::newton::Newton}", "hydraulics"),
        ["newton"]
    );
    assert!(own_machine(["see /ho", "me/me/x"].concat().as_bytes()).is_some());
    assert!(own_machine(b"src/home/x, network/y, a frame/work").is_none());
    let code = "impl A {\n    pub fn long(\n        a: u8,\n    ) {\n        b();\n    }\n    fn short() {}\n}\npub(super) fn c<T>() {\n}";
    assert_eq!(functions(code), [("long".to_string(), 5), ("c".to_string(), 2)]);
}
