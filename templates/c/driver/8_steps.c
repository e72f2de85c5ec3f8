/* ---- steps ---- */

static volatile sig_atomic_t stop_asked = 0;
static volatile time_t first_asked;

/* The first request stops the run in good order. One that comes seconds later falls through to the system; one that comes
 * at once is the same request on a second way, from a terminal and from whoever started this program. */
static void ask_to_stop(int number)
{
    time_t now = time(NULL);
    if (!stop_asked) {
        stop_asked = 1;
        first_asked = now;
    } else if (now > first_asked + 1) {
        signal(number, SIG_DFL);
        raise(number);
    }
}

static void catch_signals(void)
{
    struct sigaction action;
    memset(&action, 0, sizeof action);
    sigemptyset(&action.sa_mask);
    action.sa_handler = ask_to_stop;
    action.sa_flags = SA_RESTART;
    sigaction(SIGINT, &action, NULL);
    sigaction(SIGTERM, &action, NULL);
    action.sa_flags = 0;
    action.sa_handler = SIG_IGN; /* failed writes are reported, not fatal */
    sigaction(SIGPIPE, &action, NULL);
#ifdef SIGXFSZ
    sigaction(SIGXFSZ, &action, NULL);
#endif
}

static void set_message(struct run *run, const struct text *message)
{
    free(run->message);
    run->message = new_list(message->length + 1, 1);
    memcpy(run->message, message->bytes, message->length);
}

/* Whether a field holds anything but finite numbers; the products of finite numbers with zero are zero. */
static int is_finite(const double *values, size_t count)
{
    double sums[8] = {0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0}, sum = 0.0;
    size_t k, j;
    for (k = 0; k + 8 <= count; k += 8) {
        for (j = 0; j < 8; j++) {
            sums[j] += values[k + j] * 0.0;
        }
    }
    for (; k < count; k++) {
        sum += values[k] * 0.0;
    }
    for (j = 0; j < 8; j++) {
        sum += sums[j];
    }
    return sum == 0.0;
}

static void describe_blow_up(struct run *run, const char *field, const double *values)
{
    struct text message = {NULL, 0, 0};
    size_t node = 0, rest, axis, index[3] = {0, 0, 0};
    while (isfinite(values[node])) {
        node++;
    }
    rest = node;
    for (axis = run->about->axes; axis-- > 0;) {
        index[axis] = rest % run->nodes[axis];
        rest /= run->nodes[axis];
    }
    add_format(&message, "%s is not finite any more at ", field);
    for (axis = 0; axis < run->about->axes; axis++) {
        add_format(&message, "%s%s = %.9g %s (node %zu)", axis == 0 ? "" : ", ", run->about->axis[axis].name, coordinate(run, axis, index[axis]),
                   run->about->axis[axis].unit, index[axis]);
    }
    add_format(&message, ", after step %" PRIu64 ", t = %.9g s", run->step, run->time);
    if (run->record_count > 0) {
        const struct record *good = &run->records[run->record_count - 1];
        add_format(&message, "; the last good output is %s/%06" PRIu64 ".npy, t = %.9g s", run->series[good->series].folder, good->number, good->time);
    }
    if (run->above_limit) {
        add_text(&message, "; the step is above the limit of stability");
    }
    set_message(run, &message);
    drop_text(&message);
}

/* FINISHED, or BLEW_UP with a message. */
static int check_fields(struct run *run)
{
    size_t k;
    for (k = 0; k < run->about->fields; k++) {
        const double *values = {{ prefix }}_field(run->solver, k);
        if (!is_finite(values, run->total)) {
            describe_blow_up(run, run->about->field[k].name, values);
            return BLEW_UP;
        }
    }
    return FINISHED;
}

/* The longest step allowed now, for at most `interval`. Returns an exit status. */
static int longest_step(struct run *run, double interval, double *longest)
{
    double rate = {{ prefix }}_largest_rate(run->solver, run->time), limit = rate > 0.0 ? 1.0 / rate : HUGE_VAL;
    if (rate != rate || limit <= 0.0) {
        struct text message = {NULL, 0, 0};
        if (check_fields(run) == FINISHED) {
            add_format(&message, "the step limit is not finite after step %" PRIu64 ", t = %.9g s", run->step, run->time);
            set_message(run, &message);
            drop_text(&message);
        }
        return BLEW_UP;
    }
    if (run->step == 0) {
        run->limit = limit;
    }
    *longest = run->given_step > 0.0 ? run->given_step : isfinite(limit) ? run->about->fraction * limit : interval;
    if (run->given_step > limit && !run->above_limit) {
        run->above_limit = 1;
        say("the model's step, %.9g s, is above the limit of stability, %.9g s: the results may be worthless", run->given_step, limit);
    }
    return FINISHED;
}

