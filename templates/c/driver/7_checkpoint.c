/* ---- checkpoints ---- */

/* The layout: magic, version, endian mark, then the numbers and buffers below in this order, all little-endian, and last
 * the checksum of everything before it. */
#define CHECKPOINT_MAGIC "RIMSTONE"
#define CHECKPOINT_VERSION UINT64_C(1)
#define ENDIAN_MARK UINT64_C(0x0102030405060708)

static void put_word(struct file *file, uint64_t word)
{
    unsigned char bytes[8];
    to_bytes(word, bytes);
    put_checked(file, bytes, sizeof bytes);
}

static void put_double(struct file *file, double number)
{
    uint64_t word;
    memcpy(&word, &number, sizeof word);
    put_word(file, word);
}

static void put_string(struct file *file, const char *string)
{
    put_word(file, strlen(string));
    put_checked(file, string, strlen(string));
}

static void put_position(struct file *file, const struct run *run)
{
    size_t k;
    put_double(file, run->end);
    put_word(file, run->options->steps_given);
    put_word(file, run->options->steps);
    put_word(file, run->step);
    put_double(file, run->time);
    put_double(file, run->last_step);
    put_double(file, run->from);
    put_double(file, run->to);
    put_word(file, run->parts);
    put_word(file, run->part);
    put_double(file, run->limit);
    put_double(file, run->constant_step);
    put_word(file, (uint64_t)run->above_limit);
    put_double(file, run->earlier_wall + (seconds_now() - run->started));
    put_double(file, run->earlier_stepping + run->stepping_seconds);
    put_word(file, run->about->outputs);
    for (k = 0; k < run->about->outputs; k++) {
        put_word(file, run->due_next[k]);
    }
}

static void put_results(struct file *file, const struct run *run)
{
    size_t k;
    put_word(file, run->gauge_bytes);
    put_word(file, run->gauges.checksum);
    put_word(file, run->record_count);
    for (k = 0; k < run->record_count; k++) {
        put_word(file, run->records[k].series);
        put_word(file, run->records[k].number);
        put_word(file, run->records[k].step);
        put_double(file, run->records[k].time);
    }
}

/* A maximum so far is part of what a run has to remember. */
static void put_maxima(struct file *file, struct run *run)
{
    size_t k;
    for (k = 0; k < run->about->outputs; k++) {
        if (run->about->output[k].kind == MAXIMUM) {
            put_doubles(file, {{ prefix }}_output(run->solver, k, run->time), run->total, 1.0, put_checked);
        }
    }
}

/* Writes checkpoint.bin and keeps the one before as checkpoint.old. */
static int write_checkpoint(struct run *run)
{
    struct file file;
    char *present = path_of(run->folder, "checkpoint.bin"), *former = path_of(run->folder, "checkpoint.old");
    double began = seconds_now();
    uint64_t checksum;
    size_t k;
    int status;
    if (run->gauges.stream != NULL && (fflush(run->gauges.stream) != 0 || fsync(fileno(run->gauges.stream)) != 0)) {
        status = cannot_write(run->gauges.path, errno);
        free(present);
        free(former);
        return status;
    }
    if (!run->loop_ended) {
        run->stepping_seconds = began - run->loop_started - run->output_seconds;
    }
    file = open_file(run->folder, "checkpoint.bin");
    put_checked(&file, CHECKPOINT_MAGIC, 8);
    put_word(&file, CHECKPOINT_VERSION);
    put_word(&file, ENDIAN_MARK);
    put_string(&file, run->about->hash);
    put_string(&file, run->about->version);
    put_word(&file, run->about->axes);
    for (k = 0; k < run->about->axes; k++) {
        put_word(&file, run->nodes[k]);
    }
    put_word(&file, run->about->parameters);
    for (k = 0; k < run->about->parameters; k++) {
        put_double(&file, {{ prefix }}_parameter(run->solver, k));
    }
    put_position(&file, run);
    put_results(&file, run);
    put_word(&file, {{ prefix }}_state_count());
    for (k = 0; k < {{ prefix }}_state_count(); k++) {
        put_doubles(&file, {{ prefix }}_state(run->solver, k), run->total, 1.0, put_checked);
    }
    put_maxima(&file, run);
    checksum = file.checksum;
    put_word(&file, checksum);
    if (file.failure == 0 && rename(present, former) != 0 && errno != ENOENT) {
        file.failure = errno;
    }
    status = close_file(&file, SYNCED);
    free(present);
    free(former);
    run->checkpoint_at = seconds_now();
    run->output_seconds += run->checkpoint_at - began;
    return status;
}

/* A checkpoint in memory, read from front to back. */
struct reader {
    unsigned char *bytes;
    size_t length, at;
    int short_of; /* something was asked for beyond the end */
};

static const unsigned char *take_bytes(struct reader *reader, size_t count)
{
    const unsigned char *bytes = reader->bytes + reader->at;
    if (count > reader->length - reader->at) {
        reader->short_of = 1;
        return NULL;
    }
    reader->at += count;
    return bytes;
}

