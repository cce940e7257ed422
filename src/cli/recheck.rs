//! `bandproof recheck`.

use super::args::RecheckArgs;
use super::exit::Exit;
use super::progress::Meter;
use super::recheck_text;
use super::screen::{complain, print, print_document};
use super::table::printable;
use bandproof::recheck::{self, Findings, RecheckJob};

/// Runs the command.
pub fn run(arguments: &RecheckArgs) -> Exit {
    let job = RecheckJob {
        report: arguments.report.clone(),
        input: arguments.input.clone(),
        output: arguments.output.clone(),
        replay: arguments.replay,
        remeasure: arguments.remeasure,
        noise: arguments.noise.clone(),
        csv: arguments.csv.clone(),
        replace: arguments.replace,
        jobs: arguments.common.threads(),
    };
    let meter = match Meter::new(arguments.common.quiet, "files in work are left out") {
        Ok(meter) => meter,
        Err(exit) => return exit,
    };
    let result = recheck::run(&job, &meter);
    meter.clear();
    match result {
        Ok(findings) => show(arguments, &findings),
        Err(error) => {
            complain(&printable(&error.to_string()));
            if error.is_refusal() { Exit::Refused } else { Exit::Failed }
        }
    }
}

fn show(arguments: &RecheckArgs, findings: &Findings) -> Exit {
    let exit = exit(findings);
    match (arguments.common.json, arguments.common.quiet) {
        (true, _) => match serde_json::to_value(findings) {
            Ok(document) => print_document(&document, exit),
            Err(error) => {
                complain(&format!("the findings could not be put into JSON: {error}"));
                exit.max(Exit::Failed)
            }
        },
        (false, true) => exit,
        (false, false) => print(&recheck_text::text(findings, arguments.common.color.for_stdout()), exit),
    }
}

/// What the findings come to, the gravest first.
fn exit(findings: &Findings) -> Exit {
    if !findings.finished {
        Exit::Interrupted
    } else if !findings.unreadable.is_empty() {
        Exit::Failed
    } else if findings.agrees {
        Exit::Done
    } else {
        Exit::Missed
    }
}
