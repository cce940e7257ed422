//! Files as such: where they really are, which are the same, their hashes, and how a new
//! one comes about without ever being seen half-written.
//!
//! Knows nothing of what is in them.

pub mod comparing;
pub mod digest;
pub mod leftover;
pub mod lock;
pub mod open;
pub mod place;
pub mod temporary;
