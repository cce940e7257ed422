//! `bandproof design`.

use super::args::DesignArgs;
use super::exit::Exit;
use super::screen::{complain, print, print_document};
use super::table::wrapped;
use super::{WIDTH, design_text};
use bandproof::design;
use bandproof::job::plan::dither_name;
use bandproof::report::{DesignEntry, SpecEntry};
use bandproof::spec::{self, SpecFile};
use serde_json::json;

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
    let (designs, complaints) = designs(&spec, &rates(&arguments.rate));
    let exit = if complaints.is_empty() { Exit::Done } else { Exit::Refused };
    let exit = match (arguments.common.json, arguments.common.quiet) {
        (true, _) => print_json(&spec, &designs, exit),
        (false, true) => exit,
        (false, false) => print(&text(arguments, &spec, &designs), exit),
    };
    complaints.iter().for_each(|complaint| complain(complaint));
    exit
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
fn designs(spec: &SpecFile, rates: &[u32]) -> (Vec<DesignEntry>, Vec<String>) {
    let dither = dither_name(&spec.spec);
    let (mut designs, mut complaints) = (Vec::new(), Vec::new());
    for &rate_hz in rates {
        match design::design(&spec.spec, rate_hz) {
            Ok(design) => {
                complaints.extend(design.impossible());
                match DesignEntry::new(&design, dither, None) {
                    Ok(entry) => designs.push(entry),
                    Err(error) => complaints.push(format!("the design at {rate_hz} Hz can't be told: {error}")),
                }
            }
            Err(error) => complaints.push(error.to_string()),
        }
    }
    (designs, complaints)
}

fn text(arguments: &DesignArgs, spec: &SpecFile, designs: &[DesignEntry]) -> String {
    let palette = arguments.common.color.for_stdout();
    let title = spec.spec.title.as_ref().map_or(String::new(), |title| format!("{title}, "));
    let mut text = wrapped(&format!("Spec: {title}{}", arguments.spec.display()), 0, 2, WIDTH);
    if arguments.rate.is_empty() {
        let note = format!("No --rate given, so this is for {DEFAULT_RATE_HZ} Hz.");
        text.push_str(&wrapped(&note, 0, 0, WIDTH));
    }
    for design in designs {
        text.push('\n');
        text.push_str(&design_text::text(design, palette));
        text.push_str(&design_text::methods(design, palette));
    }
    text
}

fn print_json(spec: &SpecFile, designs: &[DesignEntry], exit: Exit) -> Exit {
    let document = SpecEntry::new(spec)
        .and_then(|spec| Ok(json!({"spec": serde_json::to_value(spec)?, "designs": serde_json::to_value(designs)?})));
    match document {
        Ok(document) => print_document(&document, exit),
        Err(error) => {
            complain(&format!("the designs can't be put into JSON: {error}"));
            exit.max(Exit::Failed)
        }
    }
}
