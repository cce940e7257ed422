//! What a person wants to read of a run without opening its report: the bands
//! missed and the recordings failed by name, and what proof is lacking.

use super::{BandEntry, Db, Finite, Hz, Pair, ReasonCode, Recording, Require, Seconds, Verdict};
use crate::align::AMBIGUOUS_DELAY;
use std::cmp::Ordering;
use std::collections::BTreeMap;

/// How many of a kind are named: nobody reads more of them, and the text of a hundred
/// thousand would fill the memory.
pub const MOST_NAMED: usize = 1000;

/// What went wrong, by name. The lists don't depend on the order in which
/// recordings were added.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Highlights {
    /// Bands missed, by path, channel and place in the spec; the first [`MOST_NAMED`].
    pub missed: Vec<MissedItem>,
    /// How many more were missed; the report has them all.
    pub missed_more: u64,
    /// Failed recordings, by path; the first [`MOST_NAMED`].
    pub failed: Vec<FailedItem>,
    /// How many more failed.
    pub failed_more: u64,
    /// What could not be proven, by band in the spec's order and by reason.
    pub unproven: Vec<UnprovenItem>,
    /// How pairs lie; `None` where there are none.
    pub pairs: Option<PairsItem>,
    /// Recordings that are done and have notes: sizes put right, chunks out of date and the like.
    pub noted: u64,
    /// The first of them by path.
    pub first_noted: Option<String>,
}

/// How the pairs of a run lie, and how far they are from the design.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct PairsItem {
    /// Pairs measured.
    pub measured: u64,
    /// Smallest and largest delay, frames.
    pub delay_frames: Option<(f64, f64)>,
    /// Pairs where another delay fits as well.
    pub ambiguous: u64,
    /// Smallest and largest difference of clocks, parts in a million.
    pub clock_ppm: Option<(f64, f64)>,
    /// Smallest and largest gain in the reference band, dB; `None` without one.
    pub reference_gain_db: Option<(f64, f64)>,
    /// Pairs whose sign is turned.
    pub inverted: u64,
    /// Pairs whose recording after holds runs of samples at full scale.
    pub at_full_scale: u64,
    /// The first of them by path.
    pub first_at_full_scale: Option<String>,
    /// The pair whose gains are farthest from the design.
    pub farthest: Option<FarthestItem>,
}

/// The gain of a run's pairs that is farthest from the design.
#[derive(Clone, Debug, PartialEq)]
pub struct FarthestItem {
    /// The pair's path as reported.
    pub path: String,
    /// Gain seen less gain of the design.
    pub deviation_db: Db,
    /// One standard error of the gain seen.
    pub error_db: Db,
    /// Where.
    pub at_hz: Hz,
}

impl PairsItem {
    fn add(&mut self, path: &str, pair: &Pair, notes: &[String]) {
        let widened = |range: Option<(f64, f64)>, figure: Option<f64>| match (range, figure) {
            (Some((least, most)), Some(figure)) => Some((least.min(figure), most.max(figure))),
            (None, Some(figure)) => Some((figure, figure)),
            (range, None) => range,
        };
        self.measured += 1;
        self.delay_frames = widened(self.delay_frames, pair.delay_frames.map(Finite::get));
        self.clock_ppm = widened(self.clock_ppm, pair.clock_ppm.map(Finite::get));
        for gain in pair.reference_gain_db.iter().flatten() {
            self.reference_gain_db = widened(self.reference_gain_db, Some(gain.get()));
        }
        self.ambiguous += u64::from(notes.iter().any(|note| note.starts_with(AMBIGUOUS_DELAY)));
        self.inverted += u64::from(pair.inverted == Some(true));
        if pair.full_scale_runs.is_some_and(|runs| runs > 0) {
            self.at_full_scale += 1;
            if self.first_at_full_scale.as_deref().is_none_or(|first| path < first) {
                self.first_at_full_scale = Some(path.to_owned());
            }
        }
        if let (Some(deviation_db), Some(error_db), Some(at_hz)) =
            (pair.design_deviation_db, pair.design_deviation_error_db, pair.design_deviation_at_hz)
        {
            let one = FarthestItem { path: path.to_owned(), deviation_db, error_db, at_hz };
            let farther = |one: &FarthestItem, other: &FarthestItem| {
                let beyond = |item: &FarthestItem| item.deviation_db.get().abs() - 2.0 * item.error_db.get();
                beyond(one).total_cmp(&beyond(other)).then_with(|| other.path.cmp(&one.path))
            };
            self.farthest = self.farthest.take().into_iter().chain([one]).max_by(farther);
        }
    }
}

/// A band that one channel of one recording missed.
#[derive(Clone, Debug, PartialEq)]
pub struct MissedItem {
    /// The recording's path as reported.
    pub path: String,
    /// 1 for the first.
    pub channel: u16,
    /// Name of the band.
    pub band: String,
    /// What had to hold.
    pub require: Option<Require>,
    /// What was found: attenuation, gain or level as in [`BandEntry::figure_db`].
    pub figure_db: Option<Db>,
    /// The report's own sentence, if there is one.
    pub reason: Option<String>,
}

/// A recording that could not be processed.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct FailedItem {
    /// Its path as reported.
    pub path: String,
    /// Why.
    pub error: String,
}

/// A band that could not be proven, for one reason.
#[derive(Clone, Debug, PartialEq)]
pub struct UnprovenItem {
    /// Name of the band.
    pub band: String,
    /// Why.
    pub reason_code: Option<ReasonCode>,
    /// Recordings in which it was unproven for this reason in at least one channel.
    pub recordings: u64,
    /// Length of the longest of them; `None` where none is known.
    pub longest_s: Option<Seconds>,
    /// The first of them by path.
    pub example_path: String,
    /// The channel of that one, 1 for the first.
    pub example_channel: u16,
    /// What the report says of that channel.
    pub example_reason: Option<String>,
}

