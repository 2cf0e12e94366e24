//! Standard output and standard error: colour only on a terminal, a quiet end on a broken pipe,
//! and a sign of life where work takes longer than a second.

use std::io::{IsTerminal, Write};
use std::time::Duration;

use anstream::ColorChoice;
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

/// Where a command prints.
#[derive(Debug)]
pub struct Screen {
    progress: Option<ProgressBar>,
}

impl Screen {
    /// The screen of this process.
    pub fn new() -> Screen {
        Screen { progress: None }
    }

    /// Prints results. Where the reader has gone away the rest is dropped: it asked for no more.
    pub fn print(&mut self, text: &str) {
        self.quiet();
        let mut out = anstream::stdout().lock();
        let _ = out.write_all(text.as_bytes()).and_then(|()| out.flush());
    }

    /// Hands raw standard output to a writer of results, buffered.
    pub fn print_with(&mut self, write: impl FnOnce(&mut dyn Write) -> std::io::Result<()>) {
        self.quiet();
        let mut out = std::io::BufWriter::with_capacity(1 << 16, std::io::stdout().lock());
        let _ = write(&mut out).and_then(|()| out.flush());
    }

    /// Prints a message to standard error.
    pub fn tell(&mut self, text: &str) {
        self.quiet();
        let mut err = anstream::stderr().lock();
        let _ = err.write_all(text.as_bytes()).and_then(|()| err.flush());
    }

    /// True where standard error shows colour.
    pub fn colour_on_stderr(&self) -> bool {
        anstream::AutoStream::choice(&std::io::stderr()) != ColorChoice::Never
    }

    /// True where standard output shows colour.
    pub fn colour_on_stdout(&self) -> bool {
        anstream::AutoStream::choice(&std::io::stdout()) != ColorChoice::Never
    }

    /// Names what is being done; shown on a terminal, once it has lasted a second.
    pub fn doing(&mut self, what: &'static str) {
        if !std::io::stderr().is_terminal() {
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

    /// Takes the sign of life off the screen.
    fn quiet(&mut self) {
        if let Some(bar) = self.progress.take() {
            bar.finish_and_clear();
        }
    }
}

impl Default for Screen {
    fn default() -> Self {
        Screen::new()
    }
}
