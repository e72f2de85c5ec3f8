/* ---- options ---- */

struct options {
    const char *out;        /* NULL: NAME.run */
    double *number;         /* for each constant, in its unit */
    unsigned char *given;   /* for each constant */
    size_t *nodes;          /* for each axis */
    unsigned char *resized; /* for each axis */
    double until;
    uint64_t steps;
    int threads;            /* 0: not given */
    unsigned char until_given, steps_given, resume, quiet, help;
};

/* A decimal number without spaces, hexadecimals, infinities. Returns 0 when `string` is none. */
static int read_number(const char *string, double *number)
{
    char *end;
    if (*string == '\0' || strspn(string, "+-.0123456789eE") != strlen(string)) {
        return 0;
    }
    *number = strtod(string, &end);
    return *end == '\0' && isfinite(*number);
}

static int read_count(const char *string, uint64_t *count)
{
    size_t digits = strspn(string, "0123456789");
    if (digits == 0 || digits > 18 || string[digits] != '\0') {
        return 0;
    }
    *count = (uint64_t)strtoull(string, NULL, 10);
    return 1;
}

static void add_fault(struct text *faults, const char *format, ...) LIKE_PRINTF(2, 3);
static void add_fault(struct text *faults, const char *format, ...)
{
    va_list arguments;
    char line[1024];
    va_start(arguments, format);
    vsnprintf(line, sizeof line, format, arguments);
    va_end(arguments);
    add_format(faults, "%s: %s\n", {{ prefix }}_describe()->name, line);
}

/* Splits NAME=VALUE; the length of NAME, or 0. */
static size_t name_length(const char *assignment)
{
    const char *sign = strchr(assignment, '=');
    return sign == NULL ? 0 : (size_t)(sign - assignment);
}

static int same_name(const char *name, const char *start, size_t length)
{
    return strlen(name) == length && memcmp(name, start, length) == 0;
}

static void read_setting(struct options *options, const char *setting, struct text *faults)
{
    const {{ prefix }}_description *about = {{ prefix }}_describe();
    size_t length = name_length(setting), k;
    struct text known = {NULL, 0, 0};
    if (length == 0) {
        add_fault(faults, "--set wants NAME=VALUE, not '%s'", setting);
        return;
    }
    for (k = 0; k < about->parameters; k++) {
        if (same_name(about->parameter[k].name, setting, length)) {
            if (read_number(setting + length + 1, &options->number[k])) {
                options->given[k] = 1;
            } else {
                add_fault(faults, "--set %.*s: '%s' is not a number (its unit is %s; write the number alone)", (int)length, setting,
                          setting + length + 1, about->parameter[k].unit);
            }
            return;
        }
    }
    for (k = 0; k < about->parameters; k++) {
        add_format(&known, "%s%s", k == 0 ? "" : ", ", about->parameter[k].name);
    }
    if (about->parameters == 0) {
        add_fault(faults, "--set %.*s: this model has no constants that can be set", (int)length, setting);
    } else {
        add_fault(faults, "--set %.*s: no such constant; there are: %s", (int)length, setting, known.bytes);
    }
    drop_text(&known);
}

static void read_size(struct options *options, const char *setting, struct text *faults)
{
    const {{ prefix }}_description *about = {{ prefix }}_describe();
    size_t length = name_length(setting), axis;
    uint64_t count;
    if (length == 0) {
        add_fault(faults, "--nodes wants AXIS=N, not '%s'", setting);
        return;
    }
    for (axis = 0; axis < about->axes; axis++) {
        if (!same_name(about->axis[axis].name, setting, length)) {
            continue;
        }
        if (!read_count(setting + length + 1, &count)) {
            add_fault(faults, "--nodes %.*s: '%s' is not a whole number", (int)length, setting, setting + length + 1);
        } else if (count < about->axis[axis].least_nodes) {
            add_fault(faults, "--nodes %s: too few nodes; the difference operators need at least %zu along %.*s", setting,
                      about->axis[axis].least_nodes, (int)length, setting);
        } else {
            options->nodes[axis] = (size_t)count;
            options->resized[axis] = 1;
        }
        return;
    }
    {
        struct text known = {NULL, 0, 0};
        for (axis = 0; axis < about->axes; axis++) {
            add_format(&known, "%s%s", axis == 0 ? "" : ", ", about->axis[axis].name);
        }
        add_fault(faults, "--nodes %.*s: no such axis; there are: %s", (int)length, setting, known.bytes);
        drop_text(&known);
    }
}

