//! The report: the serialized types, which are a public format, and their writer.
//!
//! No number is NaN or infinite; `null` stands where there is none. Units stand in
//! the key names. Attenuation is positive when a level falls, gain is negative
//! then. Keys come in the order in which the types declare them.
//!
//! Nothing is measured or judged here: [`Summary`] counts verdicts that others gave.

mod band_entry;
pub mod curve;
mod design_entry;
mod head;
mod highlights;
mod layout;
mod methods;
mod numbers;
mod pair;
mod read;
mod recording;
mod schema;
mod summary;
mod table;
mod writer;

pub use band_entry::{BandEntry, ReasonCode, Require, Verdict};
pub use curve::CurveError;
pub use design_entry::{
    CheckResult, DesignBand, DesignEntry, LeftOutEntry, LimitEdge, LimitEntry, StageEntry, ViolationEntry, WitnessBand,
    WitnessEntry,
};
pub use head::{FORMAT, Head, LEVEL_REFERENCE, REPORT_NAME, Run, SpecEntry};
pub use highlights::{FailedItem, FarthestItem, Highlights, MOST_NAMED, MissedItem, PairsItem, UnprovenItem};
pub use layout::write_pretty;
pub use methods::{EdgeDefinition, Methods, MethodsBand, MethodsLine, MethodsStage, MethodsTransition};
pub use numbers::{Db, Finite, Hz, NotFinite, Seconds, Share};
pub use pair::{DelaySource, Pair};
pub use read::{ReadError, read_report};
pub use recording::{ChannelEntry, ChunkEntry, Input, OutputFile, Recording, SpectrumEntry, Status};
pub use schema::{Report, schema};
pub use summary::{BandSummary, Skipped, Summary, SummaryBuilder, Unpaired};
pub use table::TableWriter;
pub use writer::write_report;
