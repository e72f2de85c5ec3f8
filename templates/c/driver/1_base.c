/* The command-line program around the kernel of '{{ prefix }}': options, step choice, output, checkpoints.
 * The numerics stand in {{ prefix }}.c; nothing here touches a value except to write it down.
 * Build by hand:  cc -std=c11 -O3 -march=native -ffp-contract=off -fno-math-errno -fopenmp main.c {{ prefix }}.c -lm
 */
#define _POSIX_C_SOURCE 200809L
#define _FILE_OFFSET_BITS 64

#include "{{ prefix }}.h"

#include <dirent.h>
#include <errno.h>
#include <inttypes.h>
#include <math.h>
#include <signal.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/types.h>
#include <time.h>
#include <unistd.h>
#ifdef _OPENMP
#include <omp.h>
#endif

_Static_assert(sizeof(double) == 8, "data files hold doubles of eight bytes");
_Static_assert(sizeof(size_t) >= 8, "grids need sizes of 64 bits");

#if defined(__GNUC__)
#define LIKE_PRINTF(text, first) __attribute__((format(printf, text, first)))
#else
#define LIKE_PRINTF(text, first)
#endif

enum { FINISHED = 0, BAD_ARGUMENTS = 1, ENVIRONMENT_FAILED = 2, BLEW_UP = 3, INTERRUPTED = 130 };
enum { SNAPSHOT = 0, GAUGE = 1, INTEGRAL = 2, MAXIMUM = 3 };

/* ---- messages and memory ---- */

/* Whether the line of progress still waits for its end; standard error is one for the whole program, and so is this. */
static int line_is_open = 0;

/* One line on standard error, after the model's name. */
static void say(const char *format, ...) LIKE_PRINTF(1, 2);
static void say(const char *format, ...)
{
    va_list arguments;
    if (line_is_open) {
        fputc('\n', stderr);
        line_is_open = 0;
    }
    fprintf(stderr, "%s: ", {{ prefix }}_describe()->name);
    va_start(arguments, format);
    vfprintf(stderr, format, arguments);
    va_end(arguments);
    fputc('\n', stderr);
    fflush(stderr);
}

static void *allocated(void *memory)
{
    if (memory == NULL) {
        say("not enough memory; fewer nodes need less");
        exit(ENVIRONMENT_FAILED);
    }
    return memory;
}

/* Zeroed; at least one element, so that an empty list has an address too. */
static void *new_list(size_t count, size_t size)
{
    return allocated(calloc(count > 0 ? count : 1, size));
}

/* ---- text that grows ---- */

struct text {
    char *bytes;
    size_t length, room;
};

static void add_bytes(struct text *text, const char *bytes, size_t count)
{
    if (text->length + count + 1 > text->room) {
        text->room = 2 * (text->length + count + 1);
        text->bytes = allocated(realloc(text->bytes, text->room));
    }
    memcpy(text->bytes + text->length, bytes, count);
    text->length += count;
    text->bytes[text->length] = '\0';
}

static void add_text(struct text *text, const char *string)
{
    add_bytes(text, string, strlen(string));
}

static void add_format(struct text *text, const char *format, ...) LIKE_PRINTF(2, 3);
static void add_format(struct text *text, const char *format, ...)
{
    char line[512], *bytes = line;
    va_list arguments, again;
    int count;
    va_start(arguments, format);
    va_copy(again, arguments);
    count = format != NULL ? vsnprintf(line, sizeof line, format, arguments) : 0;
    va_end(arguments);
    if (count >= (int)sizeof line) {
        bytes = new_list((size_t)count + 1, 1);
        vsnprintf(bytes, (size_t)count + 1, format, again);
    }
    va_end(again);
    if (count > 0) {
        add_bytes(text, bytes, (size_t)count);
    }
    if (bytes != line) {
        free(bytes);
    }
}

static void drop_text(struct text *text)
{
    free(text->bytes);
    text->bytes = NULL;
    text->length = text->room = 0;
}

/* Seventeen significant digits read back as the same double. */
static void add_number(struct text *text, double number)
{
    add_format(text, "%.17g", number);
}

/* JSON has neither infinities nor NaN. */
static void add_json_number(struct text *text, double number)
{
    if (isfinite(number)) {
        add_number(text, number);
    } else {
        add_text(text, "null");
    }
}

static void add_json_string(struct text *text, const char *string)
{
    const unsigned char *at = (const unsigned char *)string;
    add_text(text, "\"");
    for (; *at != '\0'; at++) {
        if (*at == '"' || *at == '\\') {
            add_format(text, "\\%c", *at);
        } else if (*at < 0x20) {
            add_format(text, "\\u%04x", (unsigned)*at);
        } else {
            add_bytes(text, (const char *)at, 1);
        }
    }
    add_text(text, "\"");
}

static void add_xml_string(struct text *text, const char *string)
{
    for (; *string != '\0'; string++) {
        switch (*string) {
        case '&': add_text(text, "&amp;"); break;
        case '<': add_text(text, "&lt;"); break;
        case '>': add_text(text, "&gt;"); break;
        case '"': add_text(text, "&quot;"); break;
        default: add_bytes(text, string, 1);
        }
    }
}

/* A CSV cell: quoted where it has to be. */
static void add_csv_cell(struct text *text, const char *cell)
{
    if (strpbrk(cell, ",\"\n\r") == NULL) {
        add_text(text, cell);
        return;
    }
    add_text(text, "\"");
    for (; *cell != '\0'; cell++) {
        add_bytes(text, cell, 1);
        if (*cell == '"') {
            add_text(text, "\"");
        }
    }
    add_text(text, "\"");
}

static double seconds_now(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

