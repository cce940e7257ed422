//! The top of a report: what it is, the run, the spec.

use super::{DesignEntry, Finite, Seconds, schema};
use crate::spec::{Spec, SpecFile};
use schemars::JsonSchema;
use serde::{Deserialize, Serialize};

/// Value of `report`.
pub const REPORT_NAME: &str = "bandproof";

/// Value of `format`: rises when a key changes its meaning or goes away.
pub const FORMAT: u32 = 1;

/// Value of `level_reference`.
pub const LEVEL_REFERENCE: &str = "0 dBFS is the level of a full-scale sine; not sound pressure";

/// Everything of a report that stands before `recordings`.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Head {
    /// What kind of file this is.
    #[schemars(extend("const" = REPORT_NAME))]
    pub report: String,
    /// Version of this format: rises when a key changes its meaning or goes away.
    #[schemars(extend("const" = FORMAT))]
    pub format: u32,
    /// Version of the program that wrote the report.
    pub tool_version: String,
    /// What every dBFS figure refers to.
    #[schemars(extend("const" = LEVEL_REFERENCE))]
    pub level_reference: String,
    /// Facts of this one run.
    pub run: Run,
    /// False while recordings of the plan are still to be done, as after an interruption.
    pub complete: bool,
    /// The spec.
    pub spec: SpecEntry,
    /// The spec at each sample rate that occurs, rates rising.
    pub designs: Vec<DesignEntry>,
}

impl Head {
    /// A head of this version's format.
    pub fn new(run: Run, complete: bool, spec: SpecEntry, designs: Vec<DesignEntry>) -> Self {
        Head {
            report: REPORT_NAME.to_owned(),
            format: FORMAT,
            tool_version: env!("CARGO_PKG_VERSION").to_owned(),
            level_reference: LEVEL_REFERENCE.to_owned(),
            run,
            complete,
            spec,
            designs,
        }
    }
}

/// Times, counts and other facts that differ between two runs of the same job.
/// Nothing else in a report does.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct Run {
    /// When the run started: RFC 3339, UTC, whole seconds.
    #[schemars(schema_with = "schema::instant")]
    pub started: String,
    /// Wall time of the run, seconds.
    #[schemars(extend("minimum" = 0))]
    pub seconds: Seconds,
    /// Threads.
    #[schemars(range(min = 1))]
    pub jobs: usize,
    /// Largest complex deviation of any witness from its design, relative to full
    /// scale; null where no witness ran.
    #[schemars(extend("minimum" = 0))]
    pub witness_deviation: Option<Finite>,
}

/// The spec of a run.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize, JsonSchema)]
#[serde(deny_unknown_fields)]
pub struct SpecEntry {
    /// The spec's own title; null where it has none.
    pub title: Option<String>,
    /// SHA-256 of the spec file's bytes, lower-case hexadecimal.
    #[schemars(schema_with = "schema::sha256")]
    pub file_sha256: String,
    /// The spec with every default filled in, itself a valid spec.
    #[schemars(with = "Spec")]
    pub normalized: serde_json::Value,
}

impl SpecEntry {
    /// The entry for `file`.
    ///
    /// # Errors
    /// The spec does not go into JSON, which no spec that was read does.
    pub fn new(file: &SpecFile) -> serde_json::Result<Self> {
        let normalized = serde_json::to_value(&file.spec)?;
        Ok(SpecEntry { title: file.spec.title.clone(), file_sha256: file.file_sha256.clone(), normalized })
    }
}