static void read_valued(struct options *options, const char *option, const char *value, struct text *faults)
{
    uint64_t count = 0;
    if (strcmp(option, "--out") == 0) {
        if (*value == '\0') {
            add_fault(faults, "--out wants the name of a folder");
        }
        options->out = value;
    } else if (strcmp(option, "--set") == 0) {
        read_setting(options, value, faults);
    } else if (strcmp(option, "--nodes") == 0) {
        read_size(options, value, faults);
    } else if (strcmp(option, "--until") == 0) {
        if (!read_number(value, &options->until)) {
            add_fault(faults, "--until wants a time in seconds, not '%s'", value);
        }
        options->until_given = 1;
    } else if (strcmp(option, "--steps") == 0) {
        if (!read_count(value, &options->steps)) {
            add_fault(faults, "--steps wants a whole number, not '%s'", value);
        }
        options->steps_given = 1;
    } else if (!read_count(value, &count) || count < 1 || count > 4096) {
        add_fault(faults, "--threads wants a whole number from 1 to 4096, not '%s'", value);
    } else {
        options->threads = (int)count;
    }
}

/* Reads all arguments; every fault is added to `faults`. */
static void read_options(struct options *options, int count, char **arguments, struct text *faults)
{
    static const char *const valued[] = {"--out", "--set", "--nodes", "--until", "--steps", "--threads"};
    int at;
    for (at = 1; at < count; at++) {
        const char *argument = arguments[at];
        size_t k, known = sizeof valued / sizeof valued[0];
        if (strcmp(argument, "--resume") == 0) {
            options->resume = 1;
            continue;
        } else if (strcmp(argument, "--quiet") == 0) {
            options->quiet = 1;
            continue;
        } else if (strcmp(argument, "--help") == 0 || strcmp(argument, "-h") == 0) {
            options->help = 1;
            continue;
        }
        for (k = 0; k < known; k++) {
            size_t length = strlen(valued[k]);
            if (strncmp(argument, valued[k], length) == 0 && (argument[length] == '\0' || argument[length] == '=')) {
                if (argument[length] == '=') {
                    read_valued(options, valued[k], argument + length + 1, faults);
                } else if (at + 1 < count) {
                    read_valued(options, valued[k], arguments[++at], faults);
                } else {
                    add_fault(faults, "%s wants a value", argument);
                }
                break;
            }
        }
        if (k == known) {
            add_fault(faults, "unknown argument '%s'; --help lists what there is", argument);
        }
    }
    if (options->steps_given && options->until_given) {
        add_fault(faults, "--steps and --until exclude each other: both say where to stop");
    }
}

/* A solver on the smallest grid: what constants, scales and times are, before the real one is allocated. */
static {{ prefix }}_solver *create_smallest_grid(const double *numbers, const unsigned char *given)
{
    const {{ prefix }}_description *about = {{ prefix }}_describe();
    size_t *least = new_list(about->axes, sizeof *least), axis;
    {{ prefix }}_solver *solver;
    for (axis = 0; axis < about->axes; axis++) {
        least[axis] = about->axis[axis].least_nodes;
    }
    solver = allocated({{ prefix }}_create(least, numbers, given, 1));
    free(least);
    return solver;
}

/* Turns given numbers into SI, in place, and holds all constants to their bounds. */
static void settle_constants(struct options *options, struct text *faults)
{
    const {{ prefix }}_description *about = {{ prefix }}_describe();
    unsigned char *none = new_list(about->parameters, 1);
    {{ prefix }}_solver *solver = create_smallest_grid(options->number, none);
    size_t k;
    for (k = 0; k < about->parameters; k++) {
        if (options->given[k]) {
            options->number[k] = options->number[k] * {{ prefix }}_parameter_scale(solver, k);
        }
    }
    {{ prefix }}_destroy(solver);
    free(none);
    solver = create_smallest_grid(options->number, options->given);
    for (k = 0; k < about->parameters; k++) {
        const {{ prefix }}_parameter_info *constant = &about->parameter[k];
        if (constant->bounded) {
            double value = {{ prefix }}_parameter(solver, k), scale = {{ prefix }}_parameter_scale(solver, k);
            double low = {{ prefix }}_parameter_low(solver, k), high = {{ prefix }}_parameter_high(solver, k);
            /* A bound written in another unit may differ from the same number typed here in the last bit. */
            if (!(value >= low - 1e-14 * fabs(low) && value <= high + 1e-14 * fabs(high))) {
                add_fault(faults, "%s = %.15g %s is outside its bounds, %.15g to %.15g %s: the model's statements hold only there", constant->name,
                          value / scale, constant->unit, low / scale, high / scale, constant->unit);
            }
        }
    }
    if (options->until_given && options->until < {{ prefix }}_start_time(solver)) {
        add_fault(faults, "--until %.9g: the run starts at %.9g s", options->until, {{ prefix }}_start_time(solver));
    }
    {{ prefix }}_destroy(solver);
}

