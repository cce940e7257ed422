//! The plan: everything that is decided before anything is written.

use super::collide;
use super::discover::{Discovered, Found, discover};
use super::earlier::{self, Earlier, Standing, verify};
use super::guard::Guarded;
use super::recording::Treatment;
use super::witness::{Witness, witness};
use super::{FilterJob, Interrupted, JobError, Progress, paths};
use crate::cascade::Cascade;
use crate::cascade::both_ways::{RING_FALL_DB, Reach};
use crate::design::{Design, auto, design, settling};
use crate::evidence::BandTask;
use crate::files::open;
use crate::files::place::{Stamp, real, same_file};
use crate::output::DITHER_NAME;
use crate::package;
use crate::spec::{Dither, OutputEncoding, RateMeaning, Spec, SpecFile};
use crate::spectrum::TransformCache;
use crate::wave::{Encoding, Header, History, RIFF_LIMIT_BYTES, Reader, SampleFormat};
use rayon::prelude::*;
use std::collections::{BTreeMap, BTreeSet};
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
    /// The spec in force: where the cascade is to be found from the bands, with the stages
    /// found for the sample rates of this run.
    pub spec: SpecFile,
    /// What was found, where it was.
    pub found_stages: Option<auto::Found>,
    /// What is done at each sample rate.
    pub rates: BTreeMap<u32, RatePlan>,
    /// Where the report goes.
    pub report: PathBuf,
    /// What an earlier run of this job left.
    pub earlier: Earlier,
    /// Files besides recordings that it wrote, and that this run replaces.
    pub ours: Vec<PathBuf>,
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
    /// Why its output can't be written: it would be that of another recording.
    pub collides: Option<String>,
    /// What of it an earlier run has done.
    pub standing: Standing,
    /// What an output that is to be replaced looked like when it was checked.
    pub outdated: Option<Stamp>,
}

/// What the plan needs of a header.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Brief {
    /// Sample rate that the spec's frequencies mean.
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
    /// checks each sample rate, runs the witnesses, sees what an earlier run of this job
    /// has done, and makes sure that nothing of the user's would be overwritten. Writes
    /// nothing.
    pub fn new(job: &FilterJob, progress: &dyn Progress) -> Result<Self, JobError> {
        let discovered = discover(&job.input, &job.include, &job.exclude)?;
        if discovered.recordings.is_empty() && discovered.unreadable.is_empty() {
            return Err(JobError::NoRecordings { path: job.input.clone(), found: found_instead(&discovered) });
        }
        outside_input(&job.input, &job.output)?;
        let rate = job.spec.spec.rate;
        let mut recordings: Vec<Planned> =
            discovered.recordings.into_par_iter().map(|found| Planned::new(found, &job.output, rate)).collect();
        let unreadable: Vec<(String, String)> =
            discovered.unreadable.into_iter().map(|(path, why)| (paths::shown(&path).0, why)).collect();
        let report = job.report.clone().unwrap_or_else(|| job.output.join(REPORT_FILE_NAME));
        collide::through_links(&mut recordings);
        if job.output.is_dir() {
            // A dry run makes no file to find out.
            collide::by_case(&mut recordings, |one, other| match job.dry_run {
                true => same_file(one, other),
                false => collide::case_insensitive(&job.output).unwrap_or(false),
            });
        }
        let listed = |shown: &str, escaped: bool| {
            position(&recordings, shown, escaped).is_some() || unreadable.iter().any(|(path, _)| path == shown)
        };
        let headers = recordings.iter().filter_map(|planned| planned.header.as_ref().ok());
        let (spec, found_stages) = in_force(&job.spec, headers.map(|brief| brief.rate_hz), progress)?;
        let earlier = Earlier::read(job, &spec, &report, &listed)
            .map_err(|cause| JobError::Earlier { path: job.output.join(super::journal::JOURNAL_NAME), cause })?;
        if let Some(recording) = earlier.stranger().filter(|_| !job.replace) {
            let path = job.output.join(super::journal::JOURNAL_NAME);
            return Err(JobError::OtherJournal { path, recording: recording.into() });
        }
        let ours = refuse_to_overwrite(job, &recordings, &report, &earlier)?;
        let rates = plan_rates(&spec, &recordings, progress)?;
        if !earlier.is_empty() {
            verify(&mut recordings, &earlier, progress)?;
            refuse_changed(job.replace, &recordings)?;
        }
        Ok(Plan {
            recordings,
            unreadable,
            dot_underscore: discovered.dot_underscore,
            other_files: discovered.other_files,
            spec,
            found_stages,
            rates,
            report,
            earlier,
            ours,
        })
    }

    /// Whether the package that is there, if any, is one that this very job wrote.
    pub fn package_is_ours(&self, job: &FilterJob) -> bool {
        let contents = super::filter::package_contents(job, &self.report, "", false);
        job.emit.is_some_and(|emit| package::files(emit, &contents).iter().all(|file| self.ours.contains(file)))
    }

    /// The recordings that no earlier run has done.
    pub fn to_do(&self) -> impl Iterator<Item = &Planned> {
        self.recordings.iter().filter(|planned| planned.standing != Standing::Kept)
    }

    /// The recording whose entry has this path, escaped or not.
    pub fn recording(&self, shown: &str, escaped: bool) -> Option<&Planned> {
        position(&self.recordings, shown, escaped).map(|place| &self.recordings[place])
    }
}

