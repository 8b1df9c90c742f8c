//! How a command ends: a sentence and an exit code.
#![allow(
    clippy::print_stdout,
    clippy::print_stderr,
    reason = "the command line is where words leave the program"
)]

use crate::measurement::{Fault, MeasureError};
use crate::record::RecordError;
use std::io::Write;
use std::process::ExitCode;

/// Why a command did not do what it was asked.
#[derive(Debug)]
pub(super) enum Failure {
    /// A sentence for stderr, and the exit code: 2 usage, 3 input, 4 not measurable.
    Said {
        /// The sentence.
        sentence: String,
        /// The exit code.
        code: u8,
    },
    /// Help or version: text for stdout, a normal end.
    Shown(String),
    /// The reader of stdout went away: a normal end.
    PipeClosed,
}

impl Failure {
    pub(super) fn usage(sentence: impl Into<String>) -> Self {
        Self::Said {
            sentence: sentence.into(),
            code: 2,
        }
    }

    pub(super) fn input(sentence: impl Into<String>) -> Self {
        Self::Said {
            sentence: sentence.into(),
            code: 3,
        }
    }

    /// A measurement's error, with the file it concerns in front where the error itself does not name it.
    pub(super) fn of_file(error: &MeasureError, file: &std::path::Path) -> Self {
        let sentence = if error.names_file() {
            error.to_string()
        } else {
            format!("{}: {error}", file.display())
        };
        Self::Said {
            sentence,
            code: code(error),
        }
    }

    /// The argument parser's page, cut to its first paragraph: one sentence, and where to read on.
    pub(super) fn from_clap(error: clap::Error) -> Self {
        use clap::error::ErrorKind::{
            DisplayHelp, DisplayHelpOnMissingArgumentOrSubcommand, DisplayVersion,
        };
        let text = error.render().to_string();
        match error.kind() {
            DisplayHelp | DisplayVersion => Self::Shown(text),
            DisplayHelpOnMissingArgumentOrSubcommand => Self::usage(
                "no verb given; try `ebbmark demo`, or `ebbmark --help` for all of them",
            ),
            _ => {
                let first = text.split("\n\n").next().unwrap_or(&text);
                let sentence = first
                    .trim_start_matches("error: ")
                    .split_whitespace()
                    .collect::<Vec<_>>()
                    .join(" ");
                Self::usage(format!(
                    "{sentence}; see `ebbmark --help` and `ebbmark VERB --help`"
                ))
            }
        }
    }

    /// Says it, and gives the exit code.
    pub(super) fn report(self) -> ExitCode {
        match self {
            Self::Said { sentence, code } => {
                // A closed stderr leaves nobody to tell.
                let _ = writeln!(std::io::stderr(), "ebbmark: {sentence}");
                ExitCode::from(code)
            }
            Self::Shown(text) => {
                let _ = write!(std::io::stdout(), "{text}");
                ExitCode::SUCCESS
            }
            Self::PipeClosed => ExitCode::SUCCESS,
        }
    }
}

impl From<MeasureError> for Failure {
    fn from(error: MeasureError) -> Self {
        Self::Said {
            sentence: error.to_string(),
            code: code(&error),
        }
    }
}

impl From<RecordError> for Failure {
    fn from(error: RecordError) -> Self {
        Self::usage(error.to_string())
    }
}

fn code(error: &MeasureError) -> u8 {
    match error.fault() {
        Fault::Usage => 2,
        Fault::Input => 3,
        Fault::NotMeasurable => 4,
    }
}

/// Prints to stdout; a closed pipe is a normal end, any other failure is said.
pub(super) fn print(text: &str) -> Result<(), Failure> {
    let mut stdout = std::io::stdout().lock();
    stdout
        .write_all(text.as_bytes())
        .and_then(|()| stdout.flush())
        .map_err(|error| match error.kind() {
            std::io::ErrorKind::BrokenPipe => Failure::PipeClosed,
            _ => Failure::usage(format!(
                "stdout cannot be written to: {error}; send it elsewhere"
            )),
        })
}
