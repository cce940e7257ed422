//! The plan: everything that is decided before anything is written.

use super::discover::{Discovered, Found, discover};
use super::guard::Guarded;
use super::recording::Treatment;
use super::witness::{Witness, witness};
use super::{FilterJob, JobError, paths};
use crate::cascade::Cascade;
use crate::design::{Design, design};
use crate::evidence::BandTask;
use crate::files::place::real;
use crate::output::DITHER_NAME;
use crate::package;
use crate::spec::{Dither, OutputEncoding, Spec};
use crate::spectrum::TransformCache;
use crate::wave::{Encoding, Header, Reader, SampleFormat};
use rayon::prelude::*;
use std::collections::BTreeMap;
use std::fs::File;
use std::path::{Path, PathBuf};
use std::sync::Arc;

/// Name of the report inside OUT, unless `--report` names another place.
pub const REPORT_FILE_NAME: &str = "bandproof-report.json";

/// A run as decided.
#[derive(Debug)]
pub struct Plan {
    /// Every recording, sorted by path.
    pub recordings: Vec<Planned>,
    /// Folders and files that could not be looked at: path as shown, and why.
    pub unreadable: Vec<(String, String)>,
    /// `._*` files passed over.
    pub dot_underscore: u64,
    /// Files that are no recordings.
    pub other_files: u64,
    /// What is done at each sample rate.
    pub rates: BTreeMap<u32, RatePlan>,
    /// Where the report goes.
    pub report: PathBuf,
}

/// One recording and where it goes.
#[derive(Clone, Debug)]
pub struct Planned {
    /// The input.
    pub found: Found,
    /// Relative path as the report shows it.
    pub shown: String,
    /// Whether [`Self::shown`] is escaped.
    pub escaped: bool,
    /// Where the output goes.
    pub target: PathBuf,
    /// What its header says, or why it can't be processed.
    pub header: Result<Brief, String>,
}

/// What the plan needs of a header.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Brief {
    /// Sample rate.
    pub rate_hz: u32,
    /// Channels.
    pub channels: u16,
    /// Frames.
    pub frames: u64,
}

impl Brief {
    /// The figures of `header`.
    pub fn of(header: &Header) -> Self {
        Brief { rate_hz: header.rate_hz, channels: header.channels, frames: header.frames }
    }
}

/// The design of one sample rate and what follows from it.
#[derive(Clone, Debug)]
pub struct RatePlan {
    /// The design.
    pub design: Design,
    /// What is done to each recording.
    pub treatment: Treatment,
    /// What the witness showed.
    pub witness: Witness,
}

impl Plan {
    /// Decides everything: finds the recordings, reads their headers, designs and
    /// checks each sample rate, runs the witnesses, and makes sure that nothing of
    /// the user's would be overwritten. Writes nothing.
    pub fn new(job: &FilterJob) -> Result<Self, JobError> {
        let discovered = discover(&job.input, &job.include, &job.exclude)?;
        if discovered.recordings.is_empty() && discovered.unreadable.is_empty() {
            return Err(JobError::NoRecordings { path: job.input.clone(), found: found_instead(&discovered) });
        }
        outside_input(&job.input, &job.output)?;
        let recordings: Vec<Planned> =
            discovered.recordings.into_par_iter().map(|found| Planned::new(found, &job.output)).collect();
        let report = job.report.clone().unwrap_or_else(|| job.output.join(REPORT_FILE_NAME));
        refuse_to_overwrite(job, &recordings, &report)?;
        let rates = plan_rates(&job.spec.spec, &recordings)?;
        let unreadable = discovered.unreadable.into_iter().map(|(path, why)| (paths::shown(&path).0, why)).collect();
        Ok(Plan {
            recordings,
            unreadable,
            dot_underscore: discovered.dot_underscore,
            other_files: discovered.other_files,
            rates,
            report,
        })
    }
}

/// What would be written must not be there, and a package must be possible.
fn refuse_to_overwrite(job: &FilterJob, recordings: &[Planned], report: &Path) -> Result<(), JobError> {
    let contents = super::filter::package_contents(job, report, "");
    let package = match job.emit {
        Some(emit) => {
            let mut planned_paths = recordings.iter().map(|planned| planned.found.relative.as_path());
            package::check(emit, &contents, &mut planned_paths).map_err(JobError::NoPackage)?;
            package::files(emit, &contents)
        }
        None => Vec::new(),
    };
    let documents = [("--report", report)].into_iter().chain(job.table.as_deref().map(|table| ("--csv", table)));
    super::guard::check(&Guarded {
        reads: recordings.iter().map(|planned| planned.found.path.as_path()).chain(job.spec_path.as_deref()).collect(),
        input: &job.input,
        outputs: recordings.iter().map(|planned| planned.target.as_path()).collect(),
        documents: documents.chain(package.iter().map(|file| ("--emit", file.as_path()))).collect(),
        replace: job.replace,
    })
}

