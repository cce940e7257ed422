//! What a person wants to read of a run without opening its report: every band
//! missed and every recording failed by name, and what proof is lacking.

use super::{BandEntry, Db, ReasonCode, Recording, Require, Seconds, Verdict};
use std::collections::BTreeMap;

/// What went wrong, by name. The lists don't depend on the order in which
/// recordings were added.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Highlights {
    /// Every band missed, by path, channel and place in the spec.
    pub missed: Vec<MissedItem>,
    /// Every failed recording, by path.
    pub failed: Vec<FailedItem>,
    /// What could not be proven, by band in the spec's order and by reason.
    pub unproven: Vec<UnprovenItem>,
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
    missed: Vec<(usize, MissedItem)>,
    failed: Vec<FailedItem>,
    unproven: BTreeMap<(usize, Option<ReasonCode>), Group>,
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

impl Collector {
    pub(super) fn failed(&mut self, recording: &Recording) {
        let error = recording.error.clone().unwrap_or_default();
        self.failed.push(FailedItem { path: recording.path.clone(), error });
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
                self.missed.push((place, item));
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
    pub(super) fn finish(mut self, names: &[String]) -> Highlights {
        self.missed
            .sort_by(|(a_place, a), (b_place, b)| (&a.path, a.channel, a_place).cmp(&(&b.path, b.channel, b_place)));
        self.failed.sort_by(|a, b| a.path.cmp(&b.path));
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
            missed: self.missed.into_iter().map(|(_, item)| item).collect(),
            failed: self.failed,
            unproven: unproven.collect(),
        }
    }
}
