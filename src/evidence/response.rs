//! What was seen of a band's response: plain data.

use super::subbands::SubBand;

/// The gain of one sub-band that counts. Figures are rounded as shown, but for those that
/// say otherwise.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SubGain {
    /// Lower edge, Hz.
    pub from_hz: f64,
    /// Upper edge, Hz.
    pub to_hz: f64,
    /// Its bins.
    pub bins: usize,
    /// Gain, dB.
    pub gain_db: f64,
    /// The same, not rounded.
    pub exact_db: f64,
    /// Its standard error, dB.
    pub error_db: f64,
    /// The same relative to the gain, not rounded.
    pub relative_error: f64,
    /// Independent values in it: segments times bins over 2.76.
    pub independent: f64,
    /// What remains of them after fitting.
    pub freedom: f64,
    /// By how much noise biases the gain either way, dB, at most about.
    pub bias_db: f64,
    /// Its window error, dB: how far off it may be, as a root of a mean square, if
    /// the sounds are short against a segment.
    pub window_db: f64,
    /// How much higher the gain may be: the input's share that leaked in from outside
    /// the band need not have come out again. dB, at least 0.
    pub low_by_db: f64,
    /// How much lower it may be: leakage that is in both spectra passes for gain.
    /// dB, at least 0.
    pub high_by_db: f64,
}

/// A sub-band of a pair that does not count because so little comes out.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Dip {
    /// Lower edge, Hz.
    pub from_hz: f64,
    /// Upper edge, Hz.
    pub to_hz: f64,
    /// All that comes out against what went in, dB, rounded: no gain is higher, but for
    /// chance.
    pub at_most_db: f64,
    /// Independent values in it.
    pub independent: f64,
    /// As of [`SubGain::low_by_db`].
    pub low_by_db: f64,
}

/// What was seen of a band's response.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Response {
    /// Whether it is that of a pair that something else filtered.
    pub of_pair: bool,
    /// The sub-bands that count, rising.
    pub counting: Vec<SubGain>,
    /// The bins of each of them.
    pub parts: Vec<SubBand>,
    /// Those of a pair that do not, although there is something before.
    pub dips: Vec<Dip>,
    /// Sub-bands in all.
    pub tried: usize,
    /// Share of the band's bins in those that count, 0 to 1, rounded.
    pub resolved: f64,
    /// Bins of sub-bands that do not count because of what leaks into them.
    pub hidden_by_leakage: usize,
    /// Bins of those that do not count because of rounding.
    pub hidden_by_rounding: usize,
    /// Bins of those that do not count because of what the device adds.
    pub hidden_by_device: usize,
    /// Bins of those among them where too few segments tell noise from a response that
    /// turns within the sub-band.
    pub unclear: usize,
    /// Bins beyond what interpolation leaves alone.
    pub beyond: usize,
}

impl Response {
    /// Width of the widest sub-band that counts, Hz: a dip narrower than this may hide.
    pub fn resolution_hz(&self) -> Option<f64> {
        self.counting.iter().map(|sub| sub.to_hz - sub.from_hz).max_by(f64::total_cmp)
    }

    /// The sub-band of the lowest gain.
    pub fn lowest(&self) -> Option<&SubGain> {
        self.counting.iter().min_by(|a, b| a.gain_db.total_cmp(&b.gain_db))
    }

    /// The sub-band of the highest gain.
    pub fn highest(&self) -> Option<&SubGain> {
        self.counting.iter().max_by(|a, b| a.gain_db.total_cmp(&b.gain_db))
    }
}
