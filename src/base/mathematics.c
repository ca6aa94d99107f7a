#include "base/mathematics.h"

#include <float.h>
#include <gsl/gsl_cdf.h>
#include <gsl/gsl_errno.h>
#include <gsl/gsl_sf_gamma.h>
#include <gsl/gsl_sf_log.h>
#include <math.h>

void bali_mathematics_init(void) {
    (void)gsl_set_error_handler_off();
}

/* GSL inside the domains the tests meet with 50-digit references. */

double bali_log1p_minus(double x) {
    gsl_sf_result result;
    if (!(x > -1) || !isfinite(x) || gsl_sf_log_1plusx_mx_e(x, &result) != GSL_SUCCESS) return NAN;
    return result.val;
}

double bali_normal_quantile(double p) {
    return p > 0 && p < 1 ? gsl_cdf_ugaussian_Pinv(p) : NAN;
}

/* Stirling's series sum_k c_k z^(1-2k), c_k = B_2k / (2k (2k - 1)) (Abramowitz & Stegun 1964, 6.1.40): what is left of
 * ln Gamma(z) after (z - 1/2) ln z - z + ln(2 pi)/2. From z = 10 on these seven terms leave less than 3e-17. */
enum { STIRLING_TERMS = 7, SHIFT = 10 };
static const double stirling[STIRLING_TERMS] = {1.0 / 12,   -1.0 / 360,        1.0 / 1260, -1.0 / 1680,
                                                1.0 / 1188, -691.0 / 360360.0, 1.0 / 156};

static double stirling_rest(double z) {
    double p = 1 / z, square = p * p, rest = 0;
    for (int k = STIRLING_TERMS; k-- > 0;) rest = rest * square + stirling[k];
    return rest * p;
}

double bali_log_gamma_star(double z) {
    gsl_sf_result result;
    if (z >= SHIFT) return isfinite(z) ? stirling_rest(z) : NAN;
    if (!(z >= 0.5) || gsl_sf_gammastar_e(z, &result) != GSL_SUCCESS) return NAN;
    return log(result.val);
}

/* The difference of two Stirling series at a + n and a, with the common factor n taken out, so that it keeps its digits
 * for the smallest n: with p = 1/a and q = 1/(a + n), q^k - p^k = (q - p) (p^(k-1) + ... + q^(k-1)). */
static double stirling_rest_rise(double a, double n) {
    double p = 1 / a, q = 1 / (a + n), quotient = 1, power = 1, sum = stirling[0];
    for (int k = 1; k < STIRLING_TERMS; k++) {
        power *= q;
        quotient = quotient * p + power;
        power *= q;
        quotient = quotient * p + power;
        sum += stirling[k] * quotient;
    }
    return -n * p * q * sum;
}

/* ln (a)_n for a >= 10: the logarithms of a and a + n are never subtracted. */
static double log_rise_of_large(double a, double n) {
    return (a - 0.5) * log1p(n / a) + n * (log(a + n) - 1) + stirling_rest_rise(a, n);
}

/* ln (a)_n = ln (a + 10)_n - sum over k < 10 of ln(1 + n/(a + k)), the sum as one logarithm of a product from which
 * nothing is lost when n is small against a. For a + n below 20. */
static double log_rise_of_small(double a, double n) {
    double excess = 0; /* the product of the factors, less 1 */
    for (int k = 1; k < SHIFT; k++) {
        double term = n / (a + k);
        excess += term + excess * term;
    }
    double first = n > a ? log(a + n) - log(a) : log1p(n / a);
    return log_rise_of_large(a + SHIFT, n) - log1p(excess) - first;
}

/* a (a + 1) ... (a + n - 1), in two chains, which a processor multiplies side by side. */
static double product_of_rise(double a, int n) {
    double even = 1, odd = 1;
    int k = 0;
    for (; k + 1 < n; k += 2) {
        even *= a + k;
        odd *= a + (k + 1);
    }
    return (k < n ? even * (a + k) : even) * odd;
}

static double stirling_without_constant(double z) {
    return (z - 0.5) * log(z) - z + stirling_rest(z);
}

