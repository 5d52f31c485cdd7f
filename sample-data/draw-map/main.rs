//! Draws the layers of a run (GeoJSON, longitude and latitude) as one picture: `draw-map RESULTS PICTURE.svg`.
//!
//! Made for the README's picture; a GIS shows more.

use std::error::Error;
use std::fmt::Write as _;
use std::path::Path;

use serde_json::Value;

const WIDTH: f64 = 1200.0;
const MARGIN: f64 = 24.0;
const LEGEND: f64 = 210.0;

/// Pressure classes as shares of the limit, with colours that stay apart for colour-blind readers and in grey print.
const LOW: &str = "#7b3294";
const NEAR: &str = "#e08214";
const FINE: &str = "#4393a3";

fn main() -> Result<(), Box<dyn Error>> {
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let [results, picture] = arguments.as_slice() else {
        return Err("usage: draw-map RESULTS PICTURE.svg".into());
    };
    let layer = |name: &str| read(&Path::new(results).join(format!("{name}.geojson")));
    let (mains, nodes) = (layer("mains")?, layer("nodes")?);
    let (hydrants, findings) = (layer("hydrants")?, layer("findings")?);
    let sheet = Sheet::around(&mains);
    let mut out = String::new();
    sheet.open(&mut out)?;
    draw_mains(&mut out, &sheet, &mains)?;
    draw_nodes(&mut out, &sheet, &nodes)?;
    draw_hydrants(&mut out, &sheet, &hydrants)?;
    draw_findings(&mut out, &sheet, &findings)?;
    legend(&mut out, &sheet)?;
    out.push_str("</svg>\n");
    std::fs::write(picture, out)?;
    Ok(())
}

fn read(path: &Path) -> Result<Vec<Value>, Box<dyn Error>> {
    let all: Value =
        serde_json::from_str(&std::fs::read_to_string(path).map_err(|cause| format!("{}: {cause}", path.display()))?)?;
    Ok(all["features"].as_array().cloned().unwrap_or_default())
}

/// A feature's lines or points as lists of longitude and latitude.
fn lines(feature: &Value) -> Vec<Vec<[f64; 2]>> {
    let pair = |value: &Value| Some([value.get(0)?.as_f64()?, value.get(1)?.as_f64()?]);
    let line = |value: &Value| {
        value
            .as_array()
            .map(|all| all.iter().filter_map(pair).collect())
            .unwrap_or_default()
    };
    let coordinates = &feature["geometry"]["coordinates"];
    match feature["geometry"]["type"].as_str() {
        Some("Point") => pair(coordinates).map(|at| vec![vec![at]]).unwrap_or_default(),
        Some("LineString") => vec![line(coordinates)],
        Some("MultiLineString") => coordinates
            .as_array()
            .map(|all| all.iter().map(line).collect())
            .unwrap_or_default(),
        _ => Vec::new(),
    }
}

/// Where things go on the sheet.
struct Sheet {
    west: f64,
    north: f64,
    per_degree: [f64; 2],
    height: f64,
    px_per_m: f64,
}

impl Sheet {
    fn around(mains: &[Value]) -> Sheet {
        let mut points: Vec<[f64; 2]> = mains.iter().flat_map(lines).flatten().collect();
        let mut span = |axis: usize| {
            points.sort_by(|a, b| a[axis].total_cmp(&b[axis]));
            (points[0][axis], points[points.len() - 1][axis])
        };
        let ((west, east), (south, north)) = (span(0), span(1));
        let narrowing = (0.5 * (south + north)).to_radians().cos();
        let scale = (WIDTH - LEGEND - 2.0 * MARGIN) / ((east - west) * narrowing);
        let meridian_degree_m = 111_200.0;
        Sheet {
            west,
            north,
            per_degree: [scale * narrowing, scale],
            height: (north - south) * scale + 2.0 * MARGIN,
            px_per_m: scale / meridian_degree_m,
        }
    }

    fn at(&self, [x, y]: [f64; 2]) -> (f64, f64) {
        (
            MARGIN + (x - self.west) * self.per_degree[0],
            MARGIN + (self.north - y) * self.per_degree[1],
        )
    }

    fn open(&self, out: &mut String) -> std::fmt::Result {
        let height = self.height;
        writeln!(
            out,
            "<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 {WIDTH} {height:.0}\" font-family=\"sans-serif\" font-size=\"13\">"
        )?;
        writeln!(out, "<rect width=\"{WIDTH}\" height=\"{height:.0}\" fill=\"#fbfaf7\"/>")
    }
}

fn path(sheet: &Sheet, line: &[[f64; 2]]) -> String {
    let mut text = String::new();
    for (at, point) in line.iter().enumerate() {
        let (x, y) = sheet.at(*point);
        let _ = write!(text, "{}{x:.1} {y:.1}", if at == 0 { "M" } else { "L" });
    }
    text
}

