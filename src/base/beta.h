/* The beta distribution: probabilities and quantiles. */
#ifndef BASE_BETA_H
#define BASE_BETA_H

#include <stdbool.h>

/**
 * Regularised incomplete beta function I_x(a, b) and its complement.
 *
 * a, b from 1e-300 to 1e16, x in [0, 1]. Each of the two is good to 1e-12 relative where it is the smaller one, also
 * when it is as small as 1e-300; checked against 50-digit arithmetic for shapes from 1e-12 to 1e15. false, and nothing
 * written, outside the domain or when it cannot be computed.
 *
 * Why not GSL: gsl_cdf_beta_P is NaN at a = b = 1e6, and gsl_cdf_beta_Pinv is NaN or does not return at many shapes.
 * Cost: at most some two microseconds, at any shapes. No allocation. Safe from several threads.
 */
bool bali_beta_cdf(double a, double b, double x, double *lower, double *upper);

/**
 * The x with I_x(a, b) = p, for 0 < p < 1.
 *
 * To 1e-10 relative (of the smaller of x and 1 - x where a double can say it) for a, b from 1e-12 to 1e15 and any p; 0
 * or 1 where the quantile is closer to them than a double can say, which is the right answer for tiny shapes. false,
 * and nothing written, outside the domain of bali_beta_cdf or when it cannot be computed.
 *
 * Cost: one to four evaluations of the distribution function, about a microsecond. No allocation. Safe from several
 * threads.
 */
bool bali_beta_quantile(double a, double b, double p, double *x);

#endif
