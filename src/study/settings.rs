//! From the tables of a study file to the settings of each stage.

use std::path::Path;
use std::time::{SystemTime, UNIX_EPOCH};

use super::file::StudyFile;
use super::section::Section;
use super::{CaseSettings, LayerFile, Study, tables};
use crate::assets::{
    AssetSettings, Basis, CustomersColumns, DiameterIs, FrictionLaw, HydrantsColumns, LayerColumns, LengthFrom,
    MainsColumns, NodesColumns, Reach, Role, SourceAt, StudySource, Valued, ValvesColumns,
};
use crate::finding::{Error, nearest};
use crate::hydraulics::{self, viscosity_m2_per_s};
use crate::screening::{Fire, Limit, Limits};
use crate::topology::{JoinSettings, ZoneContact};
use crate::units::{M_PER_MM, UnitSystem};

/// Farthest that anything may be looked for or joined over, m: beyond it a study has a wrong unit.
const FARTHEST_M: f64 = 10_000.0;
/// Elevations and heads on Earth with a wide margin, m.
const HEADS_M: std::ops::RangeInclusive<f64> = -1_000.0..=20_000.0;
/// Pressures, m: up to what no main is made for.
const PRESSURES_M: std::ops::RangeInclusive<f64> = 0.0..=1_000.0;
/// Flows, m3/s: up to a large river's.
const FLOWS_M3_PER_S: std::ops::RangeInclusive<f64> = 0.0..=1_000.0;
/// Any number that is not below zero.
const NOT_BELOW_ZERO: std::ops::RangeInclusive<f64> = 0.0..=f64::INFINITY;
/// C-factor of a main about which nothing is known. Common practice, no source.
const DEFAULT_C: f64 = 100.0;
/// Roughness height of a main about which nothing is known: DVGW W 302 for a network of mains with its fittings, from memory.
const DEFAULT_ROUGHNESS_M: f64 = 0.4 * M_PER_MM;
/// How far points may lie from their mains when the study does not say, m. Common practice, no source.
const DEFAULT_REACH: Reach = Reach {
    hydrants_m: 10.0,
    customers_m: 60.0,
    valves_m: 2.0,
};

pub(super) fn parse(path: &Path, text: &str) -> Result<Study, Error> {
    let (file, values) = StudyFile::parse(path, text)?;
    let empty = toml::Table::new();
    let top = Section::top(&file, &tables::TOP, &values)?;
    let stem = path
        .file_stem()
        .map_or_else(String::new, |stem| stem.to_string_lossy().into_owned());
    let title = top.text("title")?.unwrap_or(stem);
    let results_in = match top.choice("results_in")? {
        Some("us") => UnitSystem::Us,
        _ => UnitSystem::Si,
    };
    let friction = top.section("friction", &empty)?;
    let law = law(&friction)?;
    let hydraulics = hydraulics_settings(&friction, law)?;
    let mut layers = Layers {
        folder: path.parent().unwrap_or(Path::new("")),
        files: Vec::new(),
    };
    let mut assets = asset_settings(&top, &friction, &mut layers, law)?;
    let joining = joining(&top.section("joining", &empty)?)?;
    let limits = limits(&top.section("limits", &empty)?, &Limits::default())?;
    let cases = cases(&top, &limits)?;
    one_head_each(&top, &assets.sources, &cases)?;
    let by_case = cases.iter().flat_map(|case| &case.tank_heads_m);
    assets.heads_by_case = by_case.map(|(id, _)| id.trim().to_string()).collect();
    let fire = match top.sections("fire")?.pop() {
        Some(section) => Some(fire(&section, &cases, &mut assets)?),
        None => None,
    };
    Ok(Study {
        path: path.to_path_buf(),
        title,
        results_in,
        layers: layers.files,
        assets,
        joining,
        hydraulics,
        cases,
        fire,
        limits,
        used: file.into_used(),
    })
}

/// What the study says about the layers, and the friction of mains about which they say nothing.
fn asset_settings(
    top: &Section<'_>,
    friction: &Section<'_>,
    layers: &mut Layers<'_>,
    law: FrictionLaw,
) -> Result<AssetSettings, Error> {
    let mut assets = AssetSettings {
        mains: read_mains(top, layers, law)?,
        nodes: read_nodes(top, layers)?,
        hydrants: Vec::new(),
        customers: Vec::new(),
        valves: Vec::new(),
        sources: sources(top)?,
        heads_by_case: Vec::new(),
        law,
        default_c_factor: or_assumed(friction.plain("default_c", 20.0..=165.0)?, DEFAULT_C),
        default_roughness_m: or_assumed(
            friction.number("default_roughness", 0.0..=30.0 * M_PER_MM)?,
            DEFAULT_ROUGHNESS_M,
        ),
        age_in_year: age_in_year(friction)?,
        hydrants_at_own_elevation: true,
        reach: DEFAULT_REACH,
    };
    (assets.hydrants, assets.reach.hydrants_m) = read_hydrants(top, layers)?;
    (assets.customers, assets.reach.customers_m) = read_customers(top, layers)?;
    (assets.valves, assets.reach.valves_m) = read_valves(top, layers)?;
    Ok(assets)
}

