//! Files that are written whole or not at all: to a temporary file beside them, then renamed.

use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};

use tempfile::NamedTempFile;

/// A file in the making; it appears under its name with [`WholeFile::finish`] and not before, and is removed if that is
/// never called.
#[derive(Debug)]
pub(crate) struct WholeFile {
    to: BufWriter<NamedTempFile>,
    path: PathBuf,
}

impl WholeFile {
    /// Begins the file that will be at `path`; its folder must be there.
    pub fn create(path: &Path) -> io::Result<Self> {
        let folder = path.parent().unwrap_or(Path::new("."));
        Ok(Self { to: BufWriter::new(NamedTempFile::new_in(folder)?), path: path.into() })
    }

    /// Puts it in its place, in that of another if there is one.
    pub fn finish(self) -> io::Result<()> {
        let file = self.to.into_inner().map_err(io::IntoInnerError::into_error)?;
        readable_by_all(&file)?;
        file.persist(&self.path).map(drop).map_err(|e| e.error)
    }

    /// As [`WholeFile::finish`], but not before the bytes are on the disk: a result must outlive a power cut.
    pub fn finish_on_disk(mut self) -> io::Result<()> {
        self.to.flush()?;
        self.to.get_ref().as_file().sync_all()?;
        self.finish()
    }
}

impl Write for WholeFile {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        self.to.write(bytes)
    }

    fn flush(&mut self) -> io::Result<()> {
        self.to.flush()
    }
}

/// A temporary file is private to its owner; a result is as open as any file.
#[cfg(unix)]
fn readable_by_all(file: &NamedTempFile) -> io::Result<()> {
    use std::os::unix::fs::PermissionsExt;
    file.as_file().set_permissions(std::fs::Permissions::from_mode(0o644))
}

#[cfg(not(unix))]
fn readable_by_all(_: &NamedTempFile) -> io::Result<()> {
    Ok(())
}
