/* Special functions against 60-digit arithmetic, handbook values, slow twins and laws; sums, moments, the maximiser. */
#include "base/mathematics.h"
#include "base/mathematics_values.h"
#include "support/harness.h"

#include <float.h>
#include <gsl/gsl_errno.h>
#include <gsl/gsl_sf_log.h>
#include <math.h>

#define LENGTH(array) (sizeof(array) / sizeof *(array))

/* Referee: mpmath, 60 digits. The promise is 1e-12 x max(1, |value|); what is kept is 64 DBL_EPSILON = 1.4e-14. */
START_TEST(log_pochhammer_agrees_with_many_digits) {
    for (size_t i = 0; i < LENGTH(log_pochhammer_values); i++) {
        const double *row = log_pochhammer_values[i];
        double got = bali_log_pochhammer(row[0], row[1]);
        if (!near(got, row[2], 64 * DBL_EPSILON))
            ck_abort_msg("ln (%.17g)_%.17g = %.17g, not %.17g", row[0], row[1], got, row[2]);
    }
}
END_TEST

/* For a >= 1 and n < 1 the error vanishes with n. Referee: mpmath, 60 digits. */
START_TEST(log_pochhammer_keeps_its_digits_for_small_n) {
    size_t met = 0;
    for (size_t i = 0; i < LENGTH(log_pochhammer_values); i++) {
        const double *row = log_pochhammer_values[i], a = row[0], n = row[1];
        if (a < 1 || n >= 1) continue;
        ck_assert_double_le(fabs(bali_log_pochhammer(a, n) - row[2]), 1e-14 * n * (1 + log(a + n)));
        met++;
    }
    ck_assert_uint_ge(met, 30);
}
END_TEST

/* Abramowitz M, Stegun IA (1964) Handbook of Mathematical Functions, 6.1.8-6.1.14, Tables 6.1 and 6.3; the values are
 * recalled from memory. For z < 1, Gamma(z) is exp(-ln (z)_(1-z)), as Gamma(1) = 1. Its digits are cut, not rounded. */
static const struct {
    double a, n, sign, printed, unit;
} handbook_gamma[] = {
    {1.0 / 4, 3.0 / 4, -1, 3.6256099082, 1e-10}, {1.0 / 3, 2.0 / 3, -1, 2.6789385347, 1e-10},
    {1.0 / 2, 1.0 / 2, -1, 1.7724538509, 1e-10}, {2.0 / 3, 1.0 / 3, -1, 1.3541179394, 1e-10},
    {3.0 / 4, 1.0 / 4, -1, 1.2254167024, 1e-10}, {1, 1.0 / 2, 1, 0.8862269255, 1e-10},
};

START_TEST(gamma_function_of_the_handbook) {
    double gamma = exp(handbook_gamma[_i].sign * bali_log_pochhammer(handbook_gamma[_i].a, handbook_gamma[_i].n));
    ck_assert_double_eq_tol(gamma, handbook_gamma[_i].printed, handbook_gamma[_i].unit);
}
END_TEST

/* The same source, recalled from memory: 100! and 1000! of Table 6.3, ln Gamma of Table 6.1, psi of 6.3.2 and 6.3.3,
 * which is the limit of ln (a)_h / h. */
START_TEST(factorials_and_psi_of_the_handbook) {
    ck_assert_double_eq_tol(exp(bali_log_pochhammer(1, 100) - 157 * log(10)), 9.3326215443944, 1e-12);
    ck_assert_double_eq_tol(exp(bali_log_pochhammer(1, 1000) - 2567 * log(10)), 4.0238726008, 1e-10);
    ck_assert_double_eq_tol(bali_log_pochhammer(1, 0.5), -0.1207822376, 5e-11);
    ck_assert_double_eq_tol(-bali_log_pochhammer(0.5, 0.5), 0.5723649429, 5e-11);
    const double h = 0x1p-60;
    ck_assert_double_eq_tol(bali_log_pochhammer(1, h) / h, -0.5772156649, 5e-11);
    ck_assert_double_eq_tol(bali_log_pochhammer(2, h) / h, 0.4227843351, 5e-11);
    ck_assert_double_eq_tol(bali_log_pochhammer(0.5, h) / h, -1.963510026021423, 16 * DBL_EPSILON);
}
END_TEST

static const double twin_starts[] = {1e-9, 0.01, 0.618, 1, 3.75, 9.5, 10, 1234.5, 1e7, 1e12};

