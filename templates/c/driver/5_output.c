/* ---- .npy files ---- */

/* Version 1.0; the header ends at byte 128. */
static void put_npy_header(struct file *file, const struct run *run)
{
    char header[128];
    struct text shape = {NULL, 0, 0};
    size_t axis;
    add_text(&shape, "{'descr': '<f8', 'fortran_order': False, 'shape': (");
    for (axis = 0; axis < run->about->axes; axis++) {
        add_format(&shape, "%s%zu", axis == 0 ? "" : ", ", run->nodes[axis]);
    }
    add_text(&shape, run->about->axes == 1 ? ",), }" : "), }");
    memset(header, ' ', sizeof header);
    memcpy(header, "\x93NUMPY\x01\x00", 8);
    header[8] = (char)(sizeof header - 10);
    header[9] = 0;
    memcpy(header + 10, shape.bytes, shape.length < 117 ? shape.length : 117);
    header[127] = '\n';
    put_bytes(file, header, sizeof header);
    drop_text(&shape);
}

static void add_record(struct run *run, uint64_t series, uint64_t number, uint64_t step, double time)
{
    struct record *record;
    if (run->record_count == run->record_room) {
        run->record_room = 2 * run->record_room + 16;
        run->records = allocated(realloc(run->records, run->record_room * sizeof *run->records));
    }
    record = &run->records[run->record_count++];
    record->series = series;
    record->number = number;
    record->step = step;
    record->time = time;
}

static int write_series(struct run *run, size_t index)
{
    struct series *series = &run->series[index];
    const double *values = series->output == SIZE_MAX ? {{ prefix }}_field(run->solver, series->field)
                                                      : {{ prefix }}_output(run->solver, series->output, run->time);
    struct text name = {NULL, 0, 0};
    struct file file;
    int status;
    add_format(&name, "%s/%06" PRIu64 ".npy", series->folder, series->files);
    file = open_file(run->folder, name.bytes);
    put_npy_header(&file, run);
    put_doubles(&file, values, run->total, series->scale, put_bytes);
    status = close_file(&file, FLUSHED);
    drop_text(&name);
    if (status == FINISHED) {
        add_record(run, index, series->files, run->step, run->time);
        series->files++;
    }
    return status;
}

/* ---- gauges and integrals ---- */

/* Nodes and weights that give the value at a place along one axis. */
struct interpolation {
    size_t count, *index;
    double *weight;
};

/* Lagrange on nodes centred around the place, shifted inward at faces, wrapped on periodic axes. */
static struct interpolation interpolate_along(const struct run *run, size_t axis, double place)
{
    int periodic = run->about->axis[axis].periodic;
    int64_t nodes = (int64_t)run->nodes[axis], count = (int64_t)run->about->interpolation_nodes, first, i, j;
    double at = (place - {{ prefix }}_low(run->solver, axis)) / {{ prefix }}_spacing(run->solver, axis);
    double nearest = floor(at + 0.5);
    struct interpolation along;
    if (fabs(at - nearest) <= 1e-9) {
        first = (int64_t)nearest;
        count = 1;
    } else {
        count = count < 1 ? 1 : count > nodes ? nodes : count;
        first = count % 2 == 0 ? (int64_t)floor(at) - (count / 2 - 1) : (int64_t)nearest - (count - 1) / 2;
    }
    if (!periodic) {
        first = first < 0 ? 0 : first > nodes - count ? nodes - count : first;
    }
    along.count = (size_t)count;
    along.index = new_list(along.count, sizeof *along.index);
    along.weight = new_list(along.count, sizeof *along.weight);
    for (i = 0; i < count; i++) {
        double weight = 1.0;
        for (j = 0; count > 1 && j < count; j++) {
            if (j != i) {
                weight = weight * ((at - (double)(first + j)) / (double)(i - j));
            }
        }
        along.weight[i] = weight;
        along.index[i] = (size_t)(((first + i) % nodes + nodes) % nodes);
    }
    return along;
}

/* Tensor product, from the last axis outwards. */
static double interpolate(const struct run *run, const struct interpolation *along, const double *values, size_t axis, size_t base)
{
    double sum = 0.0;
    size_t k;
    for (k = 0; k < along[axis].count; k++) {
        size_t index = base * run->nodes[axis] + along[axis].index[k];
        double value = axis + 1 == run->about->axes ? values[index] : interpolate(run, along, values, axis + 1, index);
        sum = sum + along[axis].weight[k] * value;
    }
    return sum;
}

static double gauge_value(const struct run *run, size_t output, const double *values)
{
    struct interpolation along[3];
    double value;
    size_t axis;
    for (axis = 0; axis < run->about->axes; axis++) {
        along[axis] = interpolate_along(run, axis, {{ prefix }}_place(run->solver, output, axis));
    }
    value = interpolate(run, along, values, 0, 0);
    for (axis = 0; axis < run->about->axes; axis++) {
        free(along[axis].index);
        free(along[axis].weight);
    }
    return value;
}

