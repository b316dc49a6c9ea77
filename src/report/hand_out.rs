//! The cases of a suite, for an implementation outside of this program to answer.

use std::io::{self, Write};
use std::path::Path;

use super::records::line;
use crate::suite::Suite;
use crate::whole_file::WholeFile;

/// Writes the cases as case records, one a line; `survey --cases` reads them back as the same cases, to the bit.
///
/// # Errors
/// What the writer says.
pub fn hand_out(suite: &Suite, to: &mut dyn Write) -> io::Result<()> {
    for case in &suite.cases {
        line(&case.to_json(), to)?;
    }
    Ok(())
}

/// The same to a file, which is written whole or not at all.
///
/// # Errors
/// What the system says.
pub fn hand_out_file(suite: &Suite, path: &Path) -> io::Result<()> {
    let mut file = WholeFile::create(path)?;
    hand_out(suite, &mut file)?;
    file.finish_on_disk()
}
