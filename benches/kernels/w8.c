/* 2-D advection, order 6 (orders 2 and 4 near an end, upwind at the outflow), five-stage low-storage Runge-Kutta
 * (coefficients from memory), update fused into the right-hand side, so that the field has two arrays. */
#include "shared.h"
static ptrdiff_t m, n;
static double *q, *next, *res;
void hand_create(const size_t *nodes) {
    m = (ptrdiff_t)nodes[0]; n = (ptrdiff_t)nodes[1];
    q = grid(m * n); next = grid(m * n); res = grid(m * n);
}
static inline double sixth(const double *f, ptrdiff_t s) {
    return 0.75 * (f[s] - f[-s]) - 0.15 * (f[2 * s] - f[-2 * s]) + 1.0 / 60 * (f[3 * s] - f[-3 * s]);
}
static inline double near(const double *f, ptrdiff_t s, ptrdiff_t i, ptrdiff_t count) {
    const ptrdiff_t d = i < count - 1 - i ? i : count - 1 - i;
    if (i == count - 1) return f[0] - f[-s];
    if (d == 1) return 0.5 * (f[s] - f[-s]);
    if (d == 2) return 2.0 / 3 * (f[s] - f[-s]) - 1.0 / 12 * (f[2 * s] - f[-2 * s]);
    return sixth(f, s);
}
void hand_steps(int count) {
    static const double a[5] = { 0, -0.4178904745, -1.192151694643, -1.697784692471, -1.514183444257 };
    static const double b[5] = { 0.1496590219993, 0.3792103129999, 0.8229550293869, 0.6994504559488, 0.1530572479681 };
    const double cx = -0.3, cy = -0.15;
    while (count-- > 0)
        for (int stage = 0; stage < 5; stage++) {
            const double aa = a[stage], bb = b[stage];
            ROWS
            for (ptrdiff_t j = 1; j < m; j++) {
                const double *restrict f = q + j * n;
                double *restrict g = next + j * n, *restrict r = res + j * n;
                const int inner = j >= 3 && j < m - 3;
                for (ptrdiff_t e = 0; e < 5; e++) {
                    const ptrdiff_t i = e < 2 ? 1 + e : n - 5 + e;
                    r[i] = aa * r[i] + cx * near(f + i, 1, i, n) + cy * near(f + i, n, j, m);
                    g[i] = f[i] + bb * r[i];
                }
                if (inner) {
                    ALONG
                    for (ptrdiff_t i = 3; i < n - 3; i++) {
                        r[i] = aa * r[i] + cx * sixth(f + i, 1) + cy * sixth(f + i, n);
                        g[i] = f[i] + bb * r[i];
                    }
                } else {
                    for (ptrdiff_t i = 3; i < n - 3; i++) {
                        r[i] = aa * r[i] + cx * sixth(f + i, 1) + cy * near(f + i, n, j, m);
                        g[i] = f[i] + bb * r[i];
                    }
                }
            }
            double *t = q; q = next; next = t;
        }
}
