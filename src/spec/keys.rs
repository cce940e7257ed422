//! The tables of a spec file as they are written, key by key: what a normalized spec is
//! written from, and what the JSON Schema describes. Comments on fields are what the
//! schema tells its reader.

use schemars::JsonSchema;
use serde::Serialize;

use super::schema;
use super::schema_stage;
use super::stages::{Curve, Family, Stage};
use super::transfer::{Coefficient, Root, WrittenSection};
use super::types::{Auto, Band, BeyondHalfRate, OutputSpec, Phase, RateMeaning};
use super::words::DesignWay;

/// A spec: what is done to the recordings of a dataset, and what must come out. TOML and
/// JSON files have the same keys. Frequencies and widths are in Hz, ratios of levels in dB,
/// levels in dB relative to a full-scale sine.
///
/// What a schema can't say, and a spec must keep to all the same:
///
/// * Names of bands are unique, and none is the name of a line of a row (`name xN`).
/// * `from_hz` lies below `to_hz`, and `edges_hz` and `stop_edges_hz` rise.
/// * `stop_db` lies above `ripple_db`.
/// * `stop_edge_hz` lies above `edge_hz` of a low-pass and below that of a high-pass;
///   `stop_edges_hz` lie around `edges_hz` of a band-pass and between those of a band-stop.
/// * Every root with an imaginary part has its conjugate in the same list, within half a unit
///   of the last given digits.
/// * An analog numerator, without zeros in front, has no more coefficients than its
///   denominator.
/// * There are no more zeros than poles.
/// * `width_hz` and `span_hz` are less than twice `center_hz`, so that every line begins
///   above 0 Hz, and wide enough for numbers to tell the edges from the center.
/// * Lines of a row of stops or notches share no frequency; those of a row of band-passes
///   have one in common, since they run one after another.
/// * `except` names bands with `reduce_db`, or lines of them.
/// * A band with `reduce_db` shares no frequency with one with `keep_db`, unless the latter
///   names it in `except`.
/// * `reference_band` names one band that has `keep_db` or no requirement.
/// * No key stands twice in one table, and the file has no more than 1048576 bytes.
#[derive(Serialize, JsonSchema)]
#[schemars(deny_unknown_fields)]
pub(super) struct SpecKeys<'s> {
    /// Free text for people, without control characters but line breaks and tabs.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::title")]
    pub title: Option<&'s str>,
    /// What becomes of a stage or band that reaches beyond half a recording's sample
    /// rate: `error` ends the run before anything is written, `leave-out` leaves it out at
    /// that rate and lists it.
    #[serde(default)]
    pub beyond_half_rate: BeyondHalfRate,
    /// Name of one band that has `keep_db` or no requirement, `name xN` for a line of a row:
    /// its gain counts as 0 dB where pairs are measured that something else filtered.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::name")]
    pub reference_band: Option<&'s str>,
    /// Which sample rate every frequency of the spec means in time-expanded recordings, as
    /// GUANO metadata tells them (`TE`, `Samplerate`): `header` is the rate that the header
    /// states, `acoustic` the higher one at which the sound was sampled. Without this key such
    /// recordings fail; all others are the same with it and without it.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::rate")]
    pub rate: Option<RateMeaning>,
    /// How the cascade runs over the samples: `causal` is once, forward; `zero` is forward and
    /// backward, without a shift of phase. All limits mean what comes out in the end; `order`
    /// is that of one pass.
    #[serde(default)]
    pub phase: Phase,
    /// `auto`: there are no stages, and the cascade with the fewest sections that makes every
    /// requirement certain is found from the bands. Then some band has `reduce_db`, and none
    /// `residual_dbfs`, which no filter can make certain.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::design")]
    pub design: Option<DesignWay>,
    /// What the search is held to; it implies `design = "auto"`.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(with = "Auto")]
    pub auto: Option<Auto>,
    /// How filtered samples are written.
    #[serde(default)]
    pub output: OutputSpec,
    /// The filters, applied in this order.
    #[serde(default)]
    pub stage: &'s [Stage],
    /// Frequency ranges with what must hold in them.
    #[serde(default)]
    pub band: &'s [Band],
}

