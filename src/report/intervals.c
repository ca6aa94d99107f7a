#include "report/intervals.h"

#include "ballast/posterior.h"

#include <math.h>
#include <stdint.h>
#include <string.h>

static size_t slot_of(double a, double b) {
    uint64_t x, y;
    memcpy(&x, &a, sizeof x);
    memcpy(&y, &b, sizeof y);
    uint64_t h = (x ^ y * 0x9E3779B97F4A7C15u) * 0xBF58476D1CE4E5B9u;
    return (size_t)(h >> 32) % BALI_INTERVAL_SLOTS;
}

static bal_status interval(bali_intervals *intervals, double a, double b, double *low, double *high, bal_error *err) {
    size_t s = slot_of(a, b);
    if (intervals->slots[s].a != a || intervals->slots[s].b != b) {
        double l, h;
        bal_status status = bal_credible_interval(a, b, intervals->level, &l, &h, err);
        if (status != BAL_OK) return status;
        intervals->slots[s].a = a;
        intervals->slots[s].b = b;
        intervals->slots[s].low = l;
        intervals->slots[s].high = h;
    }
    *low = intervals->slots[s].low;
    *high = intervals->slots[s].high;
    return BAL_OK;
}

bal_status bali_intervals_row(bali_intervals *intervals, const double *post, size_t r, double *low, double *high, bal_error *err) {
    double before = 0, after = 0; /* what stands on each side of a cell: a total less the cell would lose small ones */
    for (size_t k = 0; k < r; k++) {
        low[k] = before;
        before += post[k];
    }
    for (size_t k = r; k-- > 0;) {
        double others = low[k] + after;
        after += post[k];
        low[k] = high[k] = NAN;
        if (post[k] > 0 && others > 0) {
            bal_status status = interval(intervals, post[k], others, &low[k], &high[k], err);
            if (status != BAL_OK) return status;
        } else if (post[k] > 0) {
            low[k] = high[k] = 1;
        }
    }
    return BAL_OK;
}
