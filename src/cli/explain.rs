//! `gradeline explain CODE`.

use std::fmt::Write;

use gradeline::finding::{Code, nearest};

use super::say::{Done, Stop};

/// Explains a code; without one, lists all.
///
/// # Errors
/// A code that no finding has, with the nearest.
pub fn run(code: Option<&str>) -> Result<Done, Stop> {
    let text = match code {
        None => list(),
        Some(name) => explain(Code::by_name(name).ok_or_else(|| unknown(name))?),
    };
    Ok(Done {
        text,
        ..Done::default()
    })
}

fn explain(code: Code) -> String {
    let text = code.text();
    format!(
        "{}  (about the {}; usually {})\n\n  {}\n\n  Why it matters: {}\n\n  What to do: {}\n",
        text.name,
        text.about.word(),
        text.usual_severity.word(),
        text.means,
        text.matters,
        text.todo
    )
}

fn list() -> String {
    let widest = Code::ALL.iter().map(|code| code.text().name.len()).max().unwrap_or(0);
    let mut list = String::new();
    for code in Code::ALL {
        // Writing to a String cannot fail.
        let _ = writeln!(list, "{:widest$}  {}", code.text().name, code.text().means);
    }
    list
}

fn unknown(name: &str) -> Stop {
    let todo = match nearest(name, Code::ALL.iter().map(|code| code.text().name)) {
        Some(nearest) => format!("The nearest is `{nearest}`."),
        None => "`gradeline explain` lists every code.".to_string(),
    };
    Stop::UnknownCode(format!("no finding has the code `{name}`. {todo}"))
}
