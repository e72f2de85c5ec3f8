/* 2-D heat, five points, Euler. */
#include "shared.h"
static ptrdiff_t m, n;
static double *u, *v;
void hand_create(const size_t *nodes) { m = (ptrdiff_t)nodes[0]; n = (ptrdiff_t)nodes[1]; u = grid(m * n); v = grid(m * n); }
void hand_steps(int count) {
    const double r = 0.2;
    while (count-- > 0) {
        ROWS
        for (ptrdiff_t j = 1; j < m - 1; j++) {
            const double *restrict f = u + j * n;
            double *restrict g = v + j * n;
            ALONG
            for (ptrdiff_t i = 1; i < n - 1; i++)
                g[i] = f[i] + r * (f[i - 1] + f[i + 1] + f[i - n] + f[i + n] - 4 * f[i]);
        }
        double *t = u; u = v; v = t;
    }
}
