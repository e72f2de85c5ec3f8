/* ---- progress ---- */

static double share_done(const struct run *run)
{
    if (run->options->steps_given) {
        return run->options->steps > 0 ? (double)run->step / (double)run->options->steps : 1.0;
    }
    return run->end > run->begin ? (run->time - run->begin) / (run->end - run->begin) : 1.0;
}

enum moment { FIRST_LINE, SOME_LINE, LAST_LINE };

/* One line that updates itself on a terminal; elsewhere a line at the start, one in ten seconds, one at the end. */
static void show_progress(struct run *run, enum moment moment)
{
    double now, wait, share, rate, left;
    if (run->options->quiet) {
        return;
    }
    now = seconds_now();
    wait = run->terminal ? 0.2 : 10.0;
    if (moment == SOME_LINE && now - run->shown_at < wait) {
        return;
    }
    share = share_done(run);
    rate = now > run->shown_at && run->step > run->shown_step
               ? (double)(run->step - run->shown_step) * (double)run->total / (now - run->shown_at) * 1e-6 : 0.0;
    left = share > 0.0 ? (run->earlier_wall + now - run->started) * (1.0 - share) / share : 0.0;
    if (run->terminal) {
        fputc('\r', stderr);
    }
    fprintf(stderr, "%s: step %" PRIu64 ", t = %.6g s, %.1f %%", run->about->name, run->step, run->time, 100.0 * share);
    if (moment == SOME_LINE) {
        fprintf(stderr, ", %.3g Mpt/s, %.0f s left", rate, left);
    } else if (moment == LAST_LINE) {
        fprintf(stderr, ", %.3g s", now - run->started);
    }
    fputs(run->terminal ? "\033[K" : "\n", stderr);
    line_is_open = run->terminal && moment != LAST_LINE;
    if (run->terminal && moment == LAST_LINE) {
        fputc('\n', stderr);
    }
    fflush(stderr);
    run->shown_at = now;
    run->shown_step = run->step;
}

/* ---- the run ---- */

#define CHECKPOINT_SECONDS 600.0
#define SMALL_GRID 4096
#define CHECK_STRIDE 16

static int make_series_folders(const struct run *run)
{
    size_t k;
    int status = FINISHED;
    for (k = 0; k < run->series_count && status == FINISHED; k++) {
        char *path = path_of(run->folder, run->series[k].folder);
        status = make_folders(path);
        free(path);
    }
    return status;
}

static void start_maxima(struct run *run)
{
    size_t k;
    for (k = 0; k < run->about->outputs; k++) {
        if (run->about->output[k].kind == MAXIMUM) {
            {{ prefix }}_begin_maximum(run->solver, k, run->begin);
        }
    }
}

/* The initial state, the step, and the first outputs. */
static int begin_run(struct run *run)
{
    int status, written;
    run->time = run->begin;
    {{ prefix }}_start(run->solver, run->begin);
    status = check_fields(run);
    if (status == FINISHED) {
        status = settle_steps(run);
    }
    if (status == BAD_ARGUMENTS) {
        rmdir(run->folder); /* empty so far; nothing of it is worth keeping */
        return status;
    }
    written = write_text(run->folder, "model.rim", run->about->model_text);
    if (written == FINISHED) {
        written = make_series_folders(run);
    }
    if (written == FINISHED) {
        written = open_gauges(run);
    }
    if (written != FINISHED || status != FINISHED) {
        return written != FINISHED ? written : status;
    }
    if (run->about->constant_step && !at_end(run)) {
        {{ prefix }}_first_step(run->solver, run->begin, run->constant_step);
    }
    start_maxima(run);
    return write_outputs(run, AT_START);
}

static int take_step(struct run *run)
{
    double step, next;
    size_t k;
    enum occasion occasion;
    int status = choose_step(run, &step, &next);
    if (status != FINISHED) {
        return status;
    }
    if (!(next > run->time)) {
        struct text message = {NULL, 0, 0};
        add_format(&message, "the step has shrunk to %.3g s, too little to go on from t = %.9g s", step, run->time);
        set_message(run, &message);
        drop_text(&message);
        return BLEW_UP;
    }
    {{ prefix }}_advance(run->solver, run->time, step, next);
    run->step++;
    run->time = next;
    run->last_step = step;
    for (k = 0; k < run->about->outputs; k++) {
        if (run->about->output[k].kind == MAXIMUM) {
            {{ prefix }}_accumulate_maximum(run->solver, k, run->time);
        }
    }
    occasion = at_end(run) ? AT_END : !run->options->steps_given && run->time == run->to ? AT_EVENT : BETWEEN;
    if (occasion != BETWEEN || run->total <= SMALL_GRID || run->step % CHECK_STRIDE == 0) {
        status = check_fields(run);
    }
    if (status == FINISHED && (occasion != BETWEEN || run->gauges.stream != NULL)) {
        status = write_outputs(run, occasion);
    }
    return status;
}

