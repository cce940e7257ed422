//! What can be typed.

use super::color::When;
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
  1    some band missed (with --strict: or unproven)
  2    command line, spec or folders wrong, or a requirement out of the filters' reach: nothing
       was written
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
    /// What every command takes.
    #[command(flatten)]
    pub common: CommonArgs,
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
        self.jobs.map_or_else(|| std::thread::available_parallelism().map_or(1, NonZeroUsize::get), NonZeroUsize::get)
    }
}

fn rate_hz(text: &str) -> Result<u32, String> {
    let expected = || format!("expected a whole number of hertz from 1 to {}, as 44100", u32::MAX);
    text.parse().ok().filter(|&rate_hz| rate_hz > 0).ok_or_else(expected)
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
