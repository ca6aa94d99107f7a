/* The beta distribution against 60-digit arithmetic, published limits, closed forms, GSL where GSL holds, and laws. */
#include "base/beta.h"
#include "base/beta_values.h"
#include "base/mathematics.h"
#include "support/harness.h"

#include <float.h>
#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdbool.h>

#define LENGTH(array) (sizeof(array) / sizeof *(array))

static double quantile(double a, double b, double p) {
    double x = NAN;
    if (!bali_beta_quantile(a, b, p, &x)) ck_abort_msg("no quantile at a = %.17g, b = %.17g, p = %.17g", a, b, p);
    return x;
}

typedef struct tails {
    double below, above;
} tails;

static tails tails_at(double a, double b, double x) {
    tails t = {NAN, NAN};
    bool known = bali_beta_cdf(a, b, x, &t.below, &t.above);
    if (!known) ck_abort_msg("no tails at a = %.17g, b = %.17g, x = %.17g", a, b, x);
    return t;
}

static double below(double a, double b, double x) {
    return tails_at(a, b, x).below;
}

static double above(double a, double b, double x) {
    return tails_at(a, b, x).above;
}

/* Referee: mpmath, 60 digits, by two methods. The promise is 1e-12 relative of the smaller tail. */
START_TEST(tails_agree_with_many_digits) {
    for (size_t i = 0; i < LENGTH(beta_tail_values); i++) {
        const double *row = beta_tail_values[i];
        tails got = tails_at(row[0], row[1], row[2]);
        double error = row[3] <= row[4] ? fabs(got.below / row[3] - 1) : fabs(got.above / row[4] - 1);
        bool good = error <= 5e-13 && near(got.below, row[3], 5e-13) && near(got.above, row[4], 5e-13);
        ck_assert_msg(good, "a = %.17g, b = %.17g, x = %.17g: %g relative", row[0], row[1], row[2], error);
    }
}
END_TEST

/* 1e-10 of the smaller of x and 1 - x, and half a step of the doubles for the value and half for the reference. */
static bool is_quantile(double got, double want) {
    return fabs(got - want) <= 1e-10 * fmin(want, 1 - want) + (want > 0.5 ? DBL_EPSILON / 2 : 0x1p-1074);
}

static void check_quantiles(const double (*rows)[4], size_t n) {
    for (size_t i = 0; i < n; i++) {
        const double *row = rows[i];
        double got = quantile(row[0], row[1], row[2]);
        bool good = row[3] == 0 || row[3] == 1 ? got == row[3] : is_quantile(got, row[3]);
        ck_assert_msg(good, "a = %.17g, b = %.17g, p = %.17g: %.17g, not %.17g", row[0], row[1], row[2], got, row[3]);
    }
}

START_TEST(quantiles_agree_with_many_digits) {
    check_quantiles(beta_quantile_values, LENGTH(beta_quantile_values));
}
END_TEST

START_TEST(quantiles_of_tiny_shapes_agree_with_many_digits) {
    check_quantiles(narrow_quantile_values, LENGTH(narrow_quantile_values));
}
END_TEST