fn draw_mains(out: &mut String, sheet: &Sheet, mains: &[Value]) -> std::fmt::Result {
    for main in mains {
        let bore_mm = main["properties"]["used_mm"].as_f64().unwrap_or(0.0);
        let (colour, dash) = match main["properties"]["served"].as_str() {
            Some("yes") => ("#5b6770", ""),
            _ => ("#b9b4aa", " stroke-dasharray=\"4 3\""),
        };
        let width = (0.6 + bore_mm / 90.0).min(6.0);
        for line in lines(main).iter().filter(|line| line.len() > 1) {
            let path = path(sheet, line);
            writeln!(
                out,
                "<path d=\"{path}\" fill=\"none\" stroke=\"{colour}\" stroke-width=\"{width:.1}\"{dash}/>"
            )?;
        }
    }
    Ok(())
}

fn draw_nodes(out: &mut String, sheet: &Sheet, nodes: &[Value]) -> std::fmt::Result {
    for node in nodes {
        let properties = &node["properties"];
        let colour = match (properties["low_flag"].as_str(), properties["margin_m"].as_f64()) {
            (Some("low"), _) => LOW,
            (Some("ok"), Some(margin_m)) if margin_m < 7.0 => NEAR,
            (Some("ok"), _) => FINE,
            _ => continue,
        };
        for [x, y] in lines(node).into_iter().flatten() {
            let (x, y) = sheet.at([x, y]);
            writeln!(out, "<circle cx=\"{x:.1}\" cy=\"{y:.1}\" r=\"4\" fill=\"{colour}\"/>")?;
        }
    }
    for node in nodes
        .iter()
        .filter(|node| matches!(node["properties"]["kind"].as_str(), Some("source" | "tank")))
    {
        for point in lines(node).into_iter().flatten() {
            let (x, y) = sheet.at(point);
            writeln!(
                out,
                "<rect x=\"{:.1}\" y=\"{:.1}\" width=\"16\" height=\"16\" fill=\"#1b4965\"/>",
                x - 8.0,
                y - 8.0
            )?;
        }
    }
    Ok(())
}

fn draw_hydrants(out: &mut String, sheet: &Sheet, hydrants: &[Value]) -> std::fmt::Result {
    for hydrant in hydrants
        .iter()
        .filter(|hydrant| hydrant["properties"]["fire_flag"].as_str() == Some("short"))
    {
        for point in lines(hydrant).into_iter().flatten() {
            let (x, y) = sheet.at(point);
            writeln!(
                out,
                "<circle cx=\"{x:.1}\" cy=\"{y:.1}\" r=\"7\" fill=\"none\" stroke=\"#b2182b\" stroke-width=\"2.2\"/>"
            )?;
        }
    }
    Ok(())
}

fn draw_findings(out: &mut String, sheet: &Sheet, findings: &[Value]) -> std::fmt::Result {
    let of_map = |finding: &&Value| {
        let properties = &finding["properties"];
        properties["about"].as_str() == Some("map") && properties["severity"].as_str() != Some("note")
    };
    for finding in findings.iter().filter(of_map) {
        for point in lines(finding).into_iter().flatten() {
            let (x, y) = sheet.at(point);
            let (left, right, top, foot) = (x - 6.0, x + 6.0, y - 7.0, y + 5.0);
            writeln!(
                out,
                "<path d=\"M{left:.1} {foot:.1}L{x:.1} {top:.1}L{right:.1} {foot:.1}Z\" fill=\"#ffd23f\" stroke=\"#3a3a3a\"/>"
            )?;
        }
    }
    Ok(())
}

fn legend(out: &mut String, sheet: &Sheet) -> std::fmt::Result {
    let x = WIDTH - LEGEND;
    let mut y = MARGIN + 10.0;
    let mut row = |mark: &str, words: &str| {
        let line = writeln!(
            out,
            "<g transform=\"translate({x:.0} {y:.0})\">{mark}<text x=\"20\" y=\"5\">{words}</text></g>"
        );
        y += 26.0;
        line
    };
    row(&format!("<circle r=\"5\" fill=\"{LOW}\"/>"), "pressure below its limit")?;
    row(&format!("<circle r=\"5\" fill=\"{NEAR}\"/>"), "less than 7 m above it")?;
    row(&format!("<circle r=\"5\" fill=\"{FINE}\"/>"), "pressure in order")?;
    row(
        "<circle r=\"7\" fill=\"none\" stroke=\"#b2182b\" stroke-width=\"2.2\"/>",
        "hydrant short of fire flow",
    )?;
    row(
        "<path d=\"M-6 5L0 -7L6 5Z\" fill=\"#ffd23f\" stroke=\"#3a3a3a\"/>",
        "fault of the map",
    )?;
    row(
        "<rect x=\"-8\" y=\"-8\" width=\"16\" height=\"16\" fill=\"#1b4965\"/>",
        "source or tank",
    )?;
    row(
        "<path d=\"M-8 0H8\" stroke=\"#5b6770\" stroke-width=\"3\"/>",
        "main, wider where larger",
    )?;
    row(
        "<path d=\"M-8 0H8\" stroke=\"#b9b4aa\" stroke-width=\"2\" stroke-dasharray=\"4 3\"/>",
        "not calculated",
    )?;
    let bar = 500.0 * sheet.px_per_m;
    row(
        &format!("<path d=\"M-8 18h{bar:.1}m0 -5v10m-{bar:.1} 0v-10\" fill=\"none\" stroke=\"#3a3a3a\"/>"),
        "500 m",
    )
}
