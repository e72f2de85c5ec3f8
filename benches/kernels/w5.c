/* 3-D wave with varying speed, order 8 (2, 4, 6 at distance 1, 2, 3 from a face), leapfrog. */
#include "shared.h"
static ptrdiff_t l, m, n;
static double *u, *v, *g;
static const double weights[5][5] = {
    { 0 }, { -2, 1 }, { -2.5, 4.0 / 3, -1.0 / 12 }, { -49.0 / 18, 1.5, -0.15, 1.0 / 90 },
    { -205.0 / 72, 1.6, -0.2, 8.0 / 315, -1.0 / 560 },
};
void hand_create(const size_t *nodes) {
    l = (ptrdiff_t)nodes[0]; m = (ptrdiff_t)nodes[1]; n = (ptrdiff_t)nodes[2];
    u = grid(l * m * n); v = grid(l * m * n); g = grid(l * m * n);
}
static inline ptrdiff_t distance(ptrdiff_t i, ptrdiff_t count) {
    const ptrdiff_t d = i < count - 1 - i ? i : count - 1 - i;
    return d < 4 ? d : 4;
}
static inline __attribute__((always_inline)) double second(const double *f, ptrdiff_t s, ptrdiff_t reach) {
    double t = weights[reach][0] * f[0];
    for (ptrdiff_t k = 1; k <= reach; k++) t += weights[reach][k] * (f[k * s] + f[-k * s]);
    return t;
}
void hand_steps(int count) {
    const double r = 0.1;
    const ptrdiff_t p = m * n;
    while (count-- > 0) {
        ROWS
        for (ptrdiff_t k = 1; k < l - 1; k++)
            for (ptrdiff_t j = 1; j < m - 1; j++) {
                const ptrdiff_t dk = distance(k, l), dj = distance(j, m), row = k * p + j * n;
                const double *restrict f = u + row, *restrict c = g + row;
                double *restrict w = v + row;
                const double *wj = weights[dj], *wk = weights[dk];
                if (dk == 4 && dj == 4) {
                    ALONG
                    for (ptrdiff_t i = 4; i < n - 4; i++)
                        w[i] = 2 * f[i] - w[i] + r * c[i] * (second(f + i, 1, 4) + second(f + i, n, 4) + second(f + i, p, 4));
                } else {
                    for (ptrdiff_t i = 4; i < n - 4; i++) {
                        double t = second(f + i, 1, 4) + (wj[0] + wk[0]) * f[i];
                        for (ptrdiff_t q = 1; q <= dj; q++) t += wj[q] * (f[i + q * n] + f[i - q * n]);
                        for (ptrdiff_t q = 1; q <= dk; q++) t += wk[q] * (f[i + q * p] + f[i - q * p]);
                        w[i] = 2 * f[i] - w[i] + r * c[i] * t;
                    }
                }
                for (ptrdiff_t e = 0; e < 6; e++) {
                    const ptrdiff_t i = e < 3 ? 1 + e : n - 7 + e;
                    w[i] = 2 * f[i] - w[i] + r * c[i] * (second(f + i, 1, distance(i, n)) + second(f + i, n, dj) + second(f + i, p, dk));
                }
            }
        double *t = u; u = v; v = t;
    }
}
