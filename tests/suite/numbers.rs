//! Numbers against published truth: given, expected, tolerance and source stand as data in `tests/numbers/`.

use std::collections::{BTreeMap, HashMap};
use std::f64::consts::PI;
use std::path::Path;

use gradeline::hydraulics::{
    HazenWilliams, HeadLoss, Kept, Settings, Solver, State, colebrook_white, density_kg_per_m3, dynamic_viscosity_pa_s,
    friction_factor, viscosity_m2_per_s,
};
use gradeline::network::{Condition, Friction, NodeIx, Part};
use gradeline::units::{Quantity, Unit};
use serde::Deserialize;

use super::hydraulic::{network_of, part_of};

// ---- tables ----------------------------------------------------------------------------------------------------------

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Tables {
    table: Vec<Table>,
}

/// One formula at many arguments.
#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Table {
    of: String,
    #[serde(rename = "note")]
    _note: Option<String>,
    source: String,
    status: String,
    tolerance: Tolerance,
    hazen_williams: Option<[f64; 3]>,
    columns: Vec<String>,
    rows: Vec<Vec<toml::Value>>,
}

#[derive(Clone, Copy, Deserialize)]
#[serde(rename_all = "lowercase")]
enum Tolerance {
    Absolute(f64),
    Relative(f64),
}

/// The arguments of one row, by column.
struct Given<'a> {
    table: &'a Table,
    values: HashMap<&'a str, &'a toml::Value>,
}

impl Given<'_> {
    fn number(&self, column: &str) -> f64 {
        as_number(self.values[column])
    }

    fn unit(&self, column: &str, quantity: Quantity) -> Unit {
        let name = self.values[column].as_str().unwrap();
        Unit::parse(name, quantity).unwrap_or_else(|| panic!("no unit `{name}`"))
    }

    /// A number in a unit, in SI.
    fn si(&self, column: &str, unit: &str, quantity: Quantity) -> f64 {
        Unit::parse(unit, quantity).unwrap().to_si(self.number(column))
    }

    fn settings(&self) -> Settings {
        Settings {
            hazen_williams: self.table.hazen_williams.map_or_else(HazenWilliams::published, law_of),
            ..Settings::default()
        }
    }
}

fn as_number(value: &toml::Value) -> f64 {
    let number = value.as_float().or(value.as_integer().map(|whole| whole as f64));
    number.unwrap_or_else(|| panic!("`{value}` is no number"))
}

fn law_of([constant, flow_exponent, diameter_exponent]: [f64; 3]) -> HazenWilliams {
    HazenWilliams {
        constant,
        flow_exponent,
        diameter_exponent,
    }
}

/// What the program says.
fn found(given: &Given) -> f64 {
    match given.table.of.as_str() {
        "colebrook-white" => closing_colebrook_white(given.number("reynolds"), given.number("relative_roughness")),
        "friction factor" => friction_factor(given.number("reynolds"), given.number("relative_roughness")).factor,
        "velocity in ft/s" => {
            let diameter = given.si("diameter_in", "in", Quantity::Diameter);
            let flow = given.si("flow_gpm", "gpm", Quantity::Flow);
            let velocity = flow / (PI / 4.0 * diameter * diameter);
            Unit::parse("ft/s", Quantity::Velocity).unwrap().from_si(velocity)
        }
        "loss in ft per 1000 ft" => {
            let diameter = given.si("diameter_in", "in", Quantity::Diameter);
            let flow = given.si("flow_gpm", "gpm", Quantity::Flow);
            let part = part_of(0, 1, 1.0, diameter, Friction::CFactor(given.number("c_factor")));
            let gradient = HeadLoss::new(&part, &given.settings()).head_m(flow);
            Unit::parse("ft/1000 ft", Quantity::Gradient).unwrap().from_si(gradient)
        }
        "density in kg/m3" => density_kg_per_m3(given.number("temperature_c")),
        "viscosity in uPa s" => dynamic_viscosity_pa_s(given.number("temperature_c")) * 1e6,
        "kinematic viscosity in mm2/s" => viscosity_m2_per_s(given.number("temperature_c")) * 1e6,
        "unit of length" => unit_in(given, Quantity::Length),
        "unit of diameter" => unit_in(given, Quantity::Diameter),
        "unit of pressure" => unit_in(given, Quantity::Pressure),
        "unit of flow" => unit_in(given, Quantity::Flow),
        "hydrant outlet in gpm" => outlet_gpm(given),
        "flow at a residual pressure in gpm" => at_residual_gpm(given),
        other => panic!("no such check: {other}"),
    }
}

