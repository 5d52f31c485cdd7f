//! Damaged files: whatever is wrong with a layer, the answer is a sentence or a whole layer, never a panic and never a
//! part of a layer taken for all of it.

use std::cell::Cell as Counter;
use std::fs;
use std::io::{self, Write};
use std::path::{Path, PathBuf};

use gradeline::finding::{Checked, Code, Error};
use gradeline::layers::result_columns::Holds;
use gradeline::layers::{
    Cell, Disk, Field, Format, Geometry, Layer, NewLayer, OutputDir, ReadOptions, SUMMARY, Shape, Store, Table,
    write_marked, write_new,
};

const TOWN: &str = r#"{"type":"FeatureCollection","name":"mains","crs":{"type":"name","properties":{"name":"EPSG:2264"}},
"features":[
{"type":"Feature","properties":{"main_id":"M-1","diam_mm":150,"note":"Hauptstraße"},"geometry":{"type":"LineString","coordinates":[[1450000,540000],[1450100.5,540020.25]]}},
{"type":"Feature","properties":{"main_id":"M-2","diam_mm":100.5,"note":null},"geometry":{"type":"MultiLineString","coordinates":[[[1450100.5,540020.25],[1450200,540000]],[[1450300,540000],[1450400,540000]]]}},
{"type":"Feature","properties":{"main_id":"M-3","diam_mm":null,"note":"x"},"geometry":null}
]}
"#;

fn read(path: &Path) -> Result<Checked<Layer>, Error> {
    let options = ReadOptions {
        columns: ["main_id", "diam_mm", "note"].map(String::from).to_vec(),
        encoding: None,
    };
    Layer::read(path, 0, &options)
}

fn marks(rows: u32) -> Table {
    Table {
        fields: vec![Field {
            name: "vel_flag".into(),
            holds: Holds::Text,
        }],
        columns: vec![(0..rows).map(|_| Cell::Text("ok".into())).collect()],
    }
}

/// The town as GeoJSON and as a shapefile, in a folder of its own.
fn town(folder: &Path) -> [PathBuf; 2] {
    let geojson = folder.join("town.geojson");
    fs::write(&geojson, TOWN).unwrap();
    let layer = read(&geojson).unwrap().value;
    let mut out = OutputDir::open(&folder.join("shapefile"), &[]).unwrap();
    write_marked(&mut out, "town", &layer, &marks(3), Format::Shapefile).unwrap();
    out.finish().unwrap();
    [geojson, folder.join("shapefile/town.shp")]
}

/// What matters of a layer, to tell a whole one from a part.
fn content(layer: &Layer) -> String {
    let shapes: Vec<String> = (0..layer.rows()).map(|row| format!("{:?}", layer.shape(row))).collect();
    format!("{} rows, {:?}, {:?}", layer.rows(), shapes, layer.columns)
}

fn assert_is_a_sentence(error: &Error, what: &str) {
    let text = error.to_string();
    assert!(
        text.ends_with('.') || matches!(error, Error::File { .. }),
        "{what}: {text}"
    );
    assert!(text.contains("town."), "{what} does not name the file: {text}");
}

#[test]
fn every_file_cut_at_every_byte_is_an_error_or_a_whole_layer() {
    let folder = tempfile::tempdir().unwrap();
    for path in town(folder.path()) {
        let whole = content(&read(&path).unwrap().value);
        for ending in ["geojson", "shp", "shx", "dbf", "prj", "cpg"] {
            let file = path.with_extension(ending);
            let Ok(bytes) = fs::read(&file) else { continue };
            for end in 0..bytes.len() {
                fs::write(&file, &bytes[..end]).unwrap();
                match read(&path) {
                    Err(error) => assert_is_a_sentence(&error, ending),
                    // The system and the encoding may be in doubt then, and said to be; the rest is there.
                    Ok(read) if ending == "cpg" => assert_eq!(read.value.rows(), 3),
                    Ok(read) => assert_eq!(content(&read.value), whole, "{ending} cut at {end}"),
                }
            }
            fs::write(&file, &bytes).unwrap();
        }
    }
}

