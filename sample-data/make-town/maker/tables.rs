//! The layers as tables: one list of columns for both forms of the town.

use super::plane::Point;
use super::terrain::elevation;
use super::town::{Drawing, FIRST_CUSTOMER_ID, FIRST_HYDRANT_ID, FIRST_NODE_ID, FIRST_VALVE_ID, Node, Town};

const MM_PER_INCH: f64 = 25.4;
const FEET_PER_M: f64 = 1.0 / 0.3048;
const GPM_PER_LPS: f64 = 60.0 / 3.785_411_784;

pub enum Cell {
    Null,
    Whole(i64),
    Real(f64),
    Text(String),
}

/// How a cell is stored in an attribute table.
#[derive(Clone, Copy)]
pub struct Field {
    /// `C`, `N` or `F`.
    pub kind: u8,
    pub width: u8,
    pub decimals: u8,
}

pub struct Column {
    pub si_name: &'static str,
    pub us_name: &'static str,
    pub field: Field,
    pub si: Vec<Cell>,
    pub us: Vec<Cell>,
}

/// How a row is drawn, m east and north of the middle of the town.
pub enum Shape {
    Null,
    Empty,
    Point(Point),
    Lines(Vec<Vec<Point>>),
}

pub struct Table {
    pub name: &'static str,
    pub shapes: Vec<Shape>,
    pub columns: Vec<Column>,
}

fn text(width: u8) -> Field {
    Field {
        kind: b'C',
        width,
        decimals: 0,
    }
}

fn number(width: u8, decimals: u8) -> Field {
    Field {
        kind: b'N',
        width,
        decimals,
    }
}

fn rounded(value: f64, decimals: u8) -> f64 {
    let unit = 10f64.powi(i32::from(decimals));
    (value * unit).round() / unit
}

