//! Writing all or nothing: everything goes to a temporary folder beside the target, which is renamed when all is done.
//!
//! Results of an earlier run are replaced only where its `summary.json` lists them; what else lies in the folder stays.
//! An input is never overwritten.

use std::collections::BTreeSet;
use std::fs;
use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};

use super::layer::Format;
use crate::finding::Error;

/// The file that marks a folder as results of ours. Its member `files` lists the names of all files that were written.
pub const SUMMARY: &str = "summary.json";

/// What an [`OutputDir`] does to the disk. Tests put a failing one in its place.
pub trait Store {
    /// Makes a folder and those above it.
    ///
    /// # Errors
    /// As the system says.
    fn create_folder(&self, path: &Path) -> io::Result<()> {
        fs::create_dir_all(path)
    }

    /// Makes a file to be written.
    ///
    /// # Errors
    /// As the system says.
    fn create(&self, path: &Path) -> io::Result<Box<dyn Write>> {
        fs::File::create_new(path).map(|file| Box::new(file) as Box<dyn Write>)
    }

    /// Renames a file or folder.
    ///
    /// # Errors
    /// As the system says.
    fn rename(&self, from: &Path, to: &Path) -> io::Result<()> {
        fs::rename(from, to)
    }
}

/// The disk itself.
#[derive(Clone, Copy, Debug, Default)]
pub struct Disk;

impl Store for Disk {}

/// A folder of results that comes into being whole, or not at all. Dropped before [`OutputDir::finish`], it leaves
/// nothing.
pub struct OutputDir<'s> {
    target: PathBuf,
    temporary: PathBuf,
    inputs: BTreeSet<PathBuf>,
    earlier: BTreeSet<String>,
    files: Vec<String>,
    store: &'s dyn Store,
}

impl OutputDir<'static> {
    /// Opens a folder for results. `inputs` are all files that were read; of a shapefile the `.shp` stands for all.
    ///
    /// # Errors
    /// A target that is a file, that holds anything but results of an earlier run, or beside which nothing can be made.
    pub fn open(target: &Path, inputs: &[PathBuf]) -> Result<Self, Error> {
        OutputDir::open_in(target, inputs, &Disk)
    }
}

impl<'s> OutputDir<'s> {
    /// As [`OutputDir::open`], on another store than the plain disk.
    ///
    /// # Errors
    /// As [`OutputDir::open`].
    pub fn open_in(target: &Path, inputs: &[PathBuf], store: &'s dyn Store) -> Result<Self, Error> {
        let earlier = check_target(target)?;
        // A link is followed, so that the folder it points to is replaced and not the link.
        let target = fs::canonicalize(target).or_else(|_| std::path::absolute(target));
        let target = target.map_err(|cause| Error::file(Path::new("."), "find", cause))?;
        let name = target
            .file_name()
            .map(|name| name.to_string_lossy().into_owned())
            .unwrap_or_default();
        let Some(parent) = target.parent().filter(|_| !name.is_empty()) else {
            return Err(Error::input(
                &target,
                "results cannot be written here",
                "Name a folder of their own for them.",
            ));
        };
        let temporary = parent.join(format!(".{name}.writing-{}", std::process::id()));
        // Only a killed run with the same process number can have left one.
        let _ = fs::remove_dir_all(&temporary);
        store
            .create_folder(&temporary)
            .map_err(|cause| Error::file(&target, "make the folder", cause))?;
        Ok(OutputDir {
            inputs: inputs.iter().flat_map(|input| every_file_of(input)).collect(),
            target,
            temporary,
            earlier,
            files: Vec::new(),
            store,
        })
    }