/* A slow, obvious twin: the sum of ln(a + k) over k < n, with compensation. */
START_TEST(whole_steps_are_sums_of_logarithms) {
    const double a = twin_starts[_i];
    bali_sum twin = {0};
    for (int n = 1; n <= 3000; n++) {
        bali_sum_add(&twin, log(a + (n - 1)));
        double got = bali_log_pochhammer(a, n), want = bali_sum_value(&twin);
        if (!near(got, want, 64 * DBL_EPSILON)) ck_abort_msg("ln (%g)_%d = %.17g, not %.17g", a, n, got, want);
    }
}
END_TEST

/* ln (a)_(m+n) = ln (a)_m + ln (a + m)_n, for numbers whose sums are exact. */
START_TEST(rises_follow_one_another) {
    const double steps[] = {0x1p-20, 0.25, 0.75, 1, 2, 5.5, 9, 16, 17, 40.125, 1000, 123456.5, 1e9};
    const double starts[] = {0x1p-30, 0x1p-10, 0.5, 1, 2.25, 7.5, 10, 99.75, 0x1p20, 0x1p30};
    size_t met = 0;
    for (size_t i = 0; i < LENGTH(starts); i++)
        for (size_t j = 0; j < LENGTH(steps); j++)
            for (size_t k = 0; k < LENGTH(steps); k++) {
                double a = starts[i], m = steps[j], n = steps[k];
                if (a + m - m != a || m + n - n != m) continue;
                double whole = bali_log_pochhammer(a, m + n);
                double parts = bali_log_pochhammer(a, m) + bali_log_pochhammer(a + m, n);
                if (!near(parts, whole, 128 * DBL_EPSILON))
                    ck_abort_msg("a = %g, m = %g, n = %g: %.17g, %.17g", a, m, n, parts, whole);
                met++;
            }
    ck_assert_uint_ge(met, 1000);
}
END_TEST

START_TEST(log_pochhammer_has_its_domain) {
    const double outside[][2] = {{0, 1},   {-1, 1},  {NAN, 1},       {1, NAN},       {1, -1},
                                 {1, -0.5}, {-2.5, 3}, {INFINITY, 1}, {1, INFINITY}, {-INFINITY, 1}};
    for (size_t i = 0; i < LENGTH(outside); i++)
        ck_assert_double_nan(bali_log_pochhammer(outside[i][0], outside[i][1]));
    ck_assert_double_eq(bali_log_pochhammer(0.3, 0), 0);
    ck_assert_double_eq(bali_log_pochhammer(1e12, 0), 0);
    ck_assert_double_eq(bali_log_pochhammer(1, 1), 0);
    /* far outside the range of the promise the leading terms still hold */
    ck_assert(near(bali_log_pochhammer(1e300, 3), 3 * log(1e300), 4 * DBL_EPSILON));
    ck_assert(near(bali_log_pochhammer(1e-300, 0.5), log(1e-300) + log(sqrt(acos(-1))), 4 * DBL_EPSILON));
    ck_assert(near(bali_log_pochhammer(2, 1e200), 1e200 * (log(1e200) - 1), 4 * DBL_EPSILON));
}
END_TEST

/* Referee: mpmath, 60 digits. */
START_TEST(small_functions_agree_with_many_digits) {
    for (size_t i = 0; i < LENGTH(log1p_minus_values); i++) {
        const double *row = log1p_minus_values[i];
        ck_assert_double_le(fabs(bali_log1p_minus(row[0]) - row[1]), 8 * DBL_EPSILON * fabs(row[1]));
    }
    for (size_t i = 0; i < LENGTH(log_gamma_star_values); i++) {
        const double *row = log_gamma_star_values[i];
        double tolerance = fmin(4, 64 * row[1]) * DBL_EPSILON;
        ck_assert_double_le(fabs(bali_log_gamma_star(row[0]) - row[1]), tolerance);
    }
    for (size_t i = 0; i < LENGTH(normal_quantile_values); i++) {
        const double *row = normal_quantile_values[i];
        ck_assert(near(bali_normal_quantile(row[0]), row[1], 16 * DBL_EPSILON));
    }
    /* Abramowitz & Stegun 1964, Table 26.5, recalled from memory: 1.95996 at 0.025 in the upper tail */
    ck_assert_double_eq_tol(bali_normal_quantile(0.975), 1.95996, 5e-6);
}
END_TEST

START_TEST(small_functions_have_their_domains) {
    const double outside[] = {-1, -2, NAN, INFINITY, -INFINITY};
    for (size_t i = 0; i < LENGTH(outside); i++) {
        ck_assert_double_nan(bali_log1p_minus(outside[i]));
        ck_assert_double_nan(bali_log_gamma_star(outside[i]));
        ck_assert_double_nan(bali_normal_quantile(outside[i]));
    }
    ck_assert_double_nan(bali_log_gamma_star(0));
    ck_assert_double_nan(bali_log_gamma_star(0.49));
    ck_assert_double_nan(bali_normal_quantile(0));
    ck_assert_double_nan(bali_normal_quantile(1));
}
END_TEST