/// The factor, once it is seen that it closes the implicit law.
fn closing_colebrook_white(reynolds: f64, relative_roughness: f64) -> f64 {
    let factor = colebrook_white(reynolds, relative_roughness).factor;
    let x = 1.0 / factor.sqrt();
    let open = x + 2.0 * (relative_roughness / 3.7 + 2.51 / reynolds * x).log10();
    assert!(
        open.abs() < 1e-14,
        "the law is open by {open:e} at Re {reynolds}, e/D {relative_roughness}"
    );
    factor
}

fn unit_in(given: &Given, quantity: Quantity) -> f64 {
    let one = given.unit("unit", quantity).to_si(1.0);
    given.unit("in", quantity).from_si(one)
}

/// Flow through an outlet of loss 1/c^2, held at no pressure on its far side.
fn outlet_gpm(given: &Given) -> f64 {
    let diameter = given.si("diameter_in", "in", Quantity::Diameter);
    let pressure = given.si("pitot_psi", "psi", Quantity::Pressure);
    let mut outlet = part_of(0, 1, 1e-9, diameter, Friction::CFactor(130.0));
    outlet.minor_loss_k = given.number("coefficient").powi(-2);
    let flow = held_at_the_end(outlet, pressure, 0.0);
    Unit::parse("gpm", Quantity::Flow).unwrap().from_si(flow)
}

/// Flow at a residual pressure at the end of one main that loses, at the test flow, what the test showed.
fn at_residual_gpm(given: &Given) -> f64 {
    let pressure = |column| given.si(column, "psi", Quantity::Pressure);
    let flow = given.si("test_gpm", "gpm", Quantity::Flow);
    let unit_main = part_of(0, 1, 1.0, 0.2, Friction::CFactor(100.0));
    let loss = HeadLoss::new(&unit_main, &Settings::default()).head_m(flow);
    let length_m = (pressure("static_psi") - pressure("residual_psi")) / loss;
    let main = Part { length_m, ..unit_main };
    let flow = held_at_the_end(main, pressure("static_psi"), pressure("at_psi"));
    Unit::parse("gpm", Quantity::Flow).unwrap().from_si(flow)
}

/// The flow at the end of one part from a source, with the end held at a head.
fn held_at_the_end(part: Part, source_m: f64, end_m: f64) -> f64 {
    let network = network_of(2, &[(0, source_m)], vec![part]);
    let condition = Condition {
        demand_m3_per_s: vec![0.0; 2],
        source_head_m: vec![source_m],
    };
    let solver = Solver::new(&network, Settings::default());
    let base = solver.solve(&condition, None).unwrap();
    let own = Kept {
        node: NodeIx(1),
        head_m: end_m,
    };
    solver
        .flow_at_held_head(&condition, &base, own, &[])
        .unwrap()
        .flow_m3_per_s
}

/// Holds every row of a file of tables against the program.
fn check_tables(file: &str, rows_at_least: usize) {
    let tables: Tables = read(file);
    let mut rows = 0;
    for table in &tables.table {
        assert!(
            !table.source.is_empty() && !table.status.is_empty(),
            "{file}: {} has no source",
            table.of
        );
        for row in &table.rows {
            let (wanted, arguments) = row.split_last().unwrap();
            assert_eq!(row.len(), table.columns.len(), "{file}: {} {row:?}", table.of);
            let columns = table.columns.iter().map(String::as_str);
            let given = Given {
                table,
                values: columns.zip(arguments).collect(),
            };
            check(
                &format!("{file}: {} {row:?}", table.of),
                found(&given),
                as_number(wanted),
                table.tolerance,
            );
            rows += 1;
        }
    }
    assert!(rows >= rows_at_least, "{file}: only {rows} rows");
}

