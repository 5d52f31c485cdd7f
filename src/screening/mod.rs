//! Screening: results held against limits, every hydrant judged, all findings graded. One check a file.
//!
//! A place that could not be calculated is `untested`, never `ok`. Pressure is judged where customers draw or hydrants
//! stand; elsewhere it is `not judged`. Every flag stands beside its value, limit, margin, case and the limit's source.

mod areas;
mod coverage;
mod fire_flow;
mod gradient_high;
mod grading;
mod kept_places;
mod limits;
mod pressure_high;
mod pressure_low;
mod suspects;
mod undelivered;
mod velocity_high;

pub use coverage::{Coverage, Untested};
pub use fire_flow::{FireRun, HydrantVerdict, JudgedAt, LimitBy};
pub use grading::{grade, sort};
pub use limits::{Fire, Limit, Limits};

use crate::assets::Assets;
use crate::finding::{Error, Finding};
use crate::hydraulics::{NotSettled, Solver, State};
use crate::network::{Case, Network};
use crate::topology::PipeMap;
use crate::watch::Watch;

/// What a check says of a place. Written as a word.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord, Default)]
pub enum Flag {
    /// Within its limit.
    Ok,
    /// Below a lower limit.
    Low,
    /// Above an upper limit.
    High,
    /// Less fire flow than needed.
    Short,
    /// Hangs together with no source.
    Unserved,
    /// Could not be calculated.
    #[default]
    Untested,
    /// Calculated, but nobody draws there and no hydrant stands there; or there is nothing to judge it by.
    NotJudged,
}

impl Flag {
    /// The word that is written.
    pub fn word(self) -> &'static str {
        match self {
            Flag::Ok => "ok",
            Flag::Low => "low",
            Flag::High => "high",
            Flag::Short => "short",
            Flag::Unserved => "unserved",
            Flag::Untested => "untested",
            Flag::NotJudged => "not judged",
        }
    }
}

/// A case and what became of it.
#[derive(Clone, Debug)]
pub struct Solved {
    /// The case as it was asked.
    pub case: Case,
    /// What its results are held against.
    pub limits: Limits,
    /// The outflow at each node, m3/s.
    pub demand_m3_per_s: Vec<f64>,
    /// Its solution, or why there is none.
    pub outcome: Result<State, NotSettled>,
}

/// What is screened.
#[derive(Clone, Copy)]
pub struct Subject<'a> {
    /// What the map says.
    pub assets: &'a Assets,
    /// Which mains connect.
    pub map: &'a PipeMap,
    /// The network that was solved.
    pub network: &'a Network,
    /// Every case of the study, in its order.
    pub cases: &'a [Solved],
    /// The network when nobody draws, with the limits of the study.
    pub at_rest: &'a Solved,
}

impl<'a> Subject<'a> {
    /// Cases that have a solution, with their index.
    pub fn proved(&self) -> impl Iterator<Item = (usize, &'a Solved, &'a State)> {
        let cases: &'a [Solved] = self.cases;
        cases
            .iter()
            .enumerate()
            .filter_map(|(at, solved)| Some((at, solved, solved.outcome.as_ref().ok()?)))
    }

    /// Pressure at a node in a state, m; `None` where the node is not served or has no elevation.
    pub fn pressure_m(&self, state: &State, node: usize) -> Option<f64> {
        let elevation_m = self.network.elevation_m[node]?.value;
        Some(state.head_m[node] - elevation_m).filter(|pressure_m| pressure_m.is_finite())
    }
}

/// A value that was held against a limit in the case where it came off worst.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct Verdict {
    /// What the check says.
    pub flag: Flag,
    /// The value, SI; `None` where nothing was calculated.
    pub value: Option<f64>,
    /// The limit, SI; `None` where it was not judged.
    pub limit: Option<f64>,
    /// Whether the limit is a default of this program and not the user's.
    pub on_default: bool,
    /// Index of the case (the number of cases for the network at rest).
    pub case: Option<usize>,
}

impl Verdict {
    /// A value that must not fall below its limit.
    fn at_least(value: f64, limit: &Limit, case: usize) -> Verdict {
        Verdict::held(
            value,
            limit,
            case,
            if value < limit.value { Flag::Low } else { Flag::Ok },
        )
    }

    /// A value that must not rise above its limit.
    fn at_most(value: f64, limit: &Limit, case: usize) -> Verdict {
        Verdict::held(
            value,
            limit,
            case,
            if value > limit.value { Flag::High } else { Flag::Ok },
        )
    }

