/* The incomplete beta function by whichever of three ways is short: a power series near 0 when the shape there is below
 * 1, a continued fraction, and for large shapes an integral by quadrature. Each gives the tail on one side without
 * cancellation, as a multiple of the density, so that quantiles are found on logarithms and nothing underflows.
 *
 * Places are written as (x, y) with x + y = 1 and the smaller of them exact. The natural scale is the log-odds ln(x/y):
 * on it the density is w(x) = x^a y^b / B(a, b), which is log-concave, and d ln w = (a - (a + b) x) d ln(x/y). */
#include "base/beta.h"

#include "base/mathematics.h"

#include <float.h>
#include <math.h>

typedef struct shapes {
    double a, b;
    double sum, sum_low; /* a + b to twice the digits of a double */
    double gammas;       /* ln [Gamma(1+a+b) / (Gamma(1+a) Gamma(1+b))], when a shape is below 1 */
    double scale;        /* what log_weight adds to its powers */
} shapes;

typedef struct place {
    double x, y;
} place;

static shapes mirrored(shapes s) {
    double a = s.a;
    s.a = s.b;
    s.b = a;
    return s;
}

static place opposite(place at) {
    return (place){.x = at.y, .y = at.x};
}

static place place_of_odds(double odds) {
    if (odds > 1) return opposite(place_of_odds(1 / odds));
    return (place){.x = odds / (1 + odds), .y = 1 / (1 + odds)};
}

static shapes shapes_of(double a, double b) {
    shapes s = {.a = a, .b = b, .sum = a + b};
    double small = fmin(a, b), large = fmax(a, b);
    s.sum_low = small - (s.sum - large);
    if (small < 1) {
        s.gammas = bali_log_pochhammer(1 + large, small) - bali_log_pochhammer(1, small);
        s.scale = s.gammas + log(small) - log1p(small / large);
    } else {
        const double half_log_2_pi = 0.91893853320467274178;
        s.scale = 0.5 * (log(small) - log1p(small / large)) - half_log_2_pi + bali_log_gamma_star(s.sum) -
                  bali_log_gamma_star(a) - bali_log_gamma_star(b);
    }
    return s;
}

/* (a + b) x - a = b - (a + b) y, to nearly all its digits: everything near the mean hangs on this difference. */
static double excess(const shapes *s, place at) {
    if (at.x <= at.y) return fma(at.x, s->sum, -s->a) + at.x * s->sum_low;
    return -(fma(at.y, s->sum, -s->b) + at.y * s->sum_low);
}

static double log_of_x(place at) {
    return at.x <= at.y ? log(at.x) : log1p(-at.y);
}

/* share x (relative - 1 - ln relative), which is >= 0; deviation = relative - 1. */
static double deviance(double share, double deviation, double relative) {
    return share * (deviation < -0.5 ? deviation - log(relative) : -bali_log1p_minus(deviation));
}

/* ln w(x). For shapes from 1 on by their deviances from the mean, two terms of one sign, where the powers and the beta
 * function would cancel (Loader 2000, Fast and accurate computation of binomial probabilities). */
static double log_weight(const shapes *s, place at) {
    if (fmin(s->a, s->b) < 1) return s->scale + s->a * log_of_x(at) + s->b * log_of_x(opposite(at));
    double d = excess(s, at);
    double of_x = deviance(s->a, d / s->a, at.x * (s->sum / s->a));
    double of_y = deviance(s->b, -d / s->b, at.y * (s->sum / s->b));
    return s->scale - of_x - of_y;
}

/* Below this x the power series serves for a < 1: there (1 - t)^(b - 1) is a series of small terms. */
static double series_limit(double b) {
    return fmin(0.5, 1 / b);
}

static bool is_for_series(const shapes *s, double x) {
    return s->a < 1 && x <= series_limit(s->b);
}

/* sum over k >= 1 of (1 - b)_k x^k / (k! (a + k)). */
static double power_series(const shapes *s, double x) {
    double term = 1, sum = 0;
    for (int k = 1; k < 200; k++) {
        term *= x * (k - s->b) / k;
        double add = term / (s->a + k);
        sum += add;
        if (fabs(add) <= DBL_EPSILON / 8 * fabs(sum)) return sum;
    }
    return NAN;
}

