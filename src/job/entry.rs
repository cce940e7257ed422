//! A recording's entry in the report.

use super::failure::Failure;
use super::paths;
use super::plan::{Planned, RatePlan};
use super::recording::{Processed, RecordingError};
use crate::report::{
    BandEntry, ChannelEntry, ChunkEntry, Db, Finite, Input, NotFinite, OutputFile, Recording, Seconds, SpectrumEntry,
    Status,
};
use crate::wave::{Header, stale_chunks};

/// A recording that could not be processed, with what is known of its header.
pub(super) fn failed(planned: &Planned, failure: &Failure, header: Option<&Header>) -> Recording {
    let mut recording = Recording::failed(planned.shown.clone(), failure.to_string());
    recording.notes = name_note(planned.escaped);
    if let Some(header) = header {
        recording.notes.extend(header.notes.iter().cloned());
        // An overload is known only when the recording has been read to its end.
        let read = match failure {
            Failure::Recording(RecordingError::Overload { input, .. }) => Some(input),
            _ => None,
        };
        let sha256 = read.map(|input| input.sha256.clone());
        recording.input = Some(input_entry(header, sha256, read.map(|input| input.full_scale_runs)));
        recording.chunks = header.chunks.iter().map(|chunk| ChunkEntry::new(chunk.id, chunk.bytes, false)).collect();
    }
    recording
}

/// What a reader must know of a name that is shown escaped.
pub(super) fn name_note(escaped: bool) -> Vec<String> {
    if escaped { vec![paths::ESCAPED_NOTE.into()] } else { Vec::new() }
}

/// What runs at full scale mean.
fn run_note(runs: u64) -> Option<String> {
    (runs > 0).then(|| {
        format!(
            "the input holds {runs} run{} of samples at full scale: if they are clipped, filtering \
             does not undo that",
            if runs == 1 { "" } else { "s" }
        )
    })
}

/// The file as read; hash and runs are known when it was read to its end.
pub(super) fn input_entry(header: &Header, sha256: Option<String>, full_scale_runs: Option<u64>) -> Input {
    Input {
        sha256,
        bytes: header.file_bytes,
        rate_hz: header.rate_hz,
        channels: header.channels,
        encoding: header.format.encoding.name().into(),
        frames: header.frames,
        seconds: Seconds::of_frames(header.frames, header.rate_hz),
        full_scale_runs,
        time_expansion: Finite::ratio(header.rate_hz, header.header_rate_hz),
    }
}

/// A recording that was filtered, measured and written.
pub(super) fn done(
    planned: &Planned,
    header: &Header,
    processed: &Processed,
    rate: &RatePlan,
) -> Result<Recording, NotFinite> {
    let peak_dbfs = 20.0 * libm::log10(processed.output.written_peak);
    let channels = processed.channels.iter().zip(1..).map(|(figures, channel)| {
        let bands = rate.treatment.bands.iter().zip(figures).map(|(task, figures)| BandEntry::new(task, figures));
        Ok(ChannelEntry { channel, bands: bands.collect::<Result<_, _>>()? })
    });
    Ok(Recording {
        path: planned.shown.clone(),
        status: Status::Done,
        error: None,
        notes: notes(planned, header, processed, rate),
        input: Some(input_entry(header, Some(processed.input.sha256.clone()), Some(processed.input.full_scale_runs))),
        output: Some(OutputFile {
            path: planned.shown.clone(),
            sha256: processed.written.sha256.clone(),
            bytes: processed.written.bytes,
            encoding: processed.format.encoding.name().into(),
            peak_dbfs: Db::new(peak_dbfs),
            clipped_samples: processed.output.clipped_samples,
            gain_db: Finite::try_from(processed.gain_db)?,
        }),
        chunks: processed.written.chunks.iter().map(ChunkEntry::from).collect(),
        spectrum: processed.segments.and_then(|(frames, segments)| {
            SpectrumEntry::new(header.rate_hz, frames, segments, rate.treatment.settling_frames)
        }),
        pair: None,
        channels: channels.collect::<Result<_, NotFinite>>()?,
    })
}

fn notes(planned: &Planned, header: &Header, processed: &Processed, rate: &RatePlan) -> Vec<String> {
    let mut notes = name_note(planned.escaped);
    notes.extend(header.notes.iter().chain(&processed.input.notes).chain(&processed.written.notes).cloned());
    if !rate.treatment.identity {
        notes.extend(stale_chunks(header));
    }
    notes.extend(run_note(processed.input.full_scale_runs));
    if processed.scaled {
        notes.push(format!(
            "filtered again with a gain of {:.3} dB to fit full scale: levels can't be compared with other recordings",
            processed.gain_db
        ));
    }
    if processed.output.clipped_samples > 0 {
        notes.push(format!("{} samples were saturated at full scale", processed.output.clipped_samples));
    }
    notes
}