/// A column that is the same in both forms.
fn same(names: [&'static str; 2], field: Field, cells: impl Iterator<Item = Cell> + Clone) -> Column {
    Column {
        si_name: names[0],
        us_name: names[1],
        field,
        si: cells.clone().collect(),
        us: cells.collect(),
    }
}

/// A column of numbers: SI values, and what they are multiplied by for the US form. Zero and below is a filler.
fn measured(
    names: [&'static str; 2],
    field: Field,
    si_decimals: u8,
    us_per_si: f64,
    values: impl Iterator<Item = Option<f64>> + Clone,
) -> Column {
    let cells = |times: f64, decimals: u8| {
        let cell = move |value: Option<f64>| match value {
            None => Cell::Null,
            Some(filler) if filler <= 0.0 => Cell::Real(filler),
            Some(value) => Cell::Real(rounded(value * times, decimals)),
        };
        values.clone().map(cell).collect()
    };
    Column {
        si_name: names[0],
        us_name: names[1],
        field,
        si: cells(1.0, si_decimals),
        us: cells(us_per_si, field.decimals),
    }
}

fn whole(value: impl Into<i64>) -> Cell {
    Cell::Whole(value.into())
}

fn words(value: &str) -> Cell {
    if value.is_empty() {
        Cell::Null
    } else {
        Cell::Text(value.to_string())
    }
}

fn numbered(names: [&'static str; 2], first: u32, count: usize) -> Column {
    same(
        names,
        number(8, 0),
        (0..count).map(move |row| whole(first + row as u32)),
    )
}

fn mains(town: &Town) -> Table {
    let shape = |drawing: &Drawing| match drawing {
        Drawing::Null => Shape::Null,
        Drawing::Empty => Shape::Empty,
        Drawing::Lines(lines) => Shape::Lines(lines.clone()),
    };
    Table {
        name: "mains",
        shapes: town.mains.iter().map(|main| shape(&main.drawing)).collect(),
        columns: columns_of_mains(town),
    }
}

fn columns_of_mains(town: &Town) -> Vec<Column> {
    let mains = town.mains.iter();
    vec![
        same(
            ["main_id", "MAINID"],
            number(8, 0),
            mains.clone().map(|main| main.id.map_or(Cell::Null, whole)),
        ),
        same(["kind", "KIND"], text(16), mains.clone().map(|main| words(main.kind))),
        same(
            ["status", "STAT"],
            text(10),
            mains.clone().map(|main| words(main.status)),
        ),
        measured(
            ["diam_mm", "DIAM_IN"],
            number(8, 2),
            2,
            1.0 / MM_PER_INCH,
            mains.clone().map(|main| {
                main.diameter_in
                    .map(|inches| if inches > 0.0 { inches * MM_PER_INCH } else { inches })
            }),
        ),
        same(
            ["material", "MATL"],
            text(16),
            mains.clone().map(|main| words(main.material)),
        ),
        same(
            ["year", "YR"],
            number(4, 0),
            mains.clone().map(|main| main.year.map_or(Cell::Null, whole)),
        ),
        measured(
            ["c_hw", "CHW"],
            number(5, 0),
            0,
            1.0,
            mains.clone().map(|main| main.c_factor),
        ),
        measured(
            ["length_m", "LEN_FT"],
            Field {
                kind: b'F',
                width: 19,
                decimals: 4,
            },
            2,
            FEET_PER_M,
            mains.clone().map(|main| main.stored_length_m),
        ),
        same(["zone", "PZONE"], text(8), mains.clone().map(|main| words(main.zone))),
        same(["road", "ROAD"], text(24), mains.clone().map(|main| words(&main.road))),
    ]
}

fn nodes(town: &Town) -> Table {
    let drawn: Vec<&Node> = town.nodes.iter().filter(|node| node.drawn).collect();
    let nodes = drawn.iter();
    let columns = vec![
        numbered(["node_id", "NODEID"], FIRST_NODE_ID, drawn.len()),
        same(["kind", "KIND"], text(8), nodes.clone().map(|node| words(node.kind))),
        measured(
            ["elev_m", "ELEV_FT"],
            number(10, 4),
            2,
            FEET_PER_M,
            nodes
                .clone()
                .map(|node| node.elevation_m.map(|metres| rounded(metres, 2))),
        ),
        measured(
            ["head_m", "HEAD_FT"],
            number(10, 4),
            2,
            FEET_PER_M,
            nodes.clone().map(|node| node.head_m),
        ),
        measured(
            ["dem_lps", "DEM_GPM"],
            number(10, 5),
            4,
            GPM_PER_LPS,
            nodes
                .clone()
                .map(|node| (node.demand_lps > 0.0).then_some(node.demand_lps)),
        ),
    ];
    Table {
        name: "nodes",
        shapes: nodes.map(|node| Shape::Point(node.at)).collect(),
        columns,
    }
}

fn hydrants(town: &Town) -> Table {
    let hydrants = town.hydrants.iter();
    let columns = vec![
        numbered(["hyd_id", "HYDID"], FIRST_HYDRANT_ID, town.hydrants.len()),
        measured(
            ["elev_m", "ELEV_FT"],
            number(10, 4),
            2,
            FEET_PER_M,
            hydrants
                .clone()
                .map(|hydrant| hydrant.elevation_m.map(|metres| rounded(metres, 2))),
        ),
        measured(
            ["need_lps", "NEED_GPM"],
            number(8, 1),
            3,
            GPM_PER_LPS,
            hydrants.clone().map(|hydrant| Some(hydrant.needed_gpm / GPM_PER_LPS)),
        ),
        same(
            ["zone", "PZONE"],
            text(8),
            hydrants.clone().map(|hydrant| words(hydrant.zone)),
        ),
    ];
    Table {
        name: "hydrants",
        shapes: hydrants.map(|hydrant| Shape::Point(hydrant.at)).collect(),
        columns,
    }
}

fn customers(town: &Town) -> Table {
    let customers = town.customers.iter();
    let columns = vec![
        numbered(["cust_id", "CUSTID"], FIRST_CUSTOMER_ID, town.customers.len()),
        measured(
            ["dem_lps", "DEM_GPM"],
            number(10, 5),
            4,
            GPM_PER_LPS,
            customers.clone().map(|customer| Some(customer.demand_lps)),
        ),
        same(
            ["class", "CLASS"],
            text(8),
            customers.clone().map(|customer| words(customer.class)),
        ),
        measured(
            ["elev_m", "ELEV_FT"],
            number(10, 4),
            1,
            FEET_PER_M,
            customers
                .clone()
                .map(|customer| Some(rounded(elevation(customer.at), 1))),
        ),
    ];
    Table {
        name: "customers",
        shapes: customers.map(|customer| Shape::Point(customer.at)).collect(),
        columns,
    }
}

fn valves(town: &Town) -> Table {
    let valves = town.valves.iter();
    let columns = vec![
        numbered(["valve_id", "VALVEID"], FIRST_VALVE_ID, town.valves.len()),
        same(["kind", "KIND"], text(8), valves.clone().map(|valve| words(valve.kind))),
        same(
            ["status", "STAT"],
            text(10),
            valves.clone().map(|valve| words(valve.status)),
        ),
        same(
            ["main_id", "MAINID"],
            number(8, 0),
            valves.clone().map(|valve| valve.main.map_or(Cell::Null, whole)),
        ),
    ];
    Table {
        name: "valves",
        shapes: valves.map(|valve| Shape::Point(valve.at)).collect(),
        columns,
    }
}

/// Every layer of the town.
pub fn of(town: &Town) -> Vec<Table> {
    vec![mains(town), nodes(town), hydrants(town), customers(town), valves(town)]
}