fn or_assumed(given: Option<f64>, usual: f64) -> Valued<f64> {
    match given {
        Some(value) => Valued {
            value,
            basis: Basis::Study,
        },
        None => Valued {
            value: usual,
            basis: Basis::Assumed,
        },
    }
}

/// The year that ages are counted to. Taken from the clock it is recorded, for the friction of the mains follows from it.
fn age_in_year(friction: &Section<'_>) -> Result<i32, Error> {
    if let Some(year) = friction.plain("age_in_year", 1_800.0..=3_000.0)? {
        return Ok(year as i32);
    }
    let year = this_year();
    friction.default_is("age_in_year", format!("{year} (the year of the run)"));
    Ok(year)
}

/// The calendar year by the clock, to within the leap days' drift.
fn this_year() -> i32 {
    const SECONDS_PER_YEAR: u64 = 31_556_952;
    let since_1970 = SystemTime::now()
        .duration_since(UNIX_EPOCH)
        .map_or(0, |since| since.as_secs());
    1970 + (since_1970 / SECONDS_PER_YEAR) as i32
}

/// The files of the layers, in the order of their indices.
struct Layers<'a> {
    folder: &'a Path,
    files: Vec<LayerFile>,
}

impl Layers<'_> {
    /// Adds a layer, and reads what every layer has.
    fn add(&mut self, section: &Section<'_>, role: Role) -> Result<LayerColumns, Error> {
        let from = section.needed_text("from", &format!("from = \"{}s.geojson\"", role.word()))?;
        if let Some((file, name)) = from
            .split_once('#')
            .filter(|(file, _)| file.to_lowercase().ends_with(".gpkg"))
        {
            let what = format!(
                "{} names the layer `{name}` of {file}, a file of several layers",
                section.called("from")
            );
            return Err(section.error(
                "from",
                what,
                "This version reads GeoJSON and shapefile: export the layer to one of them.",
            ));
        }
        let layer = u16::try_from(self.files.len()).map_err(|_| {
            section.error(
                "from",
                "there are more than 65,536 layers".into(),
                "Merge some of them.",
            )
        })?;
        self.files.push(LayerFile {
            path: self.folder.join(from),
            role,
            encoding: section.text("encoding")?,
        });
        Ok(LayerColumns {
            layer,
            id: section.text("id")?,
            zone: section.text("zone")?,
            status: section.text("status")?,
            leave_out: section.marks("leave_out")?,
        })
    }
}

fn read_mains(top: &Section<'_>, layers: &mut Layers<'_>, law: FrictionLaw) -> Result<Vec<MainsColumns>, Error> {
    let sections = top.sections("mains")?;
    if sections.is_empty() {
        return Err(top.missing("mains", "[mains]` with `from = \"mains.geojson\""));
    }
    sections
        .iter()
        .map(|section| mains_layer(section, layers, law))
        .collect()
}

fn mains_layer(section: &Section<'_>, layers: &mut Layers<'_>, law: FrictionLaw) -> Result<MainsColumns, Error> {
    let columns = MainsColumns {
        common: layers.add(section, Role::Main)?,
        diameter: section.unit_column("diameter")?,
        diameter_is: match section.choice("diameter_is")? {
            Some("nominal") => DiameterIs::Nominal,
            Some("outside") => DiameterIs::Outside,
            _ => DiameterIs::Inside,
        },
        c_factor: section.text("c_factor")?,
        roughness: section.unit_column("roughness")?,
        minor_loss: section.text("minor_loss")?,
        material: section.text("material")?,
        year: section.text("year")?,
        length: section.unit_column("length")?,
        length_from: match section.choice("length_from")? {
            Some("stored") => LengthFrom::Stored,
            _ => LengthFrom::Drawn,
        },
        kind: section.text("kind")?,
    };
    let unused = match (law, &columns.c_factor, &columns.roughness) {
        (FrictionLaw::DarcyWeisbach, Some(_), None) => Some(("c_factor", "darcy-weisbach", "roughness")),
        (FrictionLaw::HazenWilliams, None, Some(_)) => Some(("roughness", "hazen-williams", "c_factor")),
        _ => None,
    };
    if let Some((key, law, other)) = unused {
        let what = format!("{} is not used by the friction law {law}", section.called(key));
        let todo = format!(
            "Name a `{other}` column (both may stand there), take the other `law`, or leave the key out: material and age decide then."
        );
        return Err(section.error(key, what, todo));
    }
    if columns.length_from == LengthFrom::Stored && columns.length.is_none() {
        let what = format!(
            "{} is \"stored\", but no `length` column is named",
            section.called("length_from")
        );
        return Err(section.error("length_from", what, "Add `length = \"...\"`."));
    }
    if columns.diameter_is == DiameterIs::Outside && columns.material.is_none() {
        let what = format!(
            "{} is \"outside\", but no `material` column is named to tell the wall by",
            section.called("diameter_is")
        );
        return Err(section.error("diameter_is", what, "Add `material = \"...\"`, or give the bore."));
    }
    Ok(columns)
}

