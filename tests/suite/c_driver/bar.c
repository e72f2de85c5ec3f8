/* See bar.h. The macros choose the variant: AXES, CONSTANT_STEP, STATE_DEPENDENT, DURATION, and STOP_AT, the step at which
 * the kernel raises an interrupt in a run whose constant `stop` is not zero. */
#define _POSIX_C_SOURCE 200809L
#include "bar.h"
#include <math.h>
#include <signal.h>
#include <stdlib.h>

#ifndef AXES
#define AXES 1
#endif
#ifndef CONSTANT_STEP
#define CONSTANT_STEP 0
#endif
#ifndef STATE_DEPENDENT
#define STATE_DEPENDENT 0
#endif
#ifndef DURATION
#define DURATION 0.0
#endif

struct bar_solver {
    size_t nodes[2], total, steps;
    double k, stop, first;
    double *now, *next, *square, *peak;
};

static const bar_axis_info axis[] = {{"x", "m", 21, 5, 0}, {"y", "m", 9, 5, 1}};
static const bar_parameter_info parameter[] = {{"k", "diffusivity", "cm²/s", 1}, {"stop", "", "1", 0}};
static const bar_field_info field[] = {{"T", "K"}};
static const bar_output_info output[] = {
    {"T", "K", 0, 1}, {"middle, \"T\"", "mK", 1, 0}, {"heat", "K·m", 2, 1}, {"peak T", "K", 3, 0}, {"T²", "K²", 0, 1}};
static const double trapezium[] = {0.5};
static const double *const quadrature[] = {trapezium, trapezium};
static const size_t quadrature_count[] = {1, 0};
static const bar_description description = {
    "bar", "a \"bar\"", "0.1.0", "abc123", "euler", "1/(2k/h²)", "model bar \"a bar\"\n", AXES, 2, 1, 5, axis, parameter, field, output,
    CONSTANT_STEP, STATE_DEPENDENT, 0.9, 4, quadrature, quadrature_count};

const bar_description *bar_describe(void) { return &description; }

bar_solver *bar_create(const size_t *nodes, const double *parameters, const unsigned char *given, int threads)
{
    bar_solver *s = calloc(1, sizeof *s);
    (void)threads;
    if (s == NULL) {
        return NULL;
    }
    s->nodes[0] = nodes[0];
    s->nodes[1] = AXES == 2 ? nodes[1] : 1;
    s->total = s->nodes[0] * s->nodes[1];
    s->k = given[0] ? parameters[0] : 1e-2;
    s->stop = given[1] ? parameters[1] : 0.0;
    s->now = calloc(s->total, sizeof(double));
    s->next = calloc(s->total, sizeof(double));
    s->square = calloc(s->total, sizeof(double));
    s->peak = calloc(s->total, sizeof(double));
    if (s->now == NULL || s->next == NULL || s->square == NULL || s->peak == NULL) {
        bar_destroy(s);
        return NULL;
    }
    return s;
}

void bar_destroy(bar_solver *s)
{
    free(s->now);
    free(s->next);
    free(s->square);
    free(s->peak);
    free(s);
}

double bar_parameter(const bar_solver *s, size_t k) { return k == 0 ? s->k : s->stop; }
double bar_parameter_low(const bar_solver *s, size_t k) { return (void)s, (void)k, 1e-3; }
double bar_parameter_high(const bar_solver *s, size_t k) { return (void)s, (void)k, 1e-1; }
double bar_parameter_scale(const bar_solver *s, size_t k) { return (void)s, k == 0 ? 1e-4 : 1.0; }
double bar_low(const bar_solver *s, size_t a) { return (void)s, a == 0 ? 0.5 : 0.0; }
double bar_high(const bar_solver *s, size_t a) { return (void)s, a == 0 ? 1.5 : 0.9; }
double bar_spacing(const bar_solver *s, size_t a)
{
    return (bar_high(s, a) - bar_low(s, a)) / (double)(a == 0 ? s->nodes[0] - 1 : s->nodes[1]);
}
double bar_start_time(const bar_solver *s) { return (void)s, 1.0; }
double bar_end_time(const bar_solver *s) { return (void)s, 2.0; }
double bar_step_duration(const bar_solver *s) { return (void)s, DURATION; }
double bar_every(const bar_solver *s, size_t k) { return (void)s, k == 0 ? 0.25 : k == 2 ? 0.5 : k == 4 ? 0.4 : 0.0; }
double bar_place(const bar_solver *s, size_t k, size_t a) { return (void)s, (void)k, a == 0 ? 0.96 : 0.88; }
double bar_scale(const bar_solver *s, size_t k) { return (void)s, k == 1 ? 1e-3 : 1.0; }
double bar_field_scale(const bar_solver *s, size_t k) { return (void)s, (void)k, 1.0; }