/* These published values are all recalled from memory. Tolerances are half a unit of the last place, or as said. */
static const struct {
    const char *name;
    double a, b, p, printed, tolerance;
} published[] = {
    /* Gelman, Carlin, Stern, Dunson, Vehtari & Rubin 2013, Bayesian Data Analysis, 3rd ed., section 2.4 and Table 2.1:
     * 437 girls in 980 births; prior mean and size m, s give Beta(437 + m s, 543 + (1 - m) s) */
    {"BDA, prior 0.5, 2, median", 438, 544, 0.5, 0.446, 0.0005},
    {"BDA, prior 0.5, 2, lower", 438, 544, 0.025, 0.415, 0.0005},
    {"BDA, prior 0.5, 2, upper", 438, 544, 0.975, 0.477, 0.0005},
    {"BDA, prior 0.485, 2, median", 437.97, 544.03, 0.5, 0.446, 0.0005},
    {"BDA, prior 0.485, 2, lower", 437.97, 544.03, 0.025, 0.415, 0.0005},
    {"BDA, prior 0.485, 2, upper", 437.97, 544.03, 0.975, 0.477, 0.0005},
    {"BDA, prior 0.485, 5, median", 439.425, 545.575, 0.5, 0.446, 0.0005},
    {"BDA, prior 0.485, 5, lower", 439.425, 545.575, 0.025, 0.415, 0.0005},
    {"BDA, prior 0.485, 5, upper", 439.425, 545.575, 0.975, 0.477, 0.0005},
    {"BDA, prior 0.485, 10, median", 441.85, 548.15, 0.5, 0.446, 0.0005},
    {"BDA, prior 0.485, 10, lower", 441.85, 548.15, 0.025, 0.415, 0.0005},
    {"BDA, prior 0.485, 10, upper", 441.85, 548.15, 0.975, 0.477, 0.0005},
    {"BDA, prior 0.485, 20, median", 446.7, 553.3, 0.5, 0.447, 0.0005},
    {"BDA, prior 0.485, 20, lower", 446.7, 553.3, 0.025, 0.416, 0.0005},
    {"BDA, prior 0.485, 20, upper", 446.7, 553.3, 0.975, 0.478, 0.0005},
    {"BDA, prior 0.485, 100, median", 485.5, 594.5, 0.5, 0.450, 0.0005},
    {"BDA, prior 0.485, 100, lower", 485.5, 594.5, 0.025, 0.420, 0.0005},
    {"BDA, prior 0.485, 100, upper", 485.5, 594.5, 0.975, 0.479, 0.0005},
    {"BDA, prior 0.485, 200, median", 534, 646, 0.5, 0.453, 0.0005},
    {"BDA, prior 0.485, 200, lower", 534, 646, 0.025, 0.424, 0.0005},
    {"BDA, prior 0.485, 200, upper", 534, 646, 0.975, 0.481, 0.0005},
    /* Brown, Cai & DasGupta 2001, Statistical Science 16:101-133, Table 5: 95 % limits of the modified Jeffreys
     * interval, x of n, Beta(x + 1/2, n - x + 1/2). Three entries are one unit of the last place off what they are
     * recalled as, by recall or by the paper's rounding: those have a whole unit's tolerance. */
    {"BCD 2 of 7, lower", 2.5, 5.5, 0.025, 0.065, 0.0005},
    {"BCD 2 of 7, upper", 2.5, 5.5, 0.975, 0.648, 0.0005},
    {"BCD 3 of 7, lower", 3.5, 4.5, 0.025, 0.139, 0.0005},
    {"BCD 3 of 7, upper", 3.5, 4.5, 0.975, 0.766, 0.001},
    {"BCD 2 of 8, lower", 2.5, 6.5, 0.025, 0.056, 0.0005},
    {"BCD 2 of 8, upper", 2.5, 6.5, 0.975, 0.592, 0.0005},
    {"BCD 3 of 8, lower", 3.5, 5.5, 0.025, 0.119, 0.0005},
    {"BCD 3 of 8, upper", 3.5, 5.5, 0.975, 0.705, 0.0005},
    {"BCD 4 of 8, lower", 4.5, 4.5, 0.025, 0.199, 0.0005},
    {"BCD 4 of 8, upper", 4.5, 4.5, 0.975, 0.801, 0.0005},
    {"BCD 2 of 9, lower", 2.5, 7.5, 0.025, 0.049, 0.0005},
    {"BCD 2 of 9, upper", 2.5, 7.5, 0.975, 0.544, 0.0005},
    {"BCD 3 of 9, lower", 3.5, 6.5, 0.025, 0.104, 0.0005},
    {"BCD 3 of 9, upper", 3.5, 6.5, 0.975, 0.652, 0.0005},
    {"BCD 4 of 9, lower", 4.5, 5.5, 0.025, 0.173, 0.0005},
    {"BCD 4 of 9, upper", 4.5, 5.5, 0.975, 0.746, 0.0005},
    {"BCD 2 of 10, lower", 2.5, 8.5, 0.025, 0.044, 0.0005},
    {"BCD 2 of 10, upper", 2.5, 8.5, 0.975, 0.503, 0.0005},
    {"BCD 3 of 10, lower", 3.5, 7.5, 0.025, 0.093, 0.0005},
    {"BCD 3 of 10, upper", 3.5, 7.5, 0.975, 0.606, 0.0005},
    {"BCD 4 of 10, lower", 4.5, 6.5, 0.025, 0.153, 0.0005},
    {"BCD 4 of 10, upper", 4.5, 6.5, 0.975, 0.696, 0.0005},
    {"BCD 2 of 11, lower", 2.5, 9.5, 0.025, 0.040, 0.0005},
    {"BCD 2 of 11, upper", 2.5, 9.5, 0.975, 0.467, 0.0005},
    {"BCD 3 of 11, lower", 3.5, 8.5, 0.025, 0.084, 0.001},
    {"BCD 3 of 11, upper", 3.5, 8.5, 0.975, 0.565, 0.0005},
    {"BCD 4 of 11, lower", 4.5, 7.5, 0.025, 0.137, 0.0005},
    {"BCD 4 of 11, upper", 4.5, 7.5, 0.975, 0.652, 0.0005},
    {"BCD 2 of 12, lower", 2.5, 10.5, 0.025, 0.036, 0.0005},
    {"BCD 2 of 12, upper", 2.5, 10.5, 0.975, 0.436, 0.0005},
    {"BCD 3 of 12, lower", 3.5, 9.5, 0.025, 0.076, 0.0005},
    {"BCD 3 of 12, upper", 3.5, 9.5, 0.975, 0.529, 0.0005},
    {"BCD 4 of 12, lower", 4.5, 8.5, 0.025, 0.124, 0.001},
    {"BCD 4 of 12, upper", 4.5, 8.5, 0.975, 0.612, 0.0005},
    /* the same table's modified limit for 0 of n, 1 - 0.025^(1/n), which is the 97.5 % point of Beta(1, n) */
    {"BCD 0 of 7, upper", 1, 7, 0.975, 0.410, 0.0005},
    {"BCD 0 of 8, upper", 1, 8, 0.975, 0.369, 0.0005},
    {"BCD 0 of 9, upper", 1, 9, 0.975, 0.336, 0.0005},
    {"BCD 0 of 10, upper", 1, 10, 0.975, 0.308, 0.0005},
    {"BCD 0 of 11, upper", 1, 11, 0.975, 0.285, 0.0005},
    {"BCD 0 of 12, upper", 1, 12, 0.975, 0.265, 0.0005},
    /* Agresti 2002, Categorical Data Analysis, 2nd ed., section 1.4.3: 0 vegetarians of 25, uniform prior */
    {"Agresti, lower", 1, 26, 0.025, 0.001, 0.0005},
    {"Agresti, upper", 1, 26, 0.975, 0.132, 0.0005},
    {"Agresti, Clopper-Pearson", 1, 25, 0.975, 0.137, 0.0005},
    /* NIST/SEMATECH e-Handbook of Statistical Methods 7.2.4.2: 4 of 20, 90 %; its upper limit came from a spreadsheet's
     * goal seek and is 9e-7 off */
    {"NIST 7.2.4.2, lower", 4, 17, 0.05, 0.071354, 5e-7},
    {"NIST 7.2.4.2, upper", 5, 16, 0.95, 0.401029, 2e-6},
};