/* The weight of a node in a quadrature along an axis, in units of the spacing. */
static double quadrature_weight(const struct run *run, size_t axis, size_t index)
{
    size_t listed = run->about->quadrature_count[axis], mirrored = run->nodes[axis] - 1 - index;
    if (index < listed) {
        return run->about->quadrature[axis][index];
    }
    return mirrored < listed ? run->about->quadrature[axis][mirrored] : 1.0;
}

/* Sums of rows in increasing index, then the rows in order, then the spacings. */
static double integral_value(const struct run *run, const double *values)
{
    size_t axes = run->about->axes, length = run->nodes[axes - 1], rows = run->total / length, row, k, axis;
    double sum = 0.0;
    for (row = 0; row < rows; row++) {
        double weight = 1.0, part = 0.0;
        size_t rest = row, index[3] = {0, 0, 0};
        for (axis = axes - 1; axis-- > 0;) {
            index[axis] = rest % run->nodes[axis];
            rest /= run->nodes[axis];
        }
        for (axis = 0; axis + 1 < axes; axis++) {
            weight = weight * quadrature_weight(run, axis, index[axis]);
        }
        for (k = 0; k < length; k++) {
            part = part + quadrature_weight(run, axes - 1, k) * values[row * length + k];
        }
        sum = sum + weight * part;
    }
    for (axis = 0; axis < axes; axis++) {
        sum = sum * {{ prefix }}_spacing(run->solver, axis);
    }
    return sum;
}

static int put_row(struct run *run, struct text *row)
{
    put_checked(&run->gauges, row->bytes, row->length);
    run->gauge_bytes += row->length;
    if (run->gauges.failure != 0) {
        return cannot_write(run->gauges.path, run->gauges.failure);
    }
    return FINISHED;
}

/* Opens gauges.csv and writes its head, when there is anything to write in rows. */
static int open_gauges(struct run *run)
{
    struct text head = {NULL, 0, 0}, cell = {NULL, 0, 0};
    size_t k, columns = 0;
    int status = FINISHED;
    add_text(&head, "time [s]");
    for (k = 0; k < run->about->outputs; k++) {
        if (is_row(run, k)) {
            cell.length = 0;
            add_format(&cell, "%s [%s]", run->about->output[k].name, run->about->output[k].unit);
            add_text(&head, ",");
            add_csv_cell(&head, cell.bytes);
            columns++;
        }
    }
    add_text(&head, "\n");
    if (columns > 0) {
        run->gauges = open_file(run->folder, "gauges.csv");
        status = run->gauges.failure != 0 ? cannot_write(run->gauges.path, run->gauges.failure) : put_row(run, &head);
    }
    drop_text(&head);
    drop_text(&cell);
    return status;
}

/* A row when at least one is due; a cell that is not due stays empty. `due` is for each output. */
static int write_row(struct run *run, const unsigned char *due)
{
    struct text row = {NULL, 0, 0};
    size_t k;
    int some = 0, status = FINISHED;
    add_number(&row, run->time);
    for (k = 0; k < run->about->outputs; k++) {
        if (!is_row(run, k)) {
            continue;
        }
        add_text(&row, ",");
        if (due[k]) {
            const double *values = {{ prefix }}_output(run->solver, k, run->time);
            double value = run->about->output[k].kind == GAUGE ? gauge_value(run, k, values) : integral_value(run, values);
            add_number(&row, value / {{ prefix }}_scale(run->solver, k));
            some = 1;
        }
    }
    add_text(&row, "\n");
    if (some) {
        status = put_row(run, &row);
    }
    drop_text(&row);
    return status;
}

/* Writes what is due. With --steps the first and the last state only, and then everything. */
static int write_outputs(struct run *run, enum occasion occasion)
{
    const {{ prefix }}_description *about = run->about;
    int outermost = occasion == AT_START || occasion == AT_END, status = FINISHED;
    double began = seconds_now();
    unsigned char *due = new_list(about->outputs, 1);
    size_t k;
    for (k = 0; k < about->outputs; k++) {
        if (run->options->steps_given) {
            due[k] = (unsigned char)outermost;
        } else if (about->output[k].repeated) {
            due[k] = (unsigned char)(occasion != BETWEEN && take_due(run, k));
        } else {
            due[k] = (unsigned char)(outermost || is_row(run, k));
        }
    }
    for (k = 0; k < run->series_count && status == FINISHED; k++) {
        const struct series *series = &run->series[k];
        if ((series->field != SIZE_MAX && outermost) || (series->output != SIZE_MAX && due[series->output])) {
            status = write_series(run, k);
        }
    }
    if (status == FINISHED && run->gauges.stream != NULL) {
        status = write_row(run, due);
    }
    free(due);
    run->output_seconds += seconds_now() - began;
    return status;
}

