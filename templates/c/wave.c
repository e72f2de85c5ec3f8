/* The plan of a step: a wave. At position J of the wave every pass of every step, in order, visits slab
 * J - (its shift), so that slabs are used again while they are in cache. A slab is all nodes of one index of the slowest
 * axis{{ block_note }}; the first and the last ENDS of them are visited together. Threads have bands of slabs that shrink by the
 * shift at inner ends; the wedges between bands follow. No order changes a bit of the results. */
enum { PASSES = {{ passes }}, STEP_SHIFT = {{ step_shift }}, ENDS = {{ ends }}, PERIOD = {{ period }}, ARRAYS = {{ arrays }}, PERIODIC = {{ periodic }}, BLOCK = {{ block }} };
static const ptrdiff_t pass_shift[PASSES] = { {{ shifts }} };

/* Bytes of cache of one core, and bytes that all cores share. */
#ifndef NEAR_CACHE
#define NEAR_CACHE 1048576
#endif
#ifndef FAR_CACHE
#define FAR_CACHE 16777216
#endif
#define MOST_STEPS 32

/* One pass of a step on the rows from low to before high. */
static void step_part(const {{ prefix }}_solver *s, int pass, double time, double step, double next, ptrdiff_t low, ptrdiff_t high) {
    (void)time;
    (void)step;
    (void)next;
    switch (pass) {
{{ cases }}    default:
        break;
    }
}

/* Exchanges buffers after a step. */
static void rotate({{ prefix }}_solver *s) {
{{ swaps }}}

/* Slabs of the wave; those at an end count as one. */
static ptrdiff_t slab_count(const {{ prefix }}_solver *s) {
    return BLOCK > 1 ? (s->nodes[0] + BLOCK - 1) / BLOCK : PERIODIC ? s->nodes[0] : s->nodes[0] - 2 * ENDS + 2;
}

/* The first row of a slab. */
static ptrdiff_t slab_begin(const {{ prefix }}_solver *s, ptrdiff_t slab, ptrdiff_t slabs) {
    if (slab >= slabs) {
        return s->nodes[0]{{ slab_rows }};
    }
    return (BLOCK > 1 ? slab * BLOCK : PERIODIC || slab <= 0 ? slab : slab + ENDS - 1){{ slab_rows }};
}

/* How far the last pass of the last step trails the first. */
static ptrdiff_t wave_length(ptrdiff_t count) { return (count - 1) * STEP_SHIFT + pass_shift[PASSES - 1]; }

/* How many steps a wave should take; 0 where the plain order is better. */
static ptrdiff_t wave_steps(const {{ prefix }}_solver *s) {
    const ptrdiff_t slabs = slab_count(s);
    if (BLOCK == 1 && s->nodes[0] < 4 * ENDS + 16) {
        return 0;
    }
    const ptrdiff_t inner = BLOCK > 1 ? BLOCK : s->points / s->nodes[0];
    const ptrdiff_t bytes = ARRAYS * inner * (ptrdiff_t)sizeof(double);
    const ptrdiff_t caches[2] = { NEAR_CACHE / 10 * 7, FAR_CACHE / s->team };
    for (int cache = 0; cache < 2; cache++) {
        const ptrdiff_t length = caches[cache] / bytes - 2;
        ptrdiff_t steps = MOST_STEPS;
        while (steps > 0 && (wave_length(steps) > length || (slabs - 16) / s->team < 2 * wave_length(steps))) {
            steps--;
        }
        if (steps > 0 && (steps > 1 || PASSES > 1 || cache == 1)) {
            return steps;
        }
    }
    return 0;
}

/* The part of a wave between two slabs; at its ends it shrinks (1), stays (0) or, below only, grows (-1) with the shift. */
static void band(const {{ prefix }}_solver *views, ptrdiff_t count, const double *times, double step, ptrdiff_t low, ptrdiff_t high, int low_slope, int high_slope) {
    const ptrdiff_t slabs = slab_count(views);
    const ptrdiff_t length = wave_length(count);
    for (ptrdiff_t place = low; place < high + 2 * length; place++) {
        for (ptrdiff_t k = 0; k < count; k++) {
            for (int pass = 0; pass < PASSES; pass++) {
                const ptrdiff_t shift = k * STEP_SHIFT + pass_shift[pass];
                const ptrdiff_t slab = place - shift;
                if (slab < low + low_slope * shift || slab >= high - high_slope * shift) {
                    continue;
                }
                const ptrdiff_t real = PERIODIC ? (slab + slabs) % slabs : slab;
                step_part(&views[k % PERIOD], pass, times[k], step, times[k + 1], slab_begin(views, real, slabs), slab_begin(views, real + 1, slabs));
            }
        }
    }
}

/* Steps by a wave; views hold the buffers as they stand after 0, 1, ... rotations. */
static void wave(const {{ prefix }}_solver *views, ptrdiff_t count, const double *times, double step) {
    const {{ prefix }}_solver *const s = views;
    const ptrdiff_t slabs = slab_count(s);
    const ptrdiff_t bands = s->team;
    ROWS_IN_PARALLEL
    for (ptrdiff_t part = 0; part < bands; part++) {
        band(views, count, times, step, slabs * part / bands, slabs * (part + 1) / bands, PERIODIC || part > 0, PERIODIC || part < bands - 1);
    }
    ROWS_IN_PARALLEL
    for (ptrdiff_t part = PERIODIC ? 0 : 1; part < bands; part++) {
        const ptrdiff_t between = slabs * part / bands;
        band(views, count, times, step, between, between, -1, -1);
    }
}

/* One step, pass by pass. */
static void plain(const {{ prefix }}_solver *s, double time, double step, double next) {
    const ptrdiff_t parts = s->team;
    for (int pass = 0; pass < PASSES; pass++) {
        ROWS_IN_PARALLEL
        for (ptrdiff_t part = 0; part < parts; part++) {
            step_part(s, pass, time, step, next, s->nodes[0] * part / parts{{ slab_rows }}, s->nodes[0] * (part + 1) / parts{{ slab_rows }});
        }
    }
}

void {{ prefix }}_advance_steps({{ prefix }}_solver *s, size_t count, const double *times, double step) {
    const ptrdiff_t most = wave_steps(s);
    ptrdiff_t left = (ptrdiff_t)count;
    s->last_step = step;
    while (left > 0) {
        const ptrdiff_t now = most < 1 ? 1 : left < most ? left : most;
        if (most < 1) {
            plain(s, times[0], step, times[1]);
        } else {
            {{ prefix }}_solver views[PERIOD];
            views[0] = *s;
            for (int turn = 1; turn < PERIOD; turn++) {
                views[turn] = views[turn - 1];
                rotate(&views[turn]);
            }
            wave(views, now, times, step);
        }
        for (ptrdiff_t k = 0; k < now; k++) {
            rotate(s);
        }
        times += now;
        left -= now;
    }
}

void {{ prefix }}_advance({{ prefix }}_solver *s, double time, double step, double next) {
    const double times[2] = { time, next };
    {{ prefix }}_advance_steps(s, 1, times, step);
}