/* ln I_x(a, b) - ln b/(a + b), of the order of a when a is small, and good to its own last digits:
 * I_x = x^a / (a B(a, b)) [1 + a sum_k ...] (DLMF 8.17.7 with 15.2.1), and 1/(a B) = b/(a + b) e^gammas. */
static double series_log(const shapes *s, place at, double series) {
    return s->gammas + s->a * log_of_x(at) + log1p(s->a * series);
}

/* I_x(a, b) / w(x) for x up to the mean by the continued fraction of Didonato & Morris 1992 (ACM TOMS 18:360-373; the
 * even part of DLMF 8.17.22), summed forwards by Steed's method. */
static double by_continued_fraction(const shapes *s, place at) {
    const double a = s->a, b = s->b, x = at.x, lambda = -excess(s, at);
    double reciprocal = 1 / (a + 1), d = 1 / (a * reciprocal * (lambda + 1)), term = d, sum = d;
    for (int n = 1; n < 100000; n++) {
        double half = n * (b - n) * x * reciprocal;
        double alpha = (a + (n - 1)) * (s->sum + (n - 1)) * x * reciprocal * half;
        reciprocal = 1 / (a + (2 * n + 1));
        double beta = n + half + (a + n) * reciprocal * (lambda + 1 + n * (1 + at.y));
        double next = 1 / (beta + alpha * d);
        term *= -alpha * d * next;
        d = next;
        sum += term;
        if (fabs(term) <= DBL_EPSILON / 4 * fabs(sum)) return sum;
    }
    return NAN;
}

/* e^s - 1 - s and ln(1 + w) - w, by series made for the small arguments of the quadrature: |s| < 0.15, |w| < 0.08. */
static double expm1_minus(double s) {
    static const double inverse_factorials[] = {1.0 / 2,    1.0 / 6,     1.0 / 24,     1.0 / 120,     1.0 / 720,
                                                1.0 / 5040, 1.0 / 40320, 1.0 / 362880, 1.0 / 3628800, 1.0 / 39916800};
    double sum = 0;
    for (int k = 10; k-- > 0;) sum = sum * s + inverse_factorials[k];
    return sum * s * s;
}

static double log1p_minus_near_0(double w) {
    double r = w / (2 + w), square = r * r; /* ln(1 + w) = 2 artanh r */
    return 2 * r * square * (1.0 / 3 + square * (1.0 / 5 + square * (1.0 / 7 + square / 9))) - w * r;
}

/* ln [w(x e^-s / (x e^-s + y)) / w(x)], from a step s down the log-odds: d s less a sum of terms of one sign. */
static double log_weight_ratio(const shapes *s, place at, double d, double step) {
    double small = fmin(at.x, at.y), way = at.x <= at.y ? -step : step, bend = expm1_minus(way);
    return d * step - s->sum * (log1p_minus_near_0(small * (way + bend)) + small * bend);
}

enum { NODES = 12 };
/* The positive half of the 24 Gauss-Legendre nodes and their weights (mpmath, 40 digits). */
static const double nodes[NODES][2] = {
    {0.064056892862605626, 0.12793819534675216},  {0.19111886747361631, 0.1258374563468283},
    {0.31504267969616337, 0.12167047292780339},   {0.43379350762604514, 0.1155056680537256},
    {0.54542147138883954, 0.10744427011596563},   {0.64809365193697557, 0.097618652104113888},
    {0.74012419157855436, 0.086190161531953276},  {0.82000198597390292, 0.073346481411080306},
    {0.88641552700440103, 0.059298584915436781},  {0.93827455200273276, 0.044277438817419806},
    {0.9747285559713095, 0.028531388628933663},   {0.99518721999702136, 0.0123412297999872}};

/* I_x(a, b) / w(x) for x up to the mean and large shapes: the density over its value at x, integrated over the log-odds
 * down to where it has fallen to e^-40. There it is between an exponential and half a bell, for which 24 nodes are
 * plenty, while a continued fraction needs thousands of terms near the mean. */
static double by_quadrature(const shapes *s, place at) {
    double d = excess(s, at), variance = s->sum * at.x * at.y, depth = 40;
    double half = depth / (hypot(d, sqrt(2 * depth * variance)) - d), sum = 0;
    for (int i = 0; i < NODES; i++)
        sum += nodes[i][1] * (exp(log_weight_ratio(s, at, d, half * (1 - nodes[i][0]))) +
                              exp(log_weight_ratio(s, at, d, half * (1 + nodes[i][0]))));
    return half * sum;
}

