/* Credible intervals of rows, each pair of shapes computed once. */
#ifndef REPORT_INTERVALS_H
#define REPORT_INTERVALS_H

#include "ballast/error.h"

enum { BALI_INTERVAL_SLOTS = 1024 };

/** A memo of intervals at one level. Start it with = {.level = ...}. */
typedef struct bali_intervals {
    double level;
    struct {
        double a, b, low, high;
    } slots[BALI_INTERVAL_SLOTS];
} bali_intervals;

/**
 * The equal-tailed intervals of a row's cells under Dirichlet(post).
 *
 * post       r numbers, alpha + n; 0 is a structural zero, whose limits are NaN
 * low, high  r numbers, overwritten; 1 and 1 where no other cell of the row can happen
 */
BAL_MUST_CHECK bal_status bali_intervals_row(bali_intervals *intervals, const double *post, size_t r, double *low, double *high,
                                             bal_error *err);

#endif
