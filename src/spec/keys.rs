//! The tables of a spec file as they are written, key by key: what a normalized spec is
//! written from, and what the JSON Schema describes. Comments on fields are what the
//! schema tells its reader.

use schemars::JsonSchema;
use serde::Serialize;

use super::schema;
use super::types::{Band, BeyondHalfRate, Family, OutputSpec, RateMeaning, Stage};

/// A spec: what is done to the recordings of a dataset, and what must come out. TOML and
/// JSON files have the same keys. Frequencies and widths are in Hz, ratios of levels in dB,
/// levels in dB relative to a full-scale sine.
///
/// What a schema can't say, and a spec must keep to all the same:
///
/// * Names of bands are unique, and none is the name of a line of a row (`name xN`).
/// * `from_hz` lies below `to_hz`, and `edges_hz` rises.
/// * `stop_db` lies above `ripple_db`.
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
/// `bandstop` has `edges_hz`, or `center_hz` with `width_hz` or `q`; a `notch` has
/// `center_hz` with `width_hz` or `q`, and neither `family` nor `order`: it is one
/// second-order section a line.
#[derive(Default, Serialize, JsonSchema)]
#[schemars(deny_unknown_fields)]
pub(super) struct StageKeys {
    /// What the filter lets through or takes out.
    #[schemars(schema_with = "schema::kind_schema")]
    pub kind: &'static str,
    /// Prototype. It decides what an edge is: -3 dB (half power) for `butterworth` and
    /// `bessel`, the end of the ripple for `chebyshev1` and `elliptic`, the beginning of the
    /// stop band for `chebyshev2`.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(with = "Family")]
    pub family: Option<Family>,
    /// Order of the low-pass prototype; a band-pass or band-stop has twice as many poles.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::order")]
    pub order: Option<u32>,
    /// The edge, Hz.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::frequency")]
    pub edge_hz: Option<f64>,
    /// Lower and upper edge, Hz, in this order.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::edges")]
    pub edges_hz: Option<[f64; 2]>,
    /// Center, Hz; in a row that of the first line, and the others lie at its multiples.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::frequency")]
    pub center_hz: Option<f64>,
    /// Width from edge to edge, Hz, the same for every line; of a notch between its -3 dB
    /// points.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::width")]
    pub width_hz: Option<f64>,
    /// Center over width, the same for every line.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::q")]
    pub q: Option<f64>,
    /// Number of lines: at `center_hz` times 1, 2, ... `harmonics`.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::harmonics", extend("default" = 1))]
    pub harmonics: Option<u32>,
    /// Ripple of the pass band, dB; `chebyshev1` and `elliptic` have one.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::ripple")]
    pub ripple_db: Option<f64>,
    /// Attenuation of the stop band, dB; `chebyshev2` and `elliptic` have one.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    #[schemars(schema_with = "schema::stop")]
    pub stop_db: Option<f64>,
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
