//! Going on from a checkpoint: what differs from what is asked for is refused, each difference named.

use super::checkpoint::{ENDIAN_MARK, MAGIC, VERSION};
use super::file::{EMPTY_CHECKSUM, OutFile, cannot_write, checksum_on, temporary_name};
use super::number::exact;
use super::state::{Position, Record, Run};
use super::{Description, Failure, Options};
use std::fs::{self, OpenOptions};
use std::io::{Read, Seek, SeekFrom};
use std::path::Path;

/// A checkpoint in memory, read from front to back.
pub struct Reader {
    bytes: Vec<u8>,
    at: usize,
    /// Something was asked for beyond the end, or makes no sense.
    spoilt: bool,
}

fn misfit() -> Failure {
    Failure::refused("--resume: the checkpoint does not fit this model")
}

impl Reader {
    /// Of the folder's checkpoint, or the one before when that is damaged.
    pub fn open(folder: &Path) -> Result<Reader, Failure> {
        let load = |name: &str| Reader::load(&folder.join(name));
        let reader = load("checkpoint.bin").or_else(|| {
            let former = load("checkpoint.old")?;
            eprintln!(
                "checkpoint.bin is missing or damaged; going on from the one before it, checkpoint.old"
            );
            Some(former)
        });
        let shown = folder.display();
        let mut reader = reader.ok_or_else(|| {
            Failure::refused(format!(
                "the checkpoint in '{shown}' is damaged, and so is the one before: start a new run in another --out"
            ))
        })?;
        reader.at = MAGIC.len();
        if reader.word() != VERSION || reader.word() != ENDIAN_MARK {
            let reason =
                format!("the checkpoint in '{shown}' was written by another version of this program");
            return Err(Failure::refused(reason));
        }
        Ok(reader)
    }

    fn load(path: &Path) -> Option<Reader> {
        let mut bytes = fs::read(path).ok()?;
        let body = bytes.len().checked_sub(8).filter(|body| *body >= 24)?;
        let (front, sum) = bytes.split_at(body);
        let whole = front.starts_with(MAGIC) && checksum_on(EMPTY_CHECKSUM, front).to_le_bytes() == sum;
        bytes.truncate(body);
        whole.then_some(Reader { bytes, at: 0, spoilt: false })
    }

    fn take(&mut self, count: usize) -> &[u8] {
        if count > self.bytes.len() - self.at {
            self.spoilt = true;
            return &[];
        }
        self.at += count;
        &self.bytes[self.at - count..self.at]
    }

    fn word(&mut self) -> u64 {
        let bytes = self.take(8);
        bytes.try_into().map_or(0, u64::from_le_bytes)
    }

    fn double(&mut self) -> f64 {
        f64::from_bits(self.word())
    }

    fn string(&mut self) -> String {
        let length = self.word().min(65_536) as usize;
        String::from_utf8_lossy(self.take(length)).into_owned()
    }

    fn doubles(&mut self, values: &mut [f64]) {
        for value in values {
            *value = self.double();
        }
    }

    /// A number of things that is known from the model.
    fn count(&mut self, expected: usize) {
        self.spoilt |= self.word() != expected as u64;
    }

    /// Takes over sizes and constants; what was asked for otherwise is a fault.
    pub fn adopt_setup(&mut self, about: &Description, options: &mut Options) -> Result<(), Failure> {
        let mut faults = Vec::new();
        for (what, here) in [("model (by its hash)", &about.hash), ("version of the program", &about.version)]
        {
            let there = self.string();
            if there != *here {
                faults.push(format!("--resume: the {what} differs: {there} in the checkpoint, {here} here"));
            }
        }
        if !faults.is_empty() {
            return Err(Failure::Refused(faults));
        }
        self.count(about.axes.len());
        for (axis, wanted) in about.axes.iter().zip(&mut options.nodes) {
            let nodes = self.word() as usize;
            if let Some(asked) = wanted.filter(|asked| *asked != nodes) {
                let name = &axis.name;
                faults.push(format!(
                    "--resume: nodes along {name} differ: {nodes} in the checkpoint, {asked} asked for"
                ));
            }
            *wanted = Some(nodes);
        }
        self.count(about.parameters.len());
        for (constant, wanted) in about.parameters.iter().zip(&mut options.parameters) {
            let value = self.double();
            if let Some(asked) = wanted.filter(|asked| asked.to_bits() != value.to_bits()) {
                faults.push(format!(
                    "--resume: the constant {} differs: {} in the checkpoint, {} asked for (SI)",
                    constant.name,
                    exact(value),
                    exact(asked)
                ));
            }
            *wanted = Some(value);
        }
        if self.spoilt {
            return Err(misfit());
        }
        if faults.is_empty() { Ok(()) } else { Err(Failure::Refused(faults)) }
    }

