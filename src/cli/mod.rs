//! The command line: arguments, progress, tables. Nothing is computed here.

mod args;
mod color;
mod design;
mod design_found;
mod design_text;
mod excite;
mod excite_text;
mod exit;
mod export;
mod filter;
mod interrupt;
mod measure;
mod names;
mod outcome;
mod pairs_text;
mod plan_text;
mod pool;
mod progress;
mod recheck;
mod recheck_text;
mod schema;
mod screen;
mod summary_text;
mod table;
mod units;

use args::{Cli, Command};
use clap::Parser;
use clap::error::ErrorKind;
pub use exit::Exit;
use screen::{complain, complain_of_usage, print, show_help};
use std::ffi::OsString;

/// Width that no line of a table or summary exceeds unless a single word does.
const WIDTH: usize = 100;

/// Runs the command that `arguments` ask for, the program's name first.
pub fn run(arguments: impl IntoIterator<Item = OsString>) -> Exit {
    if let Err(error) = interrupt::outlive_file_size_limit() {
        complain(&format!("a limit on the size of files can't be listened for: {error}"));
        return Exit::Refused;
    }
    match Cli::try_parse_from(arguments) {
        Ok(Cli { command: Command::Filter(arguments) }) => filter::run(&arguments),
        Ok(Cli { command: Command::Design(arguments) }) => design::run(&arguments),
        Ok(Cli { command: Command::Measure(arguments) }) => measure::run(&arguments),
        Ok(Cli { command: Command::Excite(arguments) }) => excite::run(&arguments),
        Ok(Cli { command: Command::Recheck(arguments) }) => recheck::run(&arguments),
        Ok(Cli { command: Command::Export(arguments) }) => export::run(&arguments),
        Ok(Cli { command: Command::Schema(arguments) }) => schema::run(&arguments),
        Err(answer) if answer.use_stderr() => {
            let text = answer.render().to_string();
            match answer.kind() {
                ErrorKind::DisplayHelpOnMissingArgumentOrSubcommand => show_help(&text),
                _ => complain_of_usage(text.trim_start_matches("error: ")),
            }
            Exit::Refused
        }
        // Help and version arrive as errors that go to stdout.
        Err(answer) => print(&answer.render().to_string(), Exit::Done),
    }
}
