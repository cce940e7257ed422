//! `bandproof export`.

use super::args::ExportArgs;
use super::exit::Exit;
use super::pool::pool;
use super::progress::finding;
use super::screen::{complain, print};
use bandproof::export::{Request, export};
use bandproof::spec;

/// Runs the command: the form goes to stdout, complaints to stderr.
pub fn run(arguments: &ExportArgs) -> Exit {
    let spec = match spec::load(&arguments.spec) {
        Ok(spec) => spec,
        Err(error) => {
            complain(&error.to_string());
            return Exit::Refused;
        }
    };
    let file_name = arguments.spec.file_name().map_or_else(String::new, |name| name.to_string_lossy().into_owned());
    let request = Request {
        spec: &spec,
        file_name: &file_name,
        rate_hz: arguments.rate,
        form: arguments.form.into(),
        digits: arguments.digits,
        bits: arguments.bits,
    };
    let pool = match pool(arguments.threads()) {
        Ok(pool) => pool,
        Err(exit) => return exit,
    };
    let export = || pool.install(|| export(&request));
    let exported = if spec.spec.auto.is_some() { finding(arguments.quiet, export) } else { export() };
    match exported {
        Ok(exported) => {
            let exit = if exported.weaker.is_empty() { Exit::Done } else { Exit::Missed };
            let exit = print(&exported.text, exit);
            exported.weaker.iter().for_each(|sentence| complain(sentence));
            exit
        }
        Err(error) => {
            complain(&error.to_string());
            Exit::Refused
        }
    }
}