/// Collects [`Highlights`] while recordings come in.
#[derive(Debug, Default)]
pub(super) struct Collector {
    missed: First<(usize, MissedItem)>,
    failed: First<FailedItem>,
    unproven: BTreeMap<(usize, Option<ReasonCode>), Group>,
    pairs: Option<PairsItem>,
    noted: u64,
    first_noted: Option<String>,
}

/// Recordings in which a band was unproven for the same reason.
#[derive(Debug)]
struct Group {
    recordings: u64,
    /// Whether the recording that is being added has been counted.
    counted: bool,
    longest_s: Option<Seconds>,
    example_path: String,
    example_channel: u16,
    example_reason: Option<String>,
}

/// The first items of an order, whatever the order in which they come.
#[derive(Debug)]
struct First<T> {
    items: Vec<T>,
    dropped: u64,
}

impl<T> Default for First<T> {
    fn default() -> Self {
        First { items: Vec::new(), dropped: 0 }
    }
}

impl<T> First<T> {
    fn push(&mut self, item: T, order: fn(&T, &T) -> Ordering) {
        self.items.push(item);
        // Sorted once for as many as are kept, not for each.
        if self.items.len() >= 2 * MOST_NAMED {
            self.cut(order);
        }
    }

    fn cut(&mut self, order: fn(&T, &T) -> Ordering) {
        self.items.sort_by(order);
        self.dropped += self.items.len().saturating_sub(MOST_NAMED) as u64;
        self.items.truncate(MOST_NAMED);
    }

    /// The items in order, and how many more there were.
    fn finish(mut self, order: fn(&T, &T) -> Ordering) -> (Vec<T>, u64) {
        self.cut(order);
        (self.items, self.dropped)
    }
}

fn by_path(a: &FailedItem, b: &FailedItem) -> Ordering {
    a.path.cmp(&b.path)
}

/// By path, channel and place in the spec.
fn by_place((a_place, a): &(usize, MissedItem), (b_place, b): &(usize, MissedItem)) -> Ordering {
    (&a.path, a.channel, a_place).cmp(&(&b.path, b.channel, b_place))
}

impl Collector {
    pub(super) fn failed(&mut self, recording: &Recording) {
        let error = recording.error.clone().unwrap_or_default();
        self.failed.push(FailedItem { path: recording.path.clone(), error }, by_path);
    }

    /// Takes a recording that is done and has notes.
    pub(super) fn noted(&mut self, recording: &Recording) {
        if recording.notes.is_empty() {
            return;
        }
        self.noted += 1;
        if self.first_noted.as_ref().is_none_or(|first| recording.path < *first) {
            self.first_noted = Some(recording.path.clone());
        }
    }

    /// Takes how a pair lies that was measured.
    pub(super) fn pair(&mut self, recording: &Recording) {
        if let Some(pair) = &recording.pair {
            self.pairs.get_or_insert_default().add(&recording.path, pair, &recording.notes);
        }
    }

    /// Takes a band of one channel; `place` is its place in the spec.
    pub(super) fn band(&mut self, recording: &Recording, channel: u16, place: usize, band: &BandEntry) {
        let path = recording.path.as_str();
        match band.verdict {
            Some(Verdict::Missed) => {
                let item = MissedItem {
                    path: path.to_owned(),
                    channel,
                    band: band.name.clone(),
                    require: band.require,
                    figure_db: band.figure_db(),
                    reason: band.reason.clone(),
                };
                self.missed.push((place, item), by_place);
            }
            Some(Verdict::Unproven) => {
                let group = self.unproven.entry((place, band.reason_code)).or_insert_with(|| Group {
                    recordings: 0,
                    counted: false,
                    longest_s: None,
                    example_path: path.to_owned(),
                    example_channel: channel,
                    example_reason: band.reason.clone(),
                });
                if !group.counted {
                    group.counted = true;
                    group.recordings += 1;
                    let seconds = recording.input.as_ref().map(|input| input.seconds);
                    if group.longest_s.map(Seconds::get) < seconds.map(Seconds::get) {
                        group.longest_s = seconds;
                    }
                    if path < group.example_path.as_str() {
                        group.example_path = path.to_owned();
                        group.example_channel = channel;
                        group.example_reason = band.reason.clone();
                    }
                }
            }
            Some(Verdict::Met) | None => {}
        }
    }

    pub(super) fn end_recording(&mut self) {
        for group in self.unproven.values_mut() {
            group.counted = false;
        }
    }

    /// `names` are the bands in the spec's order.
    pub(super) fn finish(self, names: &[String]) -> Highlights {
        let (missed, missed_more) = self.missed.finish(by_place);
        let (failed, failed_more) = self.failed.finish(by_path);
        let unproven = self.unproven.into_iter().map(|((place, reason_code), group)| UnprovenItem {
            band: names.get(place).cloned().unwrap_or_default(),
            reason_code,
            recordings: group.recordings,
            longest_s: group.longest_s,
            example_path: group.example_path,
            example_channel: group.example_channel,
            example_reason: group.example_reason,
        });
        Highlights {
            missed: missed.into_iter().map(|(_, item)| item).collect(),
            missed_more,
            failed,
            failed_more,
            unproven: unproven.collect(),
            pairs: self.pairs,
            noted: self.noted,
            first_noted: self.first_noted,
        }
    }
}
