//! A recording to measure with: a sweep and noise that cover a spec's bands.
//! `bandproof excite`.

use super::args::ExciteArgs;
use super::excite_text::{document, text};
use super::exit::Exit;
use super::interrupt::Interrupt;
use super::pool::pool;
use super::screen::{complain, print, print_document};
use bandproof::excite::file::{Placing, check, save};
use bandproof::excite::{ExciteError, Plan};
use bandproof::spec;
use std::sync::Arc;

/// Runs the command.
pub fn run(arguments: &ExciteArgs) -> Exit {
    let spec = match spec::load(&arguments.spec) {
        Ok(spec) => spec,
        Err(error) => {
            complain(&error.to_string());
            return Exit::Refused;
        }
    };
    let interrupt = Arc::new(Interrupt::default());
    if let Err(error) = interrupt.watch() {
        complain(&format!("interrupts can't be listened for: {error}"));
        return Exit::Refused;
    }
    let pool = match pool(arguments.common.threads()) {
        Ok(pool) => pool,
        Err(exit) => return exit,
    };
    let placing = Placing {
        spec_path: Some(&arguments.spec),
        replace: arguments.replace,
        go_on: &|| !interrupt.asked(),
        temporary: &|path| interrupt.temporary(path),
    };
    let result = check(&arguments.file, &placing)
        .and_then(|()| pool.install(|| Plan::new(&spec.spec, arguments.rate, arguments.seconds)))
        .and_then(|plan| save(&plan, &arguments.file, &placing).map(|saved| (plan, saved)));
    let (plan, saved) = match result {
        Ok(done) => done,
        Err(error) => {
            complain(&error.to_string());
            return match error {
                ExciteError::Interrupted(_) => Exit::Interrupted,
                error if error.is_refusal() => Exit::Refused,
                _ => Exit::Failed,
            };
        }
    };
    match (arguments.common.json, arguments.common.quiet) {
        (true, _) => match document(&arguments.file, &spec, &plan, &saved) {
            Ok(document) => print_document(&document, Exit::Done),
            Err(error) => {
                complain(&format!("the recording is written, but what it holds can't be put into JSON: {error}"));
                Exit::Failed
            }
        },
        (false, true) => Exit::Done,
        (false, false) => {
            let palette = arguments.common.color.for_stdout();
            print(&text(&arguments.file, &arguments.spec, &spec.spec, &plan, &saved, palette), Exit::Done)
        }
    }
}