START_TEST(published_limits) {
    double x = quantile(published[_i].a, published[_i].b, published[_i].p);
    ck_assert_msg(fabs(x - published[_i].printed) <= published[_i].tolerance, "%s: %.7f", published[_i].name, x);
}
END_TEST

/* NIST/SEMATECH e-Handbook 1.3.6.7.2 (t at 0.975, through Beta(nu/2, 1/2)) and 1.3.6.7.3 (F at 0.95), from memory. */
static const double t_table[][2] = {{1, 12.706}, {2, 4.303}, {5, 2.571}, {10, 2.228}, {30, 2.042}, {100, 1.984}};
static const double f_table[][3] = {{1, 1, 161.448},  {2, 10, 4.103}, {5, 10, 3.326},
                                    {10, 10, 2.978}, {3, 20, 3.098}, {10, 20, 2.348}};

START_TEST(tables_of_t_and_f) {
    for (size_t i = 0; i < LENGTH(t_table); i++) {
        double nu = t_table[i][0], x = quantile(nu / 2, 0.5, 0.05);
        ck_assert_double_eq_tol(sqrt(nu * (1 - x) / x), t_table[i][1], 0.0005);
    }
    for (size_t i = 0; i < LENGTH(f_table); i++) {
        double d1 = f_table[i][0], d2 = f_table[i][1], x = quantile(d1 / 2, d2 / 2, 0.95);
        ck_assert_double_eq_tol(d2 * x / (d1 * (1 - x)), f_table[i][2], 0.0005);
    }
}
END_TEST

/* Laplace's births in Paris, 241,945 girls and 251,527 boys: P(theta >= 1/2) = 1.15e-42 (Gelman et al. 2013, section
 * 2.4, recalled from memory). */
START_TEST(births_of_laplace) {
    ck_assert_double_eq_tol(above(241946, 251528, 0.5) * 1e42, 1.15, 0.005);
}
END_TEST