static void add_example(struct text *page, const char *program, const char *arguments, const char *what)
{
    size_t length = strlen(program) + 1 + strlen(arguments);
    add_format(page, "  %s %s%*s%s\n", program, arguments, length < 43 ? (int)(44 - length) : 1, "", what);
}

static int show_usage(const char *program)
{
    const {{ prefix }}_description *about = {{ prefix }}_describe();
    struct text page = {NULL, 0, 0}, line = {NULL, 0, 0};
    unsigned char *none = new_list(about->parameters, 1);
    double *zeros = new_list(about->parameters, sizeof *zeros);
    {{ prefix }}_solver *solver = create_smallest_grid(zeros, none);
    size_t k;
    add_format(&page, "%s: %s\n\nSolves the model (method: %s) and writes a folder of results.\n\n", about->name, about->title, about->method);
    add_text(&page, "Examples\n");
    add_example(&page, program, "", "the model as written, into a folder of its name");
    if (about->axes > 0) {
        line.length = 0;
        add_format(&line, "--out fine --nodes %s=%zu", about->axis[0].name, 2 * about->axis[0].nodes - 1);
        add_example(&page, program, line.bytes, "a finer grid");
    }
    if (about->parameters > 0) {
        line.length = 0;
        add_format(&line, "--out other --set %s=%.6g", about->parameter[0].name,
                   {{ prefix }}_parameter(solver, 0) / {{ prefix }}_parameter_scale(solver, 0));
        add_example(&page, program, line.bytes, "another constant");
    }
    add_example(&page, program, "--out fine --resume", "go on after an interruption");
    drop_text(&line);
    add_text(&page, "\n");
    add_text(&page, "Options\n"
                    "  --out DIR          folder of results; must be new or empty, unless --resume\n"
                    "  --set NAME=VALUE   sets a constant, in the unit below\n"
                    "  --nodes AXIS=N     number of nodes along an axis\n"
                    "  --until T          last time, in seconds\n"
                    "  --steps N          exactly N steps; only the first and the last state are written\n"
                    "  --threads N        threads of the computation\n"
                    "  --resume           goes on from the checkpoint in the folder, to the same last bit\n"
                    "  --quiet            no progress on standard error\n"
                    "  --help             this page\n\nAxes\n");
    for (k = 0; k < about->axes; k++) {
        add_format(&page, "  %s: %zu nodes from %.9g to %.9g %s%s, at least %zu\n", about->axis[k].name, about->axis[k].nodes,
                   {{ prefix }}_low(solver, k), {{ prefix }}_high(solver, k), about->axis[k].unit,
                   about->axis[k].periodic ? " (periodic)" : "", about->axis[k].least_nodes);
    }
    add_text(&page, about->parameters > 0 ? "\nConstants\n" : "\nThis model has no constants that can be set.\n");
    for (k = 0; k < about->parameters; k++) {
        double scale = {{ prefix }}_parameter_scale(solver, k);
        add_format(&page, "  %s = %.9g %s", about->parameter[k].name, {{ prefix }}_parameter(solver, k) / scale, about->parameter[k].unit);
        if (about->parameter[k].bounded) {
            add_format(&page, ", between %.9g and %.9g", {{ prefix }}_parameter_low(solver, k) / scale,
                       {{ prefix }}_parameter_high(solver, k) / scale);
        }
        if (about->parameter[k].description != NULL && *about->parameter[k].description != '\0') {
            add_format(&page, "  (%s)", about->parameter[k].description);
        }
        add_text(&page, "\n");
    }
    add_text(&page, "\nExit status: 0 done, 1 faulty arguments, 2 the environment failed, 3 blew up, 130 interrupted.\n");
    fputs(page.bytes, stdout);
    drop_text(&page);
    {{ prefix }}_destroy(solver);
    free(zeros);
    free(none);
    return FINISHED;
}

