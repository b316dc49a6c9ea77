use std::io::{self, Write};

use crate::guidance::Choice;

/// `choices.csv`: one row a point of a choice map. An empty choice means that no method is trusted there.
pub(super) fn write(choices: &[Choice], to: &mut dyn Write) -> io::Result<()> {
    let mut csv = csv::Writer::from_writer(to);
    for choice in choices {
        csv.serialize(choice)?;
    }
    csv.flush()
}
