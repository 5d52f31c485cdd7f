//! Fire flow: what every hydrant can give, held against what it should give.
//!
//! The available flow is the solution of the network with the hydrant held at its least head, not the end of a series of
//! trial flows. It comes on top of the demands of the fire case. Needed flow comes from the hydrant's row, else from the
//! study; a hydrant without one gets its available flow and is `not judged`.

use std::sync::atomic::{AtomicU64, Ordering};

use rayon::prelude::*;

use super::coverage::{Coverage, Untested};
use super::kept_places::KeptPlaces;
use super::suspects::{Suspect, behind, suspects};
use super::{Fire, Flag, Solved, Subject};
use crate::finding::{Code, Error, FeatureRef, Finding, Sentence};
use crate::hydraulics::{self, Kept, NotSettled, Solver, State};
use crate::network::{Condition, NodeIx};
use crate::units::Quantity;
use crate::watch::{Watch, step};

/// Two flows that agree to this share are one.
const SAME: f64 = 1.0 - 1e-9;

/// What limits a hydrant.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum LimitBy {
    /// Its own residual pressure.
    OwnPressure,
    /// Pressure where customers draw elsewhere: at this node.
    Elsewhere(NodeIx),
    /// A source's greatest flow, or nothing but the source it stands on.
    Source,
    /// It is below the residual limit with no hydrant open.
    AlreadyLow,
    /// It hangs together with no source, or taps no main.
    Unserved,
}

impl LimitBy {
    /// The words that are written.
    pub fn word(self) -> &'static str {
        match self {
            LimitBy::OwnPressure => "own pressure",
            LimitBy::Elsewhere(_) => "elsewhere",
            LimitBy::Source => "source",
            LimitBy::AlreadyLow => "already low",
            LimitBy::Unserved => "unserved",
        }
    }
}

/// Whose elevation the residual pressure was judged at.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum JudgedAt {
    /// The hydrant's own.
    Hydrant,
    /// That of the main it taps.
    Main,
}

impl JudgedAt {
    /// The word that is written.
    pub fn word(self) -> &'static str {
        match self {
            JudgedAt::Hydrant => "hydrant",
            JudgedAt::Main => "main",
        }
    }
}

/// What was found at a hydrant.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct HydrantVerdict {
    /// `ok`, `short`, `not judged` (no needed flow), `unserved` or `untested` (also where a flow did not settle).
    pub flag: Flag,
    /// Pressure with no hydrant open, m.
    pub static_m: Option<f64>,
    /// Needed flow, m3/s.
    pub needed_m3_per_s: Option<f64>,
    /// Flow at its own residual limit, m3/s; `None` also where nothing limits it but a source of no stated greatest flow.
    pub available_m3_per_s: Option<f64>,
    /// Flow at which the first limit anywhere is met, m3/s; `None` unless the study asks for it.
    pub safe_m3_per_s: Option<f64>,
    /// Pressure while it gives the needed flow, m.
    pub at_need_m: Option<f64>,
    /// What limits it.
    pub limit_by: Option<LimitBy>,
    /// The user's feature at whose level a limit elsewhere is met, if one stands there.
    pub limit_at: Option<FeatureRef>,
    /// A doubtful connection of the map that likely explains a shortfall: what to look at, what else takes part, and the
    /// head it holds back, m.
    pub suspect: Option<([FeatureRef; 2], f64)>,
    /// Where it was judged.
    pub judged_at: Option<JudgedAt>,
    /// Whether one of its flows did not settle: nothing is said of it then.
    pub unsolved: bool,
}

impl HydrantVerdict {
    /// The flow that is held against the needed one, m3/s.
    pub fn counted_m3_per_s(&self) -> Option<f64> {
        match (self.available_m3_per_s, self.safe_m3_per_s) {
            (Some(available), Some(safe)) => Some(available.min(safe)),
            (available, safe) => safe.or(available),
        }
    }

    /// How much of the needed flow is missing, m3/s.
    pub fn short_m3_per_s(&self) -> Option<f64> {
        Some((self.needed_m3_per_s? - self.counted_m3_per_s()?).max(0.0))
    }
}

