//! The page about the study file, made from the definitions that the reader goes by.

use std::fmt::Write;

use super::keys::{Key, Table, Takes};
use super::tables::TOP;
use crate::units::Unit;

/// `docs/study-file.md`, in Markdown.
pub fn study_file_page() -> String {
    let mut page = String::from(
        "# The study file\n\n\
         One TOML file says what to read and what to ask. Every key but `from` of `[mains]` may be left out; the report prints every \
         setting, given or default. A key that is unknown or misspelt, given in two units, or not calculated by this version stops the \
         run with a sentence.\n\n\
         A name such as `tolerance_m` ends in its unit: any unit that fits may stand there (`tolerance_ft`). A column of numbers is \
         named as `\"diam_mm\"` (the unit is then told by the name, or by the values where they fit one unit only, and said) or as \
         `{ column = \"DIAM\", unit = \"in\" }`.\n\n\
         This page is made from the program's own list of keys.\n",
    );
    write_table(&mut page, "The top of the file", &TOP);
    for key in TOP.keys {
        match key.takes {
            Takes::Table(table) => write_table(&mut page, &format!("`[{}]`", key.name), table),
            Takes::Tables(table) => write_table(&mut page, &format!("`[{0}]`, or several `[[{0}]]`", key.name), table),
            _ => {}
        }
    }
    page
}

fn write_table(page: &mut String, title: &str, table: &Table) {
    // Writing to a String cannot fail.
    let _ = write!(
        page,
        "\n## {title}\n\n{}\n\n| key | takes | without it | meaning |\n|---|---|---|---|\n",
        table.means
    );
    for key in table.keys {
        let described = match key.takes {
            Takes::Tables(_) | Takes::Table(_) if key.means.is_empty() => continue,
            Takes::NotYet(what) => (
                format!("`{}`", key.name),
                "–".to_string(),
                "–".to_string(),
                format!("{} Refused: this version does not calculate {what}.", key.means),
            ),
            _ => (names(key), takes(key), default(key), key.means.to_string()),
        };
        let (names, takes, default, means) = described;
        let _ = writeln!(page, "| {names} | {takes} | {default} | {means} |");
    }
}

fn names(key: &Key) -> String {
    let first = &key.spellings()[0];
    let others: Vec<String> = key.spellings()[1..]
        .iter()
        .map(|name| format!("`{}`", &name[key.name.len()..]))
        .collect();
    match key.suffix_of() {
        Some(_) => format!(
            "`{first}` (or {})",
            others
                .iter()
                .map(|other| if other == "``" { "no unit".into() } else { other.clone() })
                .collect::<Vec<_>>()
                .join(" ")
        ),
        None => format!("`{first}`"),
    }
}

fn takes(key: &Key) -> String {
    let units = |quantity| {
        let names: Vec<&str> = Unit::all(quantity).map(|unit| unit.name).collect();
        names.join(", ")
    };
    match key.takes {
        Takes::Text => "text".into(),
        Takes::File => "path of a file".into(),
        Takes::Choice(words) => words
            .iter()
            .map(|word| format!("`{word}`"))
            .collect::<Vec<_>>()
            .join(" or "),
        Takes::Column => "column".into(),
        Takes::UnitColumn(quantity) => format!("column, in {}", units(quantity)),
        Takes::Number(_) => "number".into(),
        Takes::NumberOrColumn(_) => "number, or column".into(),
        Takes::Plain => "number".into(),
        Takes::PlainByName | Takes::NumberByName(_) => "table of numbers".into(),
        Takes::Marks => "table of columns and values".into(),
        Takes::Place => "id or `[x, y]`".into(),
        Takes::Table(_) | Takes::Tables(_) => "table".into(),
        Takes::NotYet(_) => "–".into(),
    }
}

fn default(key: &Key) -> String {
    if key.default.is_empty() {
        "–".into()
    } else {
        key.default.replace('"', "`")
    }
}