/// A filter, or a row of them. A `lowpass` or `highpass` has `edge_hz`; a `bandpass` or
/// `bandstop` has `edges_hz`, or `center_hz` with `width_hz` or `q`. These four have a `family`
/// and an `order`; or, in place of it, `stop_edge_hz` or `stop_edges_hz` with `ripple_db` and
/// `stop_db`, and then the smallest order that holds these limits. A `notch` has `center_hz`
/// with `width_hz` or `q`, and is one second-order section a line. A `peak` has `center_hz`,
/// `gain_db` and `q`; a `lowshelf` or `highshelf` has `edge_hz`, `gain_db`, and `q` or `slope`.
/// A `weighting` has a `curve`. A `digital` stage has `numerator` and `denominator`, or
/// `sections`, or `zeros`, `poles` and `gain`; an `analog` one has `numerator` and
/// `denominator`, or `zeros`, `poles` and `gain`, or `zeros_hz`, `poles_hz` and `gain`.
#[derive(Default, Serialize, JsonSchema)]
#[schemars(deny_unknown_fields)]
pub(super) struct StageKeys<'s> {
    /// What the filter lets through, takes out or is.
    #[schemars(schema_with = "schema::kind_schema")]
    pub kind: &'static str,
    /// Prototype. With `order` it decides what an edge is: -3 dB (half power) for
    /// `butterworth` and `bessel`, the end of the ripple for `chebyshev1` and `elliptic`, the
    /// beginning of the stop band for `chebyshev2`.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(with = "Family")]
    pub family: Option<Family>,
    /// Order of the low-pass prototype; a band-pass or band-stop has twice as many poles.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema_stage::order")]
    pub order: Option<u32>,
    /// The edge, Hz: with `stop_edge_hz` where `ripple_db` ends, whatever the family; of a
    /// shelf where its gain is half of `gain_db`.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::frequency")]
    pub edge_hz: Option<f64>,
    /// Lower and upper edge, Hz, in this order: with `stop_edges_hz` where `ripple_db` ends,
    /// whatever the family.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::edges")]
    pub edges_hz: Option<[f64; 2]>,
    /// Where `stop_db` begins, Hz: above `edge_hz` of a low-pass, below that of a high-pass.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::frequency")]
    pub stop_edge_hz: Option<f64>,
    /// Where `stop_db` begins, lower and upper one, Hz: around `edges_hz` of a band-pass,
    /// between those of a band-stop.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::edges")]
    pub stop_edges_hz: Option<[f64; 2]>,
    /// Center, Hz; in a row that of the first line, and the others lie at its multiples.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::frequency")]
    pub center_hz: Option<f64>,
    /// Width from edge to edge, Hz, the same for every line; of a notch between its -3 dB
    /// points.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::width")]
    pub width_hz: Option<f64>,
    /// Center over width, the same for every line; of a peak over the width at half of
    /// `gain_db`; of a shelf the Q of its poles and zeros.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema_stage::q")]
    pub q: Option<f64>,
    /// Number of lines: at `center_hz` times 1, 2, ... `harmonics`.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::harmonics", extend("default" = 1))]
    pub harmonics: Option<u32>,
    /// Ripple of the pass band, dB; with `order` only `chebyshev1` and `elliptic` have one.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema_stage::ripple")]
    pub ripple_db: Option<f64>,
    /// Attenuation of the stop band, dB; with `order` only `chebyshev2` and `elliptic` have
    /// one.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema_stage::stop")]
    pub stop_db: Option<f64>,
    /// Gain of a peak at its center, of a shelf far from its edge, dB.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema_stage::boost")]
    pub gain_db: Option<f64>,
    /// Slope of a shelf; 1 is the steepest without a bump.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema_stage::slope")]
    pub slope: Option<f64>,
    /// Standard curve: frequency weightings `A` and `C` of IEC 61672-1, `K` of ITU-R BS.1770,
    /// `riaa` for the playback of records after IEC 60098.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(with = "Curve")]
    pub curve: Option<Curve>,
    /// Numerator: of a digital stage in powers of z^-1, the constant term first; of an analog
    /// one in powers of s in rad/s, the highest first.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema_stage::numerator")]
    pub numerator: Option<&'s [Coefficient]>,
    /// Denominator in the same order; it doesn't begin with 0.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema_stage::denominator")]
    pub denominator: Option<&'s [Coefficient]>,
    /// Second-order sections, coefficients in powers of z^-1, the constant term first.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema_stage::sections")]
    pub sections: Option<&'s [WrittenSection]>,
    /// Zeros: of a digital stage in the z plane, of an analog one in rad/s; each a number, or
    /// `[re, im]` off the real axis.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema_stage::zeros")]
    pub zeros: Option<&'s [Root]>,
    /// Poles likewise.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema_stage::roots")]
    pub poles: Option<&'s [Root]>,
    /// Zeros of an analog stage in Hz: s = j f.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema_stage::zeros")]
    pub zeros_hz: Option<&'s [Root]>,
    /// Poles of an analog stage in Hz.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema_stage::roots")]
    pub poles_hz: Option<&'s [Root]>,
    /// Factor before the product of the roots, in the unit of the roots.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema_stage::gain")]
    pub gain: Option<Coefficient>,
    /// Frequency at which the digital filter responds as the analog one does, Hz; without it
    /// they agree at 0 Hz alone.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::frequency")]
    pub match_hz: Option<f64>,
    /// Sample rate that the coefficients of a digital stage are for, Hz: at any other the
    /// design is an error. Without it the same coefficients are used at every rate, and the
    /// frequencies of the response move with it.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema_stage::sample_rate")]
    pub rate_hz: Option<u32>,
}