fn read_nodes(top: &Section<'_>, layers: &mut Layers<'_>) -> Result<Vec<NodesColumns>, Error> {
    let sections = top.sections("nodes")?;
    let read = sections.iter().map(|section| {
        Ok(NodesColumns {
            common: layers.add(section, Role::Node)?,
            kind: section.text("kind")?,
            elevation: section.unit_column("elevation")?,
            head: section.unit_column("head")?,
            demand: section.unit_column("demand")?,
        })
    });
    read.collect()
}

fn read_hydrants(top: &Section<'_>, layers: &mut Layers<'_>) -> Result<(Vec<HydrantsColumns>, f64), Error> {
    let sections = top.sections("hydrants")?;
    let mut reach = OneReach::new(DEFAULT_REACH.hydrants_m);
    let read = sections.iter().map(|section| {
        reach.read(section)?;
        Ok(HydrantsColumns {
            common: layers.add(section, Role::Hydrant)?,
            elevation: section.unit_column("elevation")?,
            needed_flow: section.unit_column("needed_flow")?,
        })
    });
    Ok((read.collect::<Result<_, Error>>()?, reach.reach_m))
}

fn read_customers(top: &Section<'_>, layers: &mut Layers<'_>) -> Result<(Vec<CustomersColumns>, f64), Error> {
    let sections = top.sections("customers")?;
    let mut reach = OneReach::new(DEFAULT_REACH.customers_m);
    let read = sections.iter().map(|section| {
        reach.read(section)?;
        Ok(CustomersColumns {
            common: layers.add(section, Role::Customer)?,
            demand: section.unit_column("demand")?,
            class: section.text("class")?,
            elevation: section.unit_column("elevation")?,
            lift: section.number_or_column("lift")?,
        })
    });
    Ok((read.collect::<Result<_, Error>>()?, reach.reach_m))
}

fn read_valves(top: &Section<'_>, layers: &mut Layers<'_>) -> Result<(Vec<ValvesColumns>, f64), Error> {
    let sections = top.sections("valves")?;
    let mut reach = OneReach::new(DEFAULT_REACH.valves_m);
    let read = sections.iter().map(|section| {
        reach.read(section)?;
        Ok(ValvesColumns {
            common: layers.add(section, Role::Valve)?,
            kind: section.text("kind")?,
            main: section.text("main")?,
        })
    });
    Ok((read.collect::<Result<_, Error>>()?, reach.reach_m))
}

/// The reach of all layers of a kind: one number, so that layers may not contradict one another.
struct OneReach {
    reach_m: f64,
    given: bool,
}

impl OneReach {
    fn new(usual_m: f64) -> OneReach {
        OneReach {
            reach_m: usual_m,
            given: false,
        }
    }

    fn read(&mut self, section: &Section<'_>) -> Result<(), Error> {
        let Some(reach_m) = section.number("reach", 0.0..=FARTHEST_M)? else {
            return Ok(());
        };
        if self.given && reach_m != self.reach_m {
            let what = format!(
                "{} differs from that of an earlier layer of the kind",
                section.called("reach")
            );
            return Err(section.error("", what, "Give every layer of the kind the same reach."));
        }
        (self.reach_m, self.given) = (reach_m, true);
        Ok(())
    }
}

fn sources(top: &Section<'_>) -> Result<Vec<StudySource>, Error> {
    top.sections("source")?.iter().map(source).collect()
}

fn source(section: &Section<'_>) -> Result<StudySource, Error> {
    let at = section
        .place("at")?
        .ok_or_else(|| section.missing("at", "at = \"N1\""))?;
    let head_m = section.number("head", HEADS_M)?;
    let elevation_m = section.number("elevation", HEADS_M)?;
    let pressure_m = section.number("pressure", PRESSURES_M)?;
    let head_m = match (head_m, elevation_m, pressure_m) {
        (Some(head_m), _, None) => head_m,
        (None, Some(elevation_m), Some(pressure_m)) => elevation_m + pressure_m,
        (Some(_), _, Some(_)) => {
            let what = format!("{} gives the head and the pressure", section.called("pressure"));
            return Err(section.error("", what, "Give `head_m`, or `elevation_m` and `pressure_m`, not both."));
        }
        _ => return Err(section.missing("head_m", "head_m = 120.0` (or `elevation_m` and `pressure_m")),
    };
    Ok(StudySource {
        at,
        head_m,
        elevation_m,
        greatest_m3_per_s: section.number("greatest", FLOWS_M3_PER_S)?,
    })
}

/// Refuses a head by case at a node that a source of the study stands on: one of the two would be lost.
fn one_head_each(top: &Section<'_>, sources: &[StudySource], cases: &[CaseSettings]) -> Result<(), Error> {
    for case in cases {
        for (id, _) in &case.tank_heads_m {
            if sources
                .iter()
                .any(|source| source.at == SourceAt::Id(id.trim().to_string()))
            {
                let what = format!(
                    "`tank_levels` of the case `{}` and a `[[source]]` both give the head at `{}`",
                    case.name,
                    id.trim()
                );
                return Err(top.error("source", what, "Keep one of the two."));
            }
        }
    }
    Ok(())
}

fn law(section: &Section<'_>) -> Result<FrictionLaw, Error> {
    Ok(match section.choice("law")? {
        Some("darcy-weisbach") => FrictionLaw::DarcyWeisbach,
        _ => FrictionLaw::HazenWilliams,
    })
}

