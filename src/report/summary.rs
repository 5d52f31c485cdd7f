//! The summary: what a planning engineer would paste into a memo.

use std::fmt::Write;

use super::facts::{self, CAUTIONS, OfCode};
use super::words::{counted, thousands};
use super::{Report, Words, Written, plural};
use crate::assets::{Role, UnitFrom};
use crate::calculation::Calculation;
use crate::finding::{About, Code, FeatureRef, Severity};
use crate::screening::{FireRun, Flag, HydrantVerdict, Limit};
use crate::topology::JoinKind;
use crate::units::Quantity;

/// Kinds of note that are shown with an example each, where there are no more; else they are counted.
const NOTES_SHOWN: usize = 4;
/// Hydrants that are shown by name.
const HYDRANTS_SHOWN: usize = 8;

/// The whole text.
pub(super) fn text(report: &Report<'_>, written: Option<&Written>) -> String {
    let called = |feature: FeatureRef| report.called(feature);
    let words = Words {
        called: &called,
        units: report.inputs.units,
    };
    let mut out = String::new();
    // Writing to a string cannot fail.
    let _ = tell(&mut out, report, &words, written);
    out
}

fn tell(out: &mut String, report: &Report<'_>, words: &Words<'_>, written: Option<&Written>) -> std::fmt::Result {
    tested(out, report, words)?;
    read(out, report)?;
    joined(out, report, words)?;
    doubtful(out, report, words)?;
    if let Some(calculation) = report.inputs.calculation {
        pressure(out, calculation, report, words)?;
        fire(out, calculation, report, words)?;
        solution(out, calculation, report)?;
    }
    writeln!(out, "\nCautions")?;
    CAUTIONS.iter().try_for_each(|caution| writeln!(out, "  {caution}"))?;
    if let Some(written) = written {
        writeln!(out, "\nWritten to {}", written.folder.display())?;
        writeln!(out, "  {}", layers_written(&written.files))?;
    }
    Ok(())
}

/// The layers in a list of files, each with what its main file ends in.
fn layers_written(files: &[String]) -> String {
    let of_a_layer = |file: &&String| {
        [".geojson", ".shp", ".json"]
            .iter()
            .any(|ending| file.ends_with(ending))
    };
    let is_table = |file: &&String| {
        file.strip_suffix(".dbf")
            .is_some_and(|stem| !files.iter().any(|other| *other == format!("{stem}.shp")))
    };
    let shown: Vec<&str> = files
        .iter()
        .filter(|file| of_a_layer(file) || is_table(file))
        .map(String::as_str)
        .collect();
    shown.join(", ")
}

/// The first line: how much of the map the rest speaks of.
fn tested(out: &mut String, report: &Report<'_>, words: &Words<'_>) -> std::fmt::Result {
    let Some(calculation) = report.inputs.calculation else {
        writeln!(
            out,
            "{}: map only. Nothing was calculated; pressure, velocity and fire flow are untested.",
            report.inputs.title
        )?;
        return writeln!(out);
    };
    let coverage = &calculation.screened.coverage;
    if coverage.length_m == 0.0 {
        let title = report.inputs.title;
        writeln!(out, "{title}: no main is left to calculate with; nothing was tested.")?;
        return writeln!(out);
    }
    let length = words.distance(coverage.length_m);
    let untested = coverage.untested_share();
    write!(
        out,
        "{}: {} % of {length} of mains was tested",
        report.inputs.title,
        percent(1.0 - untested)
    )?;
    let reasons = coverage
        .untested_m
        .iter()
        .map(|(why, m)| format!("{} % {}", percent(m / coverage.length_m), why.word()));
    match reasons.collect::<Vec<_>>() {
        reasons if reasons.is_empty() => writeln!(out, ".")?,
        reasons => writeln!(out, "; untested: {}.", reasons.join(", "))?,
    }
    writeln!(out)
}

/// A share in percent that never rounds up to a whole that is not there.
fn percent(share: f64) -> String {
    let percent = share * 100.0;
    match percent {
        percent if percent > 99.9 && percent < 100.0 => "99.9".into(),
        percent if percent > 0.0 && percent < 0.1 => "0.1".into(),
        percent => format!("{percent:.1}").trim_end_matches(".0").to_string(),
    }
}

fn read(out: &mut String, report: &Report<'_>) -> std::fmt::Result {
    writeln!(out, "Read")?;
    for (role, layer) in report.layers() {
        let file = layer.source.path.file_name().unwrap_or_default().to_string_lossy();
        writeln!(
            out,
            "  {:>8} {} from {file}, {}",
            thousands(layer.rows() as usize),
            plural(role),
            layer.crs.name
        )?;
    }
    inferred(out, report)?;
    let left_out = report.assets().left_out.len();
    if left_out > 0 {
        writeln!(out, "  {:>8} mains left out by rules of the study", thousands(left_out))?;
    }
    Ok(())
}

