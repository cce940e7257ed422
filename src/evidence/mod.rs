//! From spectra and bands to floors, figures and verdicts: pure functions.
//!
//! [`judge`] takes one channel's spectra and one band through these steps:
//!
//! 1. the bins that speak for the band (`ranges`);
//! 2. the levels before and after and the floors of both (`floors`);
//! 3. the largest line (reduce and residual bands; `line`) or the response in sub-bands
//!    (keep and observed bands; `gains`);
//! 4. rounding to what the report shows, and the verdict from the rounded figures.
//!
//! Nothing here knows the design or calls what filtered the samples: a verdict rests on
//! the samples before and as written alone.
//!
//! Levels are in dB relative to a full-scale sine. With a gain in force the figures
//! after (level, floor, line, gains) are taken back by it.
//!
//! Of a pair that something else filtered ([`Pairing`]) less is known: what the device
//! adds of its own is a floor, too (`incoherent`), the response is looked at as finely
//! as the bins allow (`subbands`), and what chance does to so many gains is granted
//! (`chance`). [`reference_gain`] and [`deviation`] use the same gains (`compare`).

mod chance;
mod compare;
mod db;
mod delay;
mod figures;
mod floors;
mod gains;
mod incoherent;
mod keep;
mod kernel;
mod line;
mod pairing;
mod ranges;
mod reasons;
mod response;
mod subbands;
mod verdicts;
mod view;

pub use compare::{Deviation, deviation, reference_gain};
pub use figures::{judge, judge_all, unsettled};
pub use incoherent::FEWEST_SEGMENTS;
pub use pairing::{Idle, Pairing};
pub use ranges::{cross_ranges, cross_slice, pair_ranges, shows_gains};

use crate::spec::Requirement;
use crate::spectrum::Spectra;

/// One channel of a recording as measured.
#[derive(Clone, Copy, Debug)]
pub struct Measured<'a> {
    /// Sample rate, Hz.
    pub rate_hz: u32,
    /// Length of the whole recording, seconds; only for the sentences of reasons.
    pub seconds: f64,
    /// Its spectra over the settled part.
    pub spectra: &'a Spectra,
    /// How many of its segments count as independent
    /// ([`crate::spectrum::SegmentPlan::independent_segments`]).
    pub independent_segments: usize,
    /// Mean square of the rounding error before, full scale 1.0, white.
    pub rounding_power_before: f64,
    /// Mean square of rounding error and dither after, full scale 1.0, white.
    pub rounding_power_after: f64,
    /// Linear gain in force (gain_db, scale, the reference band's): figures after are taken
    /// back by it.
    pub gain: f64,
    /// What is known of the pair where something else did the filtering.
    pub pair: Option<Pairing<'a>>,
}

/// A band to be judged.
#[derive(Clone, Debug, PartialEq)]
pub struct BandTask {
    /// Reported name.
    pub name: String,
    /// Lower edge, Hz.
    pub from_hz: f64,
    /// Upper edge, Hz.
    pub to_hz: f64,
    /// What must hold.
    pub requirement: Requirement,
    /// Ranges taken out of a keep band, Hz, rising and disjoint.
    pub excepted_hz: Vec<(f64, f64)>,
    /// Shortest recording that can be judged in this band, seconds.
    pub shortest_s: Option<f64>,
}

/// What a band's requirement came to in one channel.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Verdict {
    /// Shown to hold.
    Met,
    /// Neither shown.
    Unproven,
    /// Shown not to hold.
    Missed,
}

/// Why a band is unproven.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ReasonCode {
    /// Before filtering the band holds nothing that stands 6 dB above its floor.
    NothingThere,
    /// Too few bins fall into the band, or too little was averaged.
    TooShort,
    /// Rounding of the samples hides what would have to be seen.
    TooQuiet,
    /// What leaks in from outside the band hides what would have to be seen.
    LoudNeighbor,
    /// Nothing of the recording remains after the settling time.
    Unsettled,
    /// What the device adds of its own hides what would have to be seen, or its clock
    /// wanders too much for gains to be told.
    DeviceNoise,
    /// The band lies beyond half the sample rate or what interpolation leaves alone, or
    /// wholly in its exceptions.
    OutOfRange,
}

/// Figures and verdict of one band in one channel: levels and gains in dB rounded to
/// 0.001, frequencies in Hz. `None` where there is no figure; `reason` says why.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct BandFigures {
    /// Level before, dBFS; none below -200.
    pub before_dbfs: Option<f64>,
    /// What the band would seem to hold before if nothing were in it, dBFS.
    pub before_floor_dbfs: Option<f64>,
    /// Level after, dBFS; none below -200.
    pub after_dbfs: Option<f64>,
    /// What the band would seem to hold after if nothing were in it, dBFS.
    pub after_floor_dbfs: Option<f64>,
    /// Level before over level after, dB.
    pub measured_attenuation_db: Option<f64>,
    /// Largest attenuation that could be shown, (B - Fb)/Fa, dB.
    pub demonstrable_attenuation_db: Option<f64>,
    /// The largest peak before; reduce and residual bands, none below -200 dBFS.
    pub line_hz: Option<f64>,
    /// Level of its main lobe before, dBFS.
    pub line_before_dbfs: Option<f64>,
    /// Level of the same bins after, dBFS.
    pub line_after_dbfs: Option<f64>,
    /// Lowest gain of a sub-band that counts, dB; keep and observed bands.
    pub gain_min_db: Option<f64>,
    /// Highest gain of a sub-band that counts, dB.
    pub gain_max_db: Option<f64>,
    /// One standard error of the gain that decides (the extreme closest to the limit,
    /// or the sub-band that lies outside), dB.
    pub gain_error_db: Option<f64>,
    /// Share of the band's bins in sub-bands that count, 0 to 1.
    pub resolved: Option<f64>,
    /// What the figures cannot tell apart, Hz: the widest sub-band that counts; in
    /// reduce and residual bands the window's noise bandwidth.
    pub resolution_hz: Option<f64>,
    /// `None` where the band has no requirement.
    pub verdict: Option<Verdict>,
    /// Why the verdict is `unproven`, or a figure of an observed band is missing.
    pub reason_code: Option<ReasonCode>,
    /// The same as a sentence with figures; also what remains in a missed band.
    pub reason: Option<String>,
}
