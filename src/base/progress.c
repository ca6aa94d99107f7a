#include "base/progress.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <unistd.h>

enum { WIDTH = 40 };
static const double patience_seconds = 1, between_seconds = 0.1;

static double now_seconds(void) {
    struct timespec now = {0};
    (void)clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

/* Whether standard error is a terminal on which a line can be written over. */
static bool is_patient_terminal(void) {
    const char *kind = getenv("TERM");
    return isatty(STDERR_FILENO) && (!kind || strcmp(kind, "dumb") != 0);
}

void bali_progress_start(bali_progress *progress, const char *what, bool quiet) {
    *progress = (bali_progress){.what = what, .enabled = !quiet && is_patient_terminal()};
    if (progress->enabled) progress->started = now_seconds();
}

void bali_progress_step(bali_progress *progress, uint64_t done, uint64_t total) {
    if (!progress->enabled) return;
    double now = now_seconds();
    if (now - progress->started < patience_seconds || (progress->shown && now - progress->last < between_seconds)) return;
    char line[WIDTH + 1];
    if (total > 0) {
        int percent = (int)(100 * ((double)(done < total ? done : total) / (double)total));
        (void)snprintf(line, sizeof line, "%s %d %%", progress->what, percent);
    } else {
        (void)snprintf(line, sizeof line, "%s %llu", progress->what, (unsigned long long)done);
    }
    (void)fprintf(stderr, "\r%-*s", WIDTH, line);
    (void)fflush(stderr);
    progress->shown = true;
    progress->last = now;
}

void bali_progress_end(bali_progress *progress) {
    if (progress->shown) {
        (void)fprintf(stderr, "\r%*s\r", WIDTH, "");
        (void)fflush(stderr);
    }
    progress->shown = progress->enabled = false;
}
