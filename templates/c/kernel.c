/* {{ prefix }}.c: {{ title }}
 *
{{ notes }} *
 * Made by rimstone {{ version }} from the model with SHA-256 {{ hash }}.
 * Build by hand: cc -std=c11 -O3 -march=native -ffp-contract=off -fno-math-errno -fopenmp *.c -o {{ prefix }} -lm
 *
 * Every sum and product below is written in the order in which it is computed; contraction into fused operations is
 * off, so that threads, vector widths and compilers do not change a bit of the results. */
#include "{{ prefix }}.h"

#include <float.h>
#include <math.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#if defined(FLT_EVAL_METHOD) && FLT_EVAL_METHOD != 0 && FLT_EVAL_METHOD != 1
#error "double arithmetic must be rounded to double: on old x86 use -msse2 -mfpmath=sse"
#endif

#if defined(__clang__)
#pragma STDC FP_CONTRACT OFF
#endif

#ifdef _OPENMP
#include <omp.h>
#define ROWS_IN_PARALLEL _Pragma("omp parallel for schedule(static) num_threads((int)s->team) if (s->team > 1)")
#define ALONG_THE_ROW _Pragma("omp simd")
#else
#define ROWS_IN_PARALLEL
#if defined(__clang__)
#define ALONG_THE_ROW _Pragma("clang loop vectorize(assume_safety)")
#elif defined(__GNUC__)
#define ALONG_THE_ROW _Pragma("GCC ivdep")
#else
#define ALONG_THE_ROW
#endif
#endif

#if defined(__GNUC__)
#define INLINE static inline __attribute__((always_inline))
#else
#define INLINE static inline
#endif

/* Grids of no more nodes run on one thread. */
#ifndef LEAST_SHARED
#define LEAST_SHARED 20000
#endif

/* No array has more elements than this. */
#define LARGEST_ARRAY ((size_t)PTRDIFF_MAX / 4096)

struct {{ prefix }}_solver {
{{ members }}};

{{ helpers }}/* An array of zeros that starts a cache line; each thread touches first what it will work on. */
static double *array({{ prefix }}_solver *s, ptrdiff_t count) {
    const size_t bytes = ((size_t)count * sizeof(double) + 63) / 64 * 64;
    double *const values = aligned_alloc(64, bytes);
    if (values == NULL) {
        return NULL;
    }
    s->memory += bytes;
    ROWS_IN_PARALLEL
    for (ptrdiff_t part = 0; part < s->team; part++) {
        const ptrdiff_t first = count / s->team * part;
        const ptrdiff_t last = part == s->team - 1 ? count : count / s->team * (part + 1);
        memset(values + first, 0, (size_t)(last - first) * sizeof(double));
    }
    return values;
}

{{ operators }}
{{ tables }}
{{ routines }}
{{ fixed }}
{{ lifetime }}
{{ description }}
double {{ prefix }}_parameter(const {{ prefix }}_solver *s, size_t k) { return s->parameter[k]; }
double {{ prefix }}_parameter_low(const {{ prefix }}_solver *s, size_t k) { return s->parameter_low[k]; }
double {{ prefix }}_parameter_high(const {{ prefix }}_solver *s, size_t k) { return s->parameter_high[k]; }
double {{ prefix }}_parameter_scale(const {{ prefix }}_solver *s, size_t k) { return s->parameter_scale[k]; }
double {{ prefix }}_low(const {{ prefix }}_solver *s, size_t axis) { return s->low[axis]; }
double {{ prefix }}_high(const {{ prefix }}_solver *s, size_t axis) { return s->high[axis]; }
double {{ prefix }}_spacing(const {{ prefix }}_solver *s, size_t axis) { return s->spacing[axis]; }
double {{ prefix }}_start_time(const {{ prefix }}_solver *s) { return s->start_time; }
double {{ prefix }}_end_time(const {{ prefix }}_solver *s) { return s->end_time; }
double {{ prefix }}_step_duration(const {{ prefix }}_solver *s) { return s->step_duration; }
double {{ prefix }}_every(const {{ prefix }}_solver *s, size_t output) { return s->every[output]; }
double {{ prefix }}_scale(const {{ prefix }}_solver *s, size_t output) { return s->scale[output]; }
double {{ prefix }}_field_scale(const {{ prefix }}_solver *s, size_t field) { return s->field_scale[field]; }
size_t {{ prefix }}_points(const {{ prefix }}_solver *s) { return (size_t)s->points; }
size_t {{ prefix }}_memory(const {{ prefix }}_solver *s) { return s->memory; }

double {{ prefix }}_place(const {{ prefix }}_solver *s, size_t output, size_t axis) {
    return s->place[output * (sizeof s->nodes / sizeof s->nodes[0]) + axis];
}

{{ interface }}
