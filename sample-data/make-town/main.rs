//! Makes the sample town: `cargo run --release --example make-town [FOLDER]`. The folder is `sample-data` unless named.
//!
//! The town is invented, and so is everything in it. The same program makes the same bytes every time.

mod maker;

use std::path::{Path, PathBuf};
use std::process::ExitCode;

fn main() -> ExitCode {
    let into = std::env::args_os()
        .nth(1)
        .map_or(PathBuf::from("sample-data"), PathBuf::from);
    match write(&into) {
        Ok(files) => {
            println!("{files} files of the town {} are in {}", maker::NAME, into.display());
            ExitCode::SUCCESS
        }
        Err(cause) => {
            eprintln!("{}: cannot write the town: {cause}", into.display());
            ExitCode::FAILURE
        }
    }
}

/// Writes the town's files into a folder, and says how many there are.
fn write(into: &Path) -> std::io::Result<usize> {
    let files = maker::files();
    for (path, bytes) in &files {
        let path = into.join(path);
        std::fs::create_dir_all(path.parent().expect("every file lies in a folder"))?;
        std::fs::write(path, bytes)?;
    }
    Ok(files.len())
}