/* Equal steps that divide an interval, none longer than `longest`. */
static double parts_of(double interval, double longest)
{
    double parts = ceil(interval / longest * (1.0 - 1e-12));
    return parts > 1.0 ? parts : 1.0;
}

/* The greatest interval that divides both, to one part in 10^9 (Euclid). */
static double common_interval(double a, double b)
{
    double tolerance = 1e-9 * (a > b ? a : b);
    while (b > tolerance) {
        double rest = fmod(a, b);
        if (b - rest <= tolerance) {
            rest = 0.0;
        }
        a = b;
        b = rest;
    }
    return a;
}

#define MOST_STEPS 1e8

/* One step length for the whole run. */
static int settle_constant_step(struct run *run, double longest)
{
    double interval = run->end - run->begin, base = interval, parts;
    size_t k;
    if (run->options->steps_given || !(interval > 0.0)) {
        run->constant_step = longest;
        return FINISHED;
    }
    for (k = 0; k < run->about->outputs; k++) {
        if (run->about->output[k].repeated && {{ prefix }}_every(run->solver, k) < interval) {
            base = common_interval(base, {{ prefix }}_every(run->solver, k));
        }
    }
    parts = parts_of(base, longest);
    if (parts * (interval / base) > MOST_STEPS) {
        say("the method '%s' needs one step length for the whole run; with outputs at these times it would take %.3g steps. "
            "Choose output times with a common multiple, or another method", run->about->method, parts * (interval / base));
        return BAD_ARGUMENTS;
    }
    run->constant_step = base / parts;
    return FINISHED;
}

/* What has to be known before the first step. */
static int settle_steps(struct run *run)
{
    double interval = run->end - run->begin, longest;
    int status = longest_step(run, interval, &longest);
    if (status != FINISHED) {
        return status;
    }
    if (run->options->steps_given) {
        if (!(longest > 0.0)) {
            say("--steps needs a step, and this model has none: its limit is infinite and its interval empty");
            return BAD_ARGUMENTS;
        }
        run->end = run->begin + (double)run->options->steps * longest;
    } else if (interval / longest > 9e15) {
        say("a step of %.3g s would never reach the end, %.9g s", longest, run->end);
        return BAD_ARGUMENTS;
    }
    run->last_step = longest;
    run->from = run->to = run->begin;
    if (run->about->constant_step) {
        status = settle_constant_step(run, longest);
        run->last_step = run->constant_step;
    }
    return status;
}

/* The end of the step that starts now, and its length. */
static int choose_step(struct run *run, double *step, double *next)
{
    const {{ prefix }}_description *about = run->about;
    double longest;
    int status;
    if (run->constant_step > 0.0) {
        uint64_t reached = run->step + 1;
        *step = run->constant_step;
        *next = run->begin + (double)reached * *step;
        if (!run->options->steps_given) {
            run->to = next_event(run);
            if ((double)reached >= floor((run->to - run->begin) / *step + 0.5)) {
                *next = run->to;
            }
        }
        return FINISHED;
    }
    if (run->options->steps_given) {
        *step = run->last_step;
        if (about->state_dependent) {
            status = longest_step(run, run->end - run->begin, step);
            *next = run->time + *step;
            return status;
        }
        *next = run->begin + (double)(run->step + 1) * *step;
        return FINISHED;
    }
    if (about->state_dependent || run->part == run->parts) {
        run->from = run->time;
        run->to = next_event(run);
        run->part = 0;
        longest = run->last_step;
        if (about->state_dependent) {
            status = longest_step(run, run->to - run->from, &longest);
            if (status != FINISHED) {
                return status;
            }
        } else {
            longest = run->given_step > 0.0 ? run->given_step : isfinite(run->limit) ? about->fraction * run->limit : run->to - run->from;
        }
        run->parts = (uint64_t)parts_of(run->to - run->from, longest);
    }
    *step = (run->to - run->from) / (double)run->parts;
    run->part++;
    *next = run->part == run->parts ? run->to : run->from + (double)run->part * *step;
    return FINISHED;
}

static int at_end(const struct run *run)
{
    return run->options->steps_given ? run->step >= run->options->steps : !(run->time < run->end);
}