/* I_x(a, b) / w(x) for x up to the mean. */
static double tail_ratio(const shapes *s, place at) {
    const double large = 1e4;
    return fmin(s->a, s->b) < large ? by_continued_fraction(s, at) : by_quadrature(s, at);
}

/* Beyond these the double-double sum or a reciprocal gives way, and a wrong number would be silent. */
static bool is_shape(double a) {
    return a >= 1e-300 && a <= 1e16;
}

bool bali_beta_cdf(double a, double b, double x, double *lower, double *upper) {
    if (!is_shape(a) || !is_shape(b) || !(x >= 0 && x <= 1)) return false;
    place at = {.x = x, .y = 1 - x};
    shapes s = shapes_of(a, b), t = mirrored(s);
    double below, above;
    if (x == 0 || x == 1) {
        below = x;
        above = 1 - x;
    } else if (is_for_series(&s, at.x)) {
        double rise = series_log(&s, at, power_series(&s, at.x));
        below = b / s.sum * exp(rise);
        above = (a - b * expm1(rise)) / s.sum;
    } else if (is_for_series(&t, at.y)) {
        double rise = series_log(&t, opposite(at), power_series(&t, at.y));
        above = a / s.sum * exp(rise);
        below = (b - a * expm1(rise)) / s.sum;
    } else if (excess(&s, at) <= 0) {
        below = exp(log_weight(&s, at)) * tail_ratio(&s, at);
        above = 1 - below;
    } else {
        above = exp(log_weight(&t, opposite(at))) * tail_ratio(&t, opposite(at));
        below = 1 - above;
    }
    if (!isfinite(below) || !isfinite(above)) return false;
    *lower = below;
    *upper = above;
    return true;
}

/* The probabilities sought, p + q = 1 and the smaller exact, and ln p - ln b/(a + b), ln q - ln a/(a + b): what
 * series_log gives, with all the digits of p. */
typedef struct target {
    double p, q, below, above;
} target;

static target opposite_target(target t) {
    return (target){.p = t.q, .q = t.p, .below = t.above, .above = t.below};
}

/* ln p (a + b)/b, given (p (a + b) - b)/b. */
static double log_share(double p, double excess_share, double a, double b) {
    return excess_share < -0.5 ? log(p) + log1p(a / b) : log1p(excess_share);
}

static target target_of(const shapes *s, double p) {
    double over = fma(p, s->sum, -s->b) + p * s->sum_low, q = 1 - p;
    return (target){.p = p,
                    .q = q,
                    .below = log_share(p, over / s->b, s->a, s->b),
                    .above = log_share(q, -over / s->a, s->b, s->a)};
}

/* A function of the log-odds that rises through 0 where I_x(a, b) = p: its value, its slope, and its second derivative
 * over its slope. */
typedef struct gap {
    double value, slope, bend;
} gap;

/* ln I_x - ln p */
static gap gap_below(const shapes *s, double log_ratio, double slope, place at) {
    return (gap){.value = log_ratio, .slope = slope, .bend = -excess(s, at) - slope};
}

static gap gap_by_series(const shapes *s, const target *t, place at) {
    double series = power_series(s, at.x);
    double slope = s->a * exp(s->b * log_of_x(opposite(at))) / (1 + s->a * series);
    return gap_below(s, series_log(s, at, series) - t->below, slope, at);
}

/* For p <= q, so that ln I_x says more than ln(1 - I_x). */
static gap gap_by_tails(const shapes *s, const target *t, place at) {
    if (excess(s, at) <= 0) {
        double ratio = tail_ratio(s, at);
        return gap_below(s, log_weight(s, at) + log(ratio) - log(t->p), 1 / ratio, at);
    }
    shapes m = mirrored(*s);
    double weight = exp(log_weight(&m, opposite(at))), lower = 1 - weight * tail_ratio(&m, opposite(at));
    return gap_below(s, log(lower / t->p), weight / lower, at);
}

static gap turned(gap g) {
    return (gap){.value = -g.value, .slope = g.slope, .bend = -g.bend};
}