    fn held(value: f64, limit: &Limit, case: usize, flag: Flag) -> Verdict {
        Verdict {
            flag,
            value: Some(value),
            limit: Some(limit.value),
            on_default: limit.is_default,
            case: Some(case),
        }
    }

    /// How far the value lies on the right side of a lower limit, SI: positive passes.
    pub fn margin_above(&self) -> Option<f64> {
        Some(self.value? - self.limit?)
    }

    /// Takes the other verdict where its margin above a lower limit is smaller: limits differ from case to case, so the
    /// lowest value need not be the worst.
    fn worsen_below(&mut self, other: Verdict) {
        if self
            .margin_above()
            .is_none_or(|margin| other.margin_above() < Some(margin))
        {
            *self = other;
        }
    }

    /// Takes the other verdict where it is the larger share of its upper limit.
    fn worsen_above(&mut self, other: Verdict) {
        let share = |verdict: &Verdict| Some(verdict.value? / verdict.limit?);
        if share(self).is_none_or(|known| share(&other) > Some(known)) {
            *self = other;
        }
    }

    /// What was not tested is never `ok`, and what nobody draws at is not judged. A limit that is broken stays broken.
    fn settle(&mut self, untested: bool, judged: bool) {
        match (self.flag, self.value) {
            (_, None) => *self = Verdict::default(),
            (Flag::Ok, _) if untested => self.flag = Flag::Untested,
            (Flag::Ok | Flag::Low, _) if !judged => self.flag = Flag::NotJudged,
            _ => {}
        }
        if !matches!(self.flag, Flag::Ok | Flag::Low | Flag::High) {
            self.limit = None;
        }
    }

    /// Whether it says that a limit is kept or broken.
    pub fn is_judged(&self) -> bool {
        matches!(self.flag, Flag::Ok | Flag::Low | Flag::High)
    }
}

/// What was found at a node.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct NodeVerdict {
    /// Pressure in the case where it lies worst against its limit.
    pub low: Verdict,
    /// Lowest pressure in any case, m.
    pub lowest_m: Option<f64>,
    /// Head in the case of the lowest pressure, m.
    pub head_m: Option<f64>,
    /// Pressure when nobody draws.
    pub high: Verdict,
}

/// What was found along a part.
#[derive(Clone, Debug, PartialEq, Default)]
pub struct PartVerdict {
    /// Velocity, m/s, in the case where it lies worst against its limit.
    pub velocity: Verdict,
    /// Flow in that case, m3/s, positive in the drawn direction.
    pub flow_m3_per_s: Option<f64>,
    /// Hydraulic gradient, m/m, in the case where it lies worst against its limit.
    pub gradient: Verdict,
}

/// Everything screening has to say.
#[derive(Clone, Debug, Default)]
pub struct Screened {
    /// One a node.
    pub nodes: Vec<NodeVerdict>,
    /// One a part.
    pub parts: Vec<PartVerdict>,
    /// Pressure at each customer's highest tap, one a customer.
    pub customers: Vec<Verdict>,
    /// Fire flow, one verdict a hydrant; or why it was not run.
    pub fire: FireRun,
    /// How much of the map was tested.
    pub coverage: Coverage,
    /// What was noticed, not graded yet.
    pub findings: Vec<Finding>,
}

/// Runs every check.
///
/// # Errors
/// [`Error::Cancelled`] alone.
pub fn screen(
    subject: &Subject<'_>,
    solver: &Solver,
    fire: Option<&Fire>,
    watch: &dyn Watch,
) -> Result<Screened, Error> {
    let mut screened = Screened {
        nodes: vec![NodeVerdict::default(); subject.map.nodes.len()],
        parts: vec![PartVerdict::default(); subject.map.parts.len()],
        coverage: coverage::coverage(subject),
        ..Screened::default()
    };
    let findings = &mut screened.findings;
    findings.extend(coverage::not_proved(subject));
    findings.extend(coverage::untested_pieces(subject, &screened.coverage));
    let undelivered = undelivered::find(subject, solver);
    let (nodes, customers) = (&mut screened.nodes, &mut screened.customers);
    findings.extend(pressure_low::check(
        subject,
        &screened.coverage,
        &undelivered,
        nodes,
        customers,
    ));
    findings.extend(pressure_high::check(subject, &screened.coverage, &mut screened.nodes));
    findings.extend(velocity_high::check(subject, &screened.coverage, &mut screened.parts));
    findings.extend(gradient_high::check(subject, &screened.coverage, &mut screened.parts));
    screened.fire = fire_flow::check(subject, &screened.coverage, solver, fire, findings, watch)?;
    Ok(screened)
}
