//! `index.xmf`, which lets viewers open the series, and `run.json`, which says what was run and how it ended.

use super::file::write_text;
use super::number::{exact, json_number, json_string, xml_string};
use super::state::{Record, Run};
use super::{Ended, Failure};

impl Run<'_> {
    /// Slowest axis first, as in the files; a line becomes a grid of one row.
    fn shape(&self) -> String {
        let mut sizes: Vec<String> = self.nodes.iter().map(usize::to_string).collect();
        if sizes.len() == 1 {
            sizes.insert(0, "1".to_owned());
        }
        sizes.join(" ")
    }

    fn grid_list(&self, of: fn((f64, f64, f64)) -> f64, missing: f64) -> String {
        let mut numbers: Vec<String> =
            (0..self.nodes.len()).map(|axis| exact(of(self.solver.axis(axis)))).collect();
        if numbers.len() == 1 {
            numbers.insert(0, exact(missing));
        }
        numbers.join(" ")
    }

    fn grid_head(&self, record: &Record) -> String {
        let space = self.nodes.len() == 3;
        let (topology, geometry) =
            if space { ("3DCORectMesh", "ORIGIN_DXDYDZ") } else { ("2DCORectMesh", "ORIGIN_DXDY") };
        let count = if space { 3 } else { 2 };
        let item = |numbers: String| {
            format!(
                "          <DataItem Format=\"XML\" NumberType=\"Float\" Precision=\"8\" Dimensions=\"{count}\">{numbers}</DataItem>\n"
            )
        };
        format!(
            "      <Grid Name=\"step {}\" GridType=\"Uniform\">\n        <Time Value=\"{}\"/>\n        \
             <Topology TopologyType=\"{topology}\" Dimensions=\"{}\"/>\n        \
             <Geometry GeometryType=\"{geometry}\">\n{}{}        </Geometry>\n",
            record.step,
            exact(record.time),
            self.shape(),
            item(self.grid_list(|(low, _, _)| low, 0.0)),
            item(self.grid_list(|(_, _, spacing)| spacing, 1.0)),
        )
    }

    fn attribute(&self, record: &Record) -> String {
        let series = &self.series[record.series];
        format!(
            "        <Attribute Name=\"{}\" AttributeType=\"Scalar\" Center=\"Node\">\n          \
             <DataItem Format=\"Binary\" NumberType=\"Float\" Precision=\"8\" Endian=\"Little\" Seek=\"128\" \
             Dimensions=\"{}\">{}/{:06}.npy</DataItem>\n        </Attribute>\n",
            xml_string(&series.name),
            self.shape(),
            series.folder,
            record.number
        )
    }

    pub fn write_index(&self) -> Result<(), Failure> {
        let Some(folder) = &self.folder else { return Ok(()) };
        let mut page = format!(
            "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n<Xdmf Version=\"3.0\">\n  <Domain>\n    \
             <Grid Name=\"{}\" GridType=\"Collection\" CollectionType=\"Temporal\">\n",
            xml_string(&self.about.name)
        );
        for group in self.records.chunk_by(|a, b| a.step == b.step) {
            page.push_str(&self.grid_head(&group[0]));
            for record in group {
                page.push_str(&self.attribute(record));
            }
            page.push_str("      </Grid>\n");
        }
        page.push_str("    </Grid>\n  </Domain>\n</Xdmf>\n");
        write_text(folder.join("index.xmf"), &page)
    }

    fn constants_entry(&self) -> String {
        let entry = |(index, constant): (usize, &super::ParameterInfo)| {
            format!("{}: {}", json_string(&constant.name), json_number(self.solver.parameter(index)))
        };
        let entries: Vec<String> = self.about.parameters.iter().enumerate().map(entry).collect();
        format!("{{{}}}", entries.join(", "))
    }

    fn grid_entry(&self) -> String {
        let entry = |(index, axis): (usize, &super::AxisInfo)| {
            let (low, high, spacing) = self.solver.axis(index);
            format!(
                "{}: {{\"nodes\": {}, \"low\": {}, \"high\": {}, \"spacing\": {}, \"unit\": {}}}",
                json_string(&axis.name),
                self.nodes[index],
                json_number(low),
                json_number(high),
                json_number(spacing),
                json_string(&axis.unit)
            )
        };
        let entries: Vec<String> = self.about.axes.iter().enumerate().map(entry).collect();
        format!("{{{}}}", entries.join(", "))
    }

    fn outputs_entry(&self) -> String {
        let entry = |record: &Record| {
            let series = &self.series[record.series];
            format!(
                "\n    {{\"field\": {}, \"time\": {}, \"step\": {}, \"path\": \"{}/{:06}.npy\", \"unit\": {}}}",
                json_string(&series.name),
                json_number(record.time),
                record.step,
                series.folder,
                record.number,
                json_string(&series.unit)
            )
        };
        let entries: Vec<String> = self.records.iter().map(entry).collect();
        if entries.is_empty() { "[]".to_owned() } else { format!("[{}\n  ]", entries.join(",")) }
    }

    /// `run.json`: written last, whatever the end was.
    pub fn write_summary(&self, ended: Ended, wall: f64, stepping: f64) -> Result<(), Failure> {
        let Some(folder) = &self.folder else { return Ok(()) };
        let (about, position) = (&self.about, &self.position);
        let ended = match ended {
            Ended::Finished => "finished",
            Ended::BlewUp => "blew up",
            Ended::Interrupted => "interrupted",
        };
        let entries = [
            ("schema", "1".to_owned()),
            ("program", json_string("rimstone")),
            ("version", json_string(&about.version)),
            ("model", json_string(&about.name)),
            ("hash", json_string(&about.hash)),
            ("constants", self.constants_entry()),
            ("grid", self.grid_entry()),
            ("method", json_string(&about.method)),
            ("step", json_number(position.last_step)),
            ("limit", json_number(position.limit)),
            ("limit_law", json_string(&about.limit_law)),
            ("steps", position.step.to_string()),
            ("start", json_number(self.begin)),
            ("end", json_number(position.time)),
            ("wall_seconds", json_number(wall)),
            ("stepping_seconds", json_number(stepping)),
            ("threads", self.threads.to_string()),
            ("memory_bytes", self.solver.memory_bytes().to_string()),
            ("ended", json_string(ended)),
            ("message", json_string(&self.message)),
            ("step_above_limit", position.above_limit.to_string()),
            ("outputs", self.outputs_entry()),
        ];
        let lines: Vec<String> = entries.iter().map(|(key, value)| format!("  \"{key}\": {value}")).collect();
        write_text(folder.join("run.json"), &format!("{{\n{}\n}}\n", lines.join(",\n")))
    }
}