/// Fire flow, or why it was not run.
#[derive(Clone, Debug, PartialEq)]
pub enum FireRun {
    /// Not run, and why.
    NotRun(String),
    /// One verdict a hydrant.
    Run(Vec<HydrantVerdict>),
}

impl Default for FireRun {
    fn default() -> Self {
        FireRun::NotRun("it was not asked for".into())
    }
}

impl FireRun {
    /// The verdicts, if it was run.
    pub fn verdicts(&self) -> Option<&[HydrantVerdict]> {
        match self {
            FireRun::Run(verdicts) => Some(verdicts),
            FireRun::NotRun(_) => None,
        }
    }
}

pub(super) fn check(
    subject: &Subject<'_>,
    coverage: &Coverage,
    solver: &Solver,
    fire: Option<&Fire>,
    findings: &mut Vec<Finding>,
    watch: &dyn Watch,
) -> Result<FireRun, Error> {
    let Some((fire, solved, base)) = what_to_run(subject, fire) else {
        let why = why_not(subject, fire);
        if !subject.assets.hydrants.is_empty() {
            findings.push(Finding::new(
                Code::FireNotRun,
                format!("fire flow was not run: {why}").into(),
            ));
        }
        return Ok(FireRun::NotRun(why));
    };
    findings.extend(not_a_peak(subject, solved));
    let places = KeptPlaces::new(subject, fire, base);
    findings.extend(places.already_low(subject, fire, base));
    let run = Run {
        subject,
        solver,
        fire,
        base,
        condition: Condition {
            demand_m3_per_s: solved.demand_m3_per_s.clone(),
            source_head_m: subject.network.condition(&solved.case).source_head_m,
        },
        places,
        suspects: suspects(subject),
    };
    let total = subject.assets.hydrants.len() as u64;
    let done = AtomicU64::new(0);
    let verdicts: Result<Vec<HydrantVerdict>, Error> = (0..subject.assets.hydrants.len())
        .into_par_iter()
        .map(|hydrant| {
            step(watch, "fire flow", done.fetch_add(1, Ordering::Relaxed), total)?;
            Ok(run.judge(hydrant, coverage))
        })
        .collect();
    let verdicts = verdicts?;
    findings.extend(
        (0..verdicts.len())
            .filter(|at| verdicts[*at].unsolved)
            .map(|at| run.unsolved_finding(at)),
    );
    findings.extend(
        verdicts
            .iter()
            .enumerate()
            .filter_map(|(at, verdict)| run.short_finding(at, verdict)),
    );
    Ok(FireRun::Run(verdicts))
}

/// The fire case with its solution, if there is something to run.
fn what_to_run<'a>(subject: &Subject<'a>, fire: Option<&'a Fire>) -> Option<(&'a Fire, &'a Solved, &'a State)> {
    let fire = fire?;
    let solved = subject.cases.get(fire.case)?;
    let needed = fire.needed_m3_per_s.is_some()
        || subject
            .assets
            .hydrants
            .iter()
            .any(|hydrant| hydrant.needed_m3_per_s.is_some());
    Some((fire, solved, solved.outcome.as_ref().ok()?)).filter(|_| needed && !subject.assets.hydrants.is_empty())
}

fn why_not(subject: &Subject<'_>, fire: Option<&Fire>) -> String {
    match fire {
        _ if subject.assets.hydrants.is_empty() => "there are no hydrants".into(),
        None => "the study names no fire case".into(),
        Some(fire) => match subject.cases.get(fire.case) {
            Some(solved) if solved.outcome.is_err() => format!("its case `{}` has no solution", solved.case.name),
            _ => "there is no needed flow, neither in the study nor in a column of the hydrants".into(),
        },
    }
}

fn not_a_peak(subject: &Subject<'_>, solved: &Solved) -> Option<Finding> {
    let average: f64 = subject.network.draws.iter().map(|draw| draw.demand_m3_per_s).sum();
    let drawn: f64 = solved.demand_m3_per_s.iter().sum();
    // Where nobody draws at all, that is said elsewhere.
    (average > 0.0 && drawn <= average * (1.0 + 1e-9)).then(|| {
        let message = Sentence::new()
            .text(format!("the fire case `{}` draws ", solved.case.name))
            .number(drawn, Quantity::Flow)
            .text(", no more than the average day's ")
            .number(average, Quantity::Flow);
        Finding::new(Code::FireCaseNotPeak, message).measured(drawn, Quantity::Flow)
    })
}

