//! Files written whole or not at all.

use std::fs;
use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};

/// Writes a file by a temporary one beside it and a rename: a reader sees the old file or the new, never half.
///
/// # Errors
/// What the file system says; the old file is then untouched.
pub fn write_file(path: &Path, write: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> io::Result<()> {
    let folder = path.parent().filter(|p| !p.as_os_str().is_empty()).unwrap_or(Path::new("."));
    let mut builder = tempfile::Builder::new();
    #[cfg(unix)]
    {
        // As any new file: readable to whom the user's mask allows, not to the user alone.
        use std::os::unix::fs::PermissionsExt as _;
        builder.permissions(fs::Permissions::from_mode(0o666));
    }
    let temporary = builder.tempfile_in(folder)?;
    let mut writer = BufWriter::with_capacity(1 << 16, temporary);
    write(&mut writer)?;
    writer.into_inner().map_err(io::IntoInnerError::into_error)?.persist(path).map_err(|e| e.error)?;
    Ok(())
}

/// A folder that results are written to.
#[derive(Debug)]
pub struct Folder {
    path: PathBuf,
}

impl Folder {
    /// Makes the folder where it is not there.
    ///
    /// # Errors
    /// What the file system says, or that it is the input folder, which results must not mix with.
    pub fn new(path: &Path, input: &Path) -> io::Result<Folder> {
        let same =
            |a: &Path, b: &Path| matches!((a.canonicalize(), b.canonicalize()), (Ok(a), Ok(b)) if a == b);
        if same(path, input) {
            let text = format!(
                "{} is the network folder itself; results there would overwrite its files",
                path.display()
            );
            return Err(io::Error::new(io::ErrorKind::InvalidInput, text));
        }
        fs::create_dir_all(path)?;
        Ok(Folder { path: path.to_owned() })
    }

    /// Writes a file of the folder.
    ///
    /// # Errors
    /// As [`write_file`].
    pub fn write(&self, name: &str, write: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> io::Result<()> {
        write_file(&self.path.join(name), write)
    }
}
