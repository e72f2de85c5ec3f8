/* Starts, takes steps together and prints a hash of every array of the state. Arguments: threads, steps, nodes. */
#include "PREFIX.h"
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

int main(int count, char **arguments) {
    size_t nodes[3] = { 1, 1, 1 };
    for (int k = 3; k < count && k < 6; k++) {
        nodes[k - 3] = (size_t)atol(arguments[k]);
    }
    const double parameters[64] = { 0 };
    const unsigned char given[64] = { 0 };
    double times[101];
    const int steps = atoi(arguments[2]);
    PREFIX_solver *const s = PREFIX_create(nodes, parameters, given, atoi(arguments[1]));
    if (s == NULL) {
        return 1;
    }
    PREFIX_start(s, 0.0);
    const double step = 0.5 / PREFIX_largest_rate(s, 0.0);
    PREFIX_first_step(s, 0.0, step);
    for (int k = 0; k <= steps; k++) {
        times[k] = k * step;
    }
    PREFIX_advance_steps(s, (size_t)steps, times, step);
    for (size_t k = 0; k < PREFIX_state_count(); k++) {
        uint64_t hash = 1469598103934665603u;
        const double *const values = PREFIX_state(s, k);
        for (size_t place = 0; place < PREFIX_points(s); place++) {
            uint64_t bits;
            memcpy(&bits, &values[place], sizeof bits);
            hash = (hash ^ bits) * 1099511628211u;
        }
        printf("%016llx %d\n", (unsigned long long)hash, values[PREFIX_points(s) / 2] - values[PREFIX_points(s) / 2] == 0.0);
    }
    PREFIX_destroy(s);
    return 0;
}
