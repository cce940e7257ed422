//! Figures and verdicts of two measurements of the same recording.

use super::findings::Disagreement;
use crate::report::{BandEntry, ChannelEntry, Db, Hz, Pair, Recording};

/// Reports promise figures within 0.002 dB between machines: transforms differ in their
/// last bits there, and both figures are rounded to 0.001. The rest is for 0.001 not being
/// a binary number.
const WITHIN_DB: f64 = 0.002 + 1e-9;

/// A line's frequency is found from the levels of the bins on both sides of its peak, whose
/// difference rises by at least 13.59 dB a bin (the window's main lobe, evaluated between
/// its bins). Two levels off by 0.002 dB each move it by at most 0.004 / 13.59 = 2.95e-4.
const WITHIN_BINS: f64 = 3e-4;

/// Hertz, shares, seconds and the error of a clock are rounded to a millionth, on either side.
const WITHIN_MILLIONTHS: f64 = 1e-6 + 1e-9;

/// Delays (frames) and clock differences (parts in a million) are rounded to 0.001, as dB
/// are, and come from sums as long.
const WITHIN_THOUSANDTHS: f64 = 0.002 + 1e-9;

/// How a figure is read from a band's entry.
type Figure<T> = (&'static str, fn(&BandEntry) -> Option<T>);

const DB_FIGURES: [Figure<Db>; 11] = [
    ("before_dbfs", |band| band.before_dbfs),
    ("before_floor_dbfs", |band| band.before_floor_dbfs),
    ("after_dbfs", |band| band.after_dbfs),
    ("after_floor_dbfs", |band| band.after_floor_dbfs),
    ("measured_attenuation_db", |band| band.measured_attenuation_db),
    ("demonstrable_attenuation_db", |band| band.demonstrable_attenuation_db),
    ("line_before_dbfs", |band| band.line_before_dbfs),
    ("line_after_dbfs", |band| band.line_after_dbfs),
    ("gain_min_db", |band| band.gain_min_db),
    ("gain_max_db", |band| band.gain_max_db),
    ("gain_error_db", |band| band.gain_error_db),
];

/// Fixed by the spec and the recording's length, not by its sound.
const EXACT_HZ: [Figure<Hz>; 3] = [
    ("from_hz", |band| Some(band.from_hz)),
    ("to_hz", |band| Some(band.to_hz)),
    ("resolution_hz", |band| band.resolution_hz),
];

/// Collects what differs in one recording.
pub(super) struct Comparison<'a> {
    path: &'a str,
    found: Vec<Disagreement>,
}

/// What differs between the report's entry and the same measured again; both are done.
pub(super) fn compare(then: &Recording, now: &Recording) -> Vec<Disagreement> {
    let mut comparison = Comparison { path: &then.path, found: Vec::new() };
    let bin_hz = then.spectrum.as_ref().map_or(0.0, |spectrum| spectrum.bin_hz.get());
    comparison.headers(then, now);
    if let (Some(then), Some(now)) = (&then.pair, &now.pair) {
        comparison.pair(then, now);
    }
    comparison.channels(&then.channels, &now.channels, bin_hz);
    comparison.found
}

/// Whether two figures agree; a figure that is null must be null again.
fn agree(then: Option<f64>, now: Option<f64>, within: f64) -> bool {
    match (then, now) {
        (Some(then), Some(now)) => (then - now).abs() <= within,
        (None, None) => true,
        _ => false,
    }
}

