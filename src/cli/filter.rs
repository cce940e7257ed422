//! `bandproof filter`.

use super::args::FilterArgs;
use super::exit::Exit;
use super::outcome::{ending, load_spec, metered, show};
use super::plan_text;
use super::screen::{complain, print, print_document};
use bandproof::job::{self, DryRun, FilterJob, Outcome};
use bandproof::package::Emit;

/// Runs the command.
pub fn run(arguments: &FilterArgs) -> Exit {
    match filter(arguments) {
        Ok(exit) | Err(exit) => exit,
    }
}

fn filter(arguments: &FilterArgs) -> Result<Exit, Exit> {
    let job = FilterJob {
        spec: load_spec(&arguments.spec)?,
        spec_path: Some(arguments.spec.clone()),
        input: arguments.input.clone(),
        output: arguments.output.clone(),
        report: arguments.report.clone(),
        table: arguments.csv.clone(),
        emit: arguments.emit.map(Emit::from),
        replace: arguments.replace,
        include: arguments.include.clone(),
        exclude: arguments.exclude.clone(),
        jobs: arguments.common.threads(),
        dry_run: arguments.dry_run,
        scan: arguments.scan,
    };
    let outcome = metered(&arguments.common, |meter| job::run(&job, meter))?;
    Ok(match &outcome.dry {
        Some(plan) => show_plan(arguments, &job, &outcome, plan),
        None => show(&arguments.common, arguments.strict, &job.spec.spec, &outcome),
    })
}

fn show_plan(arguments: &FilterArgs, job: &FilterJob, outcome: &Outcome, plan: &DryRun) -> Exit {
    let exit = plan_text::exit(plan).max(ending(outcome));
    match (arguments.common.json, arguments.common.quiet) {
        (true, _) => match plan_text::document(job, outcome, plan) {
            Ok(document) => print_document(&document, exit),
            Err(error) => {
                complain(&format!("the plan could not be put into JSON: {error}"));
                exit.max(Exit::Failed)
            }
        },
        (false, true) => exit,
        (false, false) => print(&plan_text::text(job, outcome, plan, arguments.common.color.for_stdout()), exit),
    }
}
