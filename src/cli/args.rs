//! What can be typed.

use super::color::When;
use bandproof::export::{Form, precision};
use bandproof::job::pair::DEFAULT_MAX_DELAY_S;
use bandproof::package::Emit;
use clap::{Args, Parser, Subcommand};
use std::num::NonZeroUsize;
use std::path::PathBuf;

/// Filter recordings by a written spec and prove, band by band, what came out.
#[derive(Debug, Parser)]
#[command(name = "bandproof", version, max_term_width = 100, after_help = STATUSES)]
#[command(arg_required_else_help = true, subcommand_required = true)]
pub struct Cli {
    /// What to do.
    #[command(subcommand)]
    pub command: Command,
}

const STATUSES: &str = "\
Exit status:
  0    every recording done, no band missed
  1    some band missed (with --strict: or unproven); recheck: something is not as the report says;
       export: a requirement holds less well with so few digits or bits
  2    command line, spec, report or folders wrong, or a requirement out of the filters' reach:
       nothing was written, but the table of `design --csv` for the rates that have a design
  3    some recording could not be processed, or the report could not be written
  130  interrupted";

/// The commands.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Filter a folder of recordings (or one) into another folder, measure each before and
    /// after, and write the report
    Filter(FilterArgs),
    /// Show what the spec becomes at a sample rate, without touching a recording
    Design(DesignArgs),
    /// Measure pairs of recordings that something else filtered, and write the report
    Measure(MeasureArgs),
    /// Write a recording to play through a device and measure with
    Excite(ExciteArgs),
    /// Check that a dataset still is what its report says
    Recheck(RecheckArgs),
    /// Print the cascade for other programs: JSON, C, Rust, NumPy, equations, integers
    Export(ExportArgs),
    /// Print the JSON Schema of spec files or of reports
    Schema(SchemaArgs),
}

/// `filter`.
#[derive(Debug, Args)]
#[command(max_term_width = 100)]
pub struct FilterArgs {
    /// The spec file, .toml or .json
    #[arg(value_name = "SPEC")]
    pub spec: PathBuf,
    /// Folder of recordings (.wav, .wave, .bwf in any case, below it at any depth), or one recording
    #[arg(value_name = "IN")]
    pub input: PathBuf,
    /// Folder for the filtered recordings; made if missing, must not be or lie inside IN
    #[arg(value_name = "OUT")]
    pub output: PathBuf,
    /// Where to write the report [default: bandproof-report.json in OUT]
    #[arg(long, value_name = "FILE")]
    pub report: Option<PathBuf>,
    /// Also write the figures as a flat table: one row a recording, channel and band
    #[arg(long, value_name = "FILE")]
    pub csv: Option<PathBuf>,
    /// Also make a dataset package of outputs and report: `datapackage` writes a descriptor beside
    /// the report, `bagit` makes the folder above OUT a bag (OUT must be named `data`)
    #[arg(long, value_name = "FORM", value_enum)]
    pub emit: Option<EmitForm>,
    /// Only plan and check the design; write nothing
    #[arg(long)]
    pub dry_run: bool,
    /// With --dry-run: read every recording too and list what would fail or overload
    #[arg(long, requires = "dry_run")]
    pub scan: bool,
    /// Allow files to be overwritten that exist already
    #[arg(long)]
    pub replace: bool,
    /// Take only recordings whose name matches, or whose path below IN if there is a `/` in the
    /// pattern; may be given more than once
    #[arg(long, value_name = "GLOB")]
    pub include: Vec<String>,
    /// Leave out recordings that match in the same way; may be given more than once
    #[arg(long, value_name = "GLOB")]
    pub exclude: Vec<String>,
    /// End with status 1 also where a band stays unproven
    #[arg(long)]
    pub strict: bool,
    /// What every command takes.
    #[command(flatten)]
    pub common: CommonArgs,
}

/// `design`.
#[derive(Debug, Args)]
#[command(max_term_width = 100)]
pub struct DesignArgs {
    /// The spec file, .toml or .json
    #[arg(value_name = "SPEC")]
    pub spec: PathBuf,
    /// Sample rate; may be given more than once [default: 48000]
    #[arg(long, value_name = "HZ", value_parser = rate_hz, allow_negative_numbers = true)]
    pub rate: Vec<u32>,
    /// Also write the response as a table, dense around each pole and exact at each edge: gain, phase,
    /// group delay and limits; not over a file that exists
    #[arg(long, value_name = "FILE")]
    pub csv: Option<PathBuf>,
    /// Also write the spec with every default filled in and the stages that were found to a new
    /// file, .toml or .json
    #[arg(long, value_name = "FILE")]
    pub write: Option<PathBuf>,
    /// What every command takes.
    #[command(flatten)]
    pub common: CommonArgs,
}

