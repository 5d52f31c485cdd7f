//! A small drawing board for tests.

use std::collections::BTreeSet;

use crate::assets::{
    Assets, Basis, Customer, Drawing, Friction, Hydrant, Main, MainKind, NamedMain, NodeKind, NodePoint, Point, Reach,
    Valued, Valve, ValveKind,
};
use crate::finding::{Checked, Code, FeatureRef, Finding, Severity};
use crate::topology::{JoinKind, JoinSettings, PipeMap, infer};

pub const MAINS: u16 = 0;
pub const HYDRANTS: u16 = 1;
pub const CUSTOMERS: u16 = 2;
pub const VALVES: u16 = 3;
pub const NODES: u16 = 4;

/// Assets under construction.
#[derive(Clone)]
pub struct Board {
    pub assets: Assets,
    pub settings: JoinSettings,
}

fn map<T>(value: T) -> Valued<T> {
    Valued {
        value,
        basis: Basis::Map,
    }
}

impl Board {
    /// An empty board with this tolerance, m.
    pub fn new(tolerance_m: f64) -> Self {
        Board {
            assets: Assets {
                mains: Vec::new(),
                left_out: Vec::new(),
                nodes: Vec::new(),
                hydrants: Vec::new(),
                customers: Vec::new(),
                valves: Vec::new(),
                zones: vec!["High".into(), "Low".into()],
                classes: Vec::new(),
                reach: Reach {
                    hydrants_m: 3.0,
                    customers_m: 40.0,
                    valves_m: 2.0,
                },
            },
            settings: JoinSettings {
                tolerance_m,
                ..JoinSettings::default()
            },
        }
    }

    pub fn drawing(&mut self, drawing: Drawing) -> u32 {
        let row = self.assets.mains.len() as u32;
        self.assets.mains.push(Main {
            origin: FeatureRef { layer: MAINS, row },
            drawing,
            length_scale: 1.0,
            stored_length_m: None,
            diameter_m: Some(map(0.15)),
            friction: map(Friction::CFactor(130.0)),
            minor_loss_k: 0.0,
            year: Some(1980),
            zone: None,
            kind: MainKind::Unknown,
        });
        row
    }

    pub fn main(&mut self, vertices: &[Point]) -> u32 {
        self.drawing(Drawing::Lines(vec![vertices.to_vec()]))
    }

    pub fn parts(&mut self, parts: &[&[Point]]) -> u32 {
        self.drawing(Drawing::Lines(parts.iter().map(|part| part.to_vec()).collect()))
    }

    pub fn edit(&mut self, main: u32) -> &mut Main {
        &mut self.assets.mains[main as usize]
    }

    pub fn in_zone(&mut self, main: u32, zone: u32) -> u32 {
        self.edit(main).zone = Some(zone);
        main
    }

    pub fn of_diameter(&mut self, main: u32, diameter_m: f64) -> u32 {
        self.edit(main).diameter_m = Some(map(diameter_m));
        main
    }

    pub fn of_kind(&mut self, main: u32, kind: MainKind) -> u32 {
        self.edit(main).kind = kind;
        main
    }

    pub fn node(&mut self, at: Point) -> u32 {
        let row = self.assets.nodes.len() as u32;
        self.assets.nodes.push(NodePoint {
            origin: Some(FeatureRef { layer: NODES, row }),
            at: Some(at),
            kind: NodeKind::Node,
            elevation_m: Some(map(50.0)),
            head_m: None,
            demand_m3_per_s: 0.0,
            greatest_m3_per_s: None,
            zone: None,
        });
        row
    }

    pub fn source(&mut self, at: Point) -> u32 {
        let node = self.node(at);
        self.assets.nodes[node as usize].head_m = Some(map(100.0));
        self.assets.nodes[node as usize].kind = NodeKind::Source;
        node
    }

    pub fn hydrant(&mut self, at: Point) -> u32 {
        let row = self.assets.hydrants.len() as u32;
        self.assets.hydrants.push(Hydrant {
            origin: FeatureRef { layer: HYDRANTS, row },
            at: Some(at),
            elevation_m: None,
            needed_m3_per_s: None,
            zone: None,
        });
        row
    }

