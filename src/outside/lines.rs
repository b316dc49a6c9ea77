use std::io::{self, BufRead, Read};

/// The longest line of an answer, in bytes: 8 MiB, as of a case record.
pub(super) const LONGEST: usize = 8 << 20;

/// One line of answers.
#[derive(Debug)]
pub(super) struct Line {
    /// Its number, from 1.
    pub number: u64,
    /// Without what comes after [`LONGEST`] bytes.
    pub bytes: Vec<u8>,
}

impl Line {
    /// Whether some of it was left out.
    pub fn is_cut(&self) -> bool {
        self.bytes.len() > LONGEST
    }
}

/// Lines of answers, in bounded memory whatever comes.
#[derive(Debug)]
pub(super) struct Lines<R> {
    from: R,
    number: u64,
}

impl<R: BufRead> Lines<R> {
    pub fn of(from: R) -> Self {
        Self { from, number: 0 }
    }

    /// The next line, or `None` at the end.
    pub fn next_line(&mut self) -> io::Result<Option<Line>> {
        let mut bytes = Vec::new();
        self.from.by_ref().take(LONGEST as u64 + 1).read_until(b'\n', &mut bytes)?;
        if bytes.is_empty() {
            return Ok(None);
        }
        self.number += 1;
        if bytes.ends_with(b"\n") {
            bytes.pop();
        } else if bytes.len() > LONGEST {
            self.from.skip_until(b'\n')?;
        }
        Ok(Some(Line { number: self.number, bytes }))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn long_lines_are_cut_and_what_follows_them_is_read() {
        let text = [&vec![b'x'; 3 * LONGEST][..], b"\nshort\n\nlast"].concat();
        let mut lines = Lines::of(text.as_slice());
        let mut next = || lines.next_line().unwrap();
        let long = next().unwrap();
        assert!(long.is_cut() && long.bytes.len() == LONGEST + 1);
        for (number, text) in [(2, "short"), (3, ""), (4, "last")] {
            let line = next().unwrap();
            assert_eq!((line.number, line.bytes.as_slice(), line.is_cut()), (number, text.as_bytes(), false));
        }
        assert!(next().is_none());
    }
}
