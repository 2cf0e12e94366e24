//! Files written whole or not at all.

use std::fs;
use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};

use tempfile::NamedTempFile;

/// Input files that no result is named like: a folder with one of them holds a network.
const NETWORK_FILES: [&str; 11] = [
    "study.csv",
    "lines.csv",
    "matrices.csv",
    "constructions.csv",
    "conductors.csv",
    "spacings.csv",
    "switches.csv",
    "transformers.csv",
    "capacitors.csv",
    "motors.csv",
    "profiles.csv",
];

/// Writes a file by a temporary one beside it and a rename: a reader sees the old file or the new, never half.
///
/// # Errors
/// What the file system says; the old file is then untouched.
pub fn write_file(path: &Path, write: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> io::Result<()> {
    let folder = path.parent().filter(|p| !p.as_os_str().is_empty()).unwrap_or(Path::new("."));
    stage(folder, write)?.persist(path).map_err(|e| e.error)?;
    Ok(())
}

/// A temporary file in `folder` with all that `write` gives; it vanishes unless it is persisted.
fn stage(folder: &Path, write: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> io::Result<NamedTempFile> {
    let mut builder = tempfile::Builder::new();
    #[cfg(unix)]
    {
        // As any new file: readable to whom the user's mask allows, not to the user alone.
        use std::os::unix::fs::PermissionsExt as _;
        builder.permissions(fs::Permissions::from_mode(0o666));
    }
    let mut writer = BufWriter::with_capacity(1 << 16, builder.tempfile_in(folder)?);
    write(&mut writer)?;
    writer.into_inner().map_err(io::IntoInnerError::into_error)
}

/// A folder that results are written to: all files of a run, or none.
#[derive(Debug)]
pub struct Folder {
    path: PathBuf,
    staged: Vec<(NamedTempFile, PathBuf)>,
}

impl Folder {
    /// Makes the folder where it is not there.
    ///
    /// # Errors
    /// What the file system says, or that the folder holds a network, whose files results must not
    /// overwrite: the input folder or any other.
    pub fn new(path: &Path, input: &Path) -> io::Result<Folder> {
        // Made first: a path through folders that are not there yet may still end at the input.
        fs::create_dir_all(path).map_err(|e| {
            let why = if path.is_file() { "it is a file, not a folder".to_string() } else { e.to_string() };
            io::Error::new(e.kind(), format!("the folder {} cannot be made: {why}", path.display()))
        })?;
        if path.canonicalize()? == input.canonicalize()? {
            return Err(refused(format!(
                "{} is the network folder itself; results there would overwrite its files: name another folder",
                path.display()
            )));
        }
        if let Some(name) = network_file(path)? {
            return Err(refused(format!(
                "{} holds a network ({name}); results there would overwrite its files: name another folder",
                path.display()
            )));
        }
        Ok(Folder { path: path.to_owned(), staged: Vec::new() })
    }

    /// Writes a file beside its place; [`Folder::commit`] puts it there.
    ///
    /// # Errors
    /// What the file system says; nothing in the folder has changed then.
    pub fn write(
        &mut self,
        name: &str,
        write: impl FnOnce(&mut dyn Write) -> io::Result<()>,
    ) -> io::Result<()> {
        let file = stage(&self.path, write)?;
        self.staged.push((file, self.path.join(name)));
        Ok(())
    }

    /// Puts all files written so far in their places, each by a rename.
    ///
    /// # Errors
    /// What the file system says; a rename fails only where the folder changed meanwhile, such as
    /// by a folder of a file's name.
    pub fn commit(self) -> io::Result<()> {
        for (file, place) in self.staged {
            file.persist(place).map_err(|e| e.error)?;
        }
        Ok(())
    }
}

fn refused(text: String) -> io::Error {
    io::Error::new(io::ErrorKind::InvalidInput, text)
}

/// The first file, by name, that makes a folder a network's.
fn network_file(folder: &Path) -> io::Result<Option<String>> {
    let mut found = Vec::new();
    for entry in fs::read_dir(folder)? {
        let name = entry?.file_name().to_string_lossy().into_owned();
        if NETWORK_FILES.iter().any(|known| name.eq_ignore_ascii_case(known)) {
            found.push(name);
        }
    }
    found.sort_unstable();
    Ok(found.into_iter().next())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn names(folder: &Path) -> Vec<String> {
        let mut names: Vec<String> = fs::read_dir(folder)
            .unwrap()
            .map(|e| e.unwrap().file_name().to_string_lossy().into_owned())
            .collect();
        names.sort_unstable();
        names
    }

    #[test]
    fn all_files_of_a_run_or_none() {
        let (input, out) = (tempfile::tempdir().unwrap(), tempfile::tempdir().unwrap());
        fs::write(out.path().join("nodes.csv"), "old").unwrap();
        let mut folder = Folder::new(out.path(), input.path()).unwrap();
        folder.write("nodes.csv", |w| w.write_all(b"new")).unwrap();
        let failed = folder.write("loads.csv", |_| Err(io::Error::other("disk full")));
        assert!(failed.is_err());
        drop(folder);
        assert_eq!(names(out.path()), ["nodes.csv"]);
        assert_eq!(fs::read_to_string(out.path().join("nodes.csv")).unwrap(), "old");

        let mut folder = Folder::new(out.path(), input.path()).unwrap();
        folder.write("nodes.csv", |w| w.write_all(b"new")).unwrap();
        folder.commit().unwrap();
        assert_eq!(fs::read_to_string(out.path().join("nodes.csv")).unwrap(), "new");
    }

    #[test]
    fn a_folder_that_holds_a_network_is_refused() {
        let (input, other) = (tempfile::tempdir().unwrap(), tempfile::tempdir().unwrap());
        let roundabout = input.path().join("results").join("..");
        for same in [input.path(), roundabout.as_path()] {
            let error = Folder::new(same, input.path()).unwrap_err().to_string();
            assert!(error.contains("network folder itself"), "{error}");
        }
        fs::write(other.path().join("Lines.csv"), "").unwrap();
        let error = Folder::new(other.path(), input.path()).unwrap_err().to_string();
        assert!(error.contains("holds a network (Lines.csv)"), "{error}");
        assert!(Folder::new(&input.path().join("results"), input.path()).is_ok());
    }
}
