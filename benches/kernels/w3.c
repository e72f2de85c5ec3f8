/* 2-D heat in flux form, order 4 (order 2 within three nodes of a face), classical Runge-Kutta, updates fused. */
#include "shared.h"
static ptrdiff_t m, n;
static double *u, *k, *a, *b, *sum;
void hand_create(const size_t *nodes) {
    m = (ptrdiff_t)nodes[0]; n = (ptrdiff_t)nodes[1];
    u = grid(m * n); k = grid(m * n); a = grid(m * n); b = grid(m * n); sum = grid(m * n);
}
/* The flux through the face after node 0. */
static inline double wide(const double *f, const double *c, ptrdiff_t s) {
    return (9.0 / 16 * (c[0] + c[s]) - 1.0 / 16 * (c[-s] + c[2 * s])) * (27.0 / 24 * (f[s] - f[0]) - 1.0 / 24 * (f[2 * s] - f[-s]));
}
static inline double fourth(const double *f, const double *c, ptrdiff_t s) {
    return 27.0 / 24 * (wide(f, c, s) - wide(f - s, c - s, s)) - 1.0 / 24 * (wide(f + s, c + s, s) - wide(f - 2 * s, c - 2 * s, s));
}
static inline double second(const double *f, const double *c, ptrdiff_t s) {
    return 0.5 * (c[0] + c[s]) * (f[s] - f[0]) - 0.5 * (c[0] + c[-s]) * (f[0] - f[-s]);
}
static inline void node(ptrdiff_t p, double rate, int stage, double dt, double *restrict to) {
    if (stage == 0) { sum[p] = u[p] + dt / 6 * rate; to[p] = u[p] + dt / 2 * rate; }
    else if (stage == 1) { sum[p] = sum[p] + dt / 3 * rate; to[p] = u[p] + dt / 2 * rate; }
    else if (stage == 2) { sum[p] = sum[p] + dt / 3 * rate; to[p] = u[p] + dt * rate; }
    else to[p] = sum[p] + dt / 6 * rate;
}
static inline __attribute__((always_inline)) void stage(int s, const double *restrict f, double *restrict to) {
    const double dt = 0.1;
    ROWS
    for (ptrdiff_t j = 1; j < m - 1; j++) {
        const int inner = j >= 3 && j < m - 3;
        for (ptrdiff_t e = 0; e < 4; e++) {
            const ptrdiff_t p = j * n + (e < 2 ? 1 + e : n - 5 + e);
            node(p, second(f + p, k + p, 1) + (inner ? fourth(f + p, k + p, n) : second(f + p, k + p, n)), s, dt, to);
        }
        if (inner) {
            ALONG
            for (ptrdiff_t i = 3; i < n - 3; i++) {
                const ptrdiff_t p = j * n + i;
                node(p, fourth(f + p, k + p, 1) + fourth(f + p, k + p, n), s, dt, to);
            }
        } else {
            ALONG
            for (ptrdiff_t i = 3; i < n - 3; i++) {
                const ptrdiff_t p = j * n + i;
                node(p, fourth(f + p, k + p, 1) + second(f + p, k + p, n), s, dt, to);
            }
        }
    }
}
void hand_steps(int count) {
    while (count-- > 0) {
        stage(0, u, a);
        stage(1, a, b);
        stage(2, b, a);
        stage(3, a, b);
        double *t = u; u = b; b = t;
    }
}