impl Comparison<'_> {
    fn entry(&mut self, what: String) {
        self.found.push(Disagreement::Entry { path: self.path.to_owned(), what });
    }

    fn whole(&mut self, figure: &'static str, then: Option<f64>, now: Option<f64>, within: f64) {
        if !agree(then, now, within) {
            let path = self.path.to_owned();
            self.found.push(Disagreement::Figure { path, channel: None, band: None, figure, then, now });
        }
    }

    /// What follows from the files alone, so only of files that are as they were.
    fn headers(&mut self, then: &Recording, now: &Recording) {
        let hash = |recording: &Recording| recording.input.as_ref().and_then(|input| input.sha256.clone());
        let before = (&then.input, &then.chunks) == (&now.input, &now.chunks);
        if hash(then) == hash(now) && !before {
            self.entry("what the report says of the recording before is not what that holds".to_owned());
        }
        if let (Some(then), Some(now)) = (&then.pair, &now.pair) {
            let facts = |pair: &Pair| (pair.bytes, pair.encoding.clone(), pair.frames, pair.full_scale_runs);
            if then.sha256 == now.sha256 && facts(then) != facts(now) {
                self.entry("what the report says of the recording after is not what that holds".to_owned());
            }
        }
        if then.spectrum != now.spectrum {
            self.entry("the spectra were not taken in the segments that the report names".to_owned());
        }
    }

    fn pair(&mut self, then: &Pair, now: &Pair) {
        let number = |figure: Option<crate::report::Finite>| figure.map(|figure| figure.get());
        let (a, b) = (number(then.delay_frames), number(now.delay_frames));
        self.whole("delay_frames", a, b, WITHIN_THOUSANDTHS);
        self.whole("clock_ppm", number(then.clock_ppm), number(now.clock_ppm), WITHIN_THOUSANDTHS);
        let clock_error = |pair: &Pair| number(pair.clock_error_ppm);
        self.whole("clock_error_ppm", clock_error(then), clock_error(now), WITHIN_MILLIONTHS);
        let seconds = |pair: &Pair| pair.delay_scatter_s.map(|seconds| seconds.get());
        self.whole("delay_scatter_s", seconds(then), seconds(now), WITHIN_MILLIONTHS);
        let frames = |pair: &Pair| pair.overlap_frames.map(|frames| frames as f64);
        self.whole("overlap_frames", frames(then), frames(now), 0.0);
        let deviation = |pair: &Pair| pair.design_deviation_db.map(Db::get);
        self.whole("design_deviation_db", deviation(then), deviation(now), WITHIN_DB);
        let error = |pair: &Pair| pair.design_deviation_error_db.map(Db::get);
        self.whole("design_deviation_error_db", error(then), error(now), WITHIN_DB);
        let at_hz = |pair: &Pair| pair.design_deviation_at_hz.map(Hz::get);
        self.whole("design_deviation_at_hz", at_hz(then), at_hz(now), WITHIN_MILLIONTHS);
        if then.inverted != now.inverted {
            let word = |inverted| match inverted {
                Some(true) => "inverted",
                Some(false) => "not inverted",
                None => "of no known sign",
            };
            self.entry(format!("{} then, {} now", word(then.inverted), word(now.inverted)));
        }
        let gains = |pair: &Pair| pair.reference_gain_db.clone().unwrap_or_default();
        let (then, now) = (gains(then), gains(now));
        for channel in 0..then.len().max(now.len()) {
            let gain = |gains: &[Db]| gains.get(channel).map(|gain| gain.get());
            self.whole("reference_gain_db", gain(&then), gain(&now), WITHIN_DB);
        }
    }

    fn channels(&mut self, then: &[ChannelEntry], now: &[ChannelEntry], bin_hz: f64) {
        if then.len() != now.len() {
            self.entry(format!("{} channels then, {} now", then.len(), now.len()));
        }
        for (then, now) in then.iter().zip(now) {
            if then.channel != now.channel {
                self.entry(format!("channel {} stands in the place of channel {}", then.channel, now.channel));
            }
            if then.bands.len() != now.bands.len() {
                let (then, now, channel) = (then.bands.len(), now.bands.len(), now.channel);
                self.entry(format!("channel {channel}: {then} bands then, {now} now"));
            }
            for (then, band) in then.bands.iter().zip(&now.bands) {
                self.band(now.channel, then, band, bin_hz);
            }
        }
    }

    fn band(&mut self, channel: u16, then: &BandEntry, now: &BandEntry, bin_hz: f64) {
        let band = &now.name;
        if then.name != now.name {
            self.entry(format!("channel {channel}: band `{}` stands in the place of `{band}`", then.name));
            return;
        }
        if then.require != now.require {
            self.entry(format!("channel {channel}, {band}: the requirement is not that of the spec"));
        }
        if then.verdict != now.verdict {
            self.found.push(Disagreement::Verdict {
                path: self.path.to_owned(),
                channel,
                band: band.clone(),
                then: then.verdict,
                now: now.verdict,
            });
        } else if then.reason_code != now.reason_code {
            let word = |band: &BandEntry| serde_json::to_value(band.reason_code).unwrap_or_default();
            self.entry(format!("channel {channel}, {band}: reason_code {} then, {} now", word(then), word(now)));
        }
        let mut figure = |figure: &'static str, a: Option<f64>, b: Option<f64>, within: f64| {
            if !agree(a, b, within) {
                let (path, band) = (self.path.to_owned(), Some(band.clone()));
                self.found.push(Disagreement::Figure { path, channel: Some(channel), band, figure, then: a, now: b });
            }
        };
        for (key, get) in DB_FIGURES {
            figure(key, get(then).map(Db::get), get(now).map(Db::get), WITHIN_DB);
        }
        for (key, get) in EXACT_HZ {
            figure(key, get(then).map(Hz::get), get(now).map(Hz::get), WITHIN_MILLIONTHS);
        }
        let hz = |band: &BandEntry| band.line_hz.map(Hz::get);
        figure("line_hz", hz(then), hz(now), WITHIN_BINS * bin_hz + WITHIN_MILLIONTHS);
        let share = |band: &BandEntry| band.resolved.map(|share| share.get());
        figure("resolved", share(then), share(now), WITHIN_MILLIONTHS);
    }
}