fn check(what: &str, found: f64, wanted: f64, tolerance: Tolerance) {
    let allowed = match tolerance {
        Tolerance::Absolute(allowed) => allowed,
        Tolerance::Relative(share) => share * wanted.abs(),
    };
    assert!(
        (found - wanted).abs() <= allowed,
        "{what}: found {found}, allowed {allowed:e} off"
    );
}

fn read<T: for<'a> Deserialize<'a>>(file: &str) -> T {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/numbers").join(file);
    let text = std::fs::read_to_string(&path).unwrap_or_else(|error| panic!("{}: {error}", path.display()));
    toml::from_str(&text).unwrap_or_else(|error| panic!("{}: {error}", path.display()))
}

#[test]
fn friction_factors() {
    check_tables("friction.toml", 150);
}

#[test]
fn hazen_williams_losses() {
    check_tables("hazen_williams.toml", 1500);
}

#[test]
fn properties_of_water() {
    check_tables("water.toml", 55);
}

#[test]
fn units() {
    check_tables("units.toml", 20);
}

#[test]
fn hydrant_discharge_and_the_extrapolation_of_flow_tests() {
    check_tables("hydrants.toml", 130);
}

// ---- networks --------------------------------------------------------------------------------------------------------

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Networks {
    network: Vec<Known>,
}

/// A network with a known answer.
#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Known {
    title: String,
    source: String,
    status: String,
    #[serde(default)]
    law: KnownLaw,
    gravity_m_per_s2: Option<f64>,
    viscosity_m2_per_s: Option<f64>,
    units: KnownUnits,
    sources: BTreeMap<String, f64>,
    #[serde(default)]
    demands: BTreeMap<String, f64>,
    mains: Vec<KnownMain>,
    expect: Vec<Expected>,
}