static double sum_of(const double *terms, size_t n) {
    bali_sum sum = {0};
    for (size_t i = 0; i < n; i++) bali_sum_add(&sum, terms[i]);
    return bali_sum_value(&sum);
}

START_TEST(sums_keep_what_plain_addition_loses) {
    ck_assert_double_eq(sum_of(NULL, 0), 0);
    ck_assert_double_eq(sum_of((const double[]){1, 1e100, 1, -1e100}, 4), 2);
    ck_assert_double_eq(sum_of((const double[]){1e100, 1, -1e100, 1}, 4), 2);
    ck_assert_double_eq(sum_of((const double[]){0x1p53, 1, 1, 1, 1}, 5), 0x1p53 + 4);
    bali_sum sum = {0};
    for (int i = 0; i < 10000000; i++) bali_sum_add(&sum, 0.1); /* plain addition gives 999999.9998389754 */
    ck_assert_double_eq(bali_sum_value(&sum), 1e6);
}
END_TEST

START_TEST(infinite_terms_stay_infinite) {
    ck_assert_double_eq(sum_of((const double[]){-3, -INFINITY, -2}, 3), -INFINITY);
    ck_assert_double_eq(sum_of((const double[]){INFINITY, 1}, 2), INFINITY);
    ck_assert_double_nan(sum_of((const double[]){INFINITY, -INFINITY}, 2));
    ck_assert_double_nan(sum_of((const double[]){1, NAN, 1}, 3));
}
END_TEST

static bali_moments moments_of(const double *values, size_t n) {
    bali_moments moments = {0};
    for (size_t i = 0; i < n; i++) bali_moments_add(&moments, values[i]);
    return moments;
}

START_TEST(moments_of_a_few_values) {
    bali_moments moments = moments_of((const double[]){1, 2, 3, 4}, 4); /* by hand: mean 5/2, squares 5 */
    ck_assert_double_eq(moments.n, 4);
    ck_assert_double_eq(moments.mean, 2.5);
    ck_assert_double_eq(moments.squares, 5);
    ck_assert_double_eq(bali_moments_standard_error(&moments), sqrt(5.0 / 3 / 4));
    bali_moments none = {0}, one = moments_of((const double[]){7}, 1);
    ck_assert_double_nan(bali_moments_standard_error(&none));
    ck_assert_double_nan(bali_moments_standard_error(&one));
    bali_moments far = moments_of((const double[]){1e9 + 4, 1e9 + 7, 1e9 + 13, 1e9 + 16}, 4); /* variance 30 exactly */
    ck_assert_double_eq(far.mean, 1e9 + 10);
    ck_assert_double_eq(far.squares, 90);
}
END_TEST

/* However a stream is cut, the merged halves have the whole's moments. */
START_TEST(merged_moments_are_those_of_the_union) {
    double values[40];
    for (size_t i = 0; i < LENGTH(values); i++) values[i] = 1000 + sin((double)(i * i)) * (double)i;
    bali_moments whole = moments_of(values, LENGTH(values));
    for (size_t cut = 0; cut <= LENGTH(values); cut++) {
        bali_moments first = moments_of(values, cut), second = moments_of(values + cut, LENGTH(values) - cut);
        bali_moments_merge(&first, &second);
        ck_assert_double_eq(first.n, whole.n);
        ck_assert(near(first.mean, whole.mean, 8 * DBL_EPSILON));
        ck_assert(near(first.squares, whole.squares, 64 * DBL_EPSILON));
    }
    bali_moments none = {0};
    bali_moments_merge(&none, &(bali_moments){0});
    ck_assert_double_eq(none.n, 0);
    ck_assert_double_eq(none.mean, 0);
}
END_TEST

typedef struct hill {
    double top;
    size_t calls;
} hill;

static double parabola(double x, void *context) {
    hill *h = context;
    h->calls++;
    return -(x - h->top) * (x - h->top);
}

static double log_likelihood(double x, void *context) { /* 3 successes of 10: the top is at 0.3 */
    ((hill *)context)->calls++;
    return x > 0 && x < 1 ? 3 * log(x) + 7 * log1p(-x) : -INFINITY;
}

static double kink(double x, void *context) {
    hill *h = context;
    h->calls++;
    return -fabs(x - h->top);
}