#[test]
fn files_with_any_byte_changed_never_panic() {
    let folder = tempfile::tempdir().unwrap();
    for path in town(folder.path()) {
        for ending in ["geojson", "shp", "shx", "dbf", "prj", "cpg"] {
            let file = path.with_extension(ending);
            let Ok(bytes) = fs::read(&file) else { continue };
            for place in 0..bytes.len() {
                let mut damaged = bytes.clone();
                // A different byte at each place, the same in each run.
                damaged[place] ^= (place as u8).wrapping_mul(37) | 1;
                fs::write(&file, &damaged).unwrap();
                if let Err(error) = read(&path) {
                    assert_is_a_sentence(&error, ending);
                }
            }
            fs::write(&file, &bytes).unwrap();
        }
    }
}

#[test]
fn sample_layers_cut_at_many_places_are_errors() {
    let samples = Path::new(env!("CARGO_MANIFEST_DIR")).join("sample-data");
    let folder = tempfile::tempdir().unwrap();
    let mut files = Vec::new();
    collect(&samples, &mut files);
    let mut cuts = 0;
    for path in files.iter().filter(|path| Format::of_path(path).is_some()) {
        let bytes = fs::read(path).unwrap();
        let copy = folder.path().join("town.").with_extension(path.extension().unwrap());
        for part in 0..40 {
            fs::write(&copy, &bytes[..bytes.len() * part / 40]).unwrap();
            assert_is_a_sentence(&read(&copy).unwrap_err(), "a sample");
            cuts += 1;
        }
    }
    assert!(cuts > 0, "the sample has layers");
}

fn collect(folder: &Path, files: &mut Vec<PathBuf>) {
    for entry in fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            collect(&path, files);
        } else {
            files.push(path);
        }
    }
}

#[test]
fn layers_without_rows_are_read_and_written() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("town.geojson");
    fs::write(&path, r#"{"type":"FeatureCollection","features":[]}"#).unwrap();
    let layer = read(&path).unwrap().value;
    assert_eq!((layer.rows(), layer.bounds(), layer.middle()), (0, None, None));
    for format in [Format::GeoJson, Format::Shapefile] {
        let target = folder.path().join(format.name());
        let mut out = OutputDir::open(&target, &[]).unwrap();
        write_marked(&mut out, "town", &layer, &marks(0), format).unwrap();
        let lines = Geometry::Lines(Vec::new());
        let parts = NewLayer {
            name: "parts",
            crs: &layer.crs,
            geometry: &lines,
            table: &marks(0),
        };
        write_new(&mut out, &parts, format).unwrap();
        out.finish().unwrap();
        let ending = if format == Format::GeoJson { "geojson" } else { "shp" };
        for name in ["town", "parts"] {
            assert_eq!(read(&target.join(name).with_extension(ending)).unwrap().value.rows(), 0);
        }
    }
}

#[test]
fn a_byte_order_mark_is_no_damage_and_other_encodings_are_said() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("town.geojson");
    let whole = |bytes: &[u8]| {
        fs::write(&path, bytes).unwrap();
        read(&path)
    };
    assert_eq!(whole(format!("\u{feff}{TOWN}").as_bytes()).unwrap().value.rows(), 3);
    let latin: Vec<u8> = TOWN.chars().map(|letter| letter as u8).collect();
    let error = whole(&latin).unwrap_err().to_string();
    assert!(error.contains("line 3 is not UTF-8"), "{error}");
    let wide: Vec<u8> = "\u{feff}{}".encode_utf16().flat_map(u16::to_le_bytes).collect();
    assert!(whole(&wide).unwrap_err().to_string().contains("UTF-16"));
}

#[test]
fn values_of_the_wrong_type_are_kept_as_they_are() {
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("town.geojson");
    fs::write(
        &path,
        TOWN.replace("\"M-2\"", "[1,{}]")
            .replace("100.5,\"note\"", "\"6 in\",\"note\""),
    )
    .unwrap();
    let layer = read(&path).unwrap().value;
    assert_eq!(layer.column("main_id").unwrap().cells[1], Cell::Text("[1,{}]".into()));
    assert_eq!(layer.column("DIAM_MM").unwrap().cells[1], Cell::Text("6 in".into()));
    fs::write(&path, TOWN.replace("[1450000,540000]", "[\"1450000\",null]")).unwrap();
    assert_eq!(read(&path).unwrap().value.shape(0), Shape::NotFinite);
    fs::write(&path, TOWN.replace("[1450000,540000]", "[NaN,540000]")).unwrap();
    assert!(read(&path).unwrap_err().to_string().contains("not-a-number"));
}

