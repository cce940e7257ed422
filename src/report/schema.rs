//! The JSON Schema of reports, from the types they are written from, and what those types
//! can't say of themselves.

use super::{FORMAT, Head, Recording, Summary};
use crate::output::DITHER_NAME;
use crate::schema::document;
use crate::wave::Encoding;
use schemars::generate::SchemaSettings;
use schemars::{JsonSchema, Schema, SchemaGenerator, json_schema};
use serde::Serialize;
use serde_json::Value;

/// What a run of `bandproof filter` or `bandproof measure` did, recording by recording, and
/// what can be proven of it, band by band.
///
/// Every key is always there; `null` stands where there is no value, and its description
/// says when. Units stand in the names of keys. Attenuation is positive when a level falls,
/// gain is negative then. `normalized` is the spec with every default filled in, itself a
/// valid spec file; of its keys those are there that its kinds of stages and bands have.
///
/// What a schema can't say: recordings are sorted by `path`, byte by byte, and designs by
/// `rate_hz`; the bands of a design, a channel and the summary have the spec's order; counts
/// in the summary add up.
#[derive(Clone, Debug, Serialize, JsonSchema)]
#[schemars(deny_unknown_fields)]
pub struct Report {
    /// What stands before the recordings.
    #[serde(flatten)]
    pub head: Head,
    /// The recordings, sorted by path, byte by byte.
    pub recordings: Vec<Recording>,
    /// What they came to.
    pub summary: Summary,
}

/// The JSON Schema (draft 2020-12) of reports of this version's
/// [`FORMAT`].
///
/// Strict on purpose: a report that lacks a key or has one more does not satisfy it.
pub fn schema() -> Value {
    document::<Report>(SchemaSettings::draft2020_12().for_serialize(), &format!("Report of bandproof, format {FORMAT}"))
}

/// SHA-256 in lower-case hexadecimal.
const SHA256: &str = "^[0-9a-f]{64}$";

/// `sha256` of a file that was read to its end.
pub(super) fn sha256(_: &mut SchemaGenerator) -> Schema {
    json_schema!({"type": "string", "pattern": SHA256})
}

/// `sha256` of a file that may not have been.
pub(super) fn sha256_or_null(_: &mut SchemaGenerator) -> Schema {
    json_schema!({"type": ["string", "null"], "pattern": SHA256})
}

/// `started`.
pub(super) fn instant(_: &mut SchemaGenerator) -> Schema {
    json_schema!({
        "type": "string", "format": "date-time",
        "pattern": "^[0-9]{4}-[0-9]{2}-[0-9]{2}T[0-9]{2}:[0-9]{2}:[0-9]{2}Z$",
    })
}

/// `encoding` of a file.
pub(super) fn encoding(_: &mut SchemaGenerator) -> Schema {
    use Encoding::{Float32, Float64, Pcm8, Pcm16, Pcm24, Pcm32};
    let names = [Pcm8, Pcm16, Pcm24, Pcm32, Float32, Float64].map(Encoding::name);
    json_schema!({"type": "string", "enum": names})
}

/// `dither` of a design.
pub(super) fn dither(_: &mut SchemaGenerator) -> Schema {
    json_schema!({"type": "string", "enum": [DITHER_NAME, "none"]})
}

/// A path below a root: neither empty nor absolute.
pub(super) fn path(_: &mut SchemaGenerator) -> Schema {
    json_schema!({"type": "string", "pattern": "^[^/]"})
}

/// A list of such.
pub(super) fn paths(generator: &mut SchemaGenerator) -> Schema {
    json_schema!({"type": "array", "items": path(generator)})
}

/// `id` of a chunk.
pub(super) fn chunk_id(_: &mut SchemaGenerator) -> Schema {
    json_schema!({"type": "string", "pattern": "^([ -$&-~]|%[0-9A-F]{2}){4}$"})
}
