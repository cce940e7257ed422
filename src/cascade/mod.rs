//! Sections over samples: the wavefront kernel and its start state; [`both_ways`] runs it
//! forward and backward.
//!
//! Every section is run in transposed direct form II, with the state `s1`, `s2`
//! and exactly these operations in this order, each rounded once (no fused
//! multiply-add, no reassociation):
//!
//! ```text
//! y  = (b0 * x) + s1
//! s1 = ((b1 * x) + s2) - (a1 * y)        s2 read before it is replaced
//! s2 = (b2 * x) - (a2 * y)
//! ```
//!
//! Its rounding errors pass through 1/A(z) like those of direct form I, but it
//! needs two numbers of state a section instead of four, and a sample waits for
//! one multiplication and two additions of the sample before it.
//!
//! # Wavefront
//! Run one section at a time, each sample waits for the one before it and most
//! of the processor idles. Here the sections lie side by side in vector lanes,
//! each lane two samples behind the lane before it, so that up to 16 sections
//! advance together. One sample behind would do, but then each sample would wait
//! for an output to move to the next lane. No lane computes anything but the expressions above:
//! samples are the same bits at every vector width, on every machine, for any
//! division into blocks, and as [`plain`] makes them section by section.
//!
//! # Start
//! The first sample x\[0\] of a channel is taken to have been there for ever: each
//! section starts in the steady state of a constant input, the first x\[0\], each
//! later one what the section before it makes of that, x\[0\] times its H(1). A
//! constant offset makes no step. A section with H(1) = 0 passes 0 on; one with
//! a pole at z = 1 has no steady state, starts from rest and passes 0 on.
//!
//! # Silence
//! A state that decays into the subnormal numbers stays there, where arithmetic is
//! many times slower on some processors: rounding to nearest never lets it reach
//! zero. So before each frame whose index is a multiple of [`CLEAR_PERIOD`], any `s1`,
//! `s2` of magnitude below [`CLEAR_BELOW`] becomes zero. The index counts from the
//! start of the recording, so block ends don't matter, and no processor mode is touched.

pub mod both_ways;
mod group;
mod kernel;
#[doc(hidden)]
pub mod plain;
mod start;

use crate::section::Section;
use group::{Group, Strand};
pub use kernel::Width;
use std::sync::Arc;

/// Frames between two looks at the states, see [Silence](self#silence).
pub const CLEAR_PERIOD: u64 = 1024;

/// State of smaller magnitude is cleared, see [Silence](self#silence): 4000 dB below
/// full scale, 3100 dB below the smallest sample of a 32-bit float recording. From
/// here to the subnormal numbers (2.2e-308) it is far enough that only a state which
/// falls by 10^107 within one [`CLEAR_PERIOD`] gets there before it is cleared, and
/// such a one is through them within a few frames.
pub const CLEAR_BELOW: f64 = 1e-200;

/// A cascade ready to run: immutable, shared by all recordings of one rate.
#[derive(Debug)]
pub struct Cascade {
    groups: Vec<Group>,
}

impl Cascade {
    /// Prepares `sections`, applied in the order given; none is the identity, bit
    /// for bit. Every `a[0]` is taken to be 1, as [`Section`] has it.
    pub fn new(sections: &[Section]) -> Self {
        Cascade { groups: sections.chunks(kernel::MAX_LANES).map(Group::new).collect() }
    }

    /// Frames by which [`Filter::process`] lags until [`Filter::finish`]: two frames
    /// for each section but the first of every 16.
    pub fn latency_frames(&self) -> usize {
        self.groups.iter().map(Group::latency_frames).sum()
    }
}

/// `s1`, `s2` of each section in the steady state of the constant input `first`, in which
/// a channel starts that begins with it: see [Start](self#start).
pub fn start_states(sections: &[Section], first: f64) -> Vec<[f64; 2]> {
    let mut constant = first;
    let start = |section| {
        let start = start::steady(section, constant);
        constant = start.output;
        [start.s1, start.s2]
    };
    sections.iter().map(start).collect()
}

/// The state of one recording's channels on their way through a [`Cascade`].
///
/// Channels never mix.
#[derive(Debug)]
pub struct Filter {
    cascade: Arc<Cascade>,
    strands: Vec<Strand>,
}

impl Filter {
    /// A filter for `channels` channels that starts in the steady state of the first frame.
    pub fn new(cascade: Arc<Cascade>, channels: usize) -> Self {
        Self::with_width(cascade, channels, Width::Widest)
    }

    /// The same, held to the vector instructions of `width`. The samples are the
    /// same bits at any width: for tests and benches.
    #[doc(hidden)]
    pub fn with_width(cascade: Arc<Cascade>, channels: usize, width: Width) -> Self {
        let strands = (0..channels).map(|_| Strand::new(cascade.groups.len(), width)).collect();
        Filter { cascade, strands }
    }

    /// Filters a planar block of any length and appends what is ready to `out`:
    /// as many frames as came in, less a latency of a few frames once
    /// ([`Cascade::latency_frames`]). All planes have the same length; `out` has one
    /// `Vec` a channel.
    ///
    /// Samples must be finite: after one that is not, the rest of its channel has
    /// no meaning.
    pub fn process(&mut self, input: &[Vec<f64>], out: &mut [Vec<f64>]) {
        debug_assert_eq!(input.len(), self.strands.len(), "one plane a channel");
        debug_assert_eq!(out.len(), self.strands.len(), "one output a channel");
        for ((strand, input), out) in self.strands.iter_mut().zip(input).zip(out) {
            strand.process(&self.cascade.groups, input, out);
        }
    }

    /// Appends the frames still in the pipeline: afterwards as many frames have
    /// come out as went in, and the filter is as new, ready for another recording.
    pub fn finish(&mut self, out: &mut [Vec<f64>]) {
        debug_assert_eq!(out.len(), self.strands.len(), "one output a channel");
        for (strand, out) in self.strands.iter_mut().zip(out) {
            strand.finish(&self.cascade.groups, out);
        }
    }
}