static uint64_t take_word(struct reader *reader)
{
    const unsigned char *bytes = take_bytes(reader, 8);
    return bytes == NULL ? 0 : from_bytes(bytes);
}

static double take_double(struct reader *reader)
{
    uint64_t word = take_word(reader);
    double number;
    memcpy(&number, &word, sizeof number);
    return number;
}

static void take_doubles(struct reader *reader, double *values, size_t count)
{
    size_t k;
    for (k = 0; k < count && !reader->short_of; k++) {
        values[k] = take_double(reader);
    }
}

static char *take_string(struct reader *reader)
{
    uint64_t length = take_word(reader);
    const unsigned char *bytes = length < 65536 ? take_bytes(reader, (size_t)length) : NULL;
    struct text string = {NULL, 0, 0};
    add_bytes(&string, bytes == NULL ? "" : (const char *)bytes, bytes == NULL ? 0 : (size_t)length);
    return string.bytes;
}

/* The whole file, when it is there and its checksum holds; else `bytes` is NULL. */
static struct reader load_checkpoint(const char *folder, const char *name)
{
    struct reader reader = {NULL, 0, 0, 0};
    char *path = path_of(folder, name);
    struct stat entry;
    FILE *stream = fopen(path, "rb");
    if (stream != NULL && fstat(fileno(stream), &entry) == 0 && entry.st_size >= 32) {
        reader.length = (size_t)entry.st_size - 8;
        reader.bytes = allocated(malloc(reader.length + 8));
        if (fread(reader.bytes, 1, reader.length + 8, stream) != reader.length + 8 || memcmp(reader.bytes, CHECKPOINT_MAGIC, 8) != 0 ||
            checksum_on(EMPTY_CHECKSUM, reader.bytes, reader.length) != from_bytes(reader.bytes + reader.length)) {
            free(reader.bytes);
            reader.bytes = NULL;
        }
    }
    if (stream != NULL) {
        fclose(stream);
    }
    free(path);
    return reader;
}

static int open_checkpoint(const char *folder, struct reader *reader)
{
    *reader = load_checkpoint(folder, "checkpoint.bin");
    if (reader->bytes == NULL) {
        *reader = load_checkpoint(folder, "checkpoint.old");
        if (reader->bytes == NULL) {
            say("the checkpoint in '%s' is damaged, and so is the one before: start a new run in another --out", folder);
            return BAD_ARGUMENTS;
        }
        say("checkpoint.bin is missing or damaged; going on from the one before it, checkpoint.old");
    }
    take_bytes(reader, 8);
    if (take_word(reader) != CHECKPOINT_VERSION || take_word(reader) != ENDIAN_MARK) {
        say("the checkpoint in '%s' was written by another version of this program", folder);
        return BAD_ARGUMENTS;
    }
    return FINISHED;
}

static void compare_texts(struct reader *reader, const char *what, const char *here, struct text *faults)
{
    char *there = take_string(reader);
    if (strcmp(there, here) != 0) {
        add_fault(faults, "--resume: the %s differs: %s in the checkpoint, %s here", what, there, here);
    }
    free(there);
}

/* Reads who made the checkpoint and takes over its sizes and constants; what was asked for otherwise is a fault. */
static void adopt_setup(struct reader *reader, struct options *options, struct text *faults)
{
    const {{ prefix }}_description *about = {{ prefix }}_describe();
    size_t k;
    compare_texts(reader, "model (by its hash)", about->hash, faults);
    compare_texts(reader, "version of the program", about->version, faults);
    if (faults->length > 0) {
        return;
    }
    if (take_word(reader) != about->axes) {
        reader->short_of = 1;
    }
    for (k = 0; k < about->axes && !reader->short_of; k++) {
        size_t nodes = (size_t)take_word(reader);
        if (options->resized[k] && options->nodes[k] != nodes) {
            add_fault(faults, "--resume: nodes along %s differ: %zu in the checkpoint, %zu asked for", about->axis[k].name, nodes, options->nodes[k]);
        }
        options->nodes[k] = nodes;
    }
    if (take_word(reader) != about->parameters) {
        reader->short_of = 1;
    }
    for (k = 0; k < about->parameters && !reader->short_of; k++) {
        double value = take_double(reader);
        if (options->given[k] && options->number[k] != value) {
            add_fault(faults, "--resume: the constant %s differs: %.17g in the checkpoint, %.17g asked for (SI)", about->parameter[k].name, value,
                      options->number[k]);
        }
        options->number[k] = value;
        options->given[k] = 1;
    }
    if (reader->short_of) {
        add_fault(faults, "--resume: the checkpoint does not fit this model");
    }
}