impl Planned {
    fn new(found: Found, output: &Path) -> Self {
        let (shown, escaped) = paths::shown(&found.relative);
        let target = output.join(&found.relative);
        let header = File::open(&found.path)
            .map_err(|error| format!("can't be opened: {error}"))
            .and_then(|file| Reader::open(file).map_err(|error| error.to_string()))
            .map(|reader| Brief::of(reader.header()));
        Planned { found, shown, escaped, target, header }
    }
}

fn found_instead(discovered: &Discovered) -> String {
    let mut parts = vec![count(discovered.other_files - discovered.links, "other file")];
    if discovered.links > 0 {
        parts.push(format!("{} (links are not followed)", count(discovered.links, "link")));
    }
    if discovered.dot_underscore > 0 {
        parts.push(count(discovered.dot_underscore, "`._` file"));
    }
    if discovered.filtered_out > 0 {
        parts.push(format!("{} left out by --include or --exclude", count(discovered.filtered_out, "recording")));
    }
    parts.join(", ")
}

fn count(number: u64, what: &str) -> String {
    format!("{number} {what}{}", if number == 1 { "" } else { "s" })
}

/// OUT must be neither the input nor inside it, nor a file.
fn outside_input(input: &Path, output: &Path) -> Result<(), JobError> {
    let inside = |relation| JobError::OutputInInput { output: output.into(), input: input.into(), relation };
    let real_input = input.canonicalize().map_err(|cause| JobError::Input { path: input.into(), cause })?;
    let real_output = real(output);
    if real_output == real_input {
        return Err(inside("the same as"));
    }
    if real_output.starts_with(&real_input) {
        return Err(inside("inside"));
    }
    if real_output.exists() && !real_output.is_dir() {
        return Err(JobError::OutputIsFile(output.into()));
    }
    Ok(())
}

fn plan_rates(spec: &Spec, recordings: &[Planned]) -> Result<BTreeMap<u32, RatePlan>, JobError> {
    let mut first_with: BTreeMap<u32, &str> = BTreeMap::new();
    for recording in recordings {
        if let Ok(header) = &recording.header {
            first_with.entry(header.rate_hz).or_insert(&recording.shown);
        }
    }
    let designs: Vec<Design> = first_with
        .par_iter()
        .map(|(&rate_hz, &recording)| {
            design(spec, rate_hz).map_err(|cause| JobError::Design { recording: recording.into(), cause })
        })
        .collect::<Result<_, _>>()?;
    let impossible: Vec<String> = designs.iter().flat_map(Design::impossible).collect();
    if !impossible.is_empty() {
        return Err(JobError::Impossible(impossible));
    }
    designs.into_par_iter().map(|design| RatePlan::new(spec, design).map(|plan| (plan.design.rate_hz, plan))).collect()
}

impl RatePlan {
    fn new(spec: &Spec, design: Design) -> Result<Self, JobError> {
        let treatment = treatment(spec, &design);
        let rate_hz = design.rate_hz;
        let witness = witness(&design, &treatment).map_err(|cause| JobError::NoWitness { rate_hz, cause })?;
        if !witness.agrees {
            return Err(JobError::Witness {
                rate_hz,
                deviation: witness.deviation,
                at_hz: witness.deviation_at_hz,
                deviation_db: witness.deviation_db,
            });
        }
        Ok(RatePlan { design, treatment, witness })
    }
}

/// What a design and the spec's `[output]` come to for each recording of its rate.
pub fn treatment(spec: &Spec, design: &Design) -> Treatment {
    let format = match spec.output.encoding {
        OutputEncoding::Same => None,
        OutputEncoding::Pcm16 => Some(SampleFormat::full(Encoding::Pcm16)),
        OutputEncoding::Pcm24 => Some(SampleFormat::full(Encoding::Pcm24)),
        OutputEncoding::Pcm32 => Some(SampleFormat::full(Encoding::Pcm32)),
        OutputEncoding::Float32 => Some(SampleFormat::full(Encoding::Float32)),
        OutputEncoding::Float64 => Some(SampleFormat::full(Encoding::Float64)),
    };
    let bands = design.bands.iter().map(|band| BandTask {
        name: band.band.name.clone(),
        from_hz: band.band.line.from_hz,
        to_hz: band.band.line.to_hz,
        requirement: band.band.requirement.clone(),
        excepted_hz: band.excepted_hz.clone(),
        shortest_s: band.shortest_s,
    });
    Treatment {
        cascade: Arc::new(Cascade::new(&design.sections)),
        identity: spec.is_identity(),
        settling_frames: design.settling_frames,
        bands: bands.collect(),
        format,
        dither: dithers(spec),
        overload: spec.output.overload,
        gain_db: spec.output.gain_db,
        transforms: Arc::new(TransformCache::new()),
    }
}

/// What reports call the dither of this spec's integer outputs, or `none`.
pub fn dither_name(spec: &Spec) -> &'static str {
    if dithers(spec) { DITHER_NAME } else { "none" }
}

/// Whether integer outputs of this spec are dithered.
fn dithers(spec: &Spec) -> bool {
    spec.output.dither == Dither::Triangular
        && !spec.is_identity()
        && !matches!(spec.output.encoding, OutputEncoding::Float32 | OutputEncoding::Float64)
}
