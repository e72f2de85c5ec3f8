/* Plain loops as a competent person writes them: arrays, parallel outer loop, simd inner loop. */
#ifndef SHARED_H
#define SHARED_H
#include <stddef.h>
#include <stdlib.h>
#define ROWS _Pragma("omp parallel for schedule(static)")
#define ALONG _Pragma("omp simd")
static inline double *grid(ptrdiff_t count) {
    double *const a = aligned_alloc(64, ((size_t)count * sizeof(double) + 63) / 64 * 64);
    ROWS
    for (ptrdiff_t i = 0; i < count; i++) a[i] = 0.001 * (double)(i % 97);
    return a;
}
void hand_create(const size_t *n);
void hand_steps(int count);
#endif
