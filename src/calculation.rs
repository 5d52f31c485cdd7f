//! The whole job without files: assets in, calculation out. Join, assemble, solve, screen.

use crate::assets::Assets;
use crate::finding::{Error, Finding};
use crate::hydraulics::{self, Solver, State};
use crate::network::{self, AssemblySettings, Case, Condition, Network};
use crate::screening::{self, Fire, Limits, Screened, Solved, Subject};
use crate::topology::{self, JoinSettings, PipeMap};
use crate::watch::{Watch, step};

/// What the calculation is asked: the settings of each stage.
#[derive(Clone, Debug)]
pub struct Settings {
    /// How mains are joined.
    pub joining: JoinSettings,
    /// How values are filled in.
    pub assembly: AssemblySettings,
    /// Constants and tolerances of the hydraulics.
    pub hydraulics: hydraulics::Settings,
    /// The demand conditions in the study's order, each with what its results are held against; at least one.
    pub cases: Vec<(Case, Limits)>,
    /// Fire flow, if asked for.
    pub fire: Option<Fire>,
    /// What the network at rest is held against.
    pub limits: Limits,
}

/// Everything that was worked out.
#[derive(Clone, Debug)]
pub struct Calculation {
    /// Which mains connect.
    pub map: PipeMap,
    /// The network that was solved.
    pub network: Network,
    /// Every case of the study, in its order.
    pub cases: Vec<Solved>,
    /// The network when nobody draws.
    pub at_rest: Solved,
    /// What was asked about fire flow.
    pub fire: Option<Fire>,
    /// The constants and tolerances it was solved with.
    pub solved_with: hydraulics::Settings,
    /// Verdicts and fire flows.
    pub screened: Screened,
    /// Every finding, graded, the most serious first.
    pub findings: Vec<Finding>,
}

/// Topology and findings alone: nothing needs demands, sources or elevations.
///
/// # Errors
/// [`Error::Cancelled`] alone.
pub fn map_only(assets: &Assets, joining: &JoinSettings, watch: &dyn Watch) -> Result<(PipeMap, Vec<Finding>), Error> {
    step(watch, "joining mains", 0, 0)?;
    let mut findings = Vec::new();
    let map = topology::infer(assets, joining).into_value(&mut findings);
    screening::sort(&mut findings);
    Ok((map, findings))
}

/// The whole job. `noticed` are the findings of reading: they are graded with the rest, by what each fault does to the
/// answer.
///
/// # Errors
/// [`Error::Cancelled`] alone: bad data is a finding, and a case that does not settle is a result.
pub fn calculate(
    assets: &Assets,
    settings: &Settings,
    noticed: Vec<Finding>,
    watch: &dyn Watch,
) -> Result<Calculation, Error> {
    let mut findings = noticed;
    step(watch, "joining mains", 0, 0)?;
    let map = topology::infer(assets, &settings.joining).into_value(&mut findings);
    step(watch, "assembling the network", 0, 0)?;
    let network = network::assemble(assets, &map, &settings.assembly).into_value(&mut findings);
    let solver = Solver::new(&network, settings.hydraulics.clone());
    let (cases, at_rest) = solve_cases(&network, &solver, settings, watch)?;
    step(watch, "screening", 0, 0)?;
    let subject = Subject {
        assets,
        map: &map,
        network: &network,
        cases: &cases,
        at_rest: &at_rest,
    };
    let mut screened = screening::screen(&subject, &solver, settings.fire.as_ref(), watch)?;
    findings.append(&mut screened.findings);
    screening::grade(&subject, &screened, &mut findings);
    Ok(Calculation {
        map,
        network,
        cases,
        at_rest,
        fire: settings.fire.clone(),
        solved_with: settings.hydraulics.clone(),
        screened,
        findings,
    })
}

impl Calculation {
    /// Whether every case, the network at rest and every fire flow settled.
    pub fn is_proved(&self) -> bool {
        let mut solved = self.cases.iter().chain([&self.at_rest]);
        let mut hydrants = self.screened.fire.verdicts().into_iter().flatten();
        solved.all(|solved| solved.outcome.is_ok()) && hydrants.all(|hydrant| !hydrant.unsolved)
    }
}

/// Solves every case, each from the one before, and the network at rest.
fn solve_cases(
    network: &Network,
    solver: &Solver,
    settings: &Settings,
    watch: &dyn Watch,
) -> Result<(Vec<Solved>, Solved), Error> {
    let total = settings.cases.len() as u64 + 1;
    let mut start: Option<State> = None;
    let mut solve = |case: Case, limits: &Limits, condition: Condition| {
        let outcome = solver.solve(&condition, start.as_ref());
        start = outcome.as_ref().ok().cloned().or(start.take());
        Solved {
            case,
            limits: limits.clone(),
            demand_m3_per_s: condition.demand_m3_per_s,
            outcome,
        }
    };
    let mut cases = Vec::with_capacity(settings.cases.len());
    for (done, (case, limits)) in settings.cases.iter().enumerate() {
        step(watch, "solving", done as u64, total)?;
        cases.push(solve(case.clone(), limits, network.condition(case)));
    }
    step(watch, "solving", total - 1, total)?;
    let at_rest = Case::at_rest(network, settings.cases.iter().map(|(case, _)| case));
    let condition = network.condition(&at_rest);
    let at_rest = solve(at_rest, &settings.limits, condition);
    Ok((cases, at_rest))
}