/// `measure`.
#[derive(Debug, Args)]
#[command(max_term_width = 100)]
pub struct MeasureArgs {
    /// The spec file, .toml or .json
    #[arg(value_name = "SPEC")]
    pub spec: PathBuf,
    /// Folder of recordings as they went in, or one recording
    #[arg(value_name = "BEFORE")]
    pub before: PathBuf,
    /// Folder of the same recordings as they came out, paired by their paths below it, or one recording
    #[arg(value_name = "AFTER")]
    pub after: PathBuf,
    /// Where to write the report
    #[arg(long, value_name = "FILE", default_value = "bandproof-report.json")]
    pub report: PathBuf,
    /// Also write the figures as a flat table: one row a recording, channel and band
    #[arg(long, value_name = "FILE")]
    pub csv: Option<PathBuf>,
    /// Recording of the idle device: its spectrum is taken for what the device adds
    #[arg(long, value_name = "FILE")]
    pub noise: Option<PathBuf>,
    /// Delay of AFTER, where it is known, frames; may be negative and have a fraction
    #[arg(long, value_name = "FRAMES", value_parser = finite, allow_negative_numbers = true, conflicts_with = "max_delay")]
    pub delay: Option<f64>,
    /// Largest delay either way to look for, seconds
    #[arg(long, value_name = "S", value_parser = max_delay, allow_negative_numbers = true, default_value_t = DEFAULT_MAX_DELAY_S)]
    pub max_delay: f64,
    /// Allow report and table to replace files that exist already
    #[arg(long)]
    pub replace: bool,
    /// Take only recordings whose name matches, or whose path below BEFORE if there is a `/` in the
    /// pattern; may be given more than once
    #[arg(long, value_name = "GLOB")]
    pub include: Vec<String>,
    /// Leave out recordings that match in the same way; may be given more than once
    #[arg(long, value_name = "GLOB")]
    pub exclude: Vec<String>,
    /// End with status 1 also where a band stays unproven
    #[arg(long)]
    pub strict: bool,
    /// What every command takes.
    #[command(flatten)]
    pub common: CommonArgs,
}

/// `excite`.
#[derive(Debug, Args)]
#[command(max_term_width = 100)]
pub struct ExciteArgs {
    /// The spec file, .toml or .json
    #[arg(value_name = "SPEC")]
    pub spec: PathBuf,
    /// The recording to write, .wav
    #[arg(value_name = "FILE")]
    pub file: PathBuf,
    /// Sample rate
    #[arg(long, value_name = "HZ", value_parser = rate_hz, allow_negative_numbers = true)]
    pub rate: u32,
    /// Length
    #[arg(long, value_name = "S", value_parser = finite, allow_negative_numbers = true)]
    pub seconds: f64,
    /// Allow the file to be overwritten
    #[arg(long)]
    pub replace: bool,
    /// What every command takes.
    #[command(flatten)]
    pub common: CommonArgs,
}

/// `recheck`.
#[derive(Debug, Args)]
#[command(max_term_width = 100)]
pub struct RecheckArgs {
    /// A report of `filter` or `measure`
    #[arg(value_name = "REPORT")]
    pub report: PathBuf,
    /// Where the inputs are (BEFORE of `measure`); without it inputs are not looked at
    #[arg(long, value_name = "DIR")]
    pub input: Option<PathBuf>,
    /// Where the outputs are (AFTER of `measure`) [default: the folder of the report]
    #[arg(long, value_name = "DIR")]
    pub output: Option<PathBuf>,
    /// Filter the inputs again and require the same outputs, bit for bit
    #[arg(long, requires = "input")]
    pub replay: bool,
    /// Measure again and require the same verdicts and, within 0.002 dB, the same figures
    #[arg(long, requires = "input")]
    pub remeasure: bool,
    /// With --remeasure: the recording of the idle device that `measure` was given
    #[arg(long, value_name = "FILE", requires = "remeasure")]
    pub noise: Option<PathBuf>,
    /// With --remeasure: also write the figures as a flat table
    #[arg(long, value_name = "FILE", requires = "remeasure")]
    pub csv: Option<PathBuf>,
    /// Allow the table to replace a file that exists already
    #[arg(long)]
    pub replace: bool,
    /// What every command takes.
    #[command(flatten)]
    pub common: CommonArgs,
}

/// `export`.
#[derive(Debug, Args)]
#[command(max_term_width = 100)]
pub struct ExportArgs {
    /// The spec file, .toml or .json
    #[arg(value_name = "SPEC")]
    pub spec: PathBuf,
    /// Sample rate
    #[arg(long, value_name = "HZ", value_parser = rate_hz, allow_negative_numbers = true)]
    pub rate: u32,
    /// As what
    #[arg(long = "as", value_name = "FORM", value_enum)]
    pub form: ExportForm,
    /// Significant decimal digits of the coefficients, 1 to 17 [default: all; equation: the fewest
    /// that hold every requirement]
    #[arg(long, value_name = "N", value_parser = digits, allow_negative_numbers = true)]
    pub digits: Option<u32>,
    /// Word length of `fixed`, 8 to 32 [default: the shortest that holds every requirement]
    #[arg(long, value_name = "N", value_parser = bits, allow_negative_numbers = true)]
    pub bits: Option<u32>,
    /// Threads to find stages with where the spec leaves them to the program [default: all cores]
    #[arg(long, value_name = "N", value_parser = threads, allow_negative_numbers = true)]
    pub jobs: Option<NonZeroUsize>,
    /// Print the form and errors only: no progress
    #[arg(long)]
    pub quiet: bool,
}

