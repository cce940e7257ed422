//! `summary`: what the recordings came to, band by band.

use super::highlights::Collector;
use super::{BandEntry, Db, Highlights, NotFinite, Recording, Require, Status, Verdict, schema};
use crate::spec::Spec;
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};
use std::collections::HashMap;

/// The end of a report.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Summary {
    /// Recordings in the report; in one of `measure` a pair is one.
    pub recordings: u64,
    /// Those that were filtered and measured; by `measure`: measured.
    pub done: u64,
    /// Those that could not be processed.
    pub failed: u64,
    /// Files of the input folder (of both folders of `measure`) that are no recordings.
    pub skipped: Skipped,
    /// Recordings on one side only; null in a report of `filter`.
    pub unpaired: Option<Unpaired>,
    /// The spec's bands in the spec's order, also those that fit at no sample rate.
    pub bands: Vec<BandSummary>,
    /// `missed` if a band was missed anywhere; else `met` if every band with a requirement
    /// was met in some recording, and there is such a band; else `unproven`.
    pub verdict: Verdict,
}

/// Files of the input folder (of both folders of `measure`) that are no recordings.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Skipped {
    /// Names that begin with `._`: companions that some systems write beside each file.
    pub dot_underscore: u64,
    /// Everything else; it is not copied.
    pub other_files: u64,
}

/// Recordings that `measure` found on one side only, by their paths below its root.
#[derive(Clone, Debug, Default, PartialEq, Eq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Unpaired {
    /// Before only.
    #[schemars(schema_with = "schema::paths")]
    pub before: Vec<String>,
    /// After only.
    #[schemars(schema_with = "schema::paths")]
    pub after: Vec<String>,
}

/// One band over all recordings that are done.
///
/// A recording missed a band if any of its channels did; else the band is unproven
/// there if it is in any channel; else it is met. Recordings at sample rates at
/// which the band does not fit are not counted.
///
/// The two dB figures are taken over all channels of all recordings in which the
/// band was judged met or missed, and are null where there are none. What they
/// are depends on the requirement:
///
/// | requirement | figure of a channel | worst |
/// |---|---|---|
/// | `reduce_db` | `measured_attenuation_db` | the smallest |
/// | `keep_db` | the gain farthest from 0 | the one farthest from 0 |
/// | `residual_dbfs` | `after_dbfs` | the largest |
/// | none | the gain farthest from 0, every channel | the one farthest from 0 |
///
/// Channels whose figure is null don't take part.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct BandSummary {
    /// Name of the band; `xN` for line N of a row.
    pub name: String,
    /// Recordings in which it was met.
    pub met: u64,
    /// Recordings in which it was missed.
    pub missed: u64,
    /// Recordings in which neither could be shown.
    pub unproven: u64,
    /// The worst figure, dB.
    pub worst_db: Option<Db>,
    /// The middle figure, dB; of an even number the mean of the two in the middle.
    pub median_db: Option<Db>,
}

/// Adds up recordings, in any order, to a [`Summary`] and its [`Highlights`]. Keeps
/// 8 bytes for each band of each channel, and the text of what went wrong.
#[derive(Debug)]
pub struct SummaryBuilder {
    bands: Vec<Tally>,
    index: HashMap<String, usize>,
    done: u64,
    failed: u64,
    collector: Collector,
}

/// What is counted for one band.
#[derive(Debug)]
struct Tally {
    name: String,
    require: Option<Require>,
    met: u64,
    missed: u64,
    unproven: u64,
    figures: Vec<f64>,
}

impl SummaryBuilder {
    /// Nothing counted yet for the bands of `spec`.
    ///
    /// # Errors
    /// The limit of a requirement is NaN or infinite.
    pub fn new(spec: &Spec) -> Result<Self, NotFinite> {
        let bands = spec
            .named_bands()
            .map(|band| {
                let require = Require::new(&band.requirement)?;
                Ok(Tally { name: band.name, require, met: 0, missed: 0, unproven: 0, figures: Vec::new() })
            })
            .collect::<Result<Vec<_>, NotFinite>>()?;
        let index = bands.iter().enumerate().map(|(place, band)| (band.name.clone(), place)).collect();
        Ok(SummaryBuilder { bands, index, done: 0, failed: 0, collector: Collector::default() })
    }

