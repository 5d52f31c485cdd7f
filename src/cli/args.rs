//! Arguments as typed.

use std::ffi::OsString;
use std::path::PathBuf;

use clap::{Args, Parser, Subcommand, ValueEnum};
use gradeline::finding::Severity;
use gradeline::layers::Format;

use super::say::Stop;

/// Checks a water utility's mapped network: joins the mains, solves the hydraulics, and writes pressure, velocity and fire flow
/// back onto the map.
#[derive(Debug, Parser)]
#[command(name = "gradeline", version, max_term_width = 100, after_help = CAUTION)]
pub struct Typed {
    #[command(subcommand)]
    pub command: Command,
}

const CAUTION: &str =
    "Results screen a map. They do not replace field flow tests or the judgement of a licensed engineer.";

/// What can be asked for.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Do the whole job: join the mains, solve every case, judge pressure, velocity and fire flow, write the layers.
    #[command(after_help = CHECK_EXAMPLES, override_usage = CHECK_USAGE)]
    Check(StudyArgs),
    /// Topology and findings alone: which mains connect, and what is doubtful. Needs no demands, sources or elevations.
    #[command(after_help = MAP_EXAMPLES, override_usage = MAP_USAGE)]
    Map(StudyArgs),
    /// Say what a finding means, why it matters and what to do.
    #[command(after_help = EXPLAIN_EXAMPLES)]
    Explain(ExplainArgs),
}

const CHECK_USAGE: &str =
    "gradeline check <STUDY> [--out DIR] [--format FORMAT] [--fail-at SEVERITY] [--quiet | --json]";
const MAP_USAGE: &str = "gradeline map <STUDY> [--out DIR] [--format FORMAT] [--fail-at SEVERITY] [--quiet | --json]";

const CHECK_EXAMPLES: &str = "\
Examples:
  gradeline check sample-data/quenlow/study.toml
  gradeline check study.toml --out results --format shapefile
  gradeline check study.toml --fail-at serious --quiet

Exit codes:
  0  done
  1  done, with findings at or above --fail-at
  2  the command was not understood, or could not be done
  3  done, but the hydraulics of a case are not proved";

const MAP_EXAMPLES: &str = "\
Examples:
  gradeline map sample-data/quenlow/study.toml
  gradeline map study.toml --json

Exit codes:
  0  done
  1  done, with findings at or above --fail-at
  2  the command was not understood, or could not be done";

const EXPLAIN_EXAMPLES: &str = "\
Examples:
  gradeline explain near-miss
  gradeline explain            (every code)";

/// Arguments of a run.
#[derive(Debug, Args)]
pub struct StudyArgs {
    /// The study file (TOML) that names the layers and what to ask.
    pub study: PathBuf,
    /// Folder for the results [default: gradeline-results beside the study file].
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,
    /// Format of the layers written [default: that of the first mains layer].
    #[arg(long, value_name = "FORMAT", value_enum)]
    pub format: Option<FormatWord>,
    /// Exit with 1 when a finding is at least this severe [default: never].
    #[arg(long, value_name = "SEVERITY", value_enum)]
    pub fail_at: Option<SeverityWord>,
    /// Print nothing but errors.
    #[arg(long, conflicts_with = "json")]
    pub quiet: bool,
    /// Print the summary as JSON instead of text.
    #[arg(long)]
    pub json: bool,
}

/// Arguments of `explain`.
#[derive(Debug, Args)]
pub struct ExplainArgs {
    /// The finding's code, as it stands in the findings layer.
    pub code: Option<String>,
}

/// A format as typed.
#[derive(Clone, Copy, Debug, ValueEnum)]
pub enum FormatWord {
    /// GeoJSON.
    Geojson,
    /// Shapefile.
    Shapefile,
}

impl From<FormatWord> for Format {
    fn from(word: FormatWord) -> Format {
        match word {
            FormatWord::Geojson => Format::GeoJson,
            FormatWord::Shapefile => Format::Shapefile,
        }
    }
}

/// A severity as typed.
#[derive(Clone, Copy, Debug, ValueEnum)]
pub enum SeverityWord {
    /// Worth knowing.
    Note,
    /// To be looked at.
    Warning,
    /// An answer is wrong, missing or unsafe.
    Serious,
}

impl From<SeverityWord> for Severity {
    fn from(word: SeverityWord) -> Severity {
        match word {
            SeverityWord::Note => Severity::Note,
            SeverityWord::Warning => Severity::Warning,
            SeverityWord::Serious => Severity::Serious,
        }
    }
}

/// Understands what was typed.
///
/// # Errors
/// Help and version that were asked for (no trouble), and usage that is not understood (exit code 2).
pub fn parse(words: impl IntoIterator<Item = OsString>) -> Result<Typed, Stop> {
    Typed::try_parse_from(words).map_err(Stop::Usage)
}

#[cfg(test)]
mod tests {
    use clap::CommandFactory;

    use super::*;

    #[test]
    fn the_definition_is_sound() {
        Typed::command().debug_assert();
    }

    #[test]
    fn every_example_in_the_help_is_understood() {
        for line in [CHECK_EXAMPLES, MAP_EXAMPLES, EXPLAIN_EXAMPLES]
            .iter()
            .flat_map(|text| text.lines())
        {
            if let Some(example) = line.trim().strip_prefix("gradeline ") {
                let words = example.split_whitespace().take_while(|word| !word.starts_with('('));
                let words = std::iter::once("gradeline").chain(words).map(OsString::from);
                assert!(parse(words).is_ok(), "{example}");
            }
        }
    }
}