static gap gap_at(const shapes *s, const target *t, place at) {
    if (is_for_series(s, at.x)) return gap_by_series(s, t, at);
    shapes m = mirrored(*s);
    target u = opposite_target(*t);
    if (is_for_series(&m, at.y)) return turned(gap_by_series(&m, &u, opposite(at)));
    return t->p <= t->q ? gap_by_tails(s, t, at) : turned(gap_by_tails(&m, &u, opposite(at)));
}

/* Odds to start from where a < 1: inside the series' reach the leading power alone, 0 where it underflows; above it,
 * for b >= 1, the bound on the upper tail that falls from there as (1 - x)^b. Negative when the quantile is above the
 * reach and b < 1. */
static double start_of_small(const shapes *s, const target *t) {
    double limit = series_limit(s->b);
    place at = {.x = limit, .y = 1 - limit};
    double rise = series_log(s, at, power_series(s, limit));
    if (rise >= t->below) {
        double x = fmin(exp((t->below - s->gammas) / s->a), limit);
        return x / (1 - x);
    }
    if (s->b < 1) return -1;
    double above = (s->a - s->b * expm1(rise)) / s->sum, log_y = log1p(-limit) + log(t->q / above) / s->b;
    return -expm1(log_y) / exp(log_y);
}

/* Abramowitz & Stegun 1964, 26.5.22, for shapes from 1 on. */
static double start_of_large(const shapes *s, const target *t) {
    double z = t->p <= t->q ? -bali_normal_quantile(t->p) : bali_normal_quantile(t->q);
    double u = 1 / (2 * s->a - 1), v = 1 / (2 * s->b - 1), h = 2 / (u + v), third = (z * z - 3) / 6;
    double w = z * sqrt(fmax(h + third, 0)) / h - (v - u) * (third + 5.0 / 6 - 2 / (3 * h));
    double least = DBL_MIN; /* no quantile of such shapes is nearer to an end, bad as the start may be */
    return fmin(fmax(s->a / s->b * exp(-2 * w), least), 1 / least);
}

static double start_odds(const shapes *s, const target *t) {
    if (fmin(s->a, s->b) >= 1) return start_of_large(s, t);
    double odds = s->a < 1 ? start_of_small(s, t) : -1;
    if (odds >= 0 || s->b >= 1) return odds;
    shapes m = mirrored(*s);
    target u = opposite_target(*t);
    odds = start_of_small(&m, &u);
    return odds < 0 ? 1 : 1 / odds;
}

/* Halley's step up the log-odds; plain Newton's where the curvature would more than double it or turn it round. */
static double halley_step(gap g) {
    double newton = -g.value / g.slope, factor = 1 + newton * g.bend / 2;
    return factor > 0.5 ? newton / factor : newton;
}

static double middle_odds(double low, double high) {
    return sqrt(fmax(low, DBL_MIN)) * sqrt(fmin(high, DBL_MAX));
}

/* The odds x/(1 - x) of the quantile; 0 or infinite beyond the doubles; NaN when not found. */
static double quantile_odds(const shapes *s, const target *t) {
    const double settled = 1e-4; /* in units of the curve's own scale: the next step would be its cube */
    double odds = start_odds(s, t), low = 0, high = INFINITY;
    for (int i = 0; i < 200 && odds > 0 && odds < INFINITY; i++) {
        gap g = gap_at(s, t, place_of_odds(odds));
        if (isnan(g.value)) return NAN;
        if (g.value > 0) high = odds;
        else low = odds;
        double step = halley_step(g), next = odds * exp(step);
        if (next == odds || fabs(step) * (1 + g.slope + fabs(g.bend)) < settled) return next;
        odds = next > low && next < high ? next : middle_odds(low, high);
    }
    return odds > 0 && odds < INFINITY ? NAN : odds;
}

bool bali_beta_quantile(double a, double b, double p, double *x) {
    if (!is_shape(a) || !is_shape(b) || !(p > 0 && p < 1)) return false;
    shapes s = shapes_of(a, b);
    target t = target_of(&s, p);
    double odds = quantile_odds(&s, &t);
    if (isnan(odds)) return false;
    place at = place_of_odds(odds);
    *x = at.x <= at.y ? at.x : 1 - at.y;
    return true;
}
