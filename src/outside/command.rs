use std::io::{self, BufReader, Read, Write};
use std::process::{Child, Command, ExitStatus, Stdio};
use std::sync::mpsc::{Receiver, RecvTimeoutError, sync_channel};
use std::time::{Duration, Instant};

use super::answers::{Origin, Outside};
use super::collector::Collector;
use super::last_words::LastWords;
use super::lines::{Line, Lines};
use super::name::{Name, NameError};
use crate::shard::Shard;
use crate::suite::Suite;
use crate::survey::Watch;

/// How often the wish to stop is looked for while a command is silent.
const TICK: Duration = Duration::from_millis(20);
/// How often a slow command's progress is told.
const TELL_EVERY: Duration = Duration::from_secs(10);
/// Lines that may wait to be laid to their cases.
const LINES_AHEAD: usize = 4;

/// A command that reads case records on standard input and writes answers on standard output, in any order.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct OutsideCommand {
    name: Name,
    words: Vec<String>,
    timeout: Duration,
}

/// What is no command.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum CommandError {
    /// No name, or no command behind it.
    #[error("is not of the form NAME=COMMAND ARG..")]
    Form,
    /// An open quote.
    #[error("cannot be split into words as a shell does: a quote is open, or a backslash ends it")]
    Quotes,
    /// The name cannot stand in a table.
    #[error(transparent)]
    Name(#[from] NameError),
}

/// Why there are no answers.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum AskError {
    /// The command cannot be started.
    #[error("`{program}` cannot be started; give a program on the path, or the path of one")]
    Start {
        /// The first word.
        program: String,
        /// What the system says.
        source: io::Error,
    },
    /// The watch wanted to stop.
    #[error("interrupted while it was asked")]
    Interrupted,
}

/// How a command ended.
enum End {
    /// By itself.
    Exit,
    /// It gave no new answer for too long, or did not end after the last.
    Silent,
}

impl OutsideCommand {
    /// The command `NAME=COMMAND ARG..`, split into words as a POSIX shell does; no shell is run. `timeout` is the longest
    /// time without a new answer.
    ///
    /// # Errors
    /// [`CommandError`].
    pub fn parse(text: &str, timeout: Duration) -> Result<Self, CommandError> {
        let (name, line) = text.split_once('=').ok_or(CommandError::Form)?;
        let name = Name::new(name.trim())?;
        let words = shlex::split(line).ok_or(CommandError::Quotes)?;
        // A NUL cannot be passed to a program; no shell would have let one through either.
        if words.first().is_none_or(|program| program.is_empty()) || words.iter().any(|w| w.contains('\0')) {
            return Err(CommandError::Form);
        }
        Ok(Self { name, words, timeout })
    }

    /// What it is called.
    pub fn name(&self) -> &str {
        self.name.as_str()
    }

    /// Runs it on the cases of `suite`, or those of a part of it, and gathers its answers until it ends or is silent for
    /// too long; whatever it gave before it failed counts.
    ///
    /// # Errors
    /// [`AskError`] if it cannot be started, or `watch` wants to stop. No command outlives this call.
    pub fn ask(&self, suite: &Suite, shard: Option<Shard>, watch: &dyn Watch) -> Result<Outside, AskError> {
        let mut collector = Collector::new(suite, shard);
        let asked = collector.asked();
        let origin = Origin::Command { words: self.words.clone(), timeout: self.timeout };
        if asked == 0 {
            return Ok(collector.finish(self.name.clone(), origin, None));
        }
        let mut running = Running::start(&self.words)
            .map_err(|source| AskError::Start { program: self.words[0].clone(), source })?;
        feed(&mut running.child, records(suite, shard));
        let words = running.child.stderr.take().map(LastWords::of);
        let mut lines = running.child.stdout.take().map(lines_of);
        let (mut heard, mut told) = (Instant::now(), Instant::now());
        let end = loop {
            if watch.stop() {
                return Err(AskError::Interrupted);
            }
            match lines.as_ref().map(|lines| lines.recv_timeout(TICK)) {
                Some(Ok(line)) => {
                    if collector.take(&line) {
                        heard = Instant::now();
                    }
                }
                // What it has started may hold its output open; there is nothing more to wait for.
                Some(Err(RecvTimeoutError::Timeout)) if collector.answered() == asked && running.has_ended() => {
                    break End::Exit;
                }
                Some(Err(RecvTimeoutError::Timeout)) => {}
                Some(Err(RecvTimeoutError::Disconnected)) => lines = None,
                None if running.has_ended() => break End::Exit,
                None => std::thread::sleep(TICK),
            }
            if heard.elapsed() >= self.timeout {
                break End::Silent;
            }
            if told.elapsed() >= TELL_EVERY {
                told = Instant::now();
                watch.note(&format!("{}: {} of {asked} answers", self.name, collector.answered()));
            }
        };
        let status = running.end();
        let answered = collector.answered();
        let failed = match end {
            End::Exit => answered < asked || !status.is_some_and(|status| status.success()),
            End::Silent => true,
        };
        let failure = failed.then(|| {
            let words = words.map_or(String::new(), |words| words.text());
            let words = if words.is_empty() { words } else { format!("; its last words: {words}") };
            match end {
                End::Exit => format!("{} after {answered} of {asked} answers{words}", how(status)),
                End::Silent => format!(
                    "stopped after {answered} of {asked} answers and {} s without a new one{words}",
                    self.timeout.as_secs_f64()
                ),
            }
        });
        Ok(collector.finish(self.name.clone(), origin, failure))
    }
}