fn position(recordings: &[Planned], shown: &str, escaped: bool) -> Option<usize> {
    recordings.binary_search_by(|planned| (planned.shown.as_str(), planned.escaped).cmp(&(shown, escaped))).ok()
}

/// What would be written must not be there unless this very job wrote it, and a package
/// must be possible. Says which files besides recordings the job wrote. Whether its
/// recordings are as it wrote them is seen later.
fn refuse_to_overwrite(
    job: &FilterJob,
    recordings: &[Planned],
    report: &Path,
    earlier: &Earlier,
) -> Result<Vec<PathBuf>, JobError> {
    let contents = super::filter::package_contents(job, report, "", false);
    let package = match job.emit {
        Some(emit) => {
            let mut planned_paths = recordings.iter().map(|planned| planned.found.relative.as_path());
            package::check(emit, &contents, &mut planned_paths).map_err(JobError::NoPackage)?;
            package::files(emit, &contents)
        }
        None => Vec::new(),
    };
    let mut ours: Vec<PathBuf> = Vec::new();
    if let earlier::Found::Ours(told) = earlier.report() {
        ours.push(report.into());
        if let Some(emit) = job.emit {
            let contents = super::filter::package_contents(job, report, &told.head.run.started, false);
            let path = |shown: &str, escaped| {
                position(recordings, shown, escaped).map(|place| recordings[place].found.relative.clone())
            };
            let items = earlier.items(&path);
            let written = items.is_ok_and(|items| {
                package::is_as_written(emit, &contents, &mut items.into_iter().map(Ok)).unwrap_or(false)
            });
            if written {
                ours.extend(package.iter().cloned());
            }
        }
    }
    if let Some(table) = job.table.as_deref().filter(|table| table.is_file())
        && earlier.wrote_table(table).unwrap_or(false)
    {
        ours.push(table.into());
    }
    let documents = [("--report", report)].into_iter().chain(job.table.as_deref().map(|table| ("--csv", table)));
    let claimed = recordings.iter().filter(|planned| earlier.claims(&planned.shown, planned.escaped));
    let reason = match earlier.report() {
        earlier::Found::Foreign(Some(what)) | earlier::Found::Wider(what) => {
            Some(format!("{} is {what}", report.display()))
        }
        _ => None,
    };
    super::guard::check(&Guarded {
        reads: recordings.iter().map(|planned| planned.found.path.as_path()).chain(job.spec_path.as_deref()).collect(),
        input: &job.input,
        output: Some(&job.output),
        outputs: recordings
            .iter()
            .filter(|planned| planned.collides.is_none())
            .map(|planned| planned.target.as_path())
            .collect(),
        documents: documents.chain(package.iter().map(|file| ("--emit", file.as_path()))).collect(),
        replace: job.replace,
        ours: claimed.map(|planned| planned.target.as_path()).chain(ours.iter().map(PathBuf::as_path)).collect(),
        reason,
    })?;
    Ok(ours)
}

/// An output that is not what the earlier run wrote is the user's, and outputs that were all
/// made from other recordings are those of another dataset.
fn refuse_changed(replace: bool, recordings: &[Planned]) -> Result<(), JobError> {
    if replace {
        return Ok(());
    }
    let refuse = |standing: Standing, reason: &str| {
        let mut those = recordings.iter().filter(|planned| planned.standing == standing);
        those.next().map_or(Ok(()), |first| {
            let (count, first) = (1 + those.count(), first.target.clone());
            Err(JobError::Exists { count, first, reason: Some(reason.into()) })
        })
    };
    refuse(Standing::InTheWay, "it is not, or can't be seen to be, what an earlier run wrote there")?;
    if recordings.iter().any(|planned| planned.standing == Standing::Kept) {
        return Ok(());
    }
    refuse(Standing::Outdated, "made from other recordings of the same names")
}

