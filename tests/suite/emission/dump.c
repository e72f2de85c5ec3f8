/* Arguments: threads, then the number of nodes of each axis. Prints the bits of everything that a solver computes. */
#include "PREFIX.h"

#include <inttypes.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static void show(const char *what, const double *values, size_t count)
{
    printf("%s", what);
    for (size_t i = 0; i < count; i++) {
        uint64_t bits;
        memcpy(&bits, values + i, sizeof bits);
        printf(" %016" PRIx64, bits);
    }
    printf("\n");
}

int main(int count, char **arguments)
{
    const PREFIX_description *const all = PREFIX_describe();
    const unsigned char given[1] = { 0 };
    const double parameters[1] = { 0.0 };
    size_t nodes[3] = { 0, 0, 0 };
    for (int i = 2; i < count && i < 5; i++) {
        nodes[i - 2] = (size_t)strtoul(arguments[i], NULL, 10);
    }
    PREFIX_solver *const s = PREFIX_create(nodes, parameters, given, atoi(arguments[1]));
    if (s == NULL) {
        return 1;
    }
    const double step = 0.0009765625 * 1.1;
    double time = 0.3;
    PREFIX_start(s, time);
    PREFIX_first_step(s, time, step);
    for (size_t k = 0; k < all->outputs; k++) {
        PREFIX_begin_maximum(s, k, time);
    }
    for (int n = 0; n < 3; n++) {
        const double rate = PREFIX_largest_rate(s, time);
        show("rate", &rate, 1);
        PREFIX_advance(s, time, step, time + step);
        time = time + step;
        for (size_t k = 0; k < all->outputs; k++) {
            PREFIX_accumulate_maximum(s, k, time);
            show("output", PREFIX_output(s, k, time), PREFIX_points(s));
        }
        for (size_t k = 0; k < PREFIX_state_count(); k++) {
            show("state", PREFIX_state(s, k), PREFIX_points(s));
        }
    }
    for (size_t k = 0; k < all->fields; k++) {
        show("field", PREFIX_field(s, k), PREFIX_points(s));
    }
    for (size_t a = 0; a < all->axes; a++) {
        const double axis[3] = { PREFIX_low(s, a), PREFIX_high(s, a), PREFIX_spacing(s, a) };
        show("axis", axis, 3);
    }
    for (size_t k = 0; k < all->parameters; k++) {
        const double parameter[2] = { PREFIX_parameter(s, k), PREFIX_parameter_high(s, k) };
        show("parameter", parameter, 2);
    }
    for (const char *c = all->model_text; *c != '\0'; c++) {
        printf("%02x", (unsigned)(unsigned char)*c);
    }
    printf("\n");
    PREFIX_destroy(s);
    return 0;
}