double bali_log_pochhammer(double a, double n) {
    const double most_factors = 16, largest_factor = 1e19; /* whose 16th power is still a double */
    if (!(a > 0) || !(n >= 0) || !isfinite(a) || !isfinite(n)) return NAN;
    if (n == 0) return 0;
    if (n <= most_factors && n == floor(n) && a <= largest_factor) return log(product_of_rise(a, (int)n));
    if (a >= SHIFT) return log_rise_of_large(a, n);
    if (n < 1 || a + n < SHIFT) return log_rise_of_small(a, n);
    return stirling_without_constant(a + n) - stirling_without_constant(a + SHIFT) + log(product_of_rise(a, SHIFT));
}

void bali_sum_add(bali_sum *sum, double term) {
    double total = sum->total + term;
    sum->correction += fabs(sum->total) >= fabs(term) ? (sum->total - total) + term : (term - total) + sum->total;
    sum->total = total;
}

double bali_sum_value(const bali_sum *sum) {
    return isfinite(sum->total) ? sum->total + sum->correction : sum->total; /* whose correction is a NaN */
}

void bali_moments_add(bali_moments *moments, double value) {
    double deviation = value - moments->mean;
    moments->n += 1;
    moments->mean += deviation / moments->n;
    moments->squares += deviation * (value - moments->mean);
}

void bali_moments_merge(bali_moments *moments, const bali_moments *more) {
    if (more->n == 0) return;
    double n = moments->n + more->n, difference = more->mean - moments->mean;
    moments->mean += difference * (more->n / n);
    moments->squares += more->squares + difference * difference * (moments->n / n * more->n);
    moments->n = n;
}

double bali_moments_standard_error(const bali_moments *moments) {
    return moments->n < 2 ? NAN : sqrt(moments->squares / (moments->n - 1) / moments->n);
}

static const double golden = 0.3819660112501051; /* (3 - sqrt 5)/2 */

typedef struct point {
    double x, value;
} point;

/* Where the parabola through three points has its vertex, as a step from the first; not finite where it has none. */
static double vertex_step(point best, point second, point third) {
    double u = second.x - best.x, v = third.x - best.x;
    double rise_u = (second.value - best.value) * v, rise_v = (third.value - best.value) * u;
    return (rise_u * v - rise_v * u) / (2 * (rise_u - rise_v));
}

/* A first point where f is finite, if a grid meets one: between two points at minus infinity nothing tells the way. */
static point first_point(double (*f)(double x, void *context), void *context, double low, double high) {
    const int steps = 64;
    point best = {.x = low + golden * (high - low)};
    best.value = f(best.x, context);
    for (int i = 1; i < steps && best.value == -INFINITY; i++) {
        point next = {.x = low + (high - low) * i / steps};
        next.value = f(next.x, context);
        if (next.value > best.value) best = next;
    }
    return best;
}

/* Whether a parabola's step may be trusted: it stays inside, and is less than half of the step before the last. */
static bool is_good_step(double step, double before_last, double to_low, double to_high) {
    return fabs(step) < fabs(before_last) / 2 && step > to_low && step < to_high;
}

double bali_maximise(double (*f)(double x, void *context), void *context, double low, double high, double tolerance) {
    const point ends[2] = {{low, f(low, context)}, {high, f(high, context)}};
    point best = first_point(f, context, low, high), second = best, third = best;
    double last = 0, before_last = 0;
    for (;;) {
        double least = fmax(fmax(tolerance / 2, 2 * DBL_EPSILON * fabs(best.x)), DBL_MIN);
        double middle = low + (high - low) / 2;
        if (!(fmax(best.x - low, high - best.x) > 2 * least)) break;
        double step = vertex_step(best, second, third);
        if (!is_good_step(step, before_last, low - best.x, high - best.x)) {
            last = best.x < middle ? high - best.x : low - best.x;
            step = golden * last;
        } else if (best.x + step - low < 2 * least || high - best.x - step < 2 * least)
            step = copysign(least, middle - best.x);
        before_last = last;
        last = step;
        point next = {.x = best.x + (fabs(step) >= least ? step : copysign(least, step))};
        next.value = f(next.x, context);
        bool better = next.value >= best.value;
        double bound = better ? best.x : next.x;
        if (better ? next.x >= best.x : next.x < best.x) low = bound;
        else high = bound;
        if (better) {
            third = second;
            second = best;
            best = next;
        } else if (next.value >= second.value || second.x == best.x) {
            third = second;
            second = next;
        } else if (next.value >= third.value || third.x == best.x || third.x == second.x)
            third = next;
    }
    for (int i = 0; i < 2; i++)
        if (ends[i].value > best.value) best = ends[i];
    return best.x;
}
