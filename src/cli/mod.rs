//! The command line: one file a verb.
//!
//! Arguments pass two layers: what was typed, checked for form only, and then a [`RunSheet`](crate::run_sheet::RunSheet)
//! that the library takes. Results go to files and a short summary to stdout; a failure is one sentence on stderr.

mod demo;
mod fit_flags;
mod inspect;
mod measure;
mod numbers;
mod outcome;
mod output;
mod progress;
mod refit;
mod rehearse;
mod repeat;
mod small_text;

use clap::{CommandFactory, FromArgMatches, Parser, Subcommand};
use outcome::Failure;
use std::ffi::OsString;
use std::process::ExitCode;

/// Turns a phone clip of a free oscillation into a number you can defend: period, damping, Q and energy loss per cycle,
/// each with an honest uncertainty.
#[derive(Debug, Parser)]
#[command(
    name = "ebbmark",
    version,
    arg_required_else_help = true,
    subcommand_value_name = "VERB",
    subcommand_help_heading = "Verbs",
    disable_help_subcommand = true
)]
struct Arguments {
    #[command(subcommand)]
    verb: Verb,
}

#[derive(Debug, Subcommand)]
enum Verb {
    /// Measure a clip: marker, scale bar, fit, verdicts, report
    Measure(Box<measure::Arguments>),
    /// Say what a clip is: stream, frame clock, still frames with a pixel grid
    Inspect(inspect::Arguments),
    /// Fit and judge a table of positions and times
    Refit(refit::Arguments),
    /// Make a film with known truth from a scene
    Rehearse(rehearse::Arguments),
    /// Measure the clip inside this program, to see what comes out
    Demo(demo::Arguments),
}

/// Runs one command line and returns its exit code: 0 done, 2 usage, 3 input, 4 not measurable.
pub fn run(arguments: impl Iterator<Item = OsString>) -> ExitCode {
    let outcome = parse(arguments).and_then(|arguments| match arguments.verb {
        Verb::Measure(arguments) => measure::run(&arguments),
        Verb::Inspect(arguments) => inspect::run(&arguments),
        Verb::Refit(arguments) => refit::run(&arguments),
        Verb::Rehearse(arguments) => rehearse::run(&arguments),
        Verb::Demo(arguments) => demo::run(&arguments),
    });
    match outcome {
        Ok(()) => ExitCode::SUCCESS,
        Err(failure) => failure.report(),
    }
}

fn parse(arguments: impl Iterator<Item = OsString>) -> Result<Arguments, Failure> {
    let matches = Arguments::command()
        .try_get_matches_from(arguments)
        .map_err(Failure::from_clap)?;
    Arguments::from_arg_matches(&matches).map_err(Failure::from_clap)
}
