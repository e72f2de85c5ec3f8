/* 3-D heat, seven points, Euler. */
#include "shared.h"
static ptrdiff_t l, m, n;
static double *u, *v;
void hand_create(const size_t *nodes) {
    l = (ptrdiff_t)nodes[0]; m = (ptrdiff_t)nodes[1]; n = (ptrdiff_t)nodes[2];
    u = grid(l * m * n); v = grid(l * m * n);
}
void hand_steps(int count) {
    const double r = 0.15;
    const ptrdiff_t p = m * n;
    while (count-- > 0) {
        ROWS
        for (ptrdiff_t k = 1; k < l - 1; k++)
            for (ptrdiff_t j = 1; j < m - 1; j++) {
                const double *restrict f = u + k * p + j * n;
                double *restrict g = v + k * p + j * n;
                ALONG
                for (ptrdiff_t i = 1; i < n - 1; i++)
                    g[i] = f[i] + r * (f[i - 1] + f[i + 1] + f[i - n] + f[i + n] + f[i - p] + f[i + p] - 6 * f[i]);
            }
        double *t = u; u = v; v = t;
    }
}
