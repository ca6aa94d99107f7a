/* Progress on standard error: only on a terminal, only for work longer than a second. */
#ifndef BASE_PROGRESS_H
#define BASE_PROGRESS_H

#include <stdbool.h>
#include <stdint.h>

typedef struct bali_progress {
    const char *what;   /* such as "reading" */
    bool shown, enabled;
    double started, last; /* seconds of the monotonic clock */
} bali_progress;

/** quiet, or standard error not a terminal (or TERM=dumb): nothing will be shown. */
void bali_progress_start(bali_progress *progress, const char *what, bool quiet);
/** total 0 = unknown. At most ten updates a second. */
void bali_progress_step(bali_progress *progress, uint64_t done, uint64_t total);
/** Wipes the line. */
void bali_progress_end(bali_progress *progress);

#endif
