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

#[cfg(test)]
mod tests {
    use super::*;
    use std::cell::Cell;

    /// A store whose n-th step fails, counted over all kinds of steps.
    struct Failing {
        left: Cell<u32>,
    }

    impl Failing {
        fn step(&self) -> io::Result<()> {
            if self.left.get() == 0 {
                return Err(io::Error::other("the disk is full"));
            }
            self.left.set(self.left.get() - 1);
            Ok(())
        }
    }

    impl Store for Failing {
        fn create_folder(&self, path: &Path) -> io::Result<()> {
            self.step()?;
            Disk.create_folder(path)
        }

        fn create(&self, path: &Path) -> io::Result<Box<dyn Write>> {
            self.step()?;
            let file = Disk.create(path)?;
            // The file's own writes fail at the same count.
            match self.step() {
                Ok(()) => Ok(file),
                Err(_) => Ok(Box::new(Full)),
            }
        }

        fn rename(&self, from: &Path, to: &Path) -> io::Result<()> {
            self.step()?;
            Disk.rename(from, to)
        }
    }

    struct Full;

    impl Write for Full {
        fn write(&mut self, _: &[u8]) -> io::Result<usize> {
            Err(io::Error::other("the disk is full"))
        }

        fn flush(&mut self) -> io::Result<()> {
            Ok(())
        }
    }

    fn results(target: &Path, inputs: &[PathBuf], store: &dyn Store, content: &str) -> Result<Vec<PathBuf>, Error> {
        let mut out = OutputDir::open_in(target, inputs, store)?;
        out.write("mains.geojson", |file| file.write_all(content.as_bytes()))?;
        out.write("nodes.geojson", |file| file.write_all(content.as_bytes()))?;
        out.write(SUMMARY, |file| {
            file.write_all(b"{\"files\":[\"mains.geojson\",\"nodes.geojson\"]}")
        })?;
        out.finish()
    }

    /// Everything in a folder: names and contents.
    fn everything(folder: &Path) -> Vec<(String, String)> {
        let mut all: Vec<(String, String)> = fs::read_dir(folder)
            .unwrap()
            .flat_map(|entry| {
                let path = entry.unwrap().path();
                let name = path.file_name().unwrap().to_string_lossy().into_owned();
                match path.is_dir() {
                    true => everything(&path)
                        .into_iter()
                        .map(|(inner, text)| (format!("{name}/{inner}"), text))
                        .collect(),
                    false => vec![(name, fs::read_to_string(&path).unwrap())],
                }
            })
            .collect();
        all.sort();
        all
    }

    #[test]
    fn results_come_whole_and_replace_earlier_ones_alone() {
        let place = tempfile::tempdir().unwrap();
        let target = place.path().join("a/results");
        let written = results(&target, &[], &Disk, "one").unwrap();
        assert_eq!(written[0], fs::canonicalize(&target).unwrap().join("mains.geojson"));
        fs::write(target.join("my notes.txt"), "mine").unwrap();
        fs::create_dir(target.join("drawings")).unwrap();
        fs::write(target.join("drawings/a.qgz"), "mine").unwrap();
        let mut out = OutputDir::open(&target, &[]).unwrap();
        out.write("mains.geojson", |file| file.write_all(b"two")).unwrap();
        out.write(SUMMARY, |file| file.write_all(b"{\"files\":[\"mains.geojson\"]}"))
            .unwrap();
        assert_eq!(out.files(), ["mains.geojson", SUMMARY]);
        out.finish().unwrap();
        let names: Vec<String> = everything(place.path()).into_iter().map(|(name, _)| name).collect();
        assert_eq!(
            names,
            [
                "a/results/drawings/a.qgz",
                "a/results/mains.geojson",
                "a/results/my notes.txt",
                "a/results/summary.json"
            ],
            "nodes.geojson of the earlier run is gone, what is not ours is there, and nothing is left beside"
        );
        assert_eq!(fs::read_to_string(target.join("mains.geojson")).unwrap(), "two");
    }

    #[test]
    fn whichever_step_fails_the_folder_stays_as_it_was() {
        let place = tempfile::tempdir().unwrap();
        let target = place.path().join("results");
        let mut failures = 0;
        for earlier in [false, true] {
            if earlier {
                results(&target, &[], &Disk, "one").unwrap();
                fs::write(target.join("notes.txt"), "mine").unwrap();
                fs::write(target.join("more notes.txt"), "mine").unwrap();
            }
            let before = everything(place.path());
            for step in 0.. {
                let store = Failing { left: Cell::new(step) };
                match results(&target, &[], &store, "two") {
                    Err(error) => {
                        assert!(error.to_string().contains("the disk is full"), "{error}");
                        assert_eq!(everything(place.path()), before, "step {step}");
                        failures += 1;
                    }
                    Ok(_) => break,
                }
            }
            fs::remove_dir_all(&target).unwrap();
        }
        assert!(failures > 15, "{failures}");
    }

    #[test]
    fn folders_and_files_that_are_not_ours_are_refused() {
        let place = tempfile::tempdir().unwrap();
        let target = place.path().join("results");
        fs::create_dir(&target).unwrap();
        results(&target, &[], &Disk, "into an empty folder").unwrap();
        let input = target.join("mains.geojson");
        let before = everything(place.path());
        let error = results(&target, std::slice::from_ref(&input), &Disk, "two").unwrap_err();
        assert!(
            error.to_string().contains("would overwrite a file that was read"),
            "{error}"
        );
        assert_eq!(everything(place.path()), before);
        fs::write(target.join(SUMMARY), "{\"files\":[\"mains.geojson\"]}").unwrap();
        let error = results(&target, &[], &Disk, "two").unwrap_err();
        assert!(error.to_string().contains("no earlier run wrote"), "{error}");
        fs::write(target.join(SUMMARY), "{}").unwrap();
        let error = results(&target, &[], &Disk, "two").unwrap_err();
        assert!(error.to_string().contains("something else than results"), "{error}");
        assert!(results(&input, &[], &Disk, "two").is_err(), "the target is a file");
        assert!(results(Path::new("/"), &[], &Disk, "two").is_err());
    }

    #[test]
    fn an_input_that_no_result_is_named_like_is_kept() {
        let place = tempfile::tempdir().unwrap();
        let target = place.path().join("results");
        results(&target, &[], &Disk, "one").unwrap();
        let input = target.join("nodes.geojson");
        let mut out = OutputDir::open(&target, std::slice::from_ref(&input)).unwrap();
        out.write("mains.geojson", |file| file.write_all(b"two")).unwrap();
        out.finish().unwrap();
        assert_eq!(fs::read_to_string(input).unwrap(), "one");
    }
}
