/* 1-D heat, order 4, Euler; the row next to an end has six points. */
#include "shared.h"
static ptrdiff_t n;
static double *u, *v;
void hand_create(const size_t *nodes) { n = (ptrdiff_t)nodes[0]; u = grid(n); v = grid(n); }
void hand_steps(int count) {
    const double r = 0.3;
    while (count-- > 0) {
        const double *restrict f = u;
        double *restrict g = v;
        _Pragma("omp parallel for simd schedule(static)")
        for (ptrdiff_t i = 2; i < n - 2; i++)
            g[i] = f[i] + r * (-2.5 * f[i] + 4.0 / 3 * (f[i - 1] + f[i + 1]) - 1.0 / 12 * (f[i - 2] + f[i + 2]));
        const double *e = f + n - 1;
        g[1] = f[1] + r * (5.0 / 6 * f[0] - 1.25 * f[1] - 1.0 / 3 * f[2] + 7.0 / 6 * f[3] - 0.5 * f[4] + 1.0 / 12 * f[5]);
        g[n - 2] = e[-1] + r * (5.0 / 6 * e[0] - 1.25 * e[-1] - 1.0 / 3 * e[-2] + 7.0 / 6 * e[-3] - 0.5 * e[-4] + 1.0 / 12 * e[-5]);
        g[0] = g[n - 1] = 0;
        double *t = u; u = v; v = t;
    }
}
