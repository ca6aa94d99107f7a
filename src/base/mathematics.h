/* Special functions, sums and a maximiser; the beta distribution is in beta.h. The only file that sees GSL. */
#ifndef BASE_MATHEMATICS_H
#define BASE_MATHEMATICS_H

#include "base/beta.h"

/**
 * ln (a)_n = ln Gamma(a + n) - ln Gamma(a), the log of the rising factorial.
 *
 * a > 0, n >= 0, both finite. Good to 1e-12 x max(1, |value|) for a from 1e-9 to 1e12 and n to 1e9; n need
 * not be whole. For a >= 1 and n < 1 the error is below 1e-14 n (1 + ln(a + n)), so it vanishes with n. 0 for n = 0.
 * NaN outside the domain.
 *
 * Not gsl_sf_lnpoch, which was 3e-5 off at a = 1e12, n = 3 and 6e-5 off near a = 0.618, n = 2; nor a difference of
 * lgamma, which loses every digit for large a and writes the global signgam.
 * Cost: one logarithm of a product for whole n to 16, else two to four logarithms. Safe from several threads.
 */
double bali_log_pochhammer(double a, double n);

/** ln(1 + x) - x for x > -1, to a few last digits also near 0; NaN outside the domain. */
double bali_log1p_minus(double x);

/**
 * ln Gamma*(z) = ln Gamma(z) - (z - 1/2) ln z + z - ln(2 pi)/2 for z >= 1/2, what Stirling's formula leaves out:
 * about 1/(12 z). NaN outside the domain.
 */
double bali_log_gamma_star(double z);

/** The z below which a standard normal variable falls with probability p, for 0 < p < 1; NaN outside the domain. */
double bali_normal_quantile(double p);

/**
 * A compensated sum (Neumaier 1974). Start it with = {0}; the order of additions fixes its bits. Infinite terms give
 * what they give without compensation.
 */
typedef struct bali_sum {
    double total, correction;
} bali_sum;
void bali_sum_add(bali_sum *sum, double term);
double bali_sum_value(const bali_sum *sum);

/**
 * Mean and variance of a stream, and of the union of two streams (Welford 1962; Chan, Golub & LeVeque 1983). Start it
 * with = {0}.
 */
typedef struct bali_moments {
    double n, mean, squares; /* squares: the sum of squared deviations from the mean */
} bali_moments;
void bali_moments_add(bali_moments *moments, double value);
void bali_moments_merge(bali_moments *moments, const bali_moments *more);
/** Standard error of the mean, sqrt(squares / (n - 1) / n); NaN below two values. */
double bali_moments_standard_error(const bali_moments *moments);

/**
 * The x in [low, high] where f is largest, to an absolute tolerance > 0, by golden section and parabolas (Brent 1973,
 * ch. 5), f having one top there.
 *
 * f may be -infinity, never NaN; where it is finite only between two points of a grid of 64, the top may be missed. An
 * end of the interval is returned exactly when f is larger there than at any point inside that was met.
 */
double bali_maximise(double (*f)(double x, void *context), void *context, double low, double high, double tolerance);

/** Turns GSL's aborting error handler off. The program calls it once, before anything else. */
void bali_mathematics_init(void);

#endif
