use std::io::{self, ErrorKind, StdoutLock, Write};

/// Standard output whose reader may leave early, as `head` does: that is no failure, what comes after is dropped
/// and the work goes on, for its files are wanted all the same.
#[derive(Debug)]
pub struct Stdout {
    to: StdoutLock<'static>,
    reader_left: bool,
}

impl Stdout {
    pub fn new() -> Self {
        Self { to: io::stdout().lock(), reader_left: false }
    }

    fn attempt<T>(
        &mut self,
        done: T,
        act: impl FnOnce(&mut StdoutLock<'static>) -> io::Result<T>,
    ) -> io::Result<T> {
        if self.reader_left {
            return Ok(done);
        }
        match act(&mut self.to) {
            Err(e) if e.kind() == ErrorKind::BrokenPipe => {
                self.reader_left = true;
                Ok(done)
            }
            result => result,
        }
    }
}

impl Write for Stdout {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        self.attempt(bytes.len(), |to| to.write(bytes))
    }

    fn flush(&mut self) -> io::Result<()> {
        self.attempt((), |to| to.flush())
    }
}
