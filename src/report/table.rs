//! The report as a flat table: RFC 4180 CSV, one row a recording, channel and band.
//!
//! UTF-8 without a byte order mark, a header line, commas, CR LF at the end of each
//! record; cells with commas, quotes or line breaks are quoted, quotes in them doubled.
//! The columns are the same in every table, whichever command wrote it, and numbers are
//! written as in the JSON report. A cell is empty where the report has null, or where there
//! is nothing to tell: a row of a failed recording has no channel and no band. Every
//! recording has a row, also one without channels or bands.
//!
//! Names are not altered. A path or a band's name may begin with `=`, `+`, `-` or `@`, and
//! a spreadsheet then takes the cell for a formula; an apostrophe put before it would be
//! part of the name for everything else that reads the table, and the path would be no path
//! any more. Import such a table with its columns as text.
//!
//! # Columns
//! Columns are named like the report's keys; of keys that occur more than once those of
//! the output begin with `output_`, those of the recording after (`pair`) with `after_`.
//!
//! | column | holds | empty |
//! |---|---|---|
//! | `path` | the recording, relative to the input root | never |
//! | `status` | `done` or `failed` | never |
//! | `error` | why it failed | unless failed |
//! | `notes` | what was unusual, joined by `; ` | nothing was |
//! | `input_sha256` | SHA-256 of the input | it was not read to its end |
//! | `input_bytes` | its length | its header could not be read, or does not tell the rate meant |
//! | `input_encoding` | `pcm8` to `pcm32`, `float32`, `float64` | likewise |
//! | `rate_hz` | sample rate that the spec's frequencies mean | likewise |
//! | `channels` | number of channels | likewise |
//! | `frames` | number of frames | likewise |
//! | `seconds` | frames over `rate_hz` | likewise |
//! | `full_scale_runs` | runs of samples at full scale | it was not read to its end |
//! | `time_expansion` | how many times the header's sample rate goes into `rate_hz` | its header could not be read, or does not tell the rate meant |
//! | `output_path` | the output, relative to the output root | nothing was written |
//! | `output_sha256` | SHA-256 of the output | likewise |
//! | `output_bytes` | its length | likewise |
//! | `output_encoding` | as `input_encoding` | likewise |
//! | `output_peak_dbfs` | largest sample as written, dB relative to full scale | likewise; silence |
//! | `clipped_samples` | samples that were saturated | nothing was written |
//! | `gain_db` | gain in force | likewise |
//! | `after_path` | the recording after, relative to its root (`measure`) | without a pair |
//! | `after_sha256` | its SHA-256 | likewise; it was not read to its end |
//! | `after_bytes` | its length | without a pair |
//! | `after_encoding` | as `input_encoding` | likewise |
//! | `after_frames` | its frames | likewise |
//! | `after_full_scale_runs` | its runs at full scale | likewise; it was not read to its end |
//! | `delay_frames` | by how much it lags at the first frame before | likewise; the pair failed |
//! | `delay_source` | `found` or `given` | likewise; the pair failed |
//! | `max_delay_s` | largest delay that was looked for | likewise; the pair failed; it was given |
//! | `clock_ppm` | how much more frames it has for the same time, parts in a million | likewise; the pair failed |
//! | `clock_error_ppm` | one standard error of that difference | likewise; fewer than two delays were seen |
//! | `delay_scatter_s` | scatter of the delays along the recording | likewise; fewer than three were seen |
//! | `inverted` | whether its sign is turned: `true`, `false` | likewise; the pair failed |
//! | `overlap_frames` | frames before that have a partner after | likewise; the pair failed |
//! | `noise_sha256` | hash of the idle device's recording | likewise; there was none |
//! | `design_deviation_db` | largest deviation of the gains seen from the spec's stages | without stages or gains |
//! | `design_deviation_error_db` | one standard error of that gain | likewise |
//! | `design_deviation_at_hz` | where that is | likewise |
//! | `window` | window of the spectra | no spectrum was taken |
//! | `segment_frames` | length of a segment | likewise |
//! | `segments` | segments averaged | likewise |
//! | `bin_hz` | distance of two bins | likewise |
//! | `skipped_s` | what was left out at the start (with two passes, at the end as well) | likewise |
//! | `channel` | 1 for the first | failed; no bands |
//! | `reference_gain_db` | this channel's gain in the reference band, counted as 0 dB (`measure`) | no reference band |
//! | `band` | name of the band | failed; no bands |
//! | `from_hz` | its lower edge | likewise |
//! | `to_hz` | its upper edge | likewise |
//! | `reduce_db` | how far its level must come down | another requirement, or none |
//! | `keep_db` | within what its gain must stay | likewise |
//! | `residual_dbfs` | at or below which level it must end | likewise |
//! | `before_dbfs` | level before | below -200 dBFS |
//! | `before_floor_dbfs` | level up to which that may be something else | likewise |
//! | `after_dbfs` | level after | likewise |
//! | `after_floor_dbfs` | level up to which that may be something else | likewise |
//! | `measured_attenuation_db` | before less after | one of them is |
//! | `demonstrable_attenuation_db` | most that could have been shown | the band is not above its floor |
//! | `line_hz` | frequency of the highest peak before | keep and observed bands; no peak |
//! | `line_before_dbfs` | its level before | likewise |
//! | `line_after_dbfs` | the level there after | likewise |
//! | `gain_min_db` | lowest gain seen in the band | reduce and residual bands; none was seen |
//! | `gain_max_db` | highest gain seen | likewise |
//! | `gain_error_db` | standard error of the gain that decides | likewise |
//! | `resolved` | share of the band in which a gain was seen, 0 to 1 | reduce and residual bands |
//! | `resolution_hz` | narrowest detail that the figures tell apart | no spectrum was taken |
//! | `verdict` | `met`, `missed` or `unproven` | nothing is required |
//! | `reason_code` | why it is unproven, one word | unless unproven |
//! | `reason` | a sentence on the verdict or on figures that are missing | none is needed |