    pub fn customer(&mut self, at: Point) -> u32 {
        let row = self.assets.customers.len() as u32;
        self.assets.customers.push(Customer {
            origin: FeatureRef { layer: CUSTOMERS, row },
            at: Some(at),
            demand_m3_per_s: 0.0001,
            class: None,
            elevation_m: None,
            lift_m: 0.0,
            zone: None,
        });
        row
    }

    pub fn valve(&mut self, at: Point, kind: ValveKind, closed: bool) -> u32 {
        let row = self.assets.valves.len() as u32;
        self.assets.valves.push(Valve {
            origin: FeatureRef { layer: VALVES, row },
            at: Some(at),
            kind,
            closed: map(closed),
            main: None,
        });
        row
    }

    pub fn closed_valve(&mut self, at: Point) -> u32 {
        self.valve(at, ValveKind::Gate, true)
    }

    pub fn names(&mut self, valve: u32, main: NamedMain) {
        self.assets.valves[valve as usize].main = Some(main);
    }

    pub fn infer(&self) -> Seen {
        Seen(infer(&self.assets, &self.settings))
    }
}

/// What was inferred, with questions tests ask of it.
pub struct Seen(pub Checked<PipeMap>);

impl Seen {
    pub fn map(&self) -> &PipeMap {
        &self.0.value
    }

    pub fn findings(&self) -> &[Finding] {
        &self.0.findings
    }

    /// Codes of all findings, sorted.
    pub fn codes(&self) -> Vec<&'static str> {
        let mut codes: Vec<_> = self.findings().iter().map(|f| f.code.text().name).collect();
        codes.sort_unstable();
        codes
    }

    /// Codes of warnings and worse, sorted.
    pub fn warnings(&self) -> Vec<&'static str> {
        let bad = self.findings().iter().filter(|f| f.severity > Severity::Note);
        let mut codes: Vec<_> = bad.map(|f| f.code.text().name).collect();
        codes.sort_unstable();
        codes
    }

    /// Whether a finding of the code names the main.
    pub fn names_main(&self, code: Code, main: u32) -> bool {
        self.names(
            code,
            FeatureRef {
                layer: MAINS,
                row: main,
            },
        )
    }

    pub fn names(&self, code: Code, feature: FeatureRef) -> bool {
        self.findings()
            .iter()
            .any(|f| f.code == code && (f.feature == Some(feature) || f.others.contains(&feature)))
    }

    pub fn finding(&self, code: Code) -> &Finding {
        let mut of_code = self.findings().iter().filter(|f| f.code == code);
        let found = of_code
            .next()
            .unwrap_or_else(|| panic!("no {code:?} among {:?}", self.codes()));
        assert!(of_code.next().is_none(), "several {code:?}");
        found
    }

    /// Pairs of different mains that share a node.
    pub fn pairs(&self) -> BTreeSet<(u32, u32)> {
        pairs(self.map())
    }

    pub fn joined(&self, a: u32, b: u32) -> bool {
        self.pairs().contains(&(a.min(b), a.max(b)))
    }

    pub fn pieces(&self) -> usize {
        self.map().piece_length_m.len()
    }

    /// How many parts a main was cut into.
    pub fn parts_of(&self, main: u32) -> usize {
        self.map().parts.iter().filter(|part| part.main == main).count()
    }

    /// Kinds of the joins made between two mains.
    pub fn kinds(&self, a: u32, b: u32) -> Vec<JoinKind> {
        let of_pair = |j: &&crate::topology::Join| (j.main_a, j.main_b) == (a, b) || (j.main_a, j.main_b) == (b, a);
        self.map().joins.iter().filter(of_pair).map(|j| j.kind).collect()
    }
}

/// Pairs of different mains that share a node.
pub fn pairs(map: &PipeMap) -> BTreeSet<(u32, u32)> {
    let mut mains_of: Vec<Vec<u32>> = vec![Vec::new(); map.nodes.len()];
    for part in &map.parts {
        for node in [part.from, part.to] {
            mains_of[node as usize].push(part.main);
        }
    }
    let mut pairs = BTreeSet::new();
    for mains in &mains_of {
        for &a in mains {
            pairs.extend(mains.iter().filter(|&&b| a < b).map(|&b| (a, b)));
        }
    }
    pairs
}