impl Planned {
    fn new(found: Found, output: &Path, rate: Option<RateMeaning>) -> Self {
        let (shown, escaped) = paths::shown(&found.relative);
        let target = output.join(&found.relative);
        let header = open::regular(&found.path)
            .map_err(|error| format!("can't be opened: {error}"))
            .and_then(|file| Reader::open_as(file, rate).map_err(|error| error.to_string()))
            .map(|reader| Brief::of(reader.header()));
        Planned { found, shown, escaped, target, header, collides: None, standing: Standing::Open, outdated: None }
    }

    /// What its header says, or why it can't be done.
    pub fn usable(&self) -> Result<&Brief, &str> {
        match (&self.collides, &self.header) {
            (Some(why), _) | (None, Err(why)) => Err(why),
            (None, Ok(brief)) => Ok(brief),
        }
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

/// The spec with the stages that are found for `rates_hz` where it leaves them to the program,
/// and what was found; as it is where there is no rate.
pub(super) fn in_force(
    spec: &SpecFile,
    rates_hz: impl Iterator<Item = u32>,
    progress: &dyn Progress,
) -> Result<(SpecFile, Option<auto::Found>), JobError> {
    let Some(asked) = spec.spec.auto else { return Ok((spec.clone(), None)) };
    let rates_hz: BTreeSet<u32> = rates_hz.collect();
    let rates_hz: Vec<u32> = rates_hz.into_iter().collect();
    if rates_hz.is_empty() {
        // Not one recording can be read: each has its own reason to fail, and nothing is filtered.
        return Ok((spec.clone(), None));
    }
    progress.finding();
    let found = auto::find(&spec.spec, asked, &rates_hz).map_err(JobError::Auto)?;
    Ok((SpecFile { spec: found.spec.clone(), file_sha256: spec.file_sha256.clone() }, Some(found)))
}

fn plan_rates(
    spec: &SpecFile,
    recordings: &[Planned],
    progress: &dyn Progress,
) -> Result<BTreeMap<u32, RatePlan>, JobError> {
    let mut first_with: BTreeMap<u32, &str> = BTreeMap::new();
    for recording in recordings {
        if let Ok(header) = &recording.header {
            first_with.entry(header.rate_hz).or_insert(&recording.shown);
        }
    }
    let designs: Vec<Design> = first_with
        .par_iter()
        .map(|(&rate_hz, &recording)| {
            go_on(progress)?;
            design(&spec.spec, rate_hz)
                .map_err(|cause| JobError::Design { recording: recording.into(), cause: cause.into() })
        })
        .collect::<Result<_, _>>()?;
    let impossible: Vec<String> = designs.iter().flat_map(Design::impossible).collect();
    if !impossible.is_empty() {
        return Err(JobError::Impossible(impossible));
    }
    let planned = |design| {
        go_on(progress)?;
        RatePlan::new(spec, design).map(|plan| (plan.design.rate_hz, plan))
    };
    designs.into_par_iter().map(planned).collect()
}

fn go_on(progress: &dyn Progress) -> Result<(), Interrupted> {
    if progress.interrupted() { Err(Interrupted) } else { Ok(()) }
}

impl RatePlan {
    fn new(spec: &SpecFile, design: Design) -> Result<Self, JobError> {
        let history = history(&spec.spec, &design, env!("CARGO_PKG_VERSION"), &spec.file_sha256);
        let treatment = Treatment { history, ..treatment(&spec.spec, &design) };
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

/// What version `version` of this program appends to each recording's own metadata, if the
/// spec, whose file has the hash `spec_sha256`, asks for it.
pub fn history(spec: &Spec, design: &Design, version: &str, spec_sha256: &str) -> Option<History> {
    let tool = format!("{} {version}", env!("CARGO_PKG_NAME"));
    let both_ways = design.passes > 1;
    spec.output.history.then(|| History { tool, both_ways, spec_sha256: spec_sha256.to_owned() })
}

/// What a design and the spec's `[output]` come to for each recording of its rate, but for
/// [`history`].
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
        both_ways: (design.passes > 1).then(|| {
            let ring_frames = settling::settling_frames(&design.sections, RING_FALL_DB);
            Reach::new(usize::try_from(ring_frames).unwrap_or(usize::MAX))
        }),
        identity: spec.is_identity(),
        settling_frames: design.settling_frames,
        bands: bands.collect(),
        format,
        riff_limit_bytes: RIFF_LIMIT_BYTES,
        history: None,
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
