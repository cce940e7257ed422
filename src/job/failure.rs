//! Why one recording failed.

use super::pair::PairError;
use super::recording::RecordingError;
use crate::report::NotFinite;
use crate::wave::WaveError;
use std::any::Any;
use std::io;
use std::panic::{AssertUnwindSafe, catch_unwind};

/// Why one recording failed, beyond what [`super::recording::process`] can say.
#[derive(Debug, thiserror::Error)]
pub(crate) enum Failure {
    #[error("{0}")]
    Header(String),
    #[error(transparent)]
    Recording(#[from] RecordingError),
    #[error(transparent)]
    Pair(#[from] PairError),
    #[error("can't be opened: {0}; see to its permissions, or leave the recording out")]
    Open(io::Error),
    #[error("its output can't be written: {0}; see to the folder's permissions and the room on the disk")]
    Write(io::Error),
    #[error(
        "its output can't be written: the disk takes its name for that of another output of this run; rename one of \
         the two recordings, or choose another output folder"
    )]
    Taken,
    #[error(
        "its output can't be written: {0}; a file with its name has come about while this run went on: see what it is, \
         and run again with --replace if it may go"
    )]
    InTheWay(io::Error),
    #[error("a figure came out as no number ({0}); this is a defect of this program")]
    Figure(#[from] NotFinite),
    #[error("processing stopped with a defect of this program: {0}")]
    Panic(String),
}

impl Failure {
    /// Whether the recording was only given up because the user asked for an end.
    pub(crate) fn is_interruption(&self) -> bool {
        matches!(self, Failure::Recording(RecordingError::Interrupted(_)) | Failure::Pair(PairError::Interrupted(_)))
    }
}

impl From<WaveError> for Failure {
    fn from(error: WaveError) -> Self {
        Failure::Recording(error.into())
    }
}

/// Runs `work`; a panic in it is a failure of that recording, not of the run.
pub(crate) fn contained<T>(work: impl FnOnce() -> Result<T, Failure>) -> Result<T, Failure> {
    catch_unwind(AssertUnwindSafe(work)).unwrap_or_else(|panic| Err(Failure::Panic(panic_text(panic.as_ref()))))
}

fn panic_text(panic: &(dyn Any + Send)) -> String {
    let text = panic.downcast_ref::<&str>().map(ToString::to_string);
    text.or_else(|| panic.downcast_ref::<String>().cloned()).unwrap_or_default()
}