    /// Writes one file of the results.
    ///
    /// # Errors
    /// A name that an input has, or what the system says.
    pub fn write(&mut self, name: &str, fill: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> Result<(), Error> {
        let place = self.target.join(name);
        if self.inputs.contains(&place) {
            return Err(Error::input(
                &place,
                "this result would overwrite a file that was read",
                "Name another folder for the results, or move the input out of this one.",
            ));
        }
        if !self.earlier.contains(name) && place.exists() {
            return Err(Error::input(
                &place,
                "a file of this name is there that no earlier run wrote",
                "Name another folder for the results, or move that file.",
            ));
        }
        let failed = |cause| Error::file(&place, "write", cause);
        let file = self.store.create(&self.temporary.join(name)).map_err(failed)?;
        let mut buffered = BufWriter::with_capacity(1 << 17, file);
        fill(&mut buffered).and_then(|()| buffered.flush()).map_err(failed)?;
        self.files.push(name.to_string());
        Ok(())
    }

    /// Names of the files written so far, for `summary.json`.
    pub fn files(&self) -> &[String] {
        &self.files
    }

    /// The folder the results will be in.
    pub fn target(&self) -> &Path {
        &self.target
    }

    /// Puts the results in place and says where each file is.
    ///
    /// # Errors
    /// What the system says; the target is then as it was.
    pub fn finish(self) -> Result<Vec<PathBuf>, Error> {
        let failed = |cause| Error::file(&self.target, "put the results in", cause);
        if self.target.is_dir() {
            self.swap().map_err(failed)?;
        } else {
            self.store.rename(&self.temporary, &self.target).map_err(failed)?;
        }
        Ok(self.files.iter().map(|name| self.target.join(name)).collect())
    }

    /// Puts the new folder in the place of the old one, and brings over what is not ours.
    fn swap(&self) -> io::Result<()> {
        let aside = self.temporary.with_extension(format!("earlier-{}", std::process::id()));
        self.store.rename(&self.target, &aside)?;
        let moved = self
            .keep_others(&aside)
            .and_then(|()| self.store.rename(&self.temporary, &self.target));
        if let Err(cause) = moved {
            // Back to what it was: what was brought over goes back first.
            self.return_others(&aside)?;
            fs::rename(&aside, &self.target)?;
            return Err(cause);
        }
        // The results are in place; earlier ones that cannot be removed are no reason to fail.
        let _ = fs::remove_dir_all(&aside);
        Ok(())
    }

    fn is_ours(&self, name: &str) -> bool {
        let is_input = self.inputs.contains(&self.target.join(name));
        !is_input && (self.earlier.contains(name) || self.files.iter().any(|written| written == name))
    }

    fn keep_others(&self, aside: &Path) -> io::Result<()> {
        for entry in fs::read_dir(aside)? {
            let entry = entry?;
            if !self.is_ours(&entry.file_name().to_string_lossy()) {
                self.store
                    .rename(&entry.path(), &self.temporary.join(entry.file_name()))?;
            }
        }
        Ok(())
    }

    fn return_others(&self, aside: &Path) -> io::Result<()> {
        for entry in fs::read_dir(&self.temporary)? {
            let entry = entry?;
            if !self
                .files
                .iter()
                .any(|written| **written == *entry.file_name().to_string_lossy())
            {
                fs::rename(entry.path(), aside.join(entry.file_name()))?;
            }
        }
        Ok(())
    }
}

impl Drop for OutputDir<'_> {
    fn drop(&mut self) {
        let _ = fs::remove_dir_all(&self.temporary);
    }
}

/// Whether results may go here; the names of an earlier run's files if there are any.
fn check_target(target: &Path) -> Result<BTreeSet<String>, Error> {
    let entries = match fs::read_dir(target) {
        Err(cause) if cause.kind() == io::ErrorKind::NotFound => return Ok(BTreeSet::new()),
        Err(cause) => return Err(Error::file(target, "write results into it: it cannot be listed", cause)),
        Ok(entries) => entries,
    };
    if entries.count() == 0 {
        return Ok(BTreeSet::new());
    }
    let summary = fs::read(target.join(SUMMARY)).ok();
    let listed = summary
        .and_then(|bytes| serde_json::from_slice::<serde_json::Value>(&bytes).ok())
        .and_then(|summary| {
            let names = summary.get("files")?.as_array()?;
            let names = names.iter().filter_map(|name| Some(name.as_str()?.to_string()));
            Some(names.chain([SUMMARY.to_string()]).collect())
        });
    listed.ok_or_else(|| {
        Error::input(
            target,
            "the folder holds something else than results of an earlier run",
            "Name a new or empty folder for the results.",
        )
    })
}

/// Every file that an input stands for, as canonical paths.
fn every_file_of(input: &Path) -> Vec<PathBuf> {
    let mut all = vec![input.to_path_buf()];
    if Format::of_path(input) == Some(Format::Shapefile) {
        all.extend(
            ["shx", "dbf", "prj", "cpg"]
                .iter()
                .filter_map(|ending| super::files::sibling(input, ending)),
        );
    }
    all.iter().filter_map(|path| fs::canonicalize(path).ok()).collect()
}