#[derive(Clone, Copy, Default, Deserialize)]
#[serde(rename_all = "kebab-case")]
enum KnownLaw {
    #[default]
    HazenWilliams,
    DarcyWeisbach,
    #[serde(rename = "constant friction factor")]
    ConstantFactor,
    Resistance,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct KnownUnits {
    length: String,
    diameter: String,
    flow: String,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct KnownMain {
    id: String,
    between: [String; 2],
    length: Option<f64>,
    diameter: Option<f64>,
    c: Option<f64>,
    roughness: Option<f64>,
    f: Option<f64>,
    r: Option<f64>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Expected {
    of: String,
    hazen_williams: Option<[f64; 3]>,
    #[serde(default)]
    heads: BTreeMap<String, f64>,
    head_tolerance: Option<f64>,
    #[serde(default)]
    flows: BTreeMap<String, f64>,
    flow_tolerance: Option<f64>,
}

impl Known {
    fn unit(name: &str, quantity: Quantity) -> Unit {
        Unit::parse(name, quantity).unwrap_or_else(|| panic!("no unit `{name}`"))
    }

    fn nodes(&self) -> Vec<&str> {
        let mut nodes: Vec<&str> = self
            .mains
            .iter()
            .flat_map(|main| &main.between)
            .map(String::as_str)
            .collect();
        nodes.sort_unstable();
        nodes.dedup();
        nodes
    }

    /// A main in SI. A constant friction factor f is the law h = 8 f L Q^2 / (pi^2 g D^5), a C-factor of 1/sqrt(f) with
    /// exponents 2 and 5; a resistance r is the law r Q^2, a length r of a main of diameter and C-factor 1.
    fn part(&self, main: &KnownMain, from: u32, to: u32) -> Part {
        let length = main
            .length
            .map(|length| Self::unit(&self.units.length, Quantity::Length).to_si(length));
        let diameter = main
            .diameter
            .map(|one| Self::unit(&self.units.diameter, Quantity::Diameter).to_si(one));
        let friction = match self.law {
            KnownLaw::HazenWilliams => Friction::CFactor(main.c.unwrap()),
            KnownLaw::DarcyWeisbach => Friction::RoughnessM(
                Self::unit(&self.units.diameter, Quantity::Diameter).to_si(main.roughness.unwrap()),
            ),
            KnownLaw::ConstantFactor => Friction::CFactor(main.f.unwrap().sqrt().recip()),
            KnownLaw::Resistance => Friction::CFactor(1.0),
        };
        part_of(from, to, length.or(main.r).unwrap(), diameter.unwrap_or(1.0), friction)
    }

    fn settings(&self, expected: &Expected) -> Settings {
        let mut settings = Settings::default();
        settings.gravity_m_per_s2 = self.gravity_m_per_s2.unwrap_or(settings.gravity_m_per_s2);
        settings.viscosity_m2_per_s = self.viscosity_m2_per_s.unwrap_or(settings.viscosity_m2_per_s);
        settings.hazen_williams = match (self.law, expected.hazen_williams) {
            (KnownLaw::ConstantFactor, _) => law_of([8.0 / (PI * PI * settings.gravity_m_per_s2), 2.0, 5.0]),
            (KnownLaw::Resistance, _) => law_of([1.0, 2.0, 5.0]),
            (_, Some(law)) => law_of(law),
            (_, None) => settings.hazen_williams,
        };
        settings
    }

    fn solve(&self, settings: Settings) -> State {
        let nodes = self.nodes();
        let at = |name: &str| nodes.binary_search(&name).unwrap() as u32;
        let head = Self::unit(&self.units.length, Quantity::Length);
        let flow = Self::unit(&self.units.flow, Quantity::Flow);
        let sources: Vec<(u32, f64)> = self
            .sources
            .iter()
            .map(|(name, &level)| (at(name), head.to_si(level)))
            .collect();
        let parts = self
            .mains
            .iter()
            .map(|main| self.part(main, at(&main.between[0]), at(&main.between[1])));
        let network = network_of(nodes.len(), &sources, parts.collect());
        let mut condition = Condition {
            demand_m3_per_s: vec![0.0; nodes.len()],
            source_head_m: sources.iter().map(|source| source.1).collect(),
        };
        for (name, &demand) in &self.demands {
            condition.demand_m3_per_s[at(name) as usize] = flow.to_si(demand);
        }
        Solver::new(&network, settings).solve(&condition, None).unwrap()
    }

    fn check(&self, expected: &Expected) -> usize {
        let what = format!("{}, {}", self.title, expected.of);
        let state = self.solve(self.settings(expected));
        let head = Self::unit(&self.units.length, Quantity::Length);
        let flow = Self::unit(&self.units.flow, Quantity::Flow);
        let nodes = self.nodes();
        for (name, &wanted) in &expected.heads {
            let node = nodes.binary_search(&name.as_str()).unwrap();
            let allowed = Tolerance::Absolute(expected.head_tolerance.unwrap());
            check(
                &format!("{what}, head at {name}"),
                head.from_si(state.head_m[node]),
                wanted,
                allowed,
            );
        }
        for (name, &wanted) in &expected.flows {
            let main = self.mains.iter().position(|main| main.id == *name).unwrap();
            let allowed = Tolerance::Absolute(expected.flow_tolerance.unwrap());
            check(
                &format!("{what}, flow in {name}"),
                flow.from_si(state.flow_m3_per_s[main]),
                wanted,
                allowed,
            );
        }
        expected.heads.len() + expected.flows.len()
    }
}

#[test]
fn networks_with_known_answers() {
    let known: Networks = read("networks.toml");
    let mut numbers = 0;
    for network in &known.network {
        assert!(
            !network.source.is_empty() && !network.status.is_empty(),
            "{} has no source",
            network.title
        );
        for expected in &network.expect {
            numbers += network.check(expected);
        }
    }
    assert!(numbers > 300, "only {numbers} numbers");
}

/// A published flag can turn on the constant alone: the same design passes 30 m with one and fails with another.
#[test]
fn a_published_constant_alone_turns_a_flag() {
    let known: Networks = read("networks.toml");
    let hanoi = &known.network[0];
    let node = hanoi.nodes().binary_search(&"13").unwrap();
    let head = |constant| {
        let settings = Settings {
            hazen_williams: law_of([constant, 1.852, 4.871]),
            ..Settings::default()
        };
        hanoi.solve(settings).head_m[node]
    };
    assert!(head(10.667) > 30.0 && head(10.6744) < 30.0);
}