/* I_x(1, b) = 1 - (1 - x)^b, I_x(a, 1) = x^a, and the arcsine law I_x(1/2, 1/2) = (2/pi) arcsin sqrt x. */
START_TEST(closed_forms) {
    const double shapes[] = {1e-6, 1e-3, 0.3, 1, 2, 77.5, 1e4, 1e9}, pi = acos(-1);
    const double probabilities[] = {1e-12, 1e-4, 0.005, 0.025, 0.3, 0.5, 0.7, 0.975, 1 - 0x1p-30};
    for (size_t j = 0; j < LENGTH(probabilities); j++) {
        double p = probabilities[j], sine = sin(pi / 2 * p);
        ck_assert(is_quantile(quantile(0.5, 0.5, p), sine * sine));
        for (size_t i = 0; i < LENGTH(shapes); i++) {
            double c = shapes[i], log_p = p < 0.5 ? log(p) : log1p(p - 1), log_q = p < 0.5 ? log1p(-p) : log(1 - p);
            ck_assert(is_quantile(quantile(1, c, p), -expm1(log_q / c)));
            ck_assert(is_quantile(quantile(c, 1, p), exp(log_p / c)));
        }
    }
    ck_assert_double_eq_tol(below(0.5, 0.5, 0.25), 1.0 / 3, 2 * DBL_EPSILON);
    ck_assert_double_eq_tol(below(2, 3, 0.4), 0.5248, 4 * DBL_EPSILON); /* by hand: 6 x^2 - 8 x^3 + 3 x^4 */
}
END_TEST

static const double grid[] = {1e-12, 1e-6,   1e-3, 0.03, 0.5, 0.999, 1,   1.5, 3,    12,
                              100,   2345.5, 9999, 1e4,  1e5, 1e6,   3e7, 1e9, 1e12, 1e15};

/* GSL 2.7 as the referee, inside the moderate shapes where its distribution function holds. */
START_TEST(moderate_shapes_agree_with_gsl) {
    for (size_t i = 4; i < 10; i++)
        for (size_t j = 4; j < 10; j++)
            for (int k = 1; k < 40; k++) {
                double a = grid[i], b = grid[j], x = k / 40.0;
                tails here = tails_at(a, b, x);
                double lower = gsl_cdf_beta_P(x, a, b), upper = gsl_cdf_beta_Q(x, a, b);
                if (!(fabs(here.below - lower) <= 1e-12) || !(fabs(here.above - upper) <= 1e-12))
                    ck_abort_msg("a = %g, b = %g, x = %g: %.17g, and GSL says %.17g", a, b, x, here.below, lower);
            }
}
END_TEST

/* I_x(a, b) = 1 - I_(1-x)(b, a), for x whose complement is exact. */
START_TEST(tails_are_mirror_images) {
    const double a = grid[_i];
    for (size_t j = 0; j < LENGTH(grid); j++)
        for (int k = 0; k <= 64; k++) {
            double b = grid[j], x = k / 64.0;
            tails here = tails_at(a, b, x), mirror = tails_at(b, a, 1 - x);
            bool below_same = fabs(here.below - mirror.above) <= 1e-12 * here.below;
            bool above_same = fabs(here.above - mirror.below) <= 1e-12 * here.above;
            bool whole = fabs(here.below + here.above - 1) <= 4 * DBL_EPSILON;
            if (!below_same || !above_same || !whole)
                ck_abort_msg("a = %g, b = %g, x = %g: %.17g, %.17g", a, b, x, here.below, here.above);
        }
}
END_TEST

static const double probabilities[] = {1e-300, 1e-30, 1e-12, 1e-6, 0.005, 0.025, 0.05,     0.3,
                                       0.499999, 0.5, 0.6,   0.95, 0.975, 0.995, 1 - 1e-12};

/* The distribution function is on the right sides of p where x is 1e-10 (and a step of the doubles) lower and higher;
 * and quantiles rise with p. */
START_TEST(quantiles_undo_the_distribution_function) {
    const double a = grid[_i];
    for (size_t j = 0; j < LENGTH(grid); j++) {
        double b = grid[j], last = 0;
        for (size_t k = 0; k < LENGTH(probabilities); k++) {
            double p = probabilities[k], x = quantile(a, b, p), reach = 1e-10 * fmin(x, 1 - x);
            double low = fmax(nextafter(x - reach, -1), 0), high = fmin(nextafter(x + reach, 2), 1), slack = 1 + 1e-13;
            bool good = p <= 0.5 ? below(a, b, low) <= p * slack && below(a, b, high) * slack >= p
                                 : above(a, b, low) * slack >= 1 - p && above(a, b, high) <= (1 - p) * slack;
            if (!good || x < last || x > 1) ck_abort_msg("a = %g, b = %g, p = %.17g: %.17g", a, b, p, x);
            last = x;
        }
    }
}
END_TEST