/* A cubic in x, so that four nodes interpolate it exactly. */
void bar_start(bar_solver *s, double time)
{
    size_t i, j;
    (void)time;
    for (i = 0; i < s->nodes[0]; i++) {
        double x = bar_low(s, 0) + (double)i * bar_spacing(s, 0);
        for (j = 0; j < s->nodes[1]; j++) {
            s->now[i * s->nodes[1] + j] = 1.0 + x * x * x;
        }
    }
}

void bar_first_step(bar_solver *s, double time, double step) { (void)time, s->first = step; }

double bar_largest_rate(bar_solver *s, double time)
{
    double h = bar_spacing(s, 0), rate = 2.0 * s->k / (h * h);
    if (AXES == 2) {
        rate += 2.0 * s->k / (bar_spacing(s, 1) * bar_spacing(s, 1));
    }
    return STATE_DEPENDENT ? rate * (1.0 + 0.5 * sin(5.0 * time)) : rate;
}

void bar_advance(bar_solver *s, double time, double step, double next)
{
    double hx = bar_spacing(s, 0), hy = AXES == 2 ? bar_spacing(s, 1) : 1.0, *swap;
    size_t m = s->nodes[1], i, j;
    (void)time, (void)next;
    for (i = 0; i < s->nodes[0]; i++) {
        for (j = 0; j < m; j++) {
            const double *u = s->now;
            size_t at = i * m + j;
            double rate = 0.0;
            if (i > 0 && i + 1 < s->nodes[0]) {
                rate = s->k * (u[at - m] - 2.0 * u[at] + u[at + m]) / (hx * hx);
                if (AXES == 2) {
                    rate += s->k * (u[i * m + (j + m - 1) % m] - 2.0 * u[at] + u[i * m + (j + 1) % m]) / (hy * hy);
                }
            }
            s->next[at] = u[at] + step * rate;
        }
    }
    swap = s->now;
    s->now = s->next;
    s->next = swap;
    s->steps++;
    if (s->stop != 0.0 && s->steps == (size_t)fabs(s->stop)) {
        if (s->stop > 0.0) {
            raise(SIGINT);
        } else {
            s->now[2 * m] = NAN;
        }
    }
}

const double *bar_field(const bar_solver *s, size_t k) { return (void)k, s->now; }

const double *bar_output(bar_solver *s, size_t k, double time)
{
    size_t i;
    (void)time;
    for (i = 0; k == 4 && i < s->total; i++) {
        s->square[i] = s->now[i] * s->now[i];
    }
    return k == 3 ? s->peak : k == 4 ? s->square : s->now;
}

void bar_begin_maximum(bar_solver *s, size_t k, double time)
{
    size_t i;
    (void)k, (void)time;
    for (i = 0; i < s->total; i++) {
        s->peak[i] = s->now[i];
    }
}

void bar_accumulate_maximum(bar_solver *s, size_t k, double time)
{
    size_t i;
    (void)k, (void)time;
    for (i = 0; i < s->total; i++) {
        s->peak[i] = s->now[i] > s->peak[i] ? s->now[i] : s->peak[i];
    }
}

size_t bar_state_count(void) { return 1; }
double *bar_state(bar_solver *s, size_t k) { return (void)k, s->now; }
size_t bar_points(const bar_solver *s) { return s->total; }
size_t bar_memory(const bar_solver *s) { return 4 * s->total * sizeof(double); }