use super::{BandEntry, ChannelEntry, Recording, Require};
use serde::Serialize;
use std::io::{self, Write};

/// What a cell holds; `None` where it is empty.
type Cell = Option<String>;

/// A band in one channel of one recording.
struct Place<'a> {
    recording: &'a Recording,
    channel: &'a ChannelEntry,
    band: &'a BandEntry,
}

type OfRecording = fn(&Recording) -> Cell;
type OfBand = fn(&Place<'_>) -> Cell;

/// The columns that are the same in all rows of a recording: name and cell.
const RECORDING: &[(&str, OfRecording)] = &[
    ("path", |r| text(&r.path)),
    ("status", |r| word(&r.status)),
    ("error", |r| r.error.clone()),
    ("notes", |r| text(&r.notes.join("; "))),
    ("input_sha256", |r| r.input.as_ref()?.sha256.clone()),
    ("input_bytes", |r| number(r.input.as_ref()?.bytes)),
    ("input_encoding", |r| text(&r.input.as_ref()?.encoding)),
    ("rate_hz", |r| number(r.input.as_ref()?.rate_hz)),
    ("channels", |r| number(r.input.as_ref()?.channels)),
    ("frames", |r| number(r.input.as_ref()?.frames)),
    ("seconds", |r| number(r.input.as_ref()?.seconds)),
    ("full_scale_runs", |r| number(r.input.as_ref()?.full_scale_runs?)),
    ("time_expansion", |r| number(r.input.as_ref()?.time_expansion)),
    ("output_path", |r| text(&r.output.as_ref()?.path)),
    ("output_sha256", |r| text(&r.output.as_ref()?.sha256)),
    ("output_bytes", |r| number(r.output.as_ref()?.bytes)),
    ("output_encoding", |r| text(&r.output.as_ref()?.encoding)),
    ("output_peak_dbfs", |r| number(r.output.as_ref()?.peak_dbfs?)),
    ("clipped_samples", |r| number(r.output.as_ref()?.clipped_samples)),
    ("gain_db", |r| number(r.output.as_ref()?.gain_db)),
    ("after_path", |r| text(&r.pair.as_ref()?.path)),
    ("after_sha256", |r| r.pair.as_ref()?.sha256.clone()),
    ("after_bytes", |r| number(r.pair.as_ref()?.bytes)),
    ("after_encoding", |r| text(&r.pair.as_ref()?.encoding)),
    ("after_frames", |r| number(r.pair.as_ref()?.frames)),
    ("after_full_scale_runs", |r| number(r.pair.as_ref()?.full_scale_runs?)),
    ("delay_frames", |r| number(r.pair.as_ref()?.delay_frames?)),
    ("delay_source", |r| word(&r.pair.as_ref()?.delay_source?)),
    ("max_delay_s", |r| number(r.pair.as_ref()?.max_delay_s?)),
    ("clock_ppm", |r| number(r.pair.as_ref()?.clock_ppm?)),
    ("clock_error_ppm", |r| number(r.pair.as_ref()?.clock_error_ppm?)),
    ("delay_scatter_s", |r| number(r.pair.as_ref()?.delay_scatter_s?)),
    ("inverted", |r| number(r.pair.as_ref()?.inverted?)),
    ("overlap_frames", |r| number(r.pair.as_ref()?.overlap_frames?)),
    ("noise_sha256", |r| r.pair.as_ref()?.noise_sha256.clone()),
    ("design_deviation_db", |r| number(r.pair.as_ref()?.design_deviation_db?)),
    ("design_deviation_error_db", |r| number(r.pair.as_ref()?.design_deviation_error_db?)),
    ("design_deviation_at_hz", |r| number(r.pair.as_ref()?.design_deviation_at_hz?)),
    ("window", |r| text(&r.spectrum.as_ref()?.window)),
    ("segment_frames", |r| number(r.spectrum.as_ref()?.segment_frames)),
    ("segments", |r| number(r.spectrum.as_ref()?.segments)),
    ("bin_hz", |r| number(r.spectrum.as_ref()?.bin_hz)),
    ("skipped_s", |r| number(r.spectrum.as_ref()?.skipped_s)),
];

/// The columns that follow them.
const BAND: &[(&str, OfBand)] = &[
    ("channel", |p| number(p.channel.channel)),
    ("reference_gain_db", |p| {
        let gains = p.recording.pair.as_ref()?.reference_gain_db.as_ref()?;
        number(*gains.get(usize::from(p.channel.channel).checked_sub(1)?)?)
    }),
    ("band", |p| text(&p.band.name)),
    ("from_hz", |p| number(p.band.from_hz)),
    ("to_hz", |p| number(p.band.to_hz)),
    ("reduce_db", |p| match p.band.require? {
        Require::ReduceDb(db) => number(db),
        Require::KeepDb(_) | Require::ResidualDbfs(_) => None,
    }),
    ("keep_db", |p| match p.band.require? {
        Require::KeepDb(db) => number(db),
        Require::ReduceDb(_) | Require::ResidualDbfs(_) => None,
    }),
    ("residual_dbfs", |p| match p.band.require? {
        Require::ResidualDbfs(dbfs) => number(dbfs),
        Require::ReduceDb(_) | Require::KeepDb(_) => None,
    }),
    ("before_dbfs", |p| number(p.band.before_dbfs?)),
    ("before_floor_dbfs", |p| number(p.band.before_floor_dbfs?)),
    ("after_dbfs", |p| number(p.band.after_dbfs?)),
    ("after_floor_dbfs", |p| number(p.band.after_floor_dbfs?)),
    ("measured_attenuation_db", |p| number(p.band.measured_attenuation_db?)),
    ("demonstrable_attenuation_db", |p| number(p.band.demonstrable_attenuation_db?)),
    ("line_hz", |p| number(p.band.line_hz?)),
    ("line_before_dbfs", |p| number(p.band.line_before_dbfs?)),
    ("line_after_dbfs", |p| number(p.band.line_after_dbfs?)),
    ("gain_min_db", |p| number(p.band.gain_min_db?)),
    ("gain_max_db", |p| number(p.band.gain_max_db?)),
    ("gain_error_db", |p| number(p.band.gain_error_db?)),
    ("resolved", |p| number(p.band.resolved?)),
    ("resolution_hz", |p| number(p.band.resolution_hz?)),
    ("verdict", |p| word(&p.band.verdict?)),
    ("reason_code", |p| word(&p.band.reason_code?)),
    ("reason", |p| p.band.reason.clone()),
];

/// Writes the rows of one recording after another.
#[derive(Debug)]
pub struct TableWriter<W: Write> {
    out: csv::Writer<W>,
}

impl<W: Write> TableWriter<W> {
    /// Writes the header line.
    ///
    /// # Errors
    /// Those of `out`.
    pub fn new(out: W) -> io::Result<Self> {
        let mut out = csv::WriterBuilder::new().terminator(csv::Terminator::CRLF).from_writer(out);
        out.write_record(Self::columns())?;
        Ok(TableWriter { out })
    }

    /// The header: the names of the columns from the first to the last.
    pub fn columns() -> impl Iterator<Item = &'static str> {
        RECORDING.iter().map(|(name, _)| *name).chain(BAND.iter().map(|(name, _)| *name))
    }

    /// Writes the rows of `recording`: one for each band of each channel, or one alone where
    /// it has none, as where it failed.
    ///
    /// # Errors
    /// Those of the output.
    pub fn add(&mut self, recording: &Recording) -> io::Result<()> {
        let common: Vec<Cell> = RECORDING.iter().map(|(_, cell)| cell(recording)).collect();
        let mut alone = true;
        for channel in &recording.channels {
            for band in &channel.bands {
                self.row(&common, Some(&Place { recording, channel, band }))?;
                alone = false;
            }
        }
        if alone { self.row(&common, None) } else { Ok(()) }
    }

    /// Writes what is still held back and gives the output back.
    ///
    /// # Errors
    /// Those of the output.
    pub fn finish(self) -> io::Result<W> {
        let mut out = self.out.into_inner().map_err(csv::IntoInnerError::into_error)?;
        out.flush()?;
        Ok(out)
    }

    fn row(&mut self, common: &[Cell], place: Option<&Place<'_>>) -> io::Result<()> {
        for cell in common {
            self.out.write_field(cell.as_deref().unwrap_or(""))?;
        }
        for (_, cell) in BAND {
            self.out.write_field(place.and_then(cell).as_deref().unwrap_or(""))?;
        }
        // Ends the record.
        self.out.write_record(None::<&[u8]>)?;
        Ok(())
    }
}

fn text(text: &str) -> Cell {
    Some(text.to_owned())
}

/// A number or a truth value, digit by digit as in the JSON report.
fn number(number: impl Serialize) -> Cell {
    serde_json::to_string(&number).ok()
}

/// The word that stands for a choice in the JSON report.
fn word(choice: &impl Serialize) -> Cell {
    match serde_json::to_value(choice) {
        Ok(serde_json::Value::String(word)) => Some(word),
        _ => None,
    }
}
