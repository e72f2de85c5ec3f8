/* {{ prefix }}.h: {{ title }}
 *
 * Made by rimstone {{ version }} from the model with SHA-256 {{ hash }}.
 * All quantities are in SI units. Arrays hold one double for each node, first axis slowest. */
#ifndef {{ PREFIX }}_H
#define {{ PREFIX }}_H

#include <stddef.h>

#ifdef __cplusplus
extern "C" {
#endif

#if defined(__GNUC__)
#define {{ PREFIX }}_API __attribute__((visibility("default")))
#else
#define {{ PREFIX }}_API
#endif

typedef struct {{ prefix }}_solver {{ prefix }}_solver;

typedef struct {
    const char *name, *unit;
    size_t nodes, least_nodes;
    int periodic;
} {{ prefix }}_axis_info;

/* A constant that may be set; a number in `unit` times its scale is the value in SI units. */
typedef struct {
    const char *name, *description, *unit;
    int bounded;
} {{ prefix }}_parameter_info;

typedef struct {
    const char *name, *unit;
} {{ prefix }}_field_info;

/* kind: 0 snapshot, 1 gauge, 2 integral, 3 maximum over time; repeated: it has an interval of its own. */
typedef struct {
    const char *name, *unit;
    int kind;
    int repeated;
} {{ prefix }}_output_info;

typedef struct {
    const char *name, *title, *version, *hash, *method, *limit_law, *model_text;
    size_t axes, parameters, fields, outputs;
    const {{ prefix }}_axis_info *axis;
    const {{ prefix }}_parameter_info *parameter;
    const {{ prefix }}_field_info *field;
    const {{ prefix }}_output_info *output;
    int constant_step, state_dependent;
    double fraction; /* of the step limit; 0 when the step is a duration */
    size_t interpolation_nodes;
    const double *const *quadrature; /* for each axis, weights at its ends in units of the spacing; one inside */
    const size_t *quadrature_count;
} {{ prefix }}_description;

{{ PREFIX }}_API const {{ prefix }}_description *{{ prefix }}_describe(void);

/* nodes: one number for each axis. parameters, given: one entry for each parameter; where given is 0 the default holds.
 * Returns NULL when there is not enough memory. */
{{ PREFIX }}_API {{ prefix }}_solver *{{ prefix }}_create(const size_t *nodes, const double *parameters, const unsigned char *given, int threads);
{{ PREFIX }}_API void {{ prefix }}_destroy({{ prefix }}_solver *s);

{{ PREFIX }}_API double {{ prefix }}_parameter(const {{ prefix }}_solver *s, size_t k);
{{ PREFIX }}_API double {{ prefix }}_parameter_low(const {{ prefix }}_solver *s, size_t k);
{{ PREFIX }}_API double {{ prefix }}_parameter_high(const {{ prefix }}_solver *s, size_t k);
{{ PREFIX }}_API double {{ prefix }}_parameter_scale(const {{ prefix }}_solver *s, size_t k);
{{ PREFIX }}_API double {{ prefix }}_low(const {{ prefix }}_solver *s, size_t axis);
{{ PREFIX }}_API double {{ prefix }}_high(const {{ prefix }}_solver *s, size_t axis);
{{ PREFIX }}_API double {{ prefix }}_spacing(const {{ prefix }}_solver *s, size_t axis);
{{ PREFIX }}_API double {{ prefix }}_start_time(const {{ prefix }}_solver *s);
{{ PREFIX }}_API double {{ prefix }}_end_time(const {{ prefix }}_solver *s);
{{ PREFIX }}_API double {{ prefix }}_step_duration(const {{ prefix }}_solver *s); /* 0: a fraction of the limit */
{{ PREFIX }}_API double {{ prefix }}_every(const {{ prefix }}_solver *s, size_t output); /* 0: no interval of its own */
{{ PREFIX }}_API double {{ prefix }}_place(const {{ prefix }}_solver *s, size_t output, size_t axis);
{{ PREFIX }}_API double {{ prefix }}_scale(const {{ prefix }}_solver *s, size_t output);
{{ PREFIX }}_API double {{ prefix }}_field_scale(const {{ prefix }}_solver *s, size_t field);

{{ PREFIX }}_API void {{ prefix }}_start({{ prefix }}_solver *s, double time);
{{ PREFIX }}_API void {{ prefix }}_first_step({{ prefix }}_solver *s, double time, double step);
{{ PREFIX }}_API double {{ prefix }}_largest_rate({{ prefix }}_solver *s, double time); /* the step limit is 1 over this */
{{ PREFIX }}_API void {{ prefix }}_advance({{ prefix }}_solver *s, double time, double step, double next);
/* The same as count calls of advance, from times[0] to times[count], and faster. */
{{ PREFIX }}_API void {{ prefix }}_advance_steps({{ prefix }}_solver *s, size_t count, const double *times, double step);

{{ PREFIX }}_API const double *{{ prefix }}_field(const {{ prefix }}_solver *s, size_t field);
{{ PREFIX }}_API const double *{{ prefix }}_output({{ prefix }}_solver *s, size_t output, double time);
{{ PREFIX }}_API void {{ prefix }}_begin_maximum({{ prefix }}_solver *s, size_t output, double time);
{{ PREFIX }}_API void {{ prefix }}_accumulate_maximum({{ prefix }}_solver *s, size_t output, double time);

/* The arrays that must be kept to go on to the last bit. */
{{ PREFIX }}_API size_t {{ prefix }}_state_count(void);
{{ PREFIX }}_API double *{{ prefix }}_state({{ prefix }}_solver *s, size_t k);
{{ PREFIX }}_API size_t {{ prefix }}_points(const {{ prefix }}_solver *s);
{{ PREFIX }}_API size_t {{ prefix }}_memory(const {{ prefix }}_solver *s);

#ifdef __cplusplus
}
#endif

#endif
