//! `bandproof filter`.

use super::args::FilterArgs;
use super::exit::Exit;
use super::interrupt::Interrupt;
use super::plan_text;
use super::progress::Meter;
use super::screen::{complain, print, print_with};
use super::summary_text;
use bandproof::job::{self, FilterJob, Outcome};
use bandproof::spec;
use std::fs::File;
use std::io;
use std::path::Path;

/// Runs the command.
pub fn run(arguments: &FilterArgs) -> Exit {
    let spec = match spec::load(&arguments.spec) {
        Ok(spec) => spec,
        Err(error) => {
            complain(&error.to_string());
            return Exit::Refused;
        }
    };
    let job = FilterJob {
        spec,
        spec_path: Some(arguments.spec.clone()),
        input: arguments.input.clone(),
        output: arguments.output.clone(),
        report: arguments.report.clone(),
        replace: arguments.replace,
        include: arguments.include.clone(),
        exclude: arguments.exclude.clone(),
        jobs: arguments.common.threads(),
        dry_run: arguments.dry_run,
        scan: arguments.scan,
    };
    let interrupt = match Interrupt::watch() {
        Ok(interrupt) => interrupt,
        Err(error) => {
            complain(&format!("interrupts can't be listened for: {error}"));
            return Exit::Refused;
        }
    };
    let meter = Meter::new(arguments.common.quiet, interrupt);
    let result = job::run(&job, &meter);
    meter.clear();
    match result {
        Ok(outcome) => show(arguments, &job, &outcome),
        Err(error) => {
            complain(&error.to_string());
            if error.is_refusal() { Exit::Refused } else { Exit::Failed }
        }
    }
}

fn show(arguments: &FilterArgs, job: &FilterJob, outcome: &Outcome) -> Exit {
    let palette = arguments.common.color.for_stdout();
    if let Some(plan) = &outcome.dry {
        let exit = plan_text::exit(plan).max(ending(outcome));
        return match (arguments.common.json, arguments.common.quiet) {
            (true, _) => print_json(plan_text::document(job, outcome, plan), exit),
            (false, true) => exit,
            (false, false) => print(&plan_text::text(job, outcome, plan, palette), exit),
        };
    }
    let exit = Exit::of_run(&outcome.summary, arguments.strict).max(ending(outcome));
    match (arguments.common.json, arguments.common.quiet) {
        (true, _) => match &outcome.report_path {
            Some(path) => print_file(path, exit),
            None => exit,
        },
        (false, true) => exit,
        (false, false) => print(&summary_text::text(&job.spec.spec, outcome, palette), exit),
    }
}

fn ending(outcome: &Outcome) -> Exit {
    if outcome.complete { Exit::Done } else { Exit::Interrupted }
}

fn print_json(document: serde_json::Result<serde_json::Value>, exit: Exit) -> Exit {
    match document {
        Ok(document) => super::screen::print_document(&document, exit),
        Err(error) => {
            complain(&format!("the plan could not be put into JSON: {error}"));
            exit.max(Exit::Failed)
        }
    }
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
