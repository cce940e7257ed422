//! `bandproof design`.

use super::args::DesignArgs;
use super::exit::Exit;
use super::pool::pool;
use super::screen::{complain, print, print_document};
use super::table::wrapped;
use super::{WIDTH, design_found, design_text, progress};
use bandproof::design::auto::{self, Found};
use bandproof::design::{self, Design};
use bandproof::job::plan::dither_name;
use bandproof::report::{CurveError, DesignEntry, SpecEntry, curve};
use bandproof::spec::document::Comments;
use bandproof::spec::save::{self, SaveError};
use bandproof::spec::{self, Spec, SpecFile};
use serde_json::json;
use std::path::Path;

/// Rate taken where none is given, Hz.
const DEFAULT_RATE_HZ: u32 = 48_000;

/// Runs the command.
pub fn run(arguments: &DesignArgs) -> Exit {
    let spec = match spec::load(&arguments.spec) {
        Ok(spec) => spec,
        Err(error) => {
            complain(&error.to_string());
            return Exit::Refused;
        }
    };
    let taken = [
        arguments.write.as_deref().and_then(|path| save::check(path).err().map(|error| error.to_string())),
        arguments.csv.as_deref().and_then(|path| curve::check(path).err().map(|error| error.to_string())),
    ];
    if let Some(complaint) = taken.into_iter().flatten().next() {
        complain(&complaint);
        return Exit::Refused;
    }
    let rates = rates(&arguments.rate);
    let pool = match pool(arguments.common.threads()) {
        Ok(pool) => pool,
        Err(exit) => return exit,
    };
    let find =
        |auto| progress::finding(arguments.common.quiet, || pool.install(|| auto::find(&spec.spec, auto, &rates)));
    let found = match spec.spec.auto.map(find).transpose() {
        Ok(found) => found,
        Err(error) => {
            complain(&format!("{}: {error}", arguments.spec.display()));
            return Exit::Refused;
        }
    };
    let explicit = found.as_ref().map_or(&spec.spec, |found| &found.spec);
    let (designed, complaints) = pool.install(|| designs(explicit, &rates));
    let (designs, entries): (Vec<Design>, Vec<DesignEntry>) = designed.into_iter().unzip();
    let exit = if complaints.is_empty() { Exit::Done } else { Exit::Refused };
    let told = Told { spec: &spec, found: found.as_ref(), designs: &entries };
    let exit = match (arguments.common.json, arguments.common.quiet) {
        (true, _) => print_json(&told, exit),
        (false, true) => exit,
        (false, false) => print(&text(arguments, &told), exit),
    };
    complaints.iter().for_each(|complaint| complain(complaint));
    let exit = arguments.csv.as_deref().map_or(exit, |path| write_responses(path, &designs, exit));
    let Some(target) = arguments.write.as_deref() else { return exit };
    if !complaints.is_empty() {
        complain(&format!("{} is not written", target.display()));
        return exit;
    }
    let name = arguments.spec.file_name().unwrap_or(arguments.spec.as_os_str()).to_string_lossy();
    let comments = found.as_ref().map_or_else(Comments::default, |found| design_found::comments(found, &name));
    match save::save(explicit, &comments, target) {
        Ok(()) => exit,
        Err(error @ (SaveError::Extension(_) | SaveError::Exists(_))) => {
            complain(&error.to_string());
            Exit::Refused
        }
        Err(error) => {
            complain(&error.to_string());
            exit.max(Exit::Failed)
        }
    }
}

/// Writes the responses as a table; where no rate has a design nothing is written: what is wrong
/// came with the designs. Gives how the program ends that would otherwise end with `exit`.
fn write_responses(path: &Path, designs: &[Design], exit: Exit) -> Exit {
    if designs.is_empty() {
        return exit;
    }
    match curve::save_curves(path, designs) {
        Ok(()) => exit,
        Err(error @ CurveError::Exists(_)) => {
            complain(&error.to_string());
            Exit::Refused
        }
        Err(error @ CurveError::Write { .. }) => {
            complain(&error.to_string());
            exit.max(Exit::Failed)
        }
    }
}

/// What there is to tell.
struct Told<'a> {
    spec: &'a SpecFile,
    found: Option<&'a Found>,
    designs: &'a [DesignEntry],
}

/// The rates asked for, each once, in the order given.
fn rates(asked: &[u32]) -> Vec<u32> {
    let mut rates = Vec::new();
    for &rate_hz in asked {
        if !rates.contains(&rate_hz) {
            rates.push(rate_hz);
        }
    }
    if rates.is_empty() { vec![DEFAULT_RATE_HZ] } else { rates }
}

/// The designs that there are, and a sentence for everything that can't be.
fn designs(spec: &Spec, rates: &[u32]) -> (Vec<(Design, DesignEntry)>, Vec<String>) {
    let dither = dither_name(spec);
    let (mut designs, mut complaints) = (Vec::new(), Vec::new());
    for &rate_hz in rates {
        match design::design(spec, rate_hz) {
            Ok(design) => {
                complaints.extend(design.impossible());
                match DesignEntry::new(&design, dither, None) {
                    Ok(entry) => designs.push((design, entry)),
                    Err(error) => complaints.push(format!("the design at {rate_hz} Hz can't be told: {error}")),
                }
            }
            Err(error) => complaints.push(error.to_string()),
        }
    }
    (designs, complaints)
}

fn text(arguments: &DesignArgs, told: &Told<'_>) -> String {
    let palette = arguments.common.color.for_stdout();
    let title = told.spec.spec.title.as_ref().map_or(String::new(), |title| format!("{title}, "));
    let mut text = wrapped(&format!("Spec: {title}{}", arguments.spec.display()), 0, 2, WIDTH);
    if arguments.rate.is_empty() {
        let note = format!("No --rate given, so this is for {DEFAULT_RATE_HZ} Hz.");
        text.push_str(&wrapped(&note, 0, 0, WIDTH));
    }
    if let Some(found) = told.found {
        text.push('\n');
        text.push_str(&design_found::text(found, palette));
    }
    for design in told.designs {
        text.push('\n');
        text.push_str(&design_text::text(design, palette));
        text.push_str(&design_text::methods(design, palette));
    }
    text
}

fn print_json(told: &Told<'_>, exit: Exit) -> Exit {
    let document = SpecEntry::new(told.spec).and_then(|spec| {
        let mut document = json!({"spec": serde_json::to_value(spec)?});
        if let Some(found) = told.found {
            document["found"] = design_found::document(found)?;
        }
        document["designs"] = serde_json::to_value(told.designs)?;
        Ok(document)
    });
    match document {
        Ok(document) => print_document(&document, exit),
        Err(error) => {
            complain(&format!("the designs can't be put into JSON: {error}"));
            exit.max(Exit::Failed)
        }
    }
}
