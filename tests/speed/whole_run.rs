//! File to files on a street-like map: seconds of each stage, and the peak memory where the system tells it.
//!
//! `cargo bench --bench whole_run [-- MAINS]`, 100,000 mains unless said otherwise. No hydrants: the cost of those is
//! measured apart.

use std::fmt::Write as _;
use std::path::Path;
use std::sync::Mutex;
use std::time::Instant;

use gradeline::study::{RunOptions, Study, run_and_write};
use gradeline::watch::Watch;

/// Notes when each stage begins.
struct Stages(Mutex<Vec<(&'static str, Instant)>>);

impl Watch for Stages {
    fn progress(&self, stage: &'static str, _done: u64, _total: u64) {
        let mut seen = self.0.lock().expect("no stage panics");
        if seen.last().is_none_or(|(last, _)| *last != stage) {
            seen.push((stage, Instant::now()));
        }
    }
}

fn main() {
    let asked = std::env::args().skip(1).find_map(|argument| argument.parse().ok());
    let mains: usize = asked.unwrap_or(100_000);
    let folder = tempfile::tempdir().expect("a temporary folder");
    let made = Instant::now();
    write_town(folder.path(), mains);
    println!("{mains} mains made in {:.2} s", made.elapsed().as_secs_f64());
    let stages = Stages(Mutex::new(Vec::new()));
    let begun = Instant::now();
    let study = Study::read(&folder.path().join("study.toml")).expect("a good study");
    let options = RunOptions {
        out: Some(folder.path().join("results")),
        ..RunOptions::default()
    };
    run_and_write(&study, &options, &stages).expect("a good run");
    let ended = Instant::now();
    let seen = stages.0.into_inner().expect("no stage panics");
    for (at, (stage, start)) in seen.iter().enumerate() {
        let end = seen.get(at + 1).map_or(ended, |next| next.1);
        println!("{:>8.3} s  {stage}", (end - *start).as_secs_f64());
    }
    println!("{:>8.3} s  in all", (ended - begun).as_secs_f64());
    if let Some(peak) = peak_memory_mb() {
        println!("{peak:>8.0} MB peak memory");
    }
}

/// The high-water mark of this process, MB, where the system tells it.
fn peak_memory_mb() -> Option<f64> {
    let status = std::fs::read_to_string("/proc/self/status").ok()?;
    let line = status.lines().find(|line| line.starts_with("VmHWM:"))?;
    Some(line.split_whitespace().nth(1)?.parse::<f64>().ok()? / 1024.0)
}

/// A grid of streets with a bend in each, one main a block side, every node with an elevation and a demand.
fn write_town(folder: &Path, mains: usize) {
    // A grid of n by n nodes has 2 n (n - 1) mains.
    let across = ((mains as f64 / 2.0).sqrt().ceil() as usize) + 1;
    let place = |column: usize, row: usize| {
        let (x, y) = (column as f64 * 0.001, row as f64 * 0.0008);
        [
            10.0 + x + 0.0002 * (y * 900.0).sin(),
            -40.0 + y + 0.0002 * (x * 700.0).cos(),
        ]
    };
    let mut lines = String::from("{\"type\":\"FeatureCollection\",\"features\":[\n");
    let mut count = 0;
    'all: for row in 0..across {
        for column in 0..across {
            for (to_column, to_row) in [(column + 1, row), (column, row + 1)] {
                if to_column == across || to_row == across {
                    continue;
                }
                if count == mains {
                    break 'all;
                }
                let ([ax, ay], [bx, by]) = (place(column, row), place(to_column, to_row));
                let bore_mm = if row % 16 == 0 || column % 16 == 0 {
                    400
                } else {
                    [100, 150, 200][(row * 7 + column) % 3]
                };
                let comma = if count == 0 { "" } else { ",\n" };
                let _ = write!(
                    lines,
                    "{comma}{{\"type\":\"Feature\",\"properties\":{{\"id\":\"M{count}\",\"diam_mm\":{bore_mm},\"c_hw\":{},\"year\":{},\"material\":\"DI\",\"street\":\"Row {row}\"}},\"geometry\":{{\"type\":\"LineString\",\"coordinates\":[[{ax:.8},{ay:.8}],[{:.8},{:.8}],[{bx:.8},{by:.8}]]}}}}",
                    90 + (row * 13 + column * 5) % 50,
                    1950 + (row + column) % 70,
                    (ax + bx) / 2.0 + 0.00003,
                    (ay + by) / 2.0 - 0.00002,
                );
                count += 1;
            }
        }
    }
    lines.push_str("\n]}\n");
    let mut points = String::from("{\"type\":\"FeatureCollection\",\"features\":[\n");
    for row in 0..across {
        for column in 0..across {
            let [x, y] = place(column, row);
            let comma = if row + column == 0 { "" } else { ",\n" };
            let head = if row % 100 == 50 && column % 100 == 50 || row + column == 0 {
                "120.0"
            } else {
                "null"
            };
            let _ = write!(
                points,
                "{comma}{{\"type\":\"Feature\",\"properties\":{{\"id\":\"N{row}-{column}\",\"elev_m\":{:.2},\"head_m\":{head},\"dem_lps\":0.03}},\"geometry\":{{\"type\":\"Point\",\"coordinates\":[{x:.8},{y:.8}]}}}}",
                40.0 + 15.0 * (x * 80.0).sin() + 10.0 * (y * 110.0).cos(),
            );
        }
    }
    points.push_str("\n]}\n");
    let study = r#"title = "A street grid"
[mains]
from = "mains.geojson"
id = "id"
diameter = { column = "diam_mm", unit = "mm" }
c_factor = "c_hw"
[nodes]
from = "nodes.geojson"
id = "id"
elevation = { column = "elev_m", unit = "m" }
head = { column = "head_m", unit = "m" }
demand = { column = "dem_lps", unit = "lps" }
[[case]]
name = "average day"
demand_times = 1.0
"#;
    for (name, text) in [
        ("mains.geojson", lines.as_str()),
        ("nodes.geojson", &points),
        ("study.toml", study),
    ] {
        std::fs::write(folder.join(name), text).expect("a temporary file can be written");
    }
}