/* Steps until the end, an interruption or a fault. */
static int step_on(struct run *run)
{
    uint64_t stride = run->total <= SMALL_GRID ? 256 : 1; /* looking at the clock costs as much as a small step */
    int status = FINISHED;
    while (status == FINISHED && !at_end(run)) {
        if (stop_asked) {
            return INTERRUPTED;
        }
        status = take_step(run);
        if (status == FINISHED && run->step % stride == 0) {
            show_progress(run, SOME_LINE);
            if (seconds_now() - run->checkpoint_at > CHECKPOINT_SECONDS) {
                status = write_checkpoint(run);
                if (status == FINISHED) {
                    status = write_index(run);
                }
            }
        }
    }
    return status;
}

static int close_gauges(struct run *run)
{
    int status;
    if (run->gauges.stream == NULL) {
        return FINISHED;
    }
    status = close_file(&run->gauges, FLUSHED);
    memset(&run->gauges, 0, sizeof run->gauges);
    return status;
}

static void remove_checkpoints(const struct run *run)
{
    char *present = path_of(run->folder, "checkpoint.bin"), *former = path_of(run->folder, "checkpoint.old");
    remove(present);
    remove(former);
    free(present);
    free(former);
}

/* Writes what closes a run that ended with `status`; returns the status in force. */
static int end_run(struct run *run, int status)
{
    const char *ended = status == FINISHED ? "finished" : status == BLEW_UP ? "blew up" : "interrupted";
    int written = FINISHED;
    if (run->loop_started > 0.0) { /* else the first state was faulty, and no loop began */
        run->stepping_seconds = seconds_now() - run->loop_started - run->output_seconds;
    }
    run->loop_ended = 1;
    show_progress(run, LAST_LINE);
    if (status == INTERRUPTED) {
        struct text message = {NULL, 0, 0};
        add_format(&message, "interrupted after step %" PRIu64 ", t = %.9g s; --resume goes on from here", run->step, run->time);
        set_message(run, &message);
        drop_text(&message);
        written = write_checkpoint(run);
    }
    if (written == FINISHED) {
        written = close_gauges(run);
    }
    if (written == FINISHED) {
        written = write_index(run);
    }
    if (written == FINISHED) {
        written = write_summary(run, ended);
    }
    if (run->message != NULL) {
        say("%s", run->message);
    }
    if (written == FINISHED && status == FINISHED) {
        remove_checkpoints(run);
    }
    return written == FINISHED ? status : written;
}

/* Times and intervals that a run can keep. */
static int check_times(const struct run *run, struct text *faults)
{
    size_t k;
    if (!(run->end >= run->begin) || !isfinite(run->end - run->begin)) {
        add_fault(faults, "the run would end at %.9g s, before its start at %.9g s", run->end, run->begin);
    }
    for (k = 0; k < run->about->outputs; k++) {
        double every = {{ prefix }}_every(run->solver, k);
        if (run->about->output[k].repeated && (!(every > 0.0) || (run->end - run->begin) / every > MOST_STEPS)) {
            add_fault(faults, "output %s every %.9g s: the interval has to be positive, and give less than 100 million times", run->about->output[k].name,
                      every);
        }
    }
    return faults->length > 0 ? BAD_ARGUMENTS : FINISHED;
}

static int report_faults(struct text *faults)
{
    if (faults->length == 0) {
        return FINISHED;
    }
    fputs(faults->bytes, stderr);
    drop_text(faults);
    return BAD_ARGUMENTS;
}

