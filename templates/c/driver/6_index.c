/* ---- index.xmf: lets viewers open the .npy series ---- */

/* Slowest axis first, as in the files; a line becomes a grid of one row. */
static void add_grid_list(struct text *page, const struct run *run, double (*of)(const {{ prefix }}_solver *, size_t), double missing)
{
    size_t axis;
    if (run->about->axes == 1) {
        add_number(page, missing);
        add_text(page, " ");
    }
    for (axis = 0; axis < run->about->axes; axis++) {
        add_text(page, axis == 0 ? "" : " ");
        add_number(page, of(run->solver, axis));
    }
}

static void add_shape(struct text *page, const struct run *run)
{
    size_t axis;
    add_text(page, run->about->axes == 1 ? "1 " : "");
    for (axis = 0; axis < run->about->axes; axis++) {
        add_format(page, "%s%zu", axis == 0 ? "" : " ", run->nodes[axis]);
    }
}

static void open_grid(struct text *page, const struct run *run, const struct record *record)
{
    int space = run->about->axes == 3;
    add_format(page, "      <Grid Name=\"step %" PRIu64 "\" GridType=\"Uniform\">\n        <Time Value=\"", record->step);
    add_number(page, record->time);
    add_format(page, "\"/>\n        <Topology TopologyType=\"%s\" Dimensions=\"", space ? "3DCORectMesh" : "2DCORectMesh");
    add_shape(page, run);
    add_format(page, "\"/>\n        <Geometry GeometryType=\"%s\">\n", space ? "ORIGIN_DXDYDZ" : "ORIGIN_DXDY");
    add_format(page, "          <DataItem Format=\"XML\" NumberType=\"Float\" Precision=\"8\" Dimensions=\"%d\">", space ? 3 : 2);
    add_grid_list(page, run, {{ prefix }}_low, 0.0);
    add_format(page, "</DataItem>\n          <DataItem Format=\"XML\" NumberType=\"Float\" Precision=\"8\" Dimensions=\"%d\">", space ? 3 : 2);
    add_grid_list(page, run, {{ prefix }}_spacing, 1.0);
    add_text(page, "</DataItem>\n        </Geometry>\n");
}

static void add_attribute(struct text *page, const struct run *run, const struct record *record)
{
    const struct series *series = &run->series[record->series];
    add_text(page, "        <Attribute Name=\"");
    add_xml_string(page, series->name);
    add_text(page, "\" AttributeType=\"Scalar\" Center=\"Node\">\n          <DataItem Format=\"Binary\" NumberType=\"Float\" Precision=\"8\" Endian=\"Little\" Seek=\"128\" Dimensions=\"");
    add_shape(page, run);
    add_format(page, "\">%s/%06" PRIu64 ".npy</DataItem>\n        </Attribute>\n", series->folder, record->number);
}

static int write_index(const struct run *run)
{
    struct text page = {NULL, 0, 0};
    size_t k;
    int status;
    add_text(&page, "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n<Xdmf Version=\"3.0\">\n  <Domain>\n    <Grid Name=\"");
    add_xml_string(&page, run->about->name);
    add_text(&page, "\" GridType=\"Collection\" CollectionType=\"Temporal\">\n");
    for (k = 0; k < run->record_count; k++) {
        const struct record *record = &run->records[k];
        if (k == 0 || record->step != record[-1].step) {
            open_grid(&page, run, record);
        }
        add_attribute(&page, run, record);
        if (k + 1 == run->record_count || record->step != record[1].step) {
            add_text(&page, "      </Grid>\n");
        }
    }
    add_text(&page, "    </Grid>\n  </Domain>\n</Xdmf>\n");
    status = write_text(run->folder, "index.xmf", page.bytes);
    drop_text(&page);
    return status;
}

/* ---- run.json ---- */

static void add_key(struct text *page, const char *key)
{
    add_format(page, ",\n  \"%s\": ", key);
}

static void add_string_entry(struct text *page, const char *key, const char *string)
{
    add_key(page, key);
    add_json_string(page, string);
}

