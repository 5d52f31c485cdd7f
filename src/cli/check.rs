//! `gradeline check` and `gradeline map`.

use gradeline::finding::Severity;
use gradeline::study::{self, RunOptions, Study};

use super::args::StudyArgs;
use super::progress::Progress;
use super::say::{Done, Stop};

/// Runs a study.
///
/// # Errors
/// What stopped the run.
pub fn run(asked: &StudyArgs, map_only: bool) -> Result<Done, Stop> {
    let study = Study::read(&asked.study).map_err(Stop::Run)?;
    let options = RunOptions {
        map_only,
        out: asked.out.clone(),
        format: asked.format.map(Into::into),
    };
    let (outcome, written) = {
        let progress = Progress::start(!asked.quiet);
        study::run_and_write(&study, &options, &progress).map_err(Stop::Run)?
    };
    let report = outcome.report(&study, &options);
    let text = match (asked.quiet, asked.json) {
        (true, _) => String::new(),
        (false, true) => {
            let mut summary = report.summary_json();
            summary["files"] = written.files.into();
            format!("{summary:#}\n")
        }
        (false, false) => report.summary_text(Some(&written)),
    };
    let fail_at: Option<Severity> = asked.fail_at.map(Into::into);
    Ok(Done {
        text,
        failing_findings: fail_at.is_some_and(|least| outcome.findings.iter().any(|finding| finding.severity >= least)),
        not_proved: !outcome.is_proved(),
    })
}
