//! Writing what is due: `.npy` series and the rows of gauges and integrals.

use super::file::{Durability, OutFile};
use super::measure::{integrate, interpolate};
use super::number::{csv_cell, exact};
use super::state::{Record, Run};
use super::{Failure, Kind};
use std::time::Instant;

/// When outputs are looked at.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Occasion {
    Start,
    Between,
    Event,
    End,
}

/// Version 1.0; the header ends at byte 128.
pub fn npy_header(nodes: &[usize]) -> [u8; 128] {
    let sizes: Vec<String> = nodes.iter().map(usize::to_string).collect();
    let comma = if nodes.len() == 1 { "," } else { "" };
    let shape =
        format!("{{'descr': '<f8', 'fortran_order': False, 'shape': ({}{comma}), }}", sizes.join(", "));
    let mut header = [b' '; 128];
    header[..8].copy_from_slice(b"\x93NUMPY\x01\x00");
    header[8..10].copy_from_slice(&118u16.to_le_bytes());
    for (place, byte) in header[10..127].iter_mut().zip(shape.bytes()) {
        *place = byte;
    }
    header[127] = b'\n';
    header
}

impl Run<'_> {
    /// Writes what is due. With a number of steps: the first and the last state only, and then everything.
    pub fn write_outputs(&mut self, occasion: Occasion) -> Result<(), Failure> {
        let began = Instant::now();
        let outermost = matches!(occasion, Occasion::Start | Occasion::End);
        let mut due = vec![false; self.about.outputs.len()];
        for (output, due) in due.iter_mut().enumerate() {
            *due = if self.position.steps.is_some() {
                outermost
            } else if self.about.outputs[output].repeated {
                occasion != Occasion::Between && self.take_due(output)
            } else {
                outermost || self.is_row(output)
            };
        }
        for index in 0..self.series.len() {
            let series = &self.series[index];
            if series.field.is_some() && outermost || series.output.is_some_and(|output| due[output]) {
                self.write_series(index)?;
            }
        }
        self.write_row(&due)?;
        self.output_seconds += began.elapsed().as_secs_f64();
        Ok(())
    }

    fn write_series(&mut self, index: usize) -> Result<(), Failure> {
        let series = &self.series[index];
        let (step, time) = (self.position.step, self.position.time);
        let values = match (series.output, series.field) {
            (Some(output), _) => self.solver.output(output, time),
            (None, field) => self.solver.field(field.unwrap_or(0)),
        };
        self.observer.series(&series.name, step, time, values);
        if let Some(folder) = &self.folder {
            let path = folder.join(&series.folder).join(format!("{:06}.npy", series.files));
            let mut file = OutFile::create(path)?;
            file.put(&npy_header(&self.nodes))?;
            file.put_doubles(values, series.scale)?;
            file.close(Durability::Flushed)?;
        }
        self.records.push(Record { series: index, number: series.files, step, time });
        self.series[index].files += 1;
        Ok(())
    }

    /// Opens `gauges.csv` and writes its head, when there is anything to write in rows.
    pub fn open_rows(&mut self) -> Result<(), Failure> {
        let Some(folder) = self.folder.as_ref().filter(|_| self.has_rows()) else { return Ok(()) };
        self.rows = Some(OutFile::create(folder.join("gauges.csv"))?);
        let mut head = "time [s]".to_owned();
        for (index, output) in self.about.outputs.iter().enumerate() {
            if self.is_row(index) {
                head.push(',');
                head.push_str(&csv_cell(&format!("{} [{}]", output.name, output.unit)));
            }
        }
        head.push('\n');
        self.put_row(&head)
    }

    fn put_row(&mut self, row: &str) -> Result<(), Failure> {
        if let Some(file) = &mut self.rows {
            file.put_checked(row.as_bytes())?;
            self.row_bytes += row.len() as u64;
        }
        Ok(())
    }

    /// A row when at least one is due; a cell that is not due stays empty.
    fn write_row(&mut self, due: &[bool]) -> Result<(), Failure> {
        let mut cells = Vec::new();
        for (output, due) in due.iter().enumerate() {
            if self.is_row(output) {
                cells.push(due.then(|| self.measure(output)));
            }
        }
        if cells.iter().all(Option::is_none) {
            return Ok(());
        }
        self.observer.row(self.position.step, self.position.time, &cells);
        let mut row = exact(self.position.time);
        for cell in &cells {
            row.push(',');
            row.push_str(&cell.map(exact).unwrap_or_default());
        }
        row.push('\n');
        self.put_row(&row)
    }

    /// A gauge or an integral in its unit.
    fn measure(&mut self, output: usize) -> f64 {
        let spacings: Vec<f64> = (0..self.nodes.len()).map(|axis| self.solver.axis(axis).2).collect();
        let values = self.solver.output(output, self.position.time);
        let value = match self.about.outputs[output].kind {
            Kind::Gauge => interpolate(&self.gauges[output], &self.nodes, values),
            _ => integrate(&self.about, &self.nodes, &spacings, values),
        };
        value / self.solver.scale(output)
    }
}