impl ExportArgs {
    /// Threads to use: as asked for, else one a core.
    pub fn threads(&self) -> usize {
        or_all_cores(self.jobs)
    }
}

/// `--as`.
#[derive(Clone, Copy, Debug, clap::ValueEnum)]
pub enum ExportForm {
    /// Sections in full, as in the report
    Json,
    /// A C99 file with a block function
    C,
    /// A Rust module with a block function
    Rust,
    /// A Python file with the array that SciPy's sosfilt takes
    Numpy,
    /// Difference equations, one line a section
    Equation,
    /// Integers of a given word length, with a scaling for each section
    Fixed,
}

impl From<ExportForm> for Form {
    fn from(form: ExportForm) -> Self {
        match form {
            ExportForm::Json => Form::Json,
            ExportForm::C => Form::C,
            ExportForm::Rust => Form::Rust,
            ExportForm::Numpy => Form::Numpy,
            ExportForm::Equation => Form::Equation,
            ExportForm::Fixed => Form::Fixed,
        }
    }
}

/// `schema`.
#[derive(Debug, Args)]
#[command(max_term_width = 100)]
pub struct SchemaArgs {
    /// Of which file
    #[arg(value_name = "FILE", value_enum)]
    pub of: SchemaOf,
}

/// The two files that have a schema.
#[derive(Clone, Copy, Debug, clap::ValueEnum)]
pub enum SchemaOf {
    /// Spec files
    Spec,
    /// Reports
    Report,
}

/// `--emit`.
#[derive(Clone, Copy, Debug, clap::ValueEnum)]
pub enum EmitForm {
    /// A Data Package descriptor
    Datapackage,
    /// A bag (RFC 8493)
    Bagit,
}

impl From<EmitForm> for Emit {
    fn from(form: EmitForm) -> Self {
        match form {
            EmitForm::Datapackage => Emit::Datapackage,
            EmitForm::Bagit => Emit::Bagit,
        }
    }
}

/// What every command takes.
#[derive(Debug, Args)]
pub struct CommonArgs {
    /// Threads to use [default: all cores]
    #[arg(long, value_name = "N", value_parser = threads, allow_negative_numbers = true)]
    pub jobs: Option<NonZeroUsize>,
    /// Print errors only: no progress, no summary
    #[arg(long)]
    pub quiet: bool,
    /// Print one JSON document on stdout and nothing else
    #[arg(long)]
    pub json: bool,
    /// When to color the text
    #[arg(long, value_name = "WHEN", value_enum, default_value_t = When::Auto)]
    pub color: When,
}

impl CommonArgs {
    /// Threads to use: as asked for, else one a core.
    pub fn threads(&self) -> usize {
        or_all_cores(self.jobs)
    }
}

fn or_all_cores(jobs: Option<NonZeroUsize>) -> usize {
    jobs.or_else(|| std::thread::available_parallelism().ok()).map_or(1, NonZeroUsize::get)
}

fn rate_hz(text: &str) -> Result<u32, String> {
    let expected = || format!("expected a whole number of hertz from 1 to {}, as 44100", u32::MAX);
    text.parse().ok().filter(|&rate_hz| rate_hz > 0).ok_or_else(expected)
}

fn digits(text: &str) -> Result<u32, String> {
    whole(text, 1, precision::MOST_DIGITS, "significant digits")
}

fn bits(text: &str) -> Result<u32, String> {
    whole(text, precision::FEWEST_BITS, precision::MOST_BITS, "bits")
}

fn whole(text: &str, least: u32, most: u32, unit: &str) -> Result<u32, String> {
    let expected = || format!("expected a whole number of {unit} from {least} to {most}");
    text.parse().ok().filter(|number| (least..=most).contains(number)).ok_or_else(expected)
}

fn finite(text: &str) -> Result<f64, String> {
    text.parse().ok().filter(|number: &f64| number.is_finite()).ok_or_else(|| "expected a number".to_owned())
}

fn max_delay(text: &str) -> Result<f64, String> {
    let expected = || "expected a number of seconds above 0 and at most 600".to_owned();
    text.parse().ok().filter(|&seconds: &f64| seconds > 0.0 && seconds <= 600.0).ok_or_else(expected)
}

fn threads(text: &str) -> Result<NonZeroUsize, String> {
    text.parse().map_err(|_| "expected a whole number of threads, at least 1".to_owned())
}

#[cfg(test)]
mod tests {
    use super::*;
    use clap::CommandFactory;

    #[test]
    fn the_arguments_are_consistent() {
        Cli::command().debug_assert();
    }
}