/// A range of frequencies under a name, with a requirement or without, or a row of them. It is given by
/// `from_hz` and `to_hz`, or by `center_hz` with `span_hz` or `q`. A band without a
/// requirement is observed: figures, no verdict.
#[derive(Default, Serialize, JsonSchema)]
#[schemars(deny_unknown_fields)]
pub(super) struct BandKeys<'s> {
    /// Its name in the report, one line of text; the bands of a row are `name x1`, `name x2`
    /// and so on.
    #[schemars(schema_with = "schema::name")]
    pub name: &'s str,
    /// Lower edge, Hz; it belongs to the band.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::from")]
    pub from_hz: Option<f64>,
    /// Upper edge, Hz; it does not belong to the band, and may equal half the sample rate.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::frequency")]
    pub to_hz: Option<f64>,
    /// Center, Hz; in a row that of the first line, and the others lie at its multiples.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::frequency")]
    pub center_hz: Option<f64>,
    /// Full extent, Hz, the same for every line.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::width")]
    pub span_hz: Option<f64>,
    /// Center over extent, the same for every line.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::q")]
    pub q: Option<f64>,
    /// Number of bands: at `center_hz` times 1, 2, ... `harmonics`.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::harmonics", extend("default" = 1))]
    pub harmonics: Option<u32>,
    /// The level must fall by this much or more, dB.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::reduce")]
    pub reduce_db: Option<f64>,
    /// The gain must stay within plus or minus this much, dB.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::keep")]
    pub keep_db: Option<f64>,
    /// Names of bands with `reduce_db`, or of lines of them, whose stops are taken out of
    /// this band.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(with = "[String]", extend("default" = []))]
    pub except: Option<&'s [String]>,
    /// What is left may have this level at most, dB relative to a full-scale sine.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::residual")]
    pub residual_dbfs: Option<f64>,
}
