//! Reading files whole, and their checksums.

use std::fmt::Write as _;
use std::path::{Path, PathBuf};

use sha2::{Digest, Sha256};

use crate::finding::Error;

/// The bytes of a file.
pub(super) fn read(path: &Path) -> Result<Vec<u8>, Error> {
    std::fs::read(path).map_err(|cause| Error::file(path, "read", cause))
}

/// SHA-256 in hexadecimal.
pub(super) fn sha256(bytes: &[u8]) -> String {
    let mut text = String::with_capacity(64);
    for byte in Sha256::digest(bytes) {
        let _ = write!(text, "{byte:02x}");
    }
    text
}

/// The file beside `path` with another ending, whatever the case of either; an exact spelling goes first.
pub(super) fn sibling(path: &Path, ending: &str) -> Option<PathBuf> {
    let exact = path.with_extension(ending);
    if exact.is_file() {
        return Some(exact);
    }
    let folder = match path.parent() {
        Some(folder) if !folder.as_os_str().is_empty() => folder,
        _ => Path::new("."),
    };
    let stem = path.file_stem()?.to_string_lossy().to_lowercase();
    let mut fitting: Vec<PathBuf> = std::fs::read_dir(folder)
        .ok()?
        .filter_map(|entry| Some(entry.ok()?.path()))
        .filter(|other| {
            let same_stem = other
                .file_stem()
                .is_some_and(|s| s.to_string_lossy().to_lowercase() == stem);
            let same_ending = other.extension().is_some_and(|e| e.eq_ignore_ascii_case(ending));
            same_stem && same_ending && other.is_file()
        })
        .collect();
    // A folder's order is not fixed; the file whose stem is spelt like ours goes first.
    fitting.sort_by_key(|other| (other.file_stem() != path.file_stem(), other.clone()));
    fitting.into_iter().next()
}
