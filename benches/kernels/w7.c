/* Two reacting and diffusing fields, order 2, Euler, zero flux by mirror rows. */
#include "shared.h"
static ptrdiff_t m, n;
static double *u, *v, *un, *vn;
void hand_create(const size_t *nodes) {
    m = (ptrdiff_t)nodes[0]; n = (ptrdiff_t)nodes[1];
    u = grid(m * n); v = grid(m * n); un = grid(m * n); vn = grid(m * n);
}
#define NODE(i, w, e) do { \
    const double a = f[i], b = g[i], react = a * b * b; \
    fn[i] = a + dt * (du * (f[w] + f[e] + fs[i] + fo[i] - 4 * a) - react + feed * (1 - a)); \
    gn[i] = b + dt * (dv * (g[w] + g[e] + gs[i] + go[i] - 4 * b) + react - (feed + kill) * b); \
} while (0)
void hand_steps(int count) {
    const double dt = 0.5, du = 0.2, dv = 0.1, feed = 0.037, kill = 0.06;
    while (count-- > 0) {
        ROWS
        for (ptrdiff_t j = 0; j < m; j++) {
            const ptrdiff_t s = (j == 0 ? 1 : j - 1) * n, o = (j == m - 1 ? m - 2 : j + 1) * n;
            const double *restrict f = u + j * n, *restrict fs = u + s, *restrict fo = u + o;
            const double *restrict g = v + j * n, *restrict gs = v + s, *restrict go = v + o;
            double *restrict fn = un + j * n, *restrict gn = vn + j * n;
            NODE(0, 1, 1);
            ALONG
            for (ptrdiff_t i = 1; i < n - 1; i++) NODE(i, i - 1, i + 1);
            NODE(n - 1, n - 2, n - 2);
        }
        double *t = u; u = un; un = t;
        t = v; v = vn; vn = t;
    }
}