    /// Counts one recording. Bands that the spec does not name are passed over.
    pub fn add(&mut self, recording: &Recording) {
        match recording.status {
            Status::Done => self.done += 1,
            Status::Failed => {
                self.failed += 1;
                self.collector.failed(recording);
                return;
            }
        }
        self.collector.noted(recording);
        self.collector.pair(recording);
        let mut verdicts: Vec<Option<Verdict>> = vec![None; self.bands.len()];
        for channel in &recording.channels {
            for band in &channel.bands {
                let Some(&place) = self.index.get(&band.name) else { continue };
                verdicts[place] = weightier(verdicts[place], band.verdict);
                self.bands[place].take_figure(band);
                self.collector.band(recording, channel.channel, place, band);
            }
        }
        self.collector.end_recording();
        for (band, verdict) in self.bands.iter_mut().zip(verdicts) {
            match verdict {
                Some(Verdict::Met) => band.met += 1,
                Some(Verdict::Missed) => band.missed += 1,
                Some(Verdict::Unproven) => band.unproven += 1,
                None => {}
            }
        }
    }

    /// The summary of everything added.
    pub fn finish(self, skipped: Skipped) -> (Summary, Highlights) {
        let verdict = self.verdict();
        let names: Vec<String> = self.bands.iter().map(|band| band.name.clone()).collect();
        let summary = Summary {
            recordings: self.done + self.failed,
            done: self.done,
            failed: self.failed,
            skipped,
            unpaired: None,
            bands: self.bands.into_iter().map(Tally::finish).collect(),
            verdict,
        };
        (summary, self.collector.finish(&names))
    }

    fn verdict(&self) -> Verdict {
        let mut required = self.bands.iter().filter(|band| band.require.is_some()).peekable();
        if self.bands.iter().any(|band| band.missed > 0) {
            Verdict::Missed
        } else if required.peek().is_none() || required.any(|band| band.met == 0) {
            Verdict::Unproven
        } else {
            Verdict::Met
        }
    }
}

/// A missed channel outweighs an unproven one, which outweighs a met one.
fn weightier(one: Option<Verdict>, other: Option<Verdict>) -> Option<Verdict> {
    let weight = |verdict| match verdict {
        None => 0,
        Some(Verdict::Met) => 1,
        Some(Verdict::Unproven) => 2,
        Some(Verdict::Missed) => 3,
    };
    if weight(other) > weight(one) { other } else { one }
}

impl Tally {
    fn take_figure(&mut self, band: &BandEntry) {
        let judged = matches!(band.verdict, Some(Verdict::Met | Verdict::Missed));
        if judged || self.require.is_none() {
            self.figures.extend(band.figure_db().map(Db::get));
        }
    }

    fn finish(mut self) -> BandSummary {
        // Sorted, so that neither figure depends on the order of the recordings.
        self.figures.sort_by(f64::total_cmp);
        let figures = &self.figures;
        let (lowest, highest) = (figures.first().copied(), figures.last().copied());
        let worst = match self.require {
            Some(Require::ReduceDb(_)) => lowest,
            Some(Require::ResidualDbfs(_)) => highest,
            Some(Require::KeepDb(_)) | None => match (lowest, highest) {
                (Some(low), Some(high)) if high.abs() > low.abs() => Some(high),
                _ => lowest,
            },
        };
        BandSummary {
            worst_db: worst.and_then(Db::new),
            median_db: median(figures).and_then(Db::new),
            name: self.name,
            met: self.met,
            missed: self.missed,
            unproven: self.unproven,
        }
    }
}

/// The middle of sorted figures; of an even number the mean of the two in the middle.
fn median(sorted: &[f64]) -> Option<f64> {
    let upper = *sorted.get(sorted.len() / 2)?;
    let lower = *sorted.get(sorted.len().checked_sub(1)? / 2)?;
    Some((lower + upper) / 2.0)
}