/// What every hydrant of a run shares.
struct Run<'a> {
    subject: &'a Subject<'a>,
    solver: &'a Solver,
    fire: &'a Fire,
    base: &'a State,
    condition: Condition,
    places: KeptPlaces,
    suspects: Vec<Suspect>,
}

impl Run<'_> {
    fn judge(&self, hydrant: usize, coverage: &Coverage) -> HydrantVerdict {
        let asset = &self.subject.assets.hydrants[hydrant];
        let needed = asset
            .needed_m3_per_s
            .map(|needed| needed.value)
            .or(self.fire.needed_m3_per_s);
        let blank = HydrantVerdict {
            needed_m3_per_s: needed,
            ..HydrantVerdict::default()
        };
        let unserved = HydrantVerdict {
            flag: Flag::Unserved,
            limit_by: Some(LimitBy::Unserved),
            ..blank.clone()
        };
        let Some(tap) = self.subject.map.hydrants[hydrant] else {
            return unserved;
        };
        let node = tap.node as usize;
        if !self.subject.network.served[node] {
            return unserved;
        }
        let at_main = self.subject.network.elevation_m[node].map(|elevation| (elevation.value, JudgedAt::Main));
        let judged = asset
            .elevation_m
            .map(|elevation_m| (elevation_m, JudgedAt::Hydrant))
            .or(at_main);
        let Some((ground_m, judged_at)) = judged else {
            return blank;
        };
        let mut verdict = HydrantVerdict {
            static_m: Some(self.base.head_m[node] - ground_m),
            judged_at: Some(judged_at),
            ..blank
        };
        let own = Kept {
            node: NodeIx(tap.node),
            head_m: ground_m + self.fire.residual_m.value,
        };
        let solved = self.flows(own, &mut verdict).is_ok() && self.at_need(node, ground_m, &mut verdict).is_ok();
        verdict.unsolved = !solved;
        // The hydrant's own elevation is enough where its main has none.
        let why = coverage.reason[node].filter(|why| *why != Untested::NoElevation || asset.elevation_m.is_none());
        let untested = why.is_some();
        verdict.flag = match (verdict.short_m3_per_s(), verdict.limit_by) {
            _ if !solved => Flag::Untested,
            (Some(short), _) if short > 0.0 => Flag::Short,
            // What a short hydrant lacks it lacks even if nobody draws; that it has enough is not shown by that.
            _ if untested => Flag::Untested,
            (Some(_), _) => Flag::Ok,
            (None, Some(LimitBy::Source)) if needed.is_some() => Flag::Ok,
            (None, _) => Flag::NotJudged,
        };
        verdict
    }

    /// The available flow, and the safe one if it is asked for.
    fn flows(&self, own: Kept, verdict: &mut HydrantVerdict) -> Result<(), NotSettled> {
        let solve = |kept: &[Kept]| self.solver.flow_at_held_head(&self.condition, self.base, own, kept);
        let finite = |flow: f64| Some(flow).filter(|flow| flow.is_finite());
        let alone = solve(&[])?;
        self.suspect(own.node, alone.state.as_ref(), verdict);
        let alone_flow = alone.flow_m3_per_s;
        verdict.available_m3_per_s = finite(alone_flow);
        verdict.limit_by = Some(limit_by(own.node, &alone.limit));
        if self.fire.keep_elsewhere_m.is_none() {
            return Ok(());
        }
        // Where the flow at the own limit breaks nothing elsewhere it is the safe flow too: no second solve.
        let breaks_nothing = |state: &State| {
            self.places
                .kept
                .iter()
                .all(|kept| state.head_m[kept.node.at()] >= kept.head_m)
        };
        let first = match alone.state.as_ref().is_none_or(breaks_nothing) {
            true => alone,
            false => solve(&self.places.kept)?,
        };
        let first_state = first.state;
        verdict.safe_m3_per_s = finite(first.flow_m3_per_s);
        verdict.limit_by = Some(match limit_by(own.node, &first.limit) {
            // Its own node, but at a level of a customer who draws there, above the hydrant's own.
            LimitBy::OwnPressure if first.flow_m3_per_s < alone_flow * SAME => LimitBy::Elsewhere(own.node),
            limit => limit,
        });
        if let Some(LimitBy::Elsewhere(node)) = verdict.limit_by {
            verdict.limit_at = self.places.whose(self.subject, node);
            self.suspect(node, first_state.as_ref(), verdict);
        }
        Ok(())
    }

    /// Notes the doubtful connection that most likely explains a low head at a node.
    fn suspect(&self, node: NodeIx, state: Option<&State>, verdict: &mut HydrantVerdict) {
        let found = state.and_then(|state| behind(&self.suspects, state, node.at()));
        verdict.suspect = found.map(|(suspect, step_m)| (suspect.features, step_m));
    }

    /// The pressure while it gives the needed flow.
    fn at_need(&self, node: usize, ground_m: f64, verdict: &mut HydrantVerdict) -> Result<(), NotSettled> {
        let Some(needed) = verdict.needed_m3_per_s else {
            return Ok(());
        };
        let mut condition = self.condition.clone();
        condition.demand_m3_per_s[node] += needed;
        let state = self.solver.solve(&condition, Some(self.base))?;
        verdict.at_need_m = Some(state.head_m[node] - ground_m);
        Ok(())
    }

    fn unsolved_finding(&self, hydrant: usize) -> Finding {
        let asset = &self.subject.assets.hydrants[hydrant];
        let message = Sentence::new()
            .feature(asset.origin)
            .text(" has no fire flow: its solution did not settle");
        let mut finding = Finding::new(Code::CaseNotProved, message).on(asset.origin);
        finding.at = asset.at;
        finding
    }

    fn short_finding(&self, hydrant: usize, verdict: &HydrantVerdict) -> Option<Finding> {
        let (short, given) = (
            verdict.short_m3_per_s().filter(|_| verdict.flag == Flag::Short)?,
            verdict.counted_m3_per_s()?,
        );
        let asset = &self.subject.assets.hydrants[hydrant];
        let mut message = Sentence::new()
            .feature(asset.origin)
            .text(" can give ")
            .number(given, Quantity::Flow);
        message = message.text(" of the needed ").number(given + short, Quantity::Flow);
        message = match (verdict.limit_by, verdict.limit_at) {
            (Some(LimitBy::Elsewhere(_)), Some(other)) => {
                message.text("; pressure at ").feature(other).text(" is the limit")
            }
            (Some(LimitBy::Elsewhere(node)), None) => {
                message.text(format!("; pressure at node {} is the limit", node.0 + 1))
            }
            (Some(LimitBy::AlreadyLow), _) => message.text("; it is below the residual limit with no hydrant open"),
            (Some(LimitBy::Source), _) => message.text("; the source gives no more"),
            _ => message.text("; its own pressure is the limit"),
        };
        if let Some((features, step_m)) = verdict.suspect {
            let known = self.suspects.iter().find(|suspect| suspect.features == features);
            message = known.map_or(message.clone(), |suspect| suspect.named(message, step_m));
        }
        let limit_from = if asset.needed_m3_per_s.is_some() {
            "map"
        } else {
            "study"
        };
        let mut finding = Finding::new(Code::FireFlowShort, message)
            .on(asset.origin)
            .measured(given, Quantity::Flow)
            .limit(given + short, limit_from);
        finding.at = asset.at;
        finding.others = verdict
            .limit_at
            .into_iter()
            .chain(verdict.suspect.into_iter().flat_map(|found| found.0))
            .collect();
        Some(finding)
    }
}

fn limit_by(own: NodeIx, limit: &hydraulics::Limit) -> LimitBy {
    match limit {
        hydraulics::Limit::Head(node) if *node == own => LimitBy::OwnPressure,
        hydraulics::Limit::Head(node) => LimitBy::Elsewhere(*node),
        hydraulics::Limit::AlreadyLow(_) => LimitBy::AlreadyLow,
        hydraulics::Limit::Source(_) | hydraulics::Limit::Nothing => LimitBy::Source,
    }
}
