//! Writing checkpoints.
//!
//! The layout: magic, version, endian mark, then the numbers and arrays below in this order, all little-endian, and last
//! the checksum of everything before it.

use super::Failure;
use super::file::{Durability, OutFile, cannot_write};
use super::state::Run;
use std::fs;
use std::io::ErrorKind;
use std::time::Instant;

pub const MAGIC: &[u8; 8] = b"RIMSTONE";
pub const VERSION: u64 = 1;
pub const ENDIAN_MARK: u64 = 0x0102_0304_0506_0708;

impl OutFile {
    fn put_word(&mut self, word: u64) -> Result<(), Failure> {
        self.put_checked(&word.to_le_bytes())
    }

    fn put_double(&mut self, number: f64) -> Result<(), Failure> {
        self.put_word(number.to_bits())
    }

    fn put_string(&mut self, text: &str) -> Result<(), Failure> {
        self.put_word(text.len() as u64)?;
        self.put_checked(text.as_bytes())
    }
}

impl Run<'_> {
    /// Writes `checkpoint.bin` and keeps the one before as `checkpoint.old`.
    pub fn write_checkpoint(&mut self) -> Result<(), Failure> {
        let Some(folder) = self.folder.clone() else { return Ok(()) };
        let began = Instant::now();
        if let Some(rows) = &mut self.rows {
            rows.sync()?;
        }
        let present = folder.join("checkpoint.bin");
        let mut file = OutFile::create(present.clone())?;
        self.put_setup(&mut file)?;
        self.put_position(&mut file)?;
        self.put_results(&mut file)?;
        file.put_word(self.solver.state_count() as u64)?;
        for index in 0..self.solver.state_count() {
            file.put_doubles_checked(self.solver.state(index))?;
        }
        for output in self.maxima() {
            file.put_doubles_checked(self.solver.maximum_mut(output))?;
        }
        let checksum = file.checksum;
        file.put_word(checksum)?;
        match fs::rename(&present, folder.join("checkpoint.old")) {
            Err(reason) if reason.kind() != ErrorKind::NotFound => {
                return Err(cannot_write(&present, &reason));
            }
            _ => file.close(Durability::Synced)?,
        }
        if let Some(rows) = &mut self.rows {
            rows.keep();
        }
        self.checkpoint_at = Instant::now();
        self.output_seconds += began.elapsed().as_secs_f64();
        Ok(())
    }

    fn put_setup(&self, file: &mut OutFile) -> Result<(), Failure> {
        file.put_checked(MAGIC)?;
        file.put_word(VERSION)?;
        file.put_word(ENDIAN_MARK)?;
        file.put_string(&self.about.hash)?;
        file.put_string(&self.about.version)?;
        file.put_word(self.nodes.len() as u64)?;
        for nodes in &self.nodes {
            file.put_word(*nodes as u64)?;
        }
        file.put_word(self.about.parameters.len() as u64)?;
        for parameter in 0..self.about.parameters.len() {
            file.put_double(self.solver.parameter(parameter))?;
        }
        Ok(())
    }

    fn put_position(&self, file: &mut OutFile) -> Result<(), Failure> {
        let position = &self.position;
        file.put_double(position.end)?;
        file.put_word(u64::from(position.steps.is_some()))?;
        file.put_word(position.steps.unwrap_or(0))?;
        file.put_word(position.step)?;
        file.put_double(position.time)?;
        file.put_double(position.last_step)?;
        file.put_double(position.from)?;
        file.put_double(position.to)?;
        file.put_word(position.parts)?;
        file.put_word(position.part)?;
        file.put_double(position.limit)?;
        file.put_double(position.constant_step)?;
        file.put_word(u64::from(position.above_limit))?;
        file.put_double(self.wall())?;
        file.put_double(self.stepping())?;
        file.put_word(position.due_next.len() as u64)?;
        position.due_next.iter().try_for_each(|due| file.put_word(*due))
    }

    fn put_results(&self, file: &mut OutFile) -> Result<(), Failure> {
        file.put_word(self.row_bytes)?;
        file.put_word(self.rows.as_ref().map_or(0, |rows| rows.checksum))?;
        file.put_word(self.records.len() as u64)?;
        for record in &self.records {
            file.put_word(record.series as u64)?;
            file.put_word(record.number)?;
            file.put_word(record.step)?;
            file.put_double(record.time)?;
        }
        Ok(())
    }
}