fn hydraulics_settings(section: &Section<'_>, law: FrictionLaw) -> Result<hydraulics::Settings, Error> {
    let mut settings = hydraulics::Settings::default();
    if law == FrictionLaw::DarcyWeisbach {
        for key in ["constant", "flow_exponent", "diameter_exponent"] {
            if section.has(key) {
                let what = format!("{} is not used by the friction law darcy-weisbach", section.called(key));
                return Err(section.error(key, what, "Leave it out, or take `law = \"hazen-williams\"`."));
            }
        }
        if let Some(temperature_c) = section.plain("temperature_c", 0.0..=100.0)? {
            settings.viscosity_m2_per_s = viscosity_m2_per_s(temperature_c);
        }
        return Ok(settings);
    }
    if section.has("temperature_c") {
        let what = format!(
            "{} is not used by the friction law hazen-williams",
            section.called("temperature_c")
        );
        return Err(section.error(
            "temperature_c",
            what,
            "Leave it out, or take `law = \"darcy-weisbach\"`.",
        ));
    }
    let law = &mut settings.hazen_williams;
    if let Some(constant) = section.plain("constant", NOT_BELOW_ZERO)? {
        if !(10.0..=11.5).contains(&constant) {
            let what = format!("{} cannot be {constant}", section.called("constant"));
            let todo = "It is K of h = K L Q^n / (C^n D^m) in metres and seconds, between 10 and 11.5; 1.318 and 0.849 belong to the \
                        velocity form, which is 10.67 here.";
            return Err(section.error("constant", what, todo));
        }
        law.constant = constant;
    }
    law.flow_exponent = section.plain("flow_exponent", 1.8..=1.9)?.unwrap_or(law.flow_exponent);
    law.diameter_exponent = section
        .plain("diameter_exponent", 4.8..=4.9)?
        .unwrap_or(law.diameter_exponent);
    Ok(settings)
}

fn joining(section: &Section<'_>) -> Result<JoinSettings, Error> {
    let usual = JoinSettings::default();
    let tolerance_m = section
        .number("tolerance", 0.0..=FARTHEST_M)?
        .unwrap_or(usual.tolerance_m);
    let look_m = section.number("look", 0.0..=FARTHEST_M)?;
    if look_m.is_some_and(|look_m| look_m < tolerance_m) {
        let what = format!("{} is less than the tolerance", section.called("look"));
        return Err(section.error("", what, "Near misses lie outside the tolerance: look farther than it."));
    }
    Ok(JoinSettings {
        tolerance_m,
        look_m: look_m.unwrap_or(usual.look_m.max(tolerance_m)),
        touch_m: section.number("touch", 0.0..=FARTHEST_M)?.unwrap_or(usual.touch_m),
        zones: match section.choice("zones")? {
            Some("ignore") => ZoneContact::Ignore,
            _ => ZoneContact::Apart,
        },
    })
}

/// Limits as a table gives them, on top of others.
fn limits(section: &Section<'_>, usual: &Limits) -> Result<Limits, Error> {
    let mut limits = usual.clone();
    let set = |limit: &mut Limit, key: &str, range: std::ops::RangeInclusive<f64>| {
        let given = section.number(key, range)?;
        if let Some(value) = given {
            *limit = Limit::of_study(value);
        }
        Ok::<bool, Error>(given.is_some())
    };
    let low = set(&mut limits.pressure_low_m, "pressure_low", PRESSURES_M)?;
    let low_serious = set(&mut limits.pressure_low_serious_m, "pressure_low_serious", PRESSURES_M)?;
    let high = set(&mut limits.pressure_high_m, "pressure_high", PRESSURES_M)?;
    let high_serious = set(
        &mut limits.pressure_high_serious_m,
        "pressure_high_serious",
        PRESSURES_M,
    )?;
    set(&mut limits.velocity_high_m_per_s, "velocity_high", NOT_BELOW_ZERO)?;
    set(&mut limits.gradient_high, "gradient_high", NOT_BELOW_ZERO)?;
    set(&mut limits.gradient_high_large, "gradient_high_large", NOT_BELOW_ZERO)?;
    limits.large_from_m = section
        .number("large_from", NOT_BELOW_ZERO)?
        .unwrap_or(limits.large_from_m);
    if limits.pressure_low_serious_m.value > limits.pressure_low_m.value {
        if low_serious && low {
            let what = format!("{} is above `pressure_low`", section.called("pressure_low_serious"));
            return Err(section.error("", what, "What is seriously low lies below what is low."));
        }
        one_follows(low, &mut limits.pressure_low_m, &mut limits.pressure_low_serious_m);
    }
    if limits.pressure_high_serious_m.value < limits.pressure_high_m.value {
        if high_serious && high {
            let what = format!("{} is below `pressure_high`", section.called("pressure_high_serious"));
            return Err(section.error("", what, "What is seriously high lies above what is high."));
        }
        one_follows(high, &mut limits.pressure_high_m, &mut limits.pressure_high_serious_m);
    }
    Ok(limits)
}

/// A default on the wrong side of a limit that the study gives follows it.
fn one_follows(first_given: bool, first: &mut Limit, second: &mut Limit) {
    if first_given {
        *second = first.clone();
    } else {
        *first = second.clone();
    }
}

