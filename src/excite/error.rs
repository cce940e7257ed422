//! Why there is no excitation.

use crate::design::DesignError;
use std::io;
use std::path::PathBuf;

/// Why a recording to measure with can't be planned or written.
#[derive(Debug, thiserror::Error)]
pub enum ExciteError {
    /// The spec does not fit the sample rate.
    #[error(transparent)]
    Design(#[from] DesignError),
    /// No band is left at this rate, or the spec has none.
    #[error("the spec has no band at {rate_hz} Hz, so there is nothing to measure: add a [[band]] below {half_hz} Hz")]
    NoBands {
        /// Sample rate, Hz.
        rate_hz: u32,
        /// Half of it, Hz.
        half_hz: f64,
    },
    /// No number of seconds above 0.
    #[error("a length of {0} s can't be written: give --seconds a number above 0")]
    Seconds(f64),
    /// No band could be judged in so short a recording.
    #[error(
        "{seconds} s are too short for every band of the spec: from {least_s:.1} s on the first can be judged, from \
         {every_band_s:.1} s on all of them, from {device_noise_s:.1} s on beside what the device adds; give --seconds that"
    )]
    TooShort {
        /// As asked for.
        seconds: f64,
        /// From here on some band can be judged, seconds.
        least_s: f64,
        /// From here on every band can, seconds.
        every_band_s: f64,
        /// From here on the device's own noise can be told, seconds.
        device_noise_s: f64,
    },
    /// More than the format's sizes can say.
    #[error("{seconds} s at {rate_hz} Hz don't fit into a WAV file, which ends at 4 GiB: {longest_s} s do")]
    TooLong {
        /// As asked for.
        seconds: f64,
        /// Sample rate, Hz.
        rate_hz: u32,
        /// Whole seconds that fit.
        longest_s: u64,
    },
    /// More bytes a second than the format can say.
    #[error("a sample rate of {rate_hz} Hz does not fit into a WAV file with 24 bits: {highest_hz} Hz is the highest")]
    Rate {
        /// Sample rate, Hz.
        rate_hz: u32,
        /// The highest that fits, Hz.
        highest_hz: u32,
    },
    /// The file's name does not say what it is.
    #[error("{0} must have a name that ends in .wav: `measure` finds recordings by their names")]
    Name(PathBuf),
    /// The file is the spec.
    #[error("{target} is the same file as the spec {spec}: choose another FILE")]
    TouchesSpec {
        /// What would be written.
        target: PathBuf,
        /// What it would destroy.
        spec: PathBuf,
    },
    /// Something else has the name.
    #[error("{0} is there already and no regular file, so no file can take its name: choose another place")]
    NotAFile(PathBuf),
    /// The file is there.
    #[error("{0} exists already: give --replace to overwrite, or choose another place")]
    Exists(PathBuf),
    /// Nothing can be written there.
    #[error("{path} can't be written: {cause}; choose a place that exists and that you may write to")]
    NotWritable {
        /// The file.
        path: PathBuf,
        /// The system's reason.
        cause: io::Error,
    },
    /// Writing ended in the middle.
    #[error("{path} could not be written: {cause}; nothing is left of it")]
    Write {
        /// The file.
        path: PathBuf,
        /// The system's reason.
        cause: io::Error,
    },
    /// Writing was ended on demand.
    #[error("interrupted: nothing is left of {0}")]
    Interrupted(PathBuf),
}

impl ExciteError {
    /// Whether nothing was begun: the command line, the spec or the place is wrong.
    pub fn is_refusal(&self) -> bool {
        !matches!(self, ExciteError::Write { .. } | ExciteError::Interrupted(_))
    }
}
