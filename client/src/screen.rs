//! Where answers, warnings and progress go: standard output is for answers alone.

use crate::exit::Failure;
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use std::io::{self, IsTerminal, Write};
use std::time::Duration;

/// How text is laid out.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Layout {
    /// For a terminal of the width that it has, with weight on the answer where colour is allowed.
    Terminal {
        /// Whether the answer may be set in bold.
        bold: bool,
    },
    /// For files, pipes and tests: no lines drawn, no width kept.
    Plain,
}

/// Whether answers are for people or for programs.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Form {
    /// Text.
    Text(Layout),
    /// JSON.
    Json,
}

/// The streams of this process.
#[derive(Debug)]
pub(crate) struct Screen {
    /// The form of answers.
    pub(crate) form: Form,
}

impl Screen {
    /// What this process writes to. NO_COLOR (no-color.org), where set to anything, is respected.
    pub(crate) fn detect(json: bool) -> Screen {
        let no_color = std::env::var_os("NO_COLOR").is_some_and(|value| !value.is_empty());
        let form = match (json, io::stdout().is_terminal()) {
            (true, _) => Form::Json,
            (false, true) => Form::Text(Layout::Terminal { bold: !no_color }),
            (false, false) => Form::Text(Layout::Plain),
        };
        Screen { form }
    }

    /// Writes an answer.
    ///
    /// # Errors
    /// When standard output takes no more.
    pub(crate) fn answer(&self, text: &str) -> Result<(), Failure> {
        let mut out = io::stdout().lock();
        out.write_all(text.as_bytes()).and_then(|()| out.flush()).map_err(|error| {
            match error.kind() {
                io::ErrorKind::BrokenPipe => Failure::OutputClosed,
                _ => Failure::writing(std::path::Path::new("standard output"), &error),
            }
        })
    }

    /// Says something beside the answer.
    pub(crate) fn say(&self, text: &str) {
        // Nowhere is left to say that standard error is gone.
        let _ = writeln!(io::stderr().lock(), "{text}");
    }

    /// Shows that something is under way; nothing where nobody watches.
    pub(crate) fn begin(&self, what: &str) -> ProgressBar {
        let bar = ProgressBar::with_draw_target(None, ProgressDrawTarget::stderr());
        if let Ok(style) = ProgressStyle::with_template("{spinner} {msg} ({elapsed})") {
            bar.set_style(style);
        }
        bar.set_message(what.to_owned());
        bar.enable_steady_tick(Duration::from_millis(200));
        bar
    }
}