fn cases(top: &Section<'_>, limits_of_study: &Limits) -> Result<Vec<CaseSettings>, Error> {
    let mut cases: Vec<CaseSettings> = Vec::new();
    for section in top.sections("case")? {
        let name = section.needed_text("name", "name = \"peak hour\"")?.trim().to_string();
        if cases.iter().any(|case| case.name.eq_ignore_ascii_case(&name)) || name.eq_ignore_ascii_case("no draw") {
            let what = format!("there is a second case `{name}`");
            return Err(section.error(
                "name",
                what,
                "Give every case a name of its own; `no draw` is the network at rest.",
            ));
        }
        let limits = match section.sections("limits")?.pop() {
            Some(own) => limits(&own, limits_of_study)?,
            None => limits_of_study.clone(),
        };
        cases.push(CaseSettings {
            name,
            demand_times: section.plain("demand_times", NOT_BELOW_ZERO)?.unwrap_or(1.0),
            demand_times_by: section.plain_by_name("demand_times_by")?,
            tank_heads_m: section.number_by_name("tank_levels")?,
            limits,
        });
    }
    if cases.is_empty() {
        cases.push(CaseSettings {
            name: "average day".into(),
            demand_times: 1.0,
            demand_times_by: Vec::new(),
            tank_heads_m: Vec::new(),
            limits: limits_of_study.clone(),
        });
    }
    Ok(cases)
}