    fn position(&mut self, outputs: usize) -> Position {
        let end = self.double();
        let counted = self.word() != 0;
        let steps = self.word();
        let mut position = Position {
            end,
            steps: counted.then_some(steps),
            step: self.word(),
            time: self.double(),
            last_step: self.double(),
            from: self.double(),
            to: self.double(),
            parts: self.word(),
            part: self.word(),
            limit: self.double(),
            constant_step: self.double(),
            above_limit: self.word() != 0,
            earlier_wall: self.double(),
            earlier_stepping: self.double(),
            due_next: Vec::new(),
        };
        self.count(outputs);
        position.due_next = (0..outputs).map(|_| self.word()).collect();
        position
    }
}

fn position_faults(position: &Position, options: &Options) -> Vec<String> {
    let mut faults = Vec::new();
    if let Some(until) = options.until.filter(|until| position.steps.is_some() || *until != position.end) {
        let (there, here) = (exact(position.end), exact(until));
        faults.push(format!(
            "--resume: the last time differs: {there} s in the checkpoint, {here} s asked for"
        ));
    }
    if let Some(steps) = options.steps.filter(|steps| position.steps != Some(*steps)) {
        let there = match position.steps {
            Some(there) => format!("{there} in the checkpoint"),
            None => "the run was not started with --steps".to_owned(),
        };
        faults.push(format!("--resume: the number of steps differs: {there}, {steps} asked for"));
    }
    faults
}

impl Run<'_> {
    /// Puts the run where the checkpoint left it.
    pub fn adopt(&mut self, reader: &mut Reader, options: &Options) -> Result<(), Failure> {
        let position = reader.position(self.about.outputs.len());
        let faults = position_faults(&position, options);
        if !faults.is_empty() {
            return Err(Failure::Refused(faults));
        }
        self.position = position;
        self.adopt_results(reader)?;
        reader.count(self.solver.state_count());
        for index in 0..self.solver.state_count() {
            reader.doubles(self.solver.state_mut(index));
        }
        for output in self.maxima() {
            reader.doubles(self.solver.maximum_mut(output));
        }
        if reader.spoilt || reader.at != reader.bytes.len() { Err(misfit()) } else { Ok(()) }
    }

    fn adopt_results(&mut self, reader: &mut Reader) -> Result<(), Failure> {
        let (length, checksum, count) = (reader.word(), reader.word(), reader.word());
        for _ in 0..count {
            let (series, number) = (reader.word() as usize, reader.word());
            let record = Record { series, number, step: reader.word(), time: reader.double() };
            if reader.spoilt || series >= self.series.len() {
                return Err(misfit());
            }
            self.series[series].files = number + 1;
            self.records.push(record);
        }
        self.reopen_rows(length, checksum)
    }

    /// Goes on with the rows written up to the checkpoint: under their final name after an interruption, under the
    /// temporary one after a crash. Later rows are cut off.
    fn reopen_rows(&mut self, length: u64, checksum: u64) -> Result<(), Failure> {
        let Some(folder) = self.folder.as_ref().filter(|_| length > 0) else { return Ok(()) };
        let path = folder.join("gauges.csv");
        let temporary = temporary_name(&path);
        if path.exists() {
            fs::rename(&path, &temporary).map_err(|reason| cannot_write(&path, &reason))?;
        }
        let other = || {
            let shown = folder.display();
            Failure::refused(format!(
                "gauges.csv in '{shown}' is not as the checkpoint left it: the run cannot go on"
            ))
        };
        let mut file = OpenOptions::new().read(true).write(true).open(&temporary).map_err(|_| other())?;
        let mut rows = Vec::new();
        (&mut file).take(length).read_to_end(&mut rows).map_err(|_| other())?;
        if rows.len() as u64 != length || checksum_on(EMPTY_CHECKSUM, &rows) != checksum {
            return Err(other());
        }
        let cut = file.set_len(length).and_then(|()| file.seek(SeekFrom::Start(length)));
        cut.map_err(|reason| cannot_write(&path, &reason))?;
        let mut rows = OutFile::wrap(file, path, checksum);
        rows.keep();
        self.rows = Some(rows);
        self.row_bytes = length;
        Ok(())
    }
}
