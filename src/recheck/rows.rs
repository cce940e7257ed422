//! Rows of the table, in the report's order whichever is ready first.

use crate::report::{Recording, TableWriter};
use std::collections::BTreeMap;
use std::io::{self, Write};

/// Puts fresh entries into the table in the report's order, whichever is ready first.
pub(super) struct Rows<W: Write> {
    table: TableWriter<W>,
    next: usize,
    waiting: BTreeMap<usize, Recording>,
    error: Option<io::Error>,
}

impl<W: Write> Rows<W> {
    /// No rows but the header.
    pub(super) fn new(out: W) -> io::Result<Self> {
        Ok(Rows { table: TableWriter::new(out)?, next: 0, waiting: BTreeMap::new(), error: None })
    }

    /// Takes what comes in the place `place`, from 0; an error is kept for the end.
    pub(super) fn put(&mut self, place: usize, recording: Recording) {
        self.waiting.insert(place, recording);
        while let Some(recording) = self.waiting.remove(&self.next) {
            self.next += 1;
            if self.error.is_none() {
                self.error = self.table.add(&recording).err();
            }
        }
    }
    /// Ends the table.
    pub(super) fn finish(self) -> io::Result<()> {
        match self.error {
            Some(error) => Err(error),
            None => self.table.finish().map(drop),
        }
    }
}