/// Units that the study does not state, and fillers that stand for "not known".
fn inferred(out: &mut String, report: &Report<'_>) -> std::fmt::Result {
    let reading = report.inputs.reading;
    let layer = |index: u16| &report.inputs.set.layers[index as usize].name;
    for used in reading.units.iter().filter(|used| used.from != UnitFrom::Study) {
        let (column, layer) = (&used.column, layer(used.layer));
        writeln!(
            out,
            "           {layer}: {column} is read in {}, {}",
            used.unit.name,
            used.from.words()
        )?;
    }
    // Blanks are no news; all of it is in `summary.json`.
    for found in reading.fillers.iter().filter(|found| !found.filler.starts_with('(')) {
        let (rows, layer) = (counted(found.count as usize, "row"), layer(found.layer));
        writeln!(
            out,
            "           {layer}: {} in {rows} is read as no {}",
            found.filler,
            found.key.replace('_', " ")
        )?;
    }
    Ok(())
}

fn joined(out: &mut String, report: &Report<'_>, words: &Words<'_>) -> std::fmt::Result {
    let map = report.inputs.map;
    let tolerance = report.inputs.tolerance_m;
    writeln!(
        out,
        "\nJoined, with a tolerance of {}",
        words.number(tolerance, Quantity::Length)
    )?;
    let joins = facts::joins(report);
    for (kind, (made, apart)) in &joins {
        match kind {
            JoinKind::Crossing => writeln!(out, "  {:>8} bare crossings, never joined", thousands(*apart))?,
            JoinKind::NearMiss => writeln!(out, "  {:>8} near misses left apart", thousands(*apart))?,
            JoinKind::ZonesApart => writeln!(out, "  {:>8} contacts of two zones kept apart", thousands(*apart))?,
            kind => writeln!(out, "  {:>8} {}", thousands(*made), made_words(*kind))?,
        }
    }
    let pieces = map.piece_length_m.len();
    writeln!(
        out,
        "  {:>8} parts to calculate with, {}",
        thousands(map.parts.len()),
        pieces_word(pieces)
    )?;
    let Some(table) = &map.tolerance else { return Ok(()) };
    writeln!(
        out,
        "  tolerance      joins    pieces   in the largest   mains swallowed"
    )?;
    for row in &table.rows {
        writeln!(
            out,
            "  {:>9} {:>10} {:>9} {:>14} % {:>17}{}",
            words.number(row.tolerance_m, Quantity::Length),
            thousands(row.joins as usize),
            thousands(row.islands as usize),
            percent(row.largest_share),
            thousands(row.swallowed as usize),
            if row.tolerance_m == tolerance { "   in use" } else { "" }
        )?;
    }
    writeln!(
        out,
        "  suggested: {}. {}",
        words.number(table.suggested_m, Quantity::Length),
        words.sentence(&table.reason)
    )
}

/// What is counted of a kind of join that was made.
fn made_words(kind: JoinKind) -> &'static str {
    match kind {
        JoinKind::EndOnEnd => "ends that meet exactly",
        JoinKind::EndNearEnd => "ends joined to ends across a gap",
        JoinKind::EndOnMiddle => "ends on the middle of a main",
        JoinKind::EndNearMiddle => "ends joined to the middle of a main across a gap",
        JoinKind::Overshoot => "overshoots joined where they cross, the tail left out",
        JoinKind::EndOnPoint => "ends joined at a point feature between them",
        kind => kind.word(),
    }
}

fn pieces_word(pieces: usize) -> String {
    if pieces == 1 {
        "all hanging together".into()
    } else {
        format!("in {} pieces that do not hang together", thousands(pieces))
    }
}

fn doubtful(out: &mut String, report: &Report<'_>, words: &Words<'_>) -> std::fmt::Result {
    let [serious, warnings, notes] = facts::by_severity(report, About::Map);
    writeln!(
        out,
        "\nDoubtful in the map: {serious} serious, {}, {}",
        counted(warnings, "warning"),
        counted(notes, "note")
    )?;
    kinds(out, &facts::by_code(report, About::Map), words)
}

