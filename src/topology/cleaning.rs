//! The cleaning of the drawing, as a list of named steps that can be read as the story. One step a file.

use std::collections::HashSet;

use rstar::RTree;

use super::lines::{Hit, Lines, Stretch};
use super::marks::Marks;
use super::web::{Place, Web};
use super::{
    CleanLine, JoinSettings, PipeMap, StepCount, crossings, customers, cutting, duplicates, exact_ends, hydrants,
    invariants, joined, multipart, near_joins, near_misses, node_points, overshoots, pieces, self_loops, short_mains,
    tolerance, touching, undrawn, valves, zones,
};
use crate::assets::Assets;
use crate::finding::{Checked, FeatureRef, Finding};

/// A cleaning step: what it is called, and what it does. It returns how many mains, ends or joins it dealt with.
pub(super) struct Step {
    /// What it is called in the summary.
    pub name: &'static str,
    /// What it does.
    run: fn(&mut Work) -> u32,
}

/// The story. Each step rests on those above it.
pub(super) const STEPS: &[Step] = &[
    // From rows to lines.
    step("rows without a usable line set aside", undrawn::set_aside),
    step("mains of several parts put together", multipart::put_together),
    step("duplicates left out", duplicates::leave_out),
    // From lines to nodes.
    step("ends on the same spot joined", exact_ends::gather),
    step("ends that touch joined", touching::join),
    step("other tolerances compared", tolerance::compare),
    step("overshoots trimmed", overshoots::trim),
    step("ends within the tolerance joined", near_joins::join),
    step("contacts of two pressure zones kept apart", zones::report),
    // What is said and not joined.
    step("bare crossings found", crossings::find),
    step("near misses found", near_misses::find),
    step("mains that end where they start found", self_loops::find),
    step("mains in parts that do not touch found", multipart::find_apart),
    step("mains shorter than the tolerance kept", short_mains::find),
    // From nodes to parts.
    step("nodes numbered", cutting::number_nodes),
    step("closed valves cut in", valves::cut_in),
    step("node points placed", node_points::place),
    step("hydrants tapped in", hydrants::tap_in),
    step("parts cut", cutting::cut),
    step("customers assigned", customers::assign),
    step("pieces without a source found", pieces::find),
];

const fn step(name: &'static str, run: fn(&mut Work) -> u32) -> Step {
    Step { name, run }
}

/// What the steps work on.
pub(super) struct Work<'a> {
    /// What was read.
    pub assets: &'a Assets,
    /// The thresholds.
    pub settings: &'a JoinSettings,
    /// What was noticed.
    pub findings: Vec<Finding>,
    /// Lines while rows are still being put together and left out.
    pub drawn: Vec<CleanLine>,
    /// The mains of several parts.
    pub multiparts: Vec<multipart::Multipart>,
    /// Those whose parts do not all touch.
    pub apart: HashSet<u32>,
    /// The lines once they no longer change.
    pub lines: Lines,
    /// Their segments, by place.
    pub index: RTree<Stretch>,
    /// The point features, by place.
    pub marks: Marks,
    /// What hangs together.
    pub web: Web,
    /// The lines near each spot, one hit a line.
    pub hits: Hits,
    /// Contacts of two pressure zones.
    pub contacts: zones::Contacts,
    /// Nodes and cuts, as they are made.
    pub cuts: cutting::Cuts,
    /// Mains that a near miss names, and the finding.
    pub missed: Vec<near_misses::Missed>,
    /// What is handed over.
    pub map: PipeMap,
}

/// The lines near each spot.
#[derive(Debug, Default)]
pub(super) struct Hits {
    pub first: Vec<u32>,
    pub all: Vec<Hit>,
}

impl Hits {
    /// The lines near a spot, nearest first. A spot made later has none.
    pub(super) fn of(&self, spot: u32) -> &[Hit] {
        match self.first.get(spot as usize..spot as usize + 2) {
            Some(range) => &self.all[range[0] as usize..range[1] as usize],
            None => &[],
        }
    }
}

/// Runs every step.
pub(super) fn clean(assets: &Assets, settings: &JoinSettings) -> Checked<PipeMap> {
    let mut work = Work {
        assets,
        settings,
        findings: Vec::new(),
        drawn: Vec::new(),
        multiparts: Vec::new(),
        apart: HashSet::new(),
        lines: Lines::default(),
        index: RTree::new(),
        marks: Marks::new(assets),
        web: Web::new(Vec::new(), Vec::new(), Vec::new()),
        hits: Hits::default(),
        contacts: zones::Contacts::default(),
        cuts: cutting::Cuts::default(),
        missed: Vec::new(),
        map: PipeMap::default(),
    };
    for step in STEPS {
        let count = (step.run)(&mut work);
        work.map.steps.push(StepCount { step: step.name, count });
        if cfg!(debug_assertions) {
            invariants::check(&work, step.name);
        }
    }
    let joins = joined::list(&work.web, &work.lines, &work.marks, settings.touch_m);
    work.map.joins.extend(joins);
    work.map.lines = std::mem::take(&mut work.lines.list);
    Checked {
        value: work.map,
        findings: work.findings,
    }
}

impl Work<'_> {
    /// The user's feature of a main.
    pub(super) fn feature(&self, main: u32) -> FeatureRef {
        self.assets.mains[main as usize].origin
    }

    /// The user's feature of a line.
    pub(super) fn feature_of_line(&self, line: u32) -> FeatureRef {
        self.feature(self.lines.main(line))
    }

    /// The mains at a spot, those of `but` left out, in an order that does not depend on rows.
    pub(super) fn mains_at(&self, spot: u32, but: u32) -> Vec<u32> {
        let mut lines = self.web.lines_at(spot);
        lines.sort_by_key(|&line| self.lines.rank(line));
        let mut mains: Vec<u32> = Vec::new();
        for line in lines {
            let main = self.lines.main(line);
            if main != but && !mains.contains(&main) {
                mains.push(main);
            }
        }
        mains
    }

    /// The way along the network between two places, if it is no longer than `limit_m`.
    pub(super) fn way_m(&self, from: Place, to: Place, limit_m: f64) -> Option<f64> {
        self.web.way_m(&self.lines, from, to, limit_m)
    }
}
