use std::io::Read;
use std::sync::mpsc::{Receiver, channel};
use std::sync::{Arc, Mutex, PoisonError};
use std::time::Duration;

use crate::wording::is_line_breaking;

/// Bytes that are kept of what a command says on standard error.
const KEPT: usize = 4096;
/// Characters of them that are shown.
const SHOWN: usize = 300;
/// How long the end of a command's standard error is waited for once the command has ended; what it started may hold
/// it open for ever.
const GRACE: Duration = Duration::from_millis(500);

/// The last that a command said on standard error, drained as it comes, so that the command never waits for a reader.
#[derive(Debug)]
pub(super) struct LastWords {
    tail: Arc<Mutex<Vec<u8>>>,
    closed: Receiver<()>,
}

impl LastWords {
    pub fn of(mut from: impl Read + Send + 'static) -> Self {
        let (close, closed) = channel::<()>();
        let tail = Arc::new(Mutex::new(Vec::new()));
        let kept = Arc::clone(&tail);
        std::thread::spawn(move || {
            let _close = close;
            let mut chunk = [0; KEPT];
            while let Ok(count @ 1..) = from.read(&mut chunk) {
                let mut tail = kept.lock().unwrap_or_else(PoisonError::into_inner);
                tail.extend_from_slice(&chunk[..count]);
                let excess = tail.len().saturating_sub(KEPT);
                tail.drain(..excess);
            }
        });
        Self { tail, closed }
    }

    /// The last lines, on one; empty if nothing was said.
    pub fn text(&self) -> String {
        // Ends when the drain does, which never sends.
        let _ = self.closed.recv_timeout(GRACE);
        let tail = self.tail.lock().unwrap_or_else(PoisonError::into_inner);
        let text = String::from_utf8_lossy(&tail);
        let lines: Vec<_> = text.lines().map(str::trim).filter(|line| !line.is_empty()).collect();
        let text: String = lines.join(" / ").chars().filter(|&c| !is_line_breaking(c)).collect();
        let first = text.chars().count().saturating_sub(SHOWN);
        if first == 0 { text } else { format!("..{}", text.chars().skip(first).collect::<String>()) }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_flood_leaves_its_end_on_one_line() {
        let flood = [vec![b'~'; 1 << 20], b"\nthe\x1b[31m line\r\n\n  before\n".to_vec()].concat();
        let text = LastWords::of(std::io::Cursor::new(flood)).text();
        assert!(text.starts_with("..~") && text.ends_with("~ / the[31m line / before"), "{text}");
        assert_eq!(text.chars().count(), SHOWN + 2);
        assert_eq!(LastWords::of(std::io::empty()).text(), "");
    }
}
