//! Standard output and standard error: colour only on a terminal, a quiet end on a broken pipe,
//! and a sign of life where work takes longer than a second.

use std::io::{self, IsTerminal, Write};
use std::time::Duration;

use anstream::ColorChoice;
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

use crate::output::Colour;

/// Where a command prints.
#[derive(Debug)]
pub struct Screen {
    progress: Option<ProgressBar>,
    failure: Option<io::Error>,
}

impl Screen {
    /// The screen of this process.
    pub fn new() -> Screen {
        Screen { progress: None, failure: None }
    }

    /// Prints results. Where the reader has gone away the rest is dropped: it asked for no more.
    /// Any other failure is kept for [`Screen::failure`].
    pub fn print(&mut self, text: &str) {
        self.quiet();
        let mut out = anstream::stdout().lock();
        let done = out.write_all(text.as_bytes()).and_then(|()| out.flush());
        self.note(done);
    }

    /// Hands raw standard output to a writer of results, buffered.
    pub fn print_with(&mut self, write: impl FnOnce(&mut dyn Write) -> io::Result<()>) {
        self.quiet();
        let mut out = io::BufWriter::with_capacity(1 << 16, io::stdout().lock());
        let done = write(&mut out).and_then(|()| out.flush());
        // What is left in a buffer that could not be written is dropped, not tried again.
        drop(out.into_parts());
        self.note(done);
    }

    /// Why standard output could not be written, such as a full disk; a reader gone away is no fault.
    pub fn failure(&self) -> Option<&io::Error> {
        self.failure.as_ref()
    }

    fn note(&mut self, done: io::Result<()>) {
        if let Err(error) = done
            && error.kind() != io::ErrorKind::BrokenPipe
        {
            self.failure.get_or_insert(error);
        }
    }

    /// Prints a message to standard error.
    pub fn tell(&mut self, text: &str) {
        self.quiet();
        let mut err = anstream::stderr().lock();
        let _ = err.write_all(text.as_bytes()).and_then(|()| err.flush());
    }

    /// Whether standard error shows colour: a terminal, and `NO_COLOR` is not set.
    pub fn colour_on_stderr(&self) -> Colour {
        colour(anstream::AutoStream::choice(&io::stderr()))
    }

    /// Whether standard output shows colour.
    pub fn colour_on_stdout(&self) -> Colour {
        colour(anstream::AutoStream::choice(&io::stdout()))
    }

    /// Names what is being done; shown on a terminal, once it has lasted a second.
    pub fn doing(&mut self, what: &'static str) {
        if !io::stderr().is_terminal() {
            return;
        }
        match &self.progress {
            Some(bar) => bar.set_message(what),
            None => {
                let bar = ProgressBar::with_draw_target(None, ProgressDrawTarget::hidden());
                if let Ok(style) = ProgressStyle::with_template("{spinner} {msg} {elapsed}") {
                    bar.set_style(style);
                }
                bar.set_message(what);
                self.progress = Some(bar.clone());
                std::thread::spawn(move || {
                    std::thread::sleep(Duration::from_secs(1));
                    if !bar.is_finished() {
                        bar.set_draw_target(ProgressDrawTarget::stderr());
                        bar.enable_steady_tick(Duration::from_millis(120));
                    }
                });
            }
        }
    }

    /// Shows how many of the expected steps are done; as [`Screen::doing`], once it has lasted a second.
    pub fn advance(&mut self, what: &'static str, done: u32, expected: u32) {
        self.doing(what);
        let Some(bar) = &self.progress else { return };
        if bar.length().is_none()
            && let Ok(style) = ProgressStyle::with_template(
                "{spinner} {msg} [{bar:24}] solve {pos} of about {len}, {elapsed}",
            )
        {
            bar.set_style(style);
        }
        bar.set_length(u64::from(expected));
        bar.set_position(u64::from(done));
    }

    /// Takes the sign of life off the screen.
    fn quiet(&mut self) {
        if let Some(bar) = self.progress.take() {
            bar.finish_and_clear();
        }
    }
}

fn colour(choice: ColorChoice) -> Colour {
    match choice {
        ColorChoice::Never => Colour::Plain,
        _ => Colour::Styled,
    }
}

impl Default for Screen {
    fn default() -> Self {
        Screen::new()
    }
}