fn records(suite: &Suite, shard: Option<Shard>) -> Vec<u8> {
    let mut records = Vec::new();
    for (index, case) in suite.cases.iter().enumerate() {
        if shard.is_none_or(|shard| shard.holds(index)) {
            records.extend_from_slice(case.to_json().to_string().as_bytes());
            records.push(b'\n');
        }
    }
    records
}

/// Writes the records while answers are read, so that neither side waits for the other. A command may close its input
/// early: what it does not read, it does not need.
fn feed(child: &mut Child, records: Vec<u8>) {
    if let Some(mut input) = child.stdin.take() {
        std::thread::spawn(move || {
            let _ = input.write_all(&records);
        });
    }
}

/// Lines as they come. The thread ends with its source or its receiver, whichever is first.
fn lines_of(from: impl Read + Send + 'static) -> Receiver<Line> {
    let (to, lines) = sync_channel(LINES_AHEAD);
    std::thread::spawn(move || {
        let mut from = Lines::of(BufReader::new(from));
        while let Ok(Some(line)) = from.next_line() {
            if to.send(line).is_err() {
                break;
            }
        }
    });
    lines
}

/// A command at work, and whatever it has started; all of it is ended when this is dropped.
struct Running {
    child: Child,
    ended: bool,
}

impl Running {
    fn start(words: &[String]) -> io::Result<Self> {
        let mut command = Command::new(&words[0]);
        command.args(&words[1..]).stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(Stdio::piped());
        // A group of its own: what the command starts can be ended with it, and an interrupt at the keyboard is ours.
        #[cfg(unix)]
        std::os::unix::process::CommandExt::process_group(&mut command, 0);
        Ok(Self { child: command.spawn()?, ended: false })
    }

    /// Whether it has ended by itself. Its status is left to [`Running::end`]: until that is taken, no other process can
    /// come by its id.
    #[cfg(unix)]
    fn has_ended(&mut self) -> bool {
        use rustix::process::{Pid, WaitId, WaitIdOptions, waitid};
        let look = WaitIdOptions::EXITED | WaitIdOptions::NOHANG | WaitIdOptions::NOWAIT;
        !matches!(waitid(WaitId::Pid(Pid::from_child(&self.child)), look), Ok(None))
    }

    #[cfg(not(unix))]
    fn has_ended(&mut self) -> bool {
        !matches!(self.child.try_wait(), Ok(None))
    }

    /// Ends it, if it has not ended, and what it has started; its exit status.
    fn end(&mut self) -> Option<ExitStatus> {
        if !self.ended {
            // What has ended cannot be ended again, which is no failure.
            #[cfg(unix)]
            let _ = rustix::process::kill_process_group(
                rustix::process::Pid::from_child(&self.child),
                rustix::process::Signal::KILL,
            );
            // Alone, in case it has left the group.
            let _ = self.child.kill();
            self.ended = true;
        }
        self.child.wait().ok()
    }
}

impl Drop for Running {
    fn drop(&mut self) {
        self.end();
    }
}

fn how(status: Option<ExitStatus>) -> String {
    #[cfg(unix)]
    if let Some(signal) = status.and_then(|status| std::os::unix::process::ExitStatusExt::signal(&status)) {
        return format!("ended by signal {signal}");
    }
    status.and_then(|status| status.code()).map_or_else(|| "ended".into(), |code| format!("exit status {code}"))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn words_are_split_as_a_shell_does() {
        let parse = |text| OutsideCommand::parse(text, Duration::from_secs(1));
        let command = parse("mine = ./a b='c d' \"e f\"").unwrap();
        assert_eq!(
            (command.name(), command.words.clone()),
            ("mine", ["./a", "b=c d", "e f"].map(String::from).to_vec())
        );
        for (text, error) in [
            ("mine", CommandError::Form),
            ("mine=", CommandError::Form),
            ("mine='' a", CommandError::Form),
            ("mine='a", CommandError::Quotes),
        ] {
            assert_eq!(parse(text), Err(error), "{text}");
        }
        for text in ["=a", "taylor-1=a", "unscented:kappa=1", "a,b=c"] {
            assert!(matches!(parse(text), Err(CommandError::Name(_))), "{text}");
        }
    }
}