static double peak_in_a_void(double x, void *context) {
    hill *h = context;
    h->calls++;
    return fabs(x - h->top) < 0.05 ? -(x - h->top) * (x - h->top) : -INFINITY;
}

static double flat_quartic(double x, void *context) {
    hill *h = context;
    h->calls++;
    return -pow(x - h->top, 4);
}

static double nothing(double x, void *context) {
    (void)x;
    ((hill *)context)->calls++;
    return -INFINITY;
}

static const struct {
    double (*f)(double x, void *context);
    double low, high, top, tolerance;
    size_t most_calls;
} hills[] = {
    {parabola, -1, 3, 0.7, 1e-6, 15},          {parabola, 0, 1e6, 123456.75, 1e-3, 30},
    {log_likelihood, 0, 1, 0.3, 1e-6, 30},     {log_likelihood, 0.01, 0.99, 0.3, 1e-6, 30},
    {log_likelihood, -2, 4, 0.3, 1e-6, 40},    {kink, -3, 3, 0.1234, 1e-9, 80},
    {peak_in_a_void, 0, 1, 0.871, 1e-6, 100},  {peak_in_a_void, 0, 1, 0.05, 1e-6, 100},
    {flat_quartic, 0, 1, 0.4, 1e-3, 40},       {kink, 0, 1, 0.5, 0.1, 12},
};

START_TEST(tops_are_found) {
    hill h = {.top = hills[_i].top};
    double x = bali_maximise(hills[_i].f, &h, hills[_i].low, hills[_i].high, hills[_i].tolerance);
    ck_assert_double_eq_tol(x, hills[_i].top, hills[_i].tolerance);
    ck_assert_msg(h.calls <= hills[_i].most_calls, "%zu calls", h.calls);
}
END_TEST

START_TEST(a_top_at_an_end_is_that_end) {
    hill left = {.top = -5}, right = {.top = 9};
    ck_assert_double_eq(bali_maximise(parabola, &left, 0, 1, 1e-6), 0);
    ck_assert_double_eq(bali_maximise(parabola, &right, 0, 1, 1e-6), 1);
    ck_assert_double_eq(bali_maximise(kink, &left, -2, 1, 1e-9), -2);
    hill point = {.top = 3};
    ck_assert_double_eq(bali_maximise(parabola, &point, 2, 2, 1e-6), 2);
}
END_TEST

START_TEST(a_search_without_hope_ends_inside) {
    hill h = {0};
    double x = bali_maximise(nothing, &h, 2, 5, 1e-6);
    ck_assert(x >= 2 && x <= 5);
    ck_assert_uint_le(h.calls, 200);
    x = bali_maximise(parabola, &h, -1, 1, 0); /* a tolerance of 0 is as good as the doubles allow, and ends */
    ck_assert_double_eq_tol(x, 0, 1e-7);
}
END_TEST

/* GSL's own handler would abort. */
START_TEST(gsl_reports_instead_of_aborting) {
    bali_mathematics_init();
    gsl_sf_result result;
    ck_assert_int_eq(gsl_sf_log_e(-1, &result), GSL_EDOM);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("mathematics");
    TCase *tc = tcase_create("mathematics");
    tcase_set_timeout(tc, 60);
    tcase_add_test(tc, log_pochhammer_agrees_with_many_digits);
    tcase_add_test(tc, log_pochhammer_keeps_its_digits_for_small_n);
    tcase_add_loop_test(tc, gamma_function_of_the_handbook, 0, (int)LENGTH(handbook_gamma));
    tcase_add_test(tc, factorials_and_psi_of_the_handbook);
    tcase_add_loop_test(tc, whole_steps_are_sums_of_logarithms, 0, (int)LENGTH(twin_starts));
    tcase_add_test(tc, rises_follow_one_another);
    tcase_add_test(tc, log_pochhammer_has_its_domain);
    tcase_add_test(tc, small_functions_agree_with_many_digits);
    tcase_add_test(tc, small_functions_have_their_domains);
    tcase_add_test(tc, sums_keep_what_plain_addition_loses);
    tcase_add_test(tc, infinite_terms_stay_infinite);
    tcase_add_test(tc, moments_of_a_few_values);
    tcase_add_test(tc, merged_moments_are_those_of_the_union);
    tcase_add_loop_test(tc, tops_are_found, 0, (int)LENGTH(hills));
    tcase_add_test(tc, a_top_at_an_end_is_that_end);
    tcase_add_test(tc, a_search_without_hope_ends_inside);
    tcase_add_test(tc, gsl_reports_instead_of_aborting);
    suite_add_tcase(s, tc);
    return s;
}

int main(void) {
    return run_suite(suite());
}
