#include "report/intervals.h"

#include "ballast/posterior.h"
#include "support/fixtures.h"

#include <math.h>
#include <stdlib.h>
#include <time.h>

enum { MOST = 8 };

/* Each cell's interval as it is defined, without a memo. */
static void check_row(bali_intervals *intervals, const double *post, size_t r) {
    double low[MOST], high[MOST];
    bal_error err = {0};
    ck_assert_msg(bali_intervals_row(intervals, post, r, low, high, &err) == BAL_OK, "%s", err.message);
    for (size_t k = 0; k < r; k++) {
        double others = 0, expected_low, expected_high;
        for (size_t o = 0; o < r; o++) others += o == k ? 0 : post[o];
        ck_assert_int_eq(bal_credible_interval(post[k], others, intervals->level, &expected_low, &expected_high, NULL), BAL_OK);
        ck_assert_msg(near(low[k], expected_low, 1e-14) && near(high[k], expected_high, 1e-14), "Beta(%g, %g)", post[k], others);
    }
}

START_TEST(intervals_are_those_of_each_cell) {
    dice d = dice_of(_i);
    bali_intervals intervals = {.level = 0.8 + 0.04 * _i};
    for (size_t row = 0; row < 60; row++) {
        double post[MOST];
        size_t r = 2 + roll(&d, MOST - 1);
        for (size_t k = 0; k < r; k++) post[k] = 0.5 + (double)roll(&d, 12); /* few values: many meet in the memo */
        check_row(&intervals, post, r);
    }
}
END_TEST

/* More pairs than the memo has places: every place is fought for. */
START_TEST(a_full_memo_gives_way) {
    bali_intervals intervals = {.level = 0.95};
    for (size_t pass = 0; pass < 2; pass++)
        for (size_t i = 0; i < BALI_INTERVAL_SLOTS; i++)
            check_row(&intervals, (const double[]){(double)(i % 50) + 0.5, (double)(i / 50) + 0.25}, 2);
}
END_TEST

START_TEST(structural_zeros_have_no_interval) {
    bali_intervals intervals = {.level = 0.9};
    double low[3], high[3], low_without[2], high_without[2];
    ck_assert_int_eq(bali_intervals_row(&intervals, (const double[]){2, 0, 3}, 3, low, high, NULL), BAL_OK);
    ck_assert_int_eq(bali_intervals_row(&intervals, (const double[]){2, 3}, 2, low_without, high_without, NULL), BAL_OK);
    ck_assert(isnan(low[1]) && isnan(high[1]));
    ck_assert(low[0] == low_without[0] && high[0] == high_without[0] && low[2] == low_without[1] && high[2] == high_without[1]);
}
END_TEST

START_TEST(what_alone_can_happen_is_certain) {
    bali_intervals intervals = {.level = 0.9};
    double low[3], high[3];
    ck_assert_int_eq(bali_intervals_row(&intervals, (const double[]){0, 7, 0}, 3, low, high, NULL), BAL_OK);
    ck_assert(low[1] == 1 && high[1] == 1 && isnan(low[0]) && isnan(high[2]));
    ck_assert_int_eq(bali_intervals_row(&intervals, (const double[]){0.5}, 1, low, high, NULL), BAL_OK);
    ck_assert(low[0] == 1 && high[0] == 1);
    ck_assert_int_eq(bali_intervals_row(&intervals, (const double[]){0, 0}, 2, low, high, NULL), BAL_OK);
    ck_assert(isnan(low[0]) && isnan(low[1]));
}
END_TEST

/* A small cell beside large ones: what is left for it is not lost in their sum. */
START_TEST(small_cells_keep_their_digits) {
    bali_intervals intervals = {.level = 0.9};
    double low[3], high[3], expected_low, expected_high;
    ck_assert_int_eq(bali_intervals_row(&intervals, (const double[]){1e9, 1e-3, 2e-3}, 3, low, high, NULL), BAL_OK);
    ck_assert_int_eq(bal_credible_interval(1e9, 3e-3, 0.9, &expected_low, &expected_high, NULL), BAL_OK);
    ck_assert(low[0] == expected_low && high[0] == expected_high);
}
END_TEST

/* The largest variable there may be: seconds would mean that every cell sums up the whole row again. */
START_TEST(a_wide_row_takes_no_long_time) {
    enum { WIDE = 65534 };
    double *post = malloc(WIDE * sizeof *post), *low = malloc(WIDE * sizeof *low), *high = malloc(WIDE * sizeof *high);
    ck_assert(post && low && high);
    for (size_t k = 0; k < WIDE; k++) post[k] = 1.5;
    bali_intervals intervals = {.level = 0.95};
    clock_t start = clock();
    ck_assert_int_eq(bali_intervals_row(&intervals, post, WIDE, low, high, NULL), BAL_OK);
    ck_assert_msg((double)(clock() - start) / CLOCKS_PER_SEC < 1.5, "%g s", (double)(clock() - start) / CLOCKS_PER_SEC);
    double expected_low, expected_high;
    ck_assert_int_eq(bal_credible_interval(1.5, 1.5 * (WIDE - 1), 0.95, &expected_low, &expected_high, NULL), BAL_OK);
    ck_assert(low[0] == expected_low && high[WIDE - 1] == expected_high && low[777] == expected_low);
    free(post);
    free(low);
    free(high);
}
END_TEST

START_TEST(a_bad_level_is_refused) {
    bali_intervals intervals = {.level = 2};
    double low[2], high[2];
    bal_error err = {0};
    ck_assert_int_eq(bali_intervals_row(&intervals, (const double[]){2, 3}, 2, low, high, &err), BAL_ERR_ARGUMENT);
    ck_assert_str_eq(err.code, "bad-level");
    ck_assert_int_eq(bali_intervals_row(&intervals, (const double[]){2, 3}, 2, low, high, NULL),
                     BAL_ERR_ARGUMENT); /* not remembered */
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("intervals");
    TCase *c = tcase_create("intervals");
    tcase_add_loop_test(c, intervals_are_those_of_each_cell, 0, 5);
    tcase_add_test(c, a_full_memo_gives_way);
    tcase_add_test(c, structural_zeros_have_no_interval);
    tcase_add_test(c, what_alone_can_happen_is_certain);
    tcase_add_test(c, small_cells_keep_their_digits);
    tcase_add_test(c, a_wide_row_takes_no_long_time);
    tcase_add_test(c, a_bad_level_is_refused);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
