//! `bandproof measure`.

use super::args::MeasureArgs;
use super::exit::Exit;
use super::outcome::{load_spec, metered, show};
use bandproof::job::{self, MeasureJob};

/// Runs the command.
pub fn run(arguments: &MeasureArgs) -> Exit {
    match measure(arguments) {
        Ok(exit) | Err(exit) => exit,
    }
}

fn measure(arguments: &MeasureArgs) -> Result<Exit, Exit> {
    let job = MeasureJob {
        spec: load_spec(&arguments.spec)?,
        spec_path: Some(arguments.spec.clone()),
        before: arguments.before.clone(),
        after: arguments.after.clone(),
        report: arguments.report.clone(),
        table: arguments.csv.clone(),
        noise: arguments.noise.clone(),
        delay_frames: arguments.delay,
        max_delay_s: arguments.max_delay,
        replace: arguments.replace,
        include: arguments.include.clone(),
        exclude: arguments.exclude.clone(),
        jobs: arguments.common.threads(),
    };
    let outcome = metered(&arguments.common, |meter| job::measure(&job, meter))?;
    Ok(show(&arguments.common, arguments.strict, &job.spec.spec, &outcome))
}
