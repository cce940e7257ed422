//! The report: the serialized types, which are a public format, and their writer.
//!
//! No number is NaN or infinite; `null` stands where there is none. Units stand in
//! the key names. Attenuation is positive when a level falls, gain is negative
//! then. Keys come in the order in which the types declare them.
//!
//! Nothing is measured or judged here: [`Summary`] counts verdicts that others gave.

mod band_entry;
mod design_entry;
mod head;
mod highlights;
mod layout;
mod numbers;
mod recording;
mod summary;
mod writer;

pub use band_entry::{BandEntry, ReasonCode, Require, Verdict};
pub use design_entry::{
    CheckResult, DesignBand, DesignEntry, LeftOutEntry, StageEntry, ViolationEntry, WitnessBand, WitnessEntry,
};
pub use head::{FORMAT, Head, LEVEL_REFERENCE, REPORT_NAME, Run, SpecEntry};
pub use highlights::{FailedItem, Highlights, MissedItem, UnprovenItem};
pub use layout::write_pretty;
pub use numbers::{Db, Finite, Hz, NotFinite, Seconds, Share};
pub use recording::{ChannelEntry, ChunkEntry, Input, OutputFile, Recording, SpectrumEntry, Status};
pub use summary::{BandSummary, Skipped, Summary, SummaryBuilder};
pub use writer::write_report;