/// Kinds of finding, one line each with its most serious example; many kinds of note in one line.
fn kinds(out: &mut String, found: &[OfCode<'_>], words: &Words<'_>) -> std::fmt::Result {
    let (notes, doubts): (Vec<&OfCode>, Vec<&OfCode>) = found.iter().partition(|of| of.worst == Severity::Note);
    let few = notes.len() <= NOTES_SHOWN;
    for of in doubts.into_iter().chain(notes.iter().copied().filter(|_| few)) {
        let example = words.sentence(&of.first.message);
        let more = match of.count {
            1 => String::new(),
            count => format!(" (and {} more)", thousands(count - 1)),
        };
        writeln!(
            out,
            "  {:<8} {:<24} {example}{more}",
            of.worst.word(),
            of.code.text().name
        )?;
    }
    if !few {
        let counts = notes
            .iter()
            .map(|of| format!("{} {}", of.code.text().name, thousands(of.count)));
        writeln!(out, "  {:<8} {}", "notes", counts.collect::<Vec<_>>().join(", "))?;
    }
    Ok(())
}

fn pressure(out: &mut String, calculation: &Calculation, report: &Report<'_>, words: &Words<'_>) -> std::fmt::Result {
    let (judged, low) = facts::low_nodes(&calculation.screened.nodes);
    let customers = &calculation.screened.customers;
    writeln!(out, "\nPressure and velocity")?;
    writeln!(
        out,
        "  {} of {} where customers draw or hydrants stand are low",
        thousands(low),
        counted(judged, "node")
    )?;
    if !customers.is_empty() {
        let low = customers.iter().filter(|verdict| verdict.flag == Flag::Low).count();
        writeln!(
            out,
            "  {} of {} have low pressure at the tap",
            thousands(low),
            counted(customers.len(), "customer")
        )?;
    }
    let mut of_water = facts::by_code(report, About::Water);
    of_water.retain(|of| !matches!(of.code, Code::FireFlowShort | Code::FireNotRun));
    kinds(out, &of_water, words)
}

fn fire(out: &mut String, calculation: &Calculation, report: &Report<'_>, words: &Words<'_>) -> std::fmt::Result {
    if facts::rows_read(report, Role::Hydrant) == 0 {
        return Ok(());
    }
    let verdicts = match &calculation.screened.fire {
        FireRun::NotRun(why) => return writeln!(out, "\nFire flow: not run; {why}"),
        FireRun::Run(verdicts) => verdicts,
    };
    let with = |flag: Flag| facts::hydrants_with(verdicts, flag);
    writeln!(
        out,
        "\nFire flow: {} of {} short, {} ok, {} unserved, {} untested, {} without a needed flow",
        with(Flag::Short),
        counted(verdicts.len(), "hydrant"),
        with(Flag::Ok),
        with(Flag::Unserved),
        with(Flag::Untested),
        with(Flag::NotJudged)
    )?;
    if let Some(fire) = &calculation.fire {
        let pressure = |limit: &Limit| format!("{} ({})", words.number(limit.value, Quantity::Pressure), limit.from);
        write!(out, "  in the case `{}`", calculation.cases[fire.case].case.name)?;
        write!(out, ", with a residual of {}", pressure(&fire.residual_m))?;
        match &fire.keep_elsewhere_m {
            Some(limit) => writeln!(out, " and {} kept wherever customers draw", pressure(limit))?,
            None => writeln!(out)?,
        }
    }
    let mut short: Vec<(usize, &HydrantVerdict)> = verdicts
        .iter()
        .enumerate()
        .filter(|(_, verdict)| verdict.flag == Flag::Short)
        .collect();
    short.sort_by(|a, b| {
        b.1.short_m3_per_s()
            .unwrap_or(0.0)
            .total_cmp(&a.1.short_m3_per_s().unwrap_or(0.0))
    });
    for (at, verdict) in short.iter().take(HYDRANTS_SHOWN) {
        let flow = |flow: Option<f64>| flow.map_or("?".into(), |flow| words.number(flow, Quantity::Flow));
        let name = report.called(report.assets().hydrants[*at].origin);
        let limit = verdict.limit_by.map_or("", |limit| limit.word());
        let place = verdict
            .limit_at
            .map_or(String::new(), |place| format!(", {}", report.called(place)));
        let suspect = verdict.suspect.map_or(String::new(), |([first, other], _)| {
            format!("; look first at {} and {}", report.called(first), report.called(other))
        });
        writeln!(
            out,
            "  {name}: {} of {} (limit: {limit}{place}){suspect}",
            flow(verdict.counted_m3_per_s()),
            flow(verdict.needed_m3_per_s)
        )?;
    }
    if short.len() > HYDRANTS_SHOWN {
        writeln!(
            out,
            "  and {} more, in the hydrants layer",
            short.len() - HYDRANTS_SHOWN
        )?;
    }
    Ok(())
}

fn solution(out: &mut String, calculation: &Calculation, report: &Report<'_>) -> std::fmt::Result {
    if calculation.network.sources.is_empty() {
        return writeln!(
            out,
            "\nNothing was solved: no main hangs together with a node of known head, nor with a source of the study"
        );
    }
    writeln!(out, "\nHow good the solution is")?;
    for solved in facts::all_cases(report) {
        match &solved.outcome {
            Ok(state) => writeln!(
                out,
                "  {}: {} steps; flows balance to {:.1e} m3/s, heads close to {:.1e} m",
                solved.case.name, state.steps, state.residuals.continuity_m3_per_s, state.residuals.head_m
            )?,
            Err(trouble) => writeln!(
                out,
                "  {}: NOT PROVED after {} steps (flows off by {:.1e} m3/s, heads by {:.1e} m); nothing of it is shown",
                solved.case.name, trouble.steps, trouble.residuals.continuity_m3_per_s, trouble.residuals.head_m
            )?,
        }
    }
    let assumed = calculation
        .network
        .main_diameter_m
        .iter()
        .filter(|bore| bore.basis == crate::assets::Basis::Assumed)
        .count();
    writeln!(out, "  {} calculated with an assumed bore", counted(assumed, "main"))?;
    let (made, on_default) = facts::verdicts_on_defaults(report);
    writeln!(
        out,
        "  {} of {} rest on default limits, not on yours",
        thousands(on_default),
        counted(made, "verdict")
    )
}
