//! A pair's entry in the report.

use super::super::entry::{input_entry, name_note};
use super::super::failure::Failure;
use super::super::pair::{PairMeasured, PairTask};
use crate::report::{
    BandEntry, ChannelEntry, ChunkEntry, Db, DelaySource, Finite, Hz, NotFinite, Pair, Recording, Seconds,
    SpectrumEntry, Status,
};
use crate::wave::Header;

/// What limits every figure of a pair.
const EXCITATION: &str = "gains hold as far as the recording before is the excitation itself: noise of its own in it \
                          makes them read low";

/// What a report calls the recordings of a pair.
#[derive(Clone, Debug)]
pub struct PairNames {
    /// Path below the root of the recordings before.
    pub before: String,
    /// Path below the root of the recordings after.
    pub after: String,
    /// Whether one of them is escaped.
    pub escaped: bool,
}

/// A pair that could not be measured, with what is known of the headers.
pub fn failed(names: &PairNames, failure: &Failure, headers: &[Option<Header>; 2]) -> Recording {
    let mut recording = Recording::failed(names.before.clone(), failure.to_string());
    recording.notes = name_note(names.escaped);
    if let Some(header) = &headers[0] {
        recording.notes.extend(sided("before", &header.notes));
        recording.input = Some(input_entry(header, None, None));
        recording.chunks = chunks(header);
    }
    if let Some(header) = &headers[1] {
        recording.notes.extend(sided("after", &header.notes));
        recording.pair = Some(partner(names, header));
    }
    recording
}

fn chunks(header: &Header) -> Vec<ChunkEntry> {
    header.chunks.iter().map(|chunk| ChunkEntry::new(chunk.id, chunk.bytes, false)).collect()
}

fn sided<'a>(side: &'a str, notes: &'a [String]) -> impl Iterator<Item = String> + 'a {
    notes.iter().map(move |note| format!("{side}: {note}"))
}

/// The recording after as its header has it.
fn partner(names: &PairNames, header: &Header) -> Pair {
    Pair {
        path: names.after.clone(),
        sha256: None,
        bytes: header.file_bytes,
        encoding: header.format.encoding.name().into(),
        frames: header.frames,
        full_scale_runs: None,
        delay_frames: None,
        delay_source: None,
        max_delay_s: None,
        clock_ppm: None,
        clock_error_ppm: None,
        delay_scatter_s: None,
        inverted: None,
        overlap_frames: None,
        noise_sha256: None,
        reference_gain_db: None,
        design_deviation_db: None,
        design_deviation_error_db: None,
        design_deviation_at_hz: None,
    }
}

/// A pair that was measured.
pub fn done(
    names: &PairNames,
    [before, after]: [&Header; 2],
    measured: &PairMeasured,
    task: &PairTask,
) -> Result<Recording, NotFinite> {
    let bands = &task.treatment.bands;
    let channels = measured.channels.iter().zip(1..).map(|(figures, channel)| {
        let bands = bands.iter().zip(figures).map(|(task, figures)| BandEntry::new(task, figures));
        Ok(ChannelEntry { channel, bands: bands.collect::<Result<_, _>>()? })
    });
    let spectrum = measured.segments.and_then(|(frames, segments)| {
        let skipped = measured.overlap.start + task.treatment.settling_frames;
        SpectrumEntry::new(before.rate_hz, frames, segments, skipped)
    });
    Ok(Recording {
        path: names.before.clone(),
        status: Status::Done,
        error: None,
        notes: notes(names, [before, after], measured),
        input: Some(input_entry(before, Some(measured.before.sha256.clone()), Some(measured.before.full_scale_runs))),
        output: None,
        chunks: chunks(before),
        spectrum,
        pair: Some(pair_entry(names, after, measured, task)?),
        channels: channels.collect::<Result<_, NotFinite>>()?,
    })
}

fn pair_entry(names: &PairNames, after: &Header, measured: &PairMeasured, task: &PairTask) -> Result<Pair, NotFinite> {
    let alignment = &measured.alignment;
    let given = task.delay_frames.is_some();
    let gain_db = |gain: &f64| Db::try_from(20.0 * libm::log10(*gain));
    let gains = measured.reference_gains.as_ref();
    Ok(Pair {
        sha256: Some(measured.after.sha256.clone()),
        full_scale_runs: Some(measured.after.full_scale_runs),
        delay_frames: Some(Finite::try_from(thousandths(alignment.delay_frames))?),
        delay_source: Some(if given { DelaySource::Given } else { DelaySource::Found }),
        max_delay_s: if given { None } else { Some(Seconds::try_from(task.max_delay_s)?) },
        clock_ppm: Some(Finite::try_from(thousandths(alignment.clock_ppm))?),
        clock_error_ppm: alignment
            .clock_error_ppm
            .map(|ppm| Finite::try_from(libm::ceil(ppm * 1e6) / 1e6))
            .transpose()?,
        delay_scatter_s: alignment.scatter_s.map(Seconds::try_from).transpose()?,
        inverted: Some(alignment.inverted),
        overlap_frames: Some(measured.overlap.end - measured.overlap.start),
        noise_sha256: task.noise.as_ref().map(|noise| noise.sha256().to_owned()),
        reference_gain_db: gains.map(|gains| gains.iter().map(gain_db).collect::<Result<_, _>>()).transpose()?,
        design_deviation_db: measured.deviation.and_then(|deviation| Db::new(deviation.db)),
        design_deviation_error_db: measured.deviation.and_then(|deviation| Db::new(deviation.error_db)),
        design_deviation_at_hz: measured.deviation.and_then(|deviation| Hz::new(deviation.at_hz)),
        ..partner(names, after)
    })
}

/// More digits than a delay or a clock can be known to.
fn thousandths(figure: f64) -> f64 {
    let rounded = libm::round(figure * 1000.0) / 1000.0;
    // No negative zero.
    rounded + 0.0
}

/// What runs at full scale mean: before, they were played; after, the device was overdriven.
fn run_note(side: &str, runs: u64) -> Option<String> {
    let plural = if runs == 1 { "" } else { "s" };
    let means = match side {
        "after" => {
            "if they are clipped, figures speak of the clipping too, and floors rise with it: lower the level and record \
             again"
        }
        _ => "if they are clipped, nothing in the figures is wrong by it as long as they were played so",
    };
    (runs > 0).then(|| format!("the recording {side} holds {runs} run{plural} of samples at full scale: {means}"))
}

fn notes(names: &PairNames, [before, after]: [&Header; 2], measured: &PairMeasured) -> Vec<String> {
    let mut notes = name_note(names.escaped);
    notes.extend(measured.alignment.notes.iter().cloned());
    notes.push(EXCITATION.into());
    for (side, header, figures) in [("before", before, &measured.before), ("after", after, &measured.after)] {
        notes.extend(sided(side, &header.notes));
        notes.extend(sided(side, &figures.notes));
        notes.extend(run_note(side, figures.full_scale_runs));
    }
    notes
}
