//! What `filter` and `measure` have in common: reading the spec, listening for
//! interrupts, showing what came of a run.

use super::args::CommonArgs;
use super::exit::Exit;
use super::progress::Meter;
use super::screen::{complain, print, print_with};
use super::summary_text;
use bandproof::job::{JobError, Outcome};
use bandproof::spec::{self, Spec, SpecFile};
use std::fs::File;
use std::io;
use std::path::Path;

/// Reads the spec; complains where that can't be.
pub fn load_spec(path: &Path) -> Result<SpecFile, Exit> {
    spec::load(path).map_err(|error| {
        complain(&error.to_string());
        Exit::Refused
    })
}

/// Runs `work` under a progress line that goes away in the end; complains of its error.
pub fn metered(common: &CommonArgs, work: impl FnOnce(&Meter) -> Result<Outcome, JobError>) -> Result<Outcome, Exit> {
    let meter = Meter::new(common.quiet, "what is in work is dropped, the report will say what was done")?;
    let result = work(&meter);
    meter.clear();
    result.map_err(|error| {
        complain(&error.to_string());
        match error {
            JobError::Interrupted(_) => Exit::Interrupted,
            error if error.is_refusal() => Exit::Refused,
            _ => Exit::Failed,
        }
    })
}

/// Shows a run that wrote a report, as asked for.
pub fn show(common: &CommonArgs, strict: bool, spec: &Spec, outcome: &Outcome) -> Exit {
    let exit = Exit::of_run(&outcome.summary, strict).max(ending(outcome));
    match (common.json, common.quiet) {
        (true, _) => match &outcome.report_path {
            Some(path) => print_file(path, exit),
            None => exit,
        },
        (false, true) => exit,
        (false, false) => print(&summary_text::text(spec, outcome, common.color.for_stdout()), exit),
    }
}

/// How a run ended, whatever it found.
pub fn ending(outcome: &Outcome) -> Exit {
    if outcome.complete { Exit::Done } else { Exit::Interrupted }
}

/// The report may be larger than memory: it goes from its file to stdout.
fn print_file(path: &Path, exit: Exit) -> Exit {
    match File::open(path) {
        Ok(mut file) => print_with(exit, |out| io::copy(&mut file, out).map(|_| ())),
        Err(error) => {
            complain(&format!("the report {} could not be read again to be printed: {error}", path.display()));
            exit.max(Exit::Failed)
        }
    }
}