/* Across the places where the method changes there is no step: the distribution function never falls. */
START_TEST(the_distribution_function_rises) {
    const double a = grid[_i];
    for (size_t j = 0; j < LENGTH(grid); j++) {
        double b = grid[j], mean = a / (a + b);
        const double centres[] = {mean, 0.5, 1 / b, 1 - 1 / a};
        for (size_t c = 0; c < LENGTH(centres); c++) {
            if (!(centres[c] > 1e-15) || !(centres[c] < 1 - 1e-15)) continue;
            tails last = {0, 1};
            for (int k = -20; k <= 20; k++) {
                double x = centres[c] * (1 + k * 1e-3 * (1 - centres[c]));
                tails next = tails_at(a, b, x);
                if (next.below * (1 + 1e-12) < last.below || next.above > last.above * (1 + 1e-12))
                    ck_abort_msg("a = %g, b = %g: it falls at x = %.17g", a, b, x);
                last = next;
            }
        }
    }
}
END_TEST

START_TEST(limits_that_reach_the_ends) {
    ck_assert_double_eq(quantile(1e-6, 1e-6, 0.025), 0);
    ck_assert_double_eq(quantile(1e-6, 1e-6, 0.975), 1);
    ck_assert_double_eq(quantile(1e-6, 1e-6, 0.5), 0.5);
    ck_assert_double_eq(quantile(1e-3, 5, 0.025), 0);
    ck_assert_double_eq(quantile(5, 1e-3, 0.975), 1);
    ck_assert_double_eq(quantile(1e9, 1e-6, 0.5), 1);
    ck_assert_double_eq(below(3, 4, 0), 0);
    ck_assert_double_eq(above(3, 4, 0), 1);
    ck_assert_double_eq(below(3, 4, 1), 1);
    ck_assert_double_eq(above(3, 4, 1), 0);
    ck_assert_double_eq(below(1e6, 1e6, 0.1), 0); /* 1e-444,000: underflow, not a failure */
}
END_TEST

START_TEST(what_is_refused_is_left_alone) {
    const double outside[][3] = {{0, 1, 0.5},     {1, 0, 0.5},      {-1, 1, 0.5},       {1, -2, 0.5},
                                 {NAN, 1, 0.5},   {1, NAN, 0.5},    {INFINITY, 1, 0.5}, {1, INFINITY, 0.5},
                                 {1e17, 1, 0.5},  {1, 1e17, 0.5},   {1e-301, 1, 0.5},   {1, 1, NAN},
                                 {1, 1, -0.01},   {1, 1, 1.01},     {1, 1, INFINITY},   {1, 1, -INFINITY}};
    double x = 7, lower = 8, upper = 9;
    for (size_t i = 0; i < LENGTH(outside); i++) {
        ck_assert(!bali_beta_cdf(outside[i][0], outside[i][1], outside[i][2], &lower, &upper));
        ck_assert(!bali_beta_quantile(outside[i][0], outside[i][1], outside[i][2], &x));
    }
    ck_assert(!bali_beta_quantile(1, 1, 0, &x));
    ck_assert(!bali_beta_quantile(1, 1, 1, &x));
    ck_assert_double_eq(x, 7);
    ck_assert_double_eq(lower, 8);
    ck_assert_double_eq(upper, 9);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("beta");
    TCase *tc = tcase_create("beta");
    tcase_set_timeout(tc, 60);
    tcase_add_checked_fixture(tc, bali_mathematics_init, NULL);
    tcase_add_test(tc, tails_agree_with_many_digits);
    tcase_add_test(tc, quantiles_agree_with_many_digits);
    tcase_add_test(tc, quantiles_of_tiny_shapes_agree_with_many_digits);
    tcase_add_loop_test(tc, published_limits, 0, (int)LENGTH(published));
    tcase_add_test(tc, tables_of_t_and_f);
    tcase_add_test(tc, births_of_laplace);
    tcase_add_test(tc, closed_forms);
    tcase_add_test(tc, moderate_shapes_agree_with_gsl);
    tcase_add_loop_test(tc, tails_are_mirror_images, 0, (int)LENGTH(grid));
    tcase_add_loop_test(tc, quantiles_undo_the_distribution_function, 0, (int)LENGTH(grid));
    tcase_add_loop_test(tc, the_distribution_function_rises, 0, (int)LENGTH(grid));
    tcase_add_test(tc, limits_that_reach_the_ends);
    tcase_add_test(tc, what_is_refused_is_left_alone);
    suite_add_tcase(s, tc);
    return s;
}

int main(void) {
    return run_suite(suite());
}
