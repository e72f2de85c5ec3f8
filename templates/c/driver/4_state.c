/* ---- the state of a run ---- */

/* A series of .npy files: a field, or an output that is a snapshot or a maximum. */
struct series {
    const char *name, *unit;
    char *folder;
    size_t field;   /* index, or SIZE_MAX */
    size_t output;  /* index, or SIZE_MAX; a snapshot named like a field serves both */
    double scale;   /* SI value of one unit */
    uint64_t files; /* written so far */
};

/* One file of a series. */
struct record {
    uint64_t series, number, step;
    double time;
};

struct run {
    const {{ prefix }}_description *about;
    {{ prefix }}_solver *solver;
    struct options *options;
    const char *folder;
    int threads;
    size_t nodes[3], total;

    struct series *series;
    size_t series_count;
    struct record *records;
    size_t record_count, record_room;
    struct file gauges; /* stream is NULL when there is nothing to write in rows */
    uint64_t gauge_bytes;

    double begin, end;
    double given_step;    /* 0: a fraction of the limit */
    double limit;         /* at the start; infinite when there is none */
    int above_limit;
    double constant_step; /* when one step length serves the whole run, else 0 */

    /* Everything below changes from step to step and stands in a checkpoint. */
    uint64_t step;
    double time, last_step;
    double from, to;      /* the interval between events, or the rest of it */
    uint64_t parts, part; /* equal steps in it, and those done */
    uint64_t *due_next;   /* for each output: the number of its next time */
    double earlier_wall, earlier_stepping;

    double started, checkpoint_at;
    double loop_started, output_seconds; /* the stepping loop, and what of it was output */
    double stepping_seconds;             /* the loop without output, up to the last look */
    int loop_ended;
    double shown_at;      /* when progress was last said, */
    uint64_t shown_step;  /* and at which step */
    int terminal;
    char *message; /* why the run ended, when not by reaching the end */
};

enum occasion { AT_START, BETWEEN, AT_EVENT, AT_END };

static int is_row(const struct run *run, size_t output)
{
    int kind = run->about->output[output].kind;
    return kind == GAUGE || kind == INTEGRAL;
}

/* Letters, digits, '_' and '-' stay; any other character becomes '_'; a number makes it unique. */
static char *folder_name(const struct run *run, const char *name)
{
    struct text folder = {NULL, 0, 0};
    size_t stem, k, number = 1;
    add_text(&folder, "");
    for (; *name != '\0'; name++) {
        unsigned char byte = (unsigned char)*name;
        int plain = (byte >= 'a' && byte <= 'z') || (byte >= 'A' && byte <= 'Z') || (byte >= '0' && byte <= '9') || byte == '_' || byte == '-';
        if ((byte & 0xC0) != 0x80) { /* one character for the bytes of one */
            add_bytes(&folder, plain ? name : "_", 1);
        }
    }
    if (folder.length == 0) {
        add_text(&folder, "_");
    }
    stem = folder.length;
    for (k = 0; k < run->series_count; k++) {
        if (strcmp(run->series[k].folder, folder.bytes) == 0) {
            folder.length = stem;
            add_format(&folder, "_%zu", ++number);
            k = (size_t)-1; /* look again from the first */
        }
    }
    return folder.bytes;
}

static void add_series(struct run *run, const char *name, const char *unit, size_t field, size_t output, double scale)
{
    struct series *series = &run->series[run->series_count];
    series->name = name;
    series->unit = unit;
    series->folder = folder_name(run, name);
    series->field = field;
    series->output = output;
    series->scale = scale;
    series->files = 0;
    run->series_count++;
}

/* Fields first, then outputs, in the order of the model. */
static void list_series(struct run *run)
{
    const {{ prefix }}_description *about = run->about;
    size_t field, k;
    run->series = new_list(about->fields + about->outputs, sizeof *run->series);
    for (field = 0; field < about->fields; field++) {
        size_t output = SIZE_MAX;
        for (k = 0; k < about->outputs; k++) {
            if (about->output[k].kind == SNAPSHOT && strcmp(about->output[k].name, about->field[field].name) == 0) {
                output = k;
            }
        }
        if (output == SIZE_MAX) {
            add_series(run, about->field[field].name, about->field[field].unit, field, output, {{ prefix }}_field_scale(run->solver, field));
        } else {
            add_series(run, about->output[output].name, about->output[output].unit, field, output, {{ prefix }}_scale(run->solver, output));
        }
    }
    for (k = 0; k < about->outputs; k++) {
        int taken = 0;
        for (field = 0; field < about->fields; field++) {
            taken |= run->series[field].output == k;
        }
        if (!taken && !is_row(run, k)) {
            add_series(run, about->output[k].name, about->output[k].unit, SIZE_MAX, k, {{ prefix }}_scale(run->solver, k));
        }
    }
}

/* The coordinate of a node: low + index*spacing, the last of a bounded axis exactly high. */
static double coordinate(const struct run *run, size_t axis, size_t index)
{
    if (!run->about->axis[axis].periodic && index + 1 == run->nodes[axis]) {
        return {{ prefix }}_high(run->solver, axis);
    }
    return {{ prefix }}_low(run->solver, axis) + (double)index * {{ prefix }}_spacing(run->solver, axis);
}

/* ---- when outputs are due ---- */

/* Two times closer than this part of an output's interval are one. */
#define ONE_TIME 1e-9

/* The time number `due_next` of an output with `every`. */
static double due_time(const struct run *run, size_t output)
{
    return run->begin + (double)run->due_next[output] * {{ prefix }}_every(run->solver, output);
}

/* The next time at which something is due, or the end. */
static double next_event(const struct run *run)
{
    double event = run->end;
    size_t k;
    for (k = 0; k < run->about->outputs; k++) {
        if (run->about->output[k].repeated) {
            double due = due_time(run, k);
            if (due < event && run->end - due > ONE_TIME * {{ prefix }}_every(run->solver, k)) {
                event = due;
            }
        }
    }
    return event;
}

/* Whether an output with `every` is due now; if so, its next time is set. */
static int take_due(struct run *run, size_t output)
{
    double tolerance = ONE_TIME * {{ prefix }}_every(run->solver, output);
    int due = 0;
    while (due_time(run, output) - run->time <= tolerance) {
        due = 1;
        run->due_next[output]++;
    }
    return due;
}