static void adopt_position(struct reader *reader, struct run *run, struct text *faults)
{
    struct options *options = run->options;
    double end = take_double(reader);
    unsigned char counted = (unsigned char)take_word(reader);
    uint64_t steps = take_word(reader);
    size_t k;
    if (options->until_given && (counted || options->until != end)) {
        add_fault(faults, "--resume: the last time differs: %.17g s in the checkpoint, %.17g s asked for", end, options->until);
    }
    if (options->steps_given && (!counted || options->steps != steps)) {
        add_fault(faults, "--resume: the number of steps differs: the checkpoint's run %s %" PRIu64, counted ? "has" : "was not started with --steps",
                  counted ? steps : options->steps);
    }
    run->end = end;
    options->steps_given = counted;
    options->steps = steps;
    run->step = take_word(reader);
    run->time = take_double(reader);
    run->last_step = take_double(reader);
    run->from = take_double(reader);
    run->to = take_double(reader);
    run->parts = take_word(reader);
    run->part = take_word(reader);
    run->limit = take_double(reader);
    run->constant_step = take_double(reader);
    run->above_limit = (int)take_word(reader);
    run->earlier_wall = take_double(reader);
    run->earlier_stepping = take_double(reader);
    if (take_word(reader) != run->about->outputs) {
        reader->short_of = 1;
    }
    for (k = 0; k < run->about->outputs && !reader->short_of; k++) {
        run->due_next[k] = take_word(reader);
    }
}

/* Goes on with the rows written up to the checkpoint: under their final name after an interruption, under the temporary
 * one after a crash. Later rows are cut off. */
static int reopen_gauges(struct run *run, uint64_t length, uint64_t checksum)
{
    struct file *gauges = &run->gauges;
    struct text temporary = {NULL, 0, 0};
    unsigned char block[4096];
    uint64_t left = length;
    if (length == 0) {
        return FINISHED;
    }
    gauges->path = path_of(run->folder, "gauges.csv");
    add_format(&temporary, "%s.tmp", gauges->path);
    gauges->temporary = temporary.bytes;
    gauges->checksum = EMPTY_CHECKSUM;
    if (file_exists(run->folder, "gauges.csv") && rename(gauges->path, gauges->temporary) != 0) {
        return cannot_write(gauges->path, errno);
    }
    gauges->stream = fopen(gauges->temporary, "r+b");
    while (gauges->stream != NULL && left > 0) {
        size_t want = left < sizeof block ? (size_t)left : sizeof block, got = fread(block, 1, want, gauges->stream);
        gauges->checksum = checksum_on(gauges->checksum, block, got);
        left -= got;
        if (got < want) {
            break;
        }
    }
    if (gauges->stream == NULL || left > 0 || gauges->checksum != checksum) {
        say("gauges.csv in '%s' is not as the checkpoint left it: the run cannot go on", run->folder);
        return BAD_ARGUMENTS;
    }
    if (ftruncate(fileno(gauges->stream), (off_t)length) != 0 || fseeko(gauges->stream, (off_t)length, SEEK_SET) != 0) {
        return cannot_write(gauges->temporary, errno);
    }
    run->gauge_bytes = length;
    return FINISHED;
}

static int adopt_results(struct reader *reader, struct run *run)
{
    uint64_t length = take_word(reader), checksum = take_word(reader), count = take_word(reader), k;
    for (k = 0; k < count && !reader->short_of; k++) {
        uint64_t series = take_word(reader), number = take_word(reader), step = take_word(reader);
        double time = take_double(reader);
        if (series >= run->series_count) {
            reader->short_of = 1;
        } else if (!reader->short_of) {
            add_record(run, series, number, step, time);
            run->series[series].files = number + 1;
        }
    }
    return reader->short_of ? FINISHED : reopen_gauges(run, length, checksum);
}

static void adopt_buffers(struct reader *reader, struct run *run)
{
    size_t k;
    if (take_word(reader) != {{ prefix }}_state_count()) {
        reader->short_of = 1;
        return;
    }
    for (k = 0; k < {{ prefix }}_state_count(); k++) {
        take_doubles(reader, {{ prefix }}_state(run->solver, k), run->total);
    }
    for (k = 0; k < run->about->outputs; k++) {
        if (run->about->output[k].kind == MAXIMUM) {
            /* The buffer belongs to the solver, which holds nothing constant. */
            take_doubles(reader, (double *)(uintptr_t){{ prefix }}_output(run->solver, k, run->time), run->total);
        }
    }
}

/* Puts the run where the checkpoint left it. */
static int adopt_run(struct reader *reader, struct run *run)
{
    struct text faults = {NULL, 0, 0};
    int status;
    adopt_position(reader, run, &faults);
    if (faults.length > 0) {
        fputs(faults.bytes, stderr);
        drop_text(&faults);
        return BAD_ARGUMENTS;
    }
    status = adopt_results(reader, run);
    if (status == FINISHED) {
        adopt_buffers(reader, run);
    }
    if (status == FINISHED && (reader->short_of || reader->at != reader->length)) {
        say("the checkpoint in '%s' does not fit this model", run->folder);
        return BAD_ARGUMENTS;
    }
    return status;
}