/* Allocates the solver and everything a run needs. */
static int set_up(struct run *run, struct options *options, const char *folder)
{
    const {{ prefix }}_description *about = {{ prefix }}_describe();
    struct text faults = {NULL, 0, 0};
    size_t axis;
    memset(run, 0, sizeof *run);
    run->about = about;
    run->options = options;
    run->folder = folder;
    run->total = 1;
    for (axis = 0; axis < about->axes; axis++) {
        run->nodes[axis] = options->nodes[axis];
        if (run->nodes[axis] > SIZE_MAX / 64 / run->total) {
            say("so many nodes cannot be addressed; ask for fewer with --nodes");
            return BAD_ARGUMENTS;
        }
        run->total *= run->nodes[axis];
    }
#ifdef _OPENMP
    run->threads = options->threads > 0 ? options->threads : omp_get_max_threads();
#else
    run->threads = 1;
#endif
    run->solver = {{ prefix }}_create(run->nodes, options->number, options->given, run->threads);
    if (run->solver == NULL) {
        say("not enough memory for %zu nodes; ask for fewer with --nodes", run->total);
        return ENVIRONMENT_FAILED;
    }
    run->due_next = new_list(about->outputs, sizeof *run->due_next);
    run->begin = {{ prefix }}_start_time(run->solver);
    run->end = options->until_given ? options->until : {{ prefix }}_end_time(run->solver);
    run->given_step = {{ prefix }}_step_duration(run->solver);
    run->limit = HUGE_VAL;
    run->terminal = isatty(STDERR_FILENO);
    list_series(run);
    check_times(run, &faults);
    return report_faults(&faults);
}

/* Rows that never got their name: a checkpoint still needs them, otherwise they are half a file. */
static void drop_gauges(struct run *run)
{
    if (run->gauges.stream != NULL) {
        fclose(run->gauges.stream);
        if (!file_exists(run->folder, "checkpoint.bin") && !file_exists(run->folder, "checkpoint.old")) {
            remove(run->gauges.temporary);
        }
    }
    free(run->gauges.path);
    free(run->gauges.temporary);
}

static void tear_down(struct run *run)
{
    size_t k;
    drop_gauges(run);
    for (k = 0; k < run->series_count; k++) {
        free(run->series[k].folder);
    }
    free(run->series);
    free(run->records);
    free(run->due_next);
    free(run->message);
    if (run->solver != NULL) {
        {{ prefix }}_destroy(run->solver);
    }
}

static int perform(struct options *options, const char *folder)
{
    struct run run;
    struct reader reader = {NULL, 0, 0, 0};
    struct text faults = {NULL, 0, 0};
    int status = FINISHED;
    memset(&run, 0, sizeof run);
    if (options->resume) {
        status = accept_folder(folder, 1);
        if (status == FINISHED) {
            status = open_checkpoint(folder, &reader);
        }
        if (status == FINISHED) {
            adopt_setup(&reader, options, &faults);
            status = report_faults(&faults);
        }
    }
    if (status == FINISHED) {
        status = set_up(&run, options, folder);
    }
    if (status == FINISHED && !options->resume) {
        status = accept_folder(folder, 0);
    }
    if (status == FINISHED) {
        catch_signals();
        run.started = run.checkpoint_at = run.shown_at = seconds_now();
        status = options->resume ? adopt_run(&reader, &run) : begin_run(&run);
        run.shown_step = run.step;
        if (status == FINISHED) {
            show_progress(&run, FIRST_LINE);
            run.loop_started = seconds_now();
            run.output_seconds = 0.0;
            status = step_on(&run);
        }
        if (status == FINISHED || status == BLEW_UP || status == INTERRUPTED) {
            status = end_run(&run, status);
            puts(folder);
        }
    }
    free(reader.bytes);
    tear_down(&run);
    return status;
}

int main(int count, char **arguments)
{
    const {{ prefix }}_description *about = {{ prefix }}_describe();
    struct options options;
    struct text faults = {NULL, 0, 0}, folder = {NULL, 0, 0};
    size_t axis;
    int status;
    memset(&options, 0, sizeof options);
    options.number = new_list(about->parameters, sizeof *options.number);
    options.given = new_list(about->parameters, 1);
    options.nodes = new_list(about->axes, sizeof *options.nodes);
    options.resized = new_list(about->axes, 1);
    for (axis = 0; axis < about->axes; axis++) {
        options.nodes[axis] = about->axis[axis].nodes;
    }
    read_options(&options, count, arguments, &faults);
    if (options.help) {
        drop_text(&faults);
        status = show_usage(arguments[0]);
    } else {
        settle_constants(&options, &faults);
        status = report_faults(&faults);
        if (status == FINISHED) {
            if (options.out != NULL) {
                add_text(&folder, options.out);
            } else {
                add_format(&folder, "%s.run", about->name);
            }
            status = perform(&options, folder.bytes);
        }
    }
    drop_text(&folder);
    free(options.number);
    free(options.given);
    free(options.nodes);
    free(options.resized);
    return status;
}
