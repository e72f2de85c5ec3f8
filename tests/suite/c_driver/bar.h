/* A hand-written kernel for the tests of the C driver: heat in a bar (AXES 1) or a plate (AXES 2), explicit Euler. */
#ifndef BAR_H
#define BAR_H
#include <stddef.h>
typedef struct bar_solver bar_solver;
typedef struct { const char *name, *unit; size_t nodes, least_nodes; int periodic; } bar_axis_info;
typedef struct { const char *name, *description, *unit; int bounded; } bar_parameter_info;
typedef struct { const char *name, *unit; } bar_field_info;
typedef struct { const char *name, *unit; int kind; int repeated; } bar_output_info;
typedef struct {
    const char *name, *title, *version, *hash, *method, *limit_law, *model_text;
    size_t axes, parameters, fields, outputs;
    const bar_axis_info *axis;
    const bar_parameter_info *parameter;
    const bar_field_info *field;
    const bar_output_info *output;
    int constant_step, state_dependent;
    double fraction;
    size_t interpolation_nodes;
    const double *const *quadrature;
    const size_t *quadrature_count;
} bar_description;
const bar_description *bar_describe(void);
bar_solver *bar_create(const size_t *nodes, const double *parameters, const unsigned char *given, int threads);
void bar_destroy(bar_solver *);
double bar_parameter(const bar_solver *, size_t);
double bar_parameter_low(const bar_solver *, size_t);
double bar_parameter_high(const bar_solver *, size_t);
double bar_parameter_scale(const bar_solver *, size_t);
double bar_low(const bar_solver *, size_t);
double bar_high(const bar_solver *, size_t);
double bar_spacing(const bar_solver *, size_t);
double bar_start_time(const bar_solver *);
double bar_end_time(const bar_solver *);
double bar_step_duration(const bar_solver *);
double bar_every(const bar_solver *, size_t);
double bar_place(const bar_solver *, size_t, size_t);
double bar_scale(const bar_solver *, size_t);
double bar_field_scale(const bar_solver *, size_t);
void bar_start(bar_solver *, double);
void bar_first_step(bar_solver *, double, double);
double bar_largest_rate(bar_solver *, double);
void bar_advance(bar_solver *, double, double, double);
const double *bar_field(const bar_solver *, size_t);
const double *bar_output(bar_solver *, size_t, double);
void bar_begin_maximum(bar_solver *, size_t, double);
void bar_accumulate_maximum(bar_solver *, size_t, double);
size_t bar_state_count(void);
double *bar_state(bar_solver *, size_t);
size_t bar_points(const bar_solver *);
size_t bar_memory(const bar_solver *);
#endif
