/* Emitted kernel against plain loops in interleaved rounds, and the bandwidth of a copy in the same run. Prints the best
 * seconds for each node and step of: waves of steps, single steps, plain loops; then bytes copied in a second. */
#define _POSIX_C_SOURCE 199309L
#include "PREFIX.h"
#include "shared.h"
#include <omp.h>
#include <stdio.h>
#include <time.h>
static double now(void) {
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}
int main(int count, char **arguments) {
    size_t nodes[3] = { 1, 1, 1 }, points = 1;
    const int steps = atoi(arguments[1]), rounds = atoi(arguments[2]);
    for (int i = 3; i < count && i < 6; i++) points *= nodes[i - 3] = (size_t)atol(arguments[i]);
    const double parameters[64] = { 0 };
    const unsigned char given[64] = { 0 };
    PREFIX_solver *const s = PREFIX_create(nodes, parameters, given, omp_get_max_threads());
    double *const times = malloc(sizeof(double) * (size_t)(steps + 1));
    if (s == NULL || times == NULL) return 1;
    PREFIX_start(s, 0);
    const double dt = 0.5 / PREFIX_largest_rate(s, 0);
    PREFIX_first_step(s, 0, dt);
    hand_create(nodes);
    const ptrdiff_t copied = 8 << 20;
    double *const from = grid(copied), *const to = grid(copied);
    double best[4] = { 1e9, 1e9, 1e9, 1e9 };
    for (int round = 0; round < rounds; round++) {
        for (int k = 0; k <= steps; k++) times[k] = dt * (round * 2 * steps + k);
        double mark[5];
        mark[0] = now();
        PREFIX_advance_steps(s, (size_t)steps, times, dt);
        mark[1] = now();
        for (int k = 0; k < steps; k++) PREFIX_advance(s, times[k], dt, times[k + 1]);
        mark[2] = now();
        hand_steps(steps);
        mark[3] = now();
        _Pragma("omp parallel for simd schedule(static)")
        for (ptrdiff_t i = 0; i < copied; i++) to[i] = from[i];
        mark[4] = now();
        for (int k = 0; k < 4; k++)
            if (mark[k + 1] - mark[k] < best[k]) best[k] = mark[k + 1] - mark[k];
    }
    const double work = (double)points * steps;
    printf("%.6e %.6e %.6e %.6e\n", best[0] / work, best[1] / work, best[2] / work, 16.0 * (double)copied / best[3]);
    PREFIX_destroy(s);
    return 0;
}
