//! How long the recording must be, and what the user should know beforehand.

use super::BandLevel;
use crate::design::Design;
use crate::evidence::FEWEST_SEGMENTS;
use crate::spec::{NamedBand, Requirement};
use crate::spectrum::{MIN_SEGMENT_FRAMES, segment_frames};

/// Fewest bins in which a band can be met.
const FEWEST_BINS: f64 = 4.0;
/// Bins that a band should hold.
const BINS: f64 = 10.0;
/// What can be shown should exceed what is required by this much, dB: the floor then adds
/// less than 1 dB to what is left.
const MARGIN_DB: f64 = 6.0;

/// Lengths from which more can be told, seconds, rising.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Needs {
    /// Some band can be judged: 4 bins in the widest, after settling.
    pub least_s: f64,
    /// Every band can: 10 bins in the narrowest, after settling.
    pub every_band_s: f64,
    /// Eight segments that overlap by half: what is not coherent with the excitation
    /// counts as the device's own.
    pub device_noise_s: f64,
}

/// The bands that decide on lengths: those with a requirement, or all where there is none.
fn deciding(design: &Design) -> Vec<f64> {
    let width = |band: &NamedBand| band.line.to_hz - band.line.from_hz;
    let all = || design.bands.iter().map(|design| &design.band);
    let required: Vec<f64> = all().filter(|band| band.requirement != Requirement::Observe).map(width).collect();
    if required.is_empty() { all().map(width).collect() } else { required }
}

/// Segment length of a measurement that is not cut short, frames; `None` without bands or
/// at a rate so low that none fits.
pub(super) fn wanted_segment(design: &Design) -> Option<usize> {
    let narrowest_hz = deciding(design).into_iter().reduce(f64::min)?;
    segment_frames(design.rate_hz, Some(narrowest_hz), u64::MAX)
}

impl Needs {
    /// `None` without bands.
    pub(super) fn new(design: &Design) -> Option<Self> {
        let rate_hz = f64::from(design.rate_hz);
        let widths = deciding(design);
        let (narrowest_hz, widest_hz) =
            (widths.iter().copied().reduce(f64::min)?, widths.iter().copied().reduce(f64::max)?);
        let segment_s = wanted_segment(design)? as f64 / rate_hz;
        let shortest_s = MIN_SEGMENT_FRAMES as f64 / rate_hz;
        let halves = (FEWEST_SEGMENTS + 1) as f64 / 2.0;
        let every_band_s = design.unsettled_s() + (BINS / narrowest_hz).max(shortest_s);
        Some(Needs {
            least_s: design.unsettled_s() + (FEWEST_BINS / widest_hz).max(shortest_s),
            every_band_s,
            device_noise_s: every_band_s.max(design.unsettled_s() + halves * segment_s),
        })
    }
}

/// Sentences on what can't be shown with this excitation, and what to do about it.
pub(super) fn notes(bands: &[BandLevel], needs: &Needs, seconds: f64) -> Vec<String> {
    let mut notes = Vec::new();
    let short = grouped(bands, |band| band.shortest_s.is_some_and(|shortest_s| shortest_s > seconds));
    for group in short {
        let need_s = group.iter().filter_map(|band| band.shortest_s).fold(0.0, f64::max);
        notes.push(format!("{}: too short to judge, which takes {} s", told(&group), tenths_up(need_s)));
    }
    if seconds < needs.device_noise_s {
        notes.push(format!(
            "under {} s what the device adds of its own can't be told from what it lets through, unless `measure` is \
             given a recording of the idle device with --noise",
            tenths_up(needs.device_noise_s)
        ));
    }
    // In a recording too short for its narrowest band a longer one shows more. Where a
    // device like the spec's stages would miss the requirement, that is said below.
    let hidden = |band: &BandLevel, shown_db: Option<f64>| match (shown_db, band.required_db) {
        (Some(shown_db), Some(required_db)) => {
            seconds >= needs.every_band_s && shown_db < required_db + MARGIN_DB && !band.own_stages_fall_short()
        }
        _ => false,
    };
    let least = |group: &[&BandLevel], shown_db: fn(&BandLevel) -> Option<f64>| {
        group.iter().filter_map(|band| shown_db(band)).fold(f64::INFINITY, f64::min)
    };
    for group in grouped(bands, |band| hidden(band, band.shown_24_bit_db)) {
        notes.push(format!(
            "{}: {:.0} dB are the most that can be shown, at any length and with 24 bits too, as sound beside a band leaks \
             into it; narrow the band, or widen the stop, or ask for less",
            told(&group),
            least(&group, |band| band.shown_24_bit_db)
        ));
    }
    for group in grouped(bands, |band| hidden(band, band.shown_16_bit_db) && !hidden(band, band.shown_24_bit_db)) {
        notes.push(format!(
            "{}: with 16 bits {:.0} dB are the most that can be shown, at any length; record the device with 24",
            told(&group),
            least(&group, |band| band.shown_16_bit_db)
        ));
    }
    for group in grouped(bands, BandLevel::own_stages_fall_short) {
        let own_db = group.iter().filter_map(|band| band.own_stages_db).fold(f64::INFINITY, f64::min);
        let told = told(&group);
        notes.push(match group.first().map(|band| &band.band.requirement) {
            Some(Requirement::Residual { residual_dbfs }) => format!(
                "{told}: a limit to what remains is meant for recordings, and this excitation is louder than most: the spec's own \
                 stages would leave more than {residual_dbfs} dBFS of it; a device is better asked for reduce_db"
            ),
            _ => format!(
                "{told}: the excitation fills the whole band, and the spec's own stages would take {own_db:.1} dB out of it; \
                 to measure a device like them, narrow the band to where they reach the requirement (`bandproof design` says where)"
            ),
        });
    }
    notes
}

/// Bands that `apply`, those of one row together.
fn grouped(bands: &[BandLevel], applies: impl Fn(&BandLevel) -> bool) -> Vec<Vec<&BandLevel>> {
    let mut groups: Vec<Vec<&BandLevel>> = Vec::new();
    for band in bands.iter().filter(|band| applies(band)) {
        match groups.last_mut() {
            Some(group) if group.iter().any(|one| one.band.base_name == band.band.base_name) => group.push(band),
            _ => groups.push(vec![band]),
        }
    }
    groups
}

/// One band by its name, several of a row by the row's.
fn told(group: &[&BandLevel]) -> String {
    match group {
        [] => String::new(),
        [one] => one.band.name.clone(),
        [first, ..] => format!("{} ({} of its bands)", first.band.base_name, group.len()),
    }
}

/// Rounded up to a tenth: what is given is enough.
fn tenths_up(seconds: f64) -> String {
    format!("{:.1}", libm::ceil(seconds * 10.0) / 10.0)
}
