//! How a command ends: a sentence and an exit code.
#![allow(
    clippy::print_stdout,
    clippy::print_stderr,
    reason = "the command line is where words leave the program"
)]

use crate::footage::FootageError;
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
    /// The film is damaged and must be decoded with patience: no end, but a second beginning.
    Damaged,
}

/// Longest sentence that is printed, characters: names and fields of a hostile file may have any length.
const MOST_CHARACTERS: usize = 700;

/// A sentence on one line: control characters, which could steer a terminal, become their escapes.
fn on_one_line(sentence: &str) -> String {
    let mut line: String = sentence
        .chars()
        .take(MOST_CHARACTERS)
        .flat_map(|c| {
            if c.is_control() {
                c.escape_default().collect::<Vec<_>>()
            } else {
                vec![c]
            }
        })
        .collect();
    if sentence.chars().count() > MOST_CHARACTERS {
        line.push('…');
    }
    line
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
                let _ = writeln!(std::io::stderr(), "ebbmark: {}", on_one_line(&sentence));
                ExitCode::from(code)
            }
            Self::Shown(text) => {
                let _ = write!(std::io::stdout(), "{text}");
                ExitCode::SUCCESS
            }
            Self::PipeClosed => ExitCode::SUCCESS,
            // Whoever decodes catches it; should it come this far, it is the input's fault.
            Self::Damaged => ExitCode::from(3),
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

impl From<FootageError> for Failure {
    fn from(error: FootageError) -> Self {
        match error {
            FootageError::Damaged { .. } => Self::Damaged,
            error => MeasureError::from(error).into(),
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