fn fire(section: &Section<'_>, cases: &[CaseSettings], assets: &mut AssetSettings) -> Result<Fire, Error> {
    let name = section.needed_text("case", &format!("case = \"{}\"", cases[cases.len() - 1].name))?;
    let Some(case) = cases.iter().position(|case| case.name == name.trim()) else {
        let names = cases.iter().map(|case| case.name.as_str());
        let todo = match nearest(&name, names.clone()) {
            Some(nearest) => format!("The nearest is `{nearest}`."),
            None => format!("Cases of this study: {}.", names.collect::<Vec<_>>().join(", ")),
        };
        return Err(section.error(
            "case",
            format!("{} is `{name}`, which is no case of this study", section.called("case")),
            todo,
        ));
    };
    match section.choice("judged_at")? {
        Some("main") => assets.hydrants_at_own_elevation = false,
        Some("outlet") => {
            let what = format!(
                "{} is \"outlet\", and losses inside hydrants are not calculated by this version",
                section.called("judged_at")
            );
            return Err(section.error("judged_at", what, "Take `hydrant` or `main`."));
        }
        _ => {}
    }
    Ok(Fire {
        case,
        residual_m: section
            .number("residual", PRESSURES_M)?
            .map_or_else(Fire::default_residual, Limit::of_study),
        needed_m3_per_s: section.number("needed", FLOWS_M3_PER_S)?.filter(|needed| *needed > 0.0),
        keep_elsewhere_m: section.number("keep_elsewhere", PRESSURES_M)?.map(Limit::of_study),
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::assets::NumberOrColumn;

    const EVERYTHING: &str = r#"
        title = "Existing network"
        results_in = "us"

        [[mains]]
        from = "mains.geojson"
        id = "main_id"
        diameter = { column = "DIAM", unit = "in" }
        diameter_is = "nominal"
        c_factor = "c_hw"
        roughness = "rough_mm"
        minor_loss = "k"
        material = "mat"
        year = "laid"
        length = "len_ft"
        length_from = "stored"
        zone = "zone"
        status = "status"
        kind = "kind"
        leave_out = { STATUS = ["ABANDONED"], OWNER = "private", PHASE = [1, 2] }
        encoding = "windows-1252"

        [[mains]]
        from = "more/mains.shp"

        [nodes]
        from = "nodes.geojson"
        id = "node_id"
        kind = "kind"
        elevation = "elev_m"
        head = { column = "head" , unit = "ft" }
        demand = "dem_lps"
        zone = "zone"
        status = "status"
        leave_out = { KIND = ["x"] }

        [hydrants]
        from = "hydrants.shp"
        id = "ID"
        elevation = "ELEV_FT"
        needed_flow = "NEED_GPM"
        zone = "ZONE"
        status = "STATUS"
        reach_ft = 20

        [customers]
        from = "customers.geojson"
        demand = "dem_lps"
        class = "class"
        elevation = "elev_m"
        lift_m = 6.0
        reach_m = 40

        [valves]
        from = "valves.geojson"
        kind = "kind"
        status = "status"
        main = "on_main"
        reach_m = 1.5

        [[source]]
        at = "N1"
        head_ft = 100

        [[source]]
        at = [12.5, 47]
        elevation_m = 100.0
        pressure_kpa = 98.0665
        greatest_lps = 40

        [joining]
        tolerance_ft = 1
        look_m = 5
        touch_m = 0.002
        zones = "ignore"

        [friction]
        law = "hazen-williams"
        constant = 10.667
        flow_exponent = 1.852
        diameter_exponent = 4.871
        default_c = 110
        default_roughness_mm = 0.5
        age_in_year = 2020

        [[case]]
        name = "peak hour"
        demand_times = 2.5
        demand_times_by = { industry = 1.0 }
        tank_levels_m = { T1 = 118.2 }
        [case.limits]
        pressure_low_m = 14

        [[case]]
        name = "maximum day"
        demand_times = 1.8

        [fire]
        case = "maximum day"
        residual_psi = 20
        needed_gpm = 1000
        keep_elsewhere_bar = 1.4
        judged_at = "main"

        [limits]
        pressure_low_psi = 35
        pressure_high_kpa = 700
        velocity_high_mps = 2
        gradient_high_mkm = 5
    "#;

    fn study(text: &str) -> Result<Study, String> {
        Study::parse(Path::new("town/study.toml"), text).map_err(|error| error.to_string())
    }

    /// What a study that has mains and `more` is refused with.
    fn refused(more: &str) -> String {
        let text = format!("{more}\n[mains]\nfrom = \"mains.geojson\"\n");
        match study(&text) {
            Err(error) => error,
            Ok(_) => panic!("accepted: {more}"),
        }
    }

    #[test]
    fn every_key_is_read_and_obeyed() {
        let study = study(EVERYTHING).unwrap();
        assert_eq!(
            (study.title.as_str(), study.results_in),
            ("Existing network", UnitSystem::Us)
        );
        assert_eq!(study.layers.len(), 6);
        assert_eq!(study.layers[1].path, Path::new("town/more/mains.shp"));
        let mains = &study.assets.mains[0];
        assert_eq!(mains.diameter.as_ref().unwrap().unit.unwrap().name, "in");
        assert_eq!(mains.diameter_is, DiameterIs::Nominal);
        assert_eq!(mains.length_from, LengthFrom::Stored);
        assert_eq!(mains.common.leave_out.len(), 3);
        assert_eq!(study.assets.customers[0].lift, Some(NumberOrColumn::Number(6.0)));
        assert!((study.assets.reach.hydrants_m - 6.096).abs() < 1e-12);
        assert_eq!(
            (study.assets.reach.customers_m, study.assets.reach.valves_m),
            (40.0, 1.5)
        );
        assert!((study.assets.sources[0].head_m - 30.48).abs() < 1e-12);
        assert_eq!(study.assets.sources[1].at, SourceAt::Point([12.5, 47.0]));
        assert!((study.assets.sources[1].head_m - 110.0).abs() < 1e-9);
        assert!((study.joining.tolerance_m - 0.3048).abs() < 1e-12);
        assert_eq!(study.joining.zones, ZoneContact::Ignore);
        assert_eq!(study.hydraulics.hazen_williams.constant, 10.667);
        assert_eq!(
            study.assets.default_c_factor,
            Valued {
                value: 110.0,
                basis: Basis::Study
            }
        );
        assert_eq!(study.assets.age_in_year, 2020);
        assert_eq!(study.cases[0].tank_heads_m, vec![("T1".to_string(), 118.2)]);
        assert_eq!(study.cases[0].limits.pressure_low_m.value, 14.0);
        assert_eq!(study.cases[0].limits.pressure_low_serious_m.value, 14.0);
        assert!((study.cases[1].limits.pressure_low_m.value - 24.607).abs() < 1e-3);
        let fire = study.fire.unwrap();
        assert_eq!(fire.case, 1);
        assert!((fire.needed_m3_per_s.unwrap() - 0.063_090_196_4).abs() < 1e-9);
        assert!(!study.assets.hydrants_at_own_elevation);
        assert_eq!(study.limits.gradient_high.value, 0.005);
        assert_eq!(study.limits.velocity_high_m_per_s.from, "study");
        assert!(study.limits.pressure_low_serious_m.is_default);
    }

    #[test]
    fn the_least_study_has_defaults_and_records_them() {
        let study = study("[mains]\nfrom = \"mains.geojson\"").unwrap();
        assert_eq!(study.title, "study");
        assert_eq!(study.cases.len(), 1);
        assert_eq!(study.cases[0].name, "average day");
        assert_eq!(study.joining, JoinSettings::default());
        assert!(study.fire.is_none());
        let used = |key: &str| study.used.iter().find(|used| used.key == key).unwrap();
        assert_eq!((used("from").given, used("from").table.as_str()), (true, "[mains]"));
        // The year by the clock changes the answer from one year to the next: the number itself is on record.
        let year = study.assets.age_in_year;
        assert_eq!(used("age_in_year").value, format!("{year} (the year of the run)"));
        assert_eq!(
            (used("tolerance").given, used("tolerance").value.as_str()),
            (false, "0.3 m")
        );
    }

    #[test]
    fn the_defaults_in_the_key_list_are_those_that_hold() {
        use super::super::keys::Takes;
        use crate::units::Unit;
        let study = study("[mains]\nfrom = \"mains.geojson\"").unwrap();
        let (joining, limits, reach) = (&study.joining, &study.limits, study.assets.reach);
        let law = study.hydraulics.hazen_williams;
        let fire = Fire::default_residual();
        let holds = [
            (&tables::JOINING, "tolerance", joining.tolerance_m),
            (&tables::JOINING, "look", joining.look_m),
            (&tables::JOINING, "touch", joining.touch_m),
            (&tables::LIMITS, "pressure_low", limits.pressure_low_m.value),
            (
                &tables::LIMITS,
                "pressure_low_serious",
                limits.pressure_low_serious_m.value,
            ),
            (&tables::LIMITS, "pressure_high", limits.pressure_high_m.value),
            (
                &tables::LIMITS,
                "pressure_high_serious",
                limits.pressure_high_serious_m.value,
            ),
            (&tables::LIMITS, "velocity_high", limits.velocity_high_m_per_s.value),
            (&tables::LIMITS, "gradient_high", limits.gradient_high.value),
            (&tables::LIMITS, "gradient_high_large", limits.gradient_high_large.value),
            (&tables::LIMITS, "large_from", limits.large_from_m),
            (&tables::FIRE, "residual", fire.value),
            (&tables::HYDRANTS, "reach", reach.hydrants_m),
            (&tables::CUSTOMERS, "reach", reach.customers_m),
            (&tables::VALVES, "reach", reach.valves_m),
            (&tables::FRICTION, "default_c", study.assets.default_c_factor.value),
            (
                &tables::FRICTION,
                "default_roughness",
                study.assets.default_roughness_m.value,
            ),
            (&tables::FRICTION, "temperature_c", hydraulics::USUAL_TEMPERATURE_C),
        ];
        for (table, name, value) in holds {
            let key = table.keys.iter().find(|key| key.name == name).unwrap();
            let mut words = key.default.split(' ');
            let number: f64 = words.next().unwrap().parse().unwrap();
            let unit = match key.takes {
                Takes::Number(quantity) => Unit::parse(words.next().unwrap(), quantity).unwrap(),
                _ => Unit::all(crate::units::Quantity::Plain).next().unwrap(),
            };
            assert!(
                (unit.to_si(number) - value).abs() < 1e-9,
                "{name}: {} says {value}",
                key.default
            );
        }
        let key = tables::FRICTION.keys.iter().find(|key| key.name == "constant").unwrap();
        assert!((key.default.parse::<f64>().unwrap() - law.constant).abs() < 1e-5);
        assert!((law.flow_exponent - 1.0 / 0.54).abs() < 1e-12 && (law.diameter_exponent - 2.63 / 0.54).abs() < 1e-12);
    }

    #[test]
    fn darcy_weisbach_takes_the_temperature() {
        let text =
            "[mains]\nfrom = \"m.shp\"\nroughness = \"k_mm\"\n[friction]\nlaw = \"darcy-weisbach\"\ntemperature_c = 20";
        let study = study(text).unwrap();
        assert_eq!(study.assets.law, FrictionLaw::DarcyWeisbach);
        assert_eq!(study.hydraulics.viscosity_m2_per_s, viscosity_m2_per_s(20.0));
    }

    #[test]
    fn every_key_misspelt_is_refused_with_the_nearest_spelling() {
        for (section, table) in [
            ("joining", &tables::JOINING),
            ("friction", &tables::FRICTION),
            ("limits", &tables::LIMITS),
        ] {
            for key in table.keys {
                let right = key.spellings()[0].clone();
                let wrong = right.replacen(|letter: char| letter == right.chars().next().unwrap(), "q", 1);
                let error = refused(&format!("[{section}]\n{wrong} = 1"));
                assert!(error.contains(&format!("`{wrong}`")), "{error}");
                assert!(error.contains("The nearest is"), "{error}");
            }
        }
    }

    #[test]
    fn what_is_wrong_is_said_with_its_line_and_what_to_do() {
        for (more, wanted) in [
            (
                "[joining]\ntolerence_m = 1",
                "line 2: there is no key `tolerence_m` in [joining]. The nearest is `tolerance_m`",
            ),
            (
                "[joining]\ntolerance = 1",
                "`tolerance` in [joining] does not end in a unit that fits. Write one of: `tolerance_m`",
            ),
            ("[joining]\ntolerance_psi = 1", "does not end in a unit that fits"),
            (
                "[joining]\ntolerance_m = 1\ntolerance_ft = 3",
                "are one setting in two units",
            ),
            (
                "[joining]\ntolerance_m = \"1\"",
                "is a text. It takes a number without quotes",
            ),
            (
                "[joining]\ntolerance_m = -1",
                "cannot be -1 m. It must lie between 0 m and 10000 m",
            ),
            ("[joining]\ntolerance_m = nan", "not finite"),
            ("[joining]\ntolerance_m = 2\nlook_m = 1", "is less than the tolerance"),
            (
                "[joining]\nzones = \"appart\"",
                "cannot be `appart`. It takes one of: `apart`, `ignore`",
            ),
            (
                "[joining]\ndecisions = \"joins.geojson\"",
                "which this version does not calculate",
            ),
            (
                "[pumps]\nfrom = \"pumps.shp\"",
                "asks for pumps, which this version does not calculate",
            ),
            ("[[curve]]\nname = \"well\"", "pump curves"),
            ("[tests]\nfrom = \"tests.shp\"", "field flow tests"),
            ("[proposal.mains]\nfrom = \"new.shp\"", "a proposed development"),
            ("[valves]\nfrom = \"v.shp\"\nsetting = \"set_psi\"", "regulating valves"),
            ("[valves]\nfrom = \"v.shp\"\nflow_bearing = \"b\"", "does not calculate"),
            ("[[source]]\nat = \"N1\"\nstatic_psi = 60", "a source by a flow test"),
            ("[[source]]\nat = \"N1\"", "has no `head_m`"),
            ("[[source]]\nhead_m = 1", "has no `at`"),
            (
                "[[source]]\nat = \"T1\"\nhead_m = 1\n[[case]]\nname = \"a\"\ntank_levels_m = { \"T1 \" = 1 }",
                "`tank_levels` of the case `a` and a `[[source]]` both give the head at `T1`",
            ),
            ("[[source]]\nat = true\nhead_m = 1", "is true or false. It takes an id"),
            ("[[source]]\nat = \"N\"\nhead_m = 1\npressure_m = 2", "not both"),
            ("[[case]]\nname = \"a\"\noff = [\"p\"]", "pumps"),
            (
                "[[case]]\nname = \"a\"\n[[case]]\nname = \"A\"",
                "there is a second case `A`",
            ),
            ("[[case]]\ndemand_times = 1", "has no `name`"),
            ("[[case]]\nname = \"a\"\ndemand_times = -1", "must not be below 0"),
            (
                "[[case]]\nname = \"a\"\ntank_levels = { T = 1 }",
                "does not end in a unit",
            ),
            (
                "[[case]]\nname = \"a\"\n[case.limits]\npresure_low_m = 1",
                "in [case.limits]. The nearest is `pressure_low_m`",
            ),
            ("[fire]\nneeded_lps = 1", "[fire] has no `case`"),
            (
                "[[case]]\nname = \"maximum day\"\n[fire]\ncase = \"maximun day\"",
                "The nearest is `maximum day`",
            ),
            (
                "[fire]\ncase = \"average day\"\njudged_at = \"outlet\"",
                "losses inside hydrants",
            ),
            ("[friction]\nlaw = \"darcy\"", "It takes one of"),
            ("[friction]\nconstant = 1.318", "velocity form"),
            (
                "[friction]\ntemperature_c = 10",
                "is not used by the friction law hazen-williams",
            ),
            (
                "[limits]\npressure_low_m = 10\npressure_low_serious_m = 20",
                "is above `pressure_low`",
            ),
            ("results_in = \"imperial\"", "It takes one of: `si`, `us`"),
            (
                "titel = \"x\"",
                "line 1: there is no key `titel` in the top of the study. The nearest is `title`",
            ),
            ("title = x", "line 1, column 9"),
            ("[joining]\n[joining]", "line 2"),
            (
                "[nodes]\nfrom = \"n.shp\"\nelevation = { column = \"z\", units = \"m\" }",
                "there is no key `units`",
            ),
            (
                "[nodes]\nfrom = \"n.shp\"\nelevation = { column = \"z\", unit = \"gpm\" }",
                "cannot be in `gpm`",
            ),
            (
                "[nodes]\nfrom = \"n.shp\"\nelevation = { unit = \"m\" }",
                "names no column",
            ),
            ("[nodes]\nfrom = \"n.shp\"\nelevation = 7", "is a whole number"),
            ("[nodes]\nfrom = \"town.gpkg#nodes\"", "a file of several layers"),
            ("[nodes]\nfrom = \"n.shp\"\nid = \"\"", "is empty"),
            ("[nodes]\nid = \"n\"", "[nodes] has no `from`"),
            ("nodes = 3", "is a whole number. It takes a table"),
            ("[customers]\nfrom = \"c.shp\"\nlift = 6", "does not end in a unit"),
            (
                "[[hydrants]]\nfrom = \"a.shp\"\nreach_m = 1\n[[hydrants]]\nfrom = \"b.shp\"\nreach_m = 2",
                "differs",
            ),
            (
                "[nodes]\nfrom = \"n.shp\"\nleave_out = { KIND = { a = 1 } }",
                "does not list values",
            ),
        ] {
            let error = refused(more);
            assert!(
                error.starts_with("town/study.toml: ") && error.contains(wanted),
                "{more}\n{error}"
            );
        }
    }

    #[test]
    fn mains_must_be_named_and_their_keys_must_not_contradict() {
        assert!(study("").unwrap_err().contains("has no `mains`"));
        let of_mains = |more: &str| study(&format!("[mains]\nfrom = \"m.shp\"\n{more}")).unwrap_err();
        assert!(of_mains("roughness = \"k_mm\"").contains("is not used by the friction law hazen-williams"));
        assert!(of_mains("length_from = \"stored\"").contains("no `length` column is named"));
        assert!(of_mains("diameter_is = \"outside\"").contains("no `material` column"));
        assert!(of_mains("diameter_is = \"inner\"").contains("It takes one of"));
    }

    #[test]
    fn a_lift_may_be_a_column() {
        for (key, unit) in [("lift = \"tap\"", None), ("lift_ft = \"tap\"", Some("ft"))] {
            let study = study(&format!(
                "[mains]\nfrom = \"m.shp\"\n[customers]\nfrom = \"c.shp\"\n{key}"
            ))
            .unwrap();
            let Some(NumberOrColumn::Column(column)) = &study.assets.customers[0].lift else {
                panic!("{key}")
            };
            assert_eq!(column.unit.map(|unit| unit.name), unit);
        }
    }
}