#[test]
fn a_shapefile_without_its_side_files_says_what_it_assumes() {
    let folder = tempfile::tempdir().unwrap();
    let [_, path] = town(folder.path());
    fs::remove_file(path.with_extension("shx")).unwrap();
    fs::remove_file(path.with_extension("cpg")).unwrap();
    let doubts = read(&path).unwrap();
    assert_eq!(doubts.value.rows(), 3);
    assert_eq!(
        doubts.findings.iter().map(|f| f.code).collect::<Vec<_>>(),
        [Code::EncodingDoubtful]
    );
    fs::remove_file(path.with_extension("dbf")).unwrap();
    fs::remove_file(path.with_extension("prj")).unwrap();
    let bare = read(&path).unwrap();
    assert_eq!((bare.value.rows(), bare.value.column_names.len()), (3, 0));
    assert_eq!(
        bare.findings.iter().map(|f| f.code).collect::<Vec<_>>(),
        [Code::CrsAssumed]
    );
}

#[test]
fn endings_are_found_in_any_case() {
    let folder = tempfile::tempdir().unwrap();
    let [_, path] = town(folder.path());
    let whole = content(&read(&path).unwrap().value);
    for ending in ["shp", "shx", "dbf", "prj", "cpg"] {
        fs::rename(path.with_extension(ending), path.with_extension(ending.to_uppercase())).unwrap();
    }
    let read = read(&path.with_extension("SHP")).unwrap();
    assert!(read.findings.is_empty());
    assert_eq!(content(&read.value), whole);
}

/// A disk on which the n-th write of bytes fails.
struct FullAfter {
    left: std::rc::Rc<Counter<u32>>,
}

struct CountedFile {
    file: Box<dyn Write>,
    left: std::rc::Rc<Counter<u32>>,
}

impl Store for FullAfter {
    fn create(&self, path: &Path) -> io::Result<Box<dyn Write>> {
        let file = Disk.create(path)?;
        let left = self.left.clone();
        Ok(Box::new(CountedFile { file, left }))
    }
}

impl Write for CountedFile {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        match self.left.get() {
            0 => Err(io::Error::other("no space left on the disk")),
            left => {
                self.left.set(left - 1);
                // Half of what is asked, so that a file can fail in its middle.
                self.file.write(&bytes[..bytes.len().div_ceil(2)])
            }
        }
    }

    fn flush(&mut self) -> io::Result<()> {
        self.file.flush()
    }
}

#[test]
fn whichever_write_fails_the_results_stay_as_they_were() {
    let folder = tempfile::tempdir().unwrap();
    let target = folder.path().join("results");
    for source in town(folder.path()) {
        let layer = read(&source).unwrap().value;
        for format in [Format::GeoJson, Format::Shapefile] {
            let run = |store: &dyn Store| -> Result<Vec<PathBuf>, Error> {
                let mut out = OutputDir::open_in(&target, std::slice::from_ref(&source), store)?;
                write_marked(&mut out, "town", &layer, &marks(3), format)?;
                let files: Vec<String> = out.files().to_vec();
                out.write(SUMMARY, |file| write!(file, "{{\"files\":{files:?}}}"))?;
                out.finish()
            };
            run(&Disk).unwrap();
            let before = snapshot(folder.path());
            let mut failures = 0;
            loop {
                let left = std::rc::Rc::new(Counter::new(failures));
                let Err(error) = run(&FullAfter { left }) else { break };
                assert!(error.to_string().contains("no space left"), "{error}");
                assert_eq!(snapshot(folder.path()), before);
                failures += 1;
            }
            assert!(failures > 5, "{failures}");
        }
    }
}

/// Every file under a folder with its bytes.
fn snapshot(folder: &Path) -> Vec<(PathBuf, Vec<u8>)> {
    let mut files = Vec::new();
    collect(folder, &mut files);
    files.sort();
    files
        .into_iter()
        .map(|path| (path.clone(), fs::read(path).unwrap()))
        .collect()
}
