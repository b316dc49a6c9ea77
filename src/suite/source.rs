//! Files: what they are called, and how much of them is read.

use std::fs::File;
use std::io::Read;
use std::path::Path;

use super::{SuiteError, name};

/// The largest TOML file that is read, in bytes: 8 MiB. Parsed, a file takes up to ninety times its size in
/// memory (62 MiB of digits took 5.5 GB), and a suite of a million cases is ten lines long.
const MOST_BYTES: u64 = 8 << 20;

/// The name of the file without its ending, which becomes the name of the suite.
pub(super) fn stem(path: &Path) -> Result<String, SuiteError> {
    let stem = path.file_stem().map(|stem| stem.to_string_lossy().into_owned()).unwrap_or_default();
    match name::suite_flaw(&stem) {
        None => Ok(stem),
        Some(flaw) => Err(SuiteError::of_file(path.display().to_string(), format!("{flaw}; rename the file"))),
    }
}

/// Opens a file.
pub(super) fn open(path: &Path) -> Result<File, SuiteError> {
    let unreadable = |e: std::io::Error| cannot_read(path, &e);
    let file = File::open(path).map_err(unreadable)?;
    if file.metadata().map_err(unreadable)?.is_dir() {
        return Err(SuiteError::of_file(path.display().to_string(), "is a folder; give a file"));
    }
    Ok(file)
}

pub(super) fn cannot_read(path: &Path, e: &std::io::Error) -> SuiteError {
    SuiteError::of_file(path.display().to_string(), format!("cannot be read: {e}"))
}

/// The text of a TOML file, unless it is too large to be one.
pub(super) fn read_text(path: &Path) -> Result<String, SuiteError> {
    let file = open(path)?;
    let too_large = |size: String| {
        let limit = MOST_BYTES >> 20;
        let message = format!("has {size} bytes; a suite has at most {limit} MiB ({MOST_BYTES} bytes)");
        SuiteError::of_file(path.display().to_string(), message)
    };
    let size = file.metadata().map_err(|e| cannot_read(path, &e))?.len();
    if size > MOST_BYTES {
        return Err(too_large(size.to_string()));
    }
    // A pipe has no size, and a file may grow: the limit holds for what comes, too.
    let mut bytes = Vec::new();
    file.take(MOST_BYTES + 1).read_to_end(&mut bytes).map_err(|e| cannot_read(path, &e))?;
    if bytes.len() as u64 > MOST_BYTES {
        return Err(too_large(format!("more than {MOST_BYTES}")));
    }
    String::from_utf8(bytes).map_err(|e| {
        let before = &e.as_bytes()[..e.utf8_error().valid_up_to()];
        let line = 1 + before.iter().filter(|&&byte| byte == b'\n').count();
        SuiteError::at(line, "", "is not UTF-8 text").in_file(&path.display().to_string())
    })
}