static void add_number_entry(struct text *page, const char *key, double number)
{
    add_key(page, key);
    add_json_number(page, number);
}

static void add_constants(struct text *page, const struct run *run)
{
    size_t k;
    add_key(page, "constants");
    add_text(page, "{");
    for (k = 0; k < run->about->parameters; k++) {
        add_text(page, k == 0 ? "" : ", ");
        add_json_string(page, run->about->parameter[k].name);
        add_text(page, ": ");
        add_json_number(page, {{ prefix }}_parameter(run->solver, k));
    }
    add_text(page, "}");
}

static void add_axes(struct text *page, const struct run *run)
{
    size_t axis;
    add_key(page, "grid");
    add_text(page, "{");
    for (axis = 0; axis < run->about->axes; axis++) {
        add_text(page, axis == 0 ? "" : ", ");
        add_json_string(page, run->about->axis[axis].name);
        add_format(page, ": {\"nodes\": %zu, \"low\": ", run->nodes[axis]);
        add_json_number(page, {{ prefix }}_low(run->solver, axis));
        add_text(page, ", \"high\": ");
        add_json_number(page, {{ prefix }}_high(run->solver, axis));
        add_text(page, ", \"spacing\": ");
        add_json_number(page, {{ prefix }}_spacing(run->solver, axis));
        add_text(page, ", \"unit\": ");
        add_json_string(page, run->about->axis[axis].unit);
        add_text(page, "}");
    }
    add_text(page, "}");
}

static void add_outputs(struct text *page, const struct run *run)
{
    size_t k;
    add_key(page, "outputs");
    add_text(page, "[");
    for (k = 0; k < run->record_count; k++) {
        const struct record *record = &run->records[k];
        const struct series *series = &run->series[record->series];
        add_text(page, k == 0 ? "\n    {\"field\": " : ",\n    {\"field\": ");
        add_json_string(page, series->name);
        add_text(page, ", \"time\": ");
        add_json_number(page, record->time);
        add_format(page, ", \"step\": %" PRIu64 ", \"path\": \"%s/%06" PRIu64 ".npy\", \"unit\": ", record->step, series->folder, record->number);
        add_json_string(page, series->unit);
        add_text(page, "}");
    }
    add_text(page, run->record_count > 0 ? "\n  ]" : "]");
}

/* Written last, whatever the end was. */
static int write_summary(const struct run *run, const char *ended)
{
    double wall = run->earlier_wall + (seconds_now() - run->started);
    struct text page = {NULL, 0, 0};
    int status;
    add_text(&page, "{\n  \"schema\": 1,\n  \"program\": \"rimstone\"");
    add_string_entry(&page, "version", run->about->version);
    add_string_entry(&page, "model", run->about->name);
    add_string_entry(&page, "hash", run->about->hash);
    add_constants(&page, run);
    add_axes(&page, run);
    add_string_entry(&page, "method", run->about->method);
    add_number_entry(&page, "step", run->last_step);
    add_number_entry(&page, "limit", run->limit);
    add_string_entry(&page, "limit_law", run->about->limit_law);
    add_format(&page, ",\n  \"steps\": %" PRIu64, run->step);
    add_number_entry(&page, "start", run->begin);
    add_number_entry(&page, "end", run->time);
    add_number_entry(&page, "wall_seconds", wall);
    add_number_entry(&page, "stepping_seconds", run->earlier_stepping + run->stepping_seconds);
    add_format(&page, ",\n  \"threads\": %d,\n  \"memory_bytes\": %zu", run->threads, {{ prefix }}_memory(run->solver));
    add_string_entry(&page, "ended", ended);
    add_string_entry(&page, "message", run->message == NULL ? "" : run->message);
    add_key(&page, "step_above_limit");
    add_text(&page, run->above_limit ? "true" : "false");
    add_outputs(&page, run);
    add_text(&page, "\n}\n");
    status = write_text(run->folder, "run.json", page.bytes);
    drop_text(&page);
    return status;
}

