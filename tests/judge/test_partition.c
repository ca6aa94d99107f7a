#include "judge/partition.h"

#include "support/fixtures.h"

#include <math.h>
#include <stdlib.h>

/* The rule again, from its words: splitmix64(s, i) = mix(mix(s + g) + (i + 1) g), g = 0x9E3779B97F4A7C15, mix the finaliser of Steele,
 * Lea & Flood 2014. */
static uint64_t own_mix(uint64_t z) {
    z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9u;
    z = (z ^ (z >> 27)) * 0x94D049BB133111EBu;
    return z ^ (z >> 31);
}

static uint64_t own_splitmix64(uint64_t s, uint64_t i) {
    const uint64_t g = 0x9E3779B97F4A7C15u;
    return own_mix(own_mix(s + g) + (i + 1) * g);
}

/* Of each run of K consecutive records b K ... b K + K - 1, record b K + t is in fold p[t], p the identity shuffled by: for t = K - 1 down
 * to 1 swap p[t] and p[splitmix64(key, b K + t) mod (t + 1)]. */
static size_t own_fold(uint64_t key, size_t n_folds, uint64_t record) {
    uint64_t b = record / n_folds;
    size_t *p = malloc(n_folds * sizeof *p);
    ck_assert_ptr_nonnull(p);
    for (size_t t = 0; t < n_folds; t++) p[t] = t;
    for (size_t t = n_folds - 1; t >= 1; t--) {
        size_t u = (size_t)(own_splitmix64(key, b * n_folds + t) % (t + 1)), held = p[t];
        p[t] = p[u];
        p[u] = held;
    }
    size_t fold = p[record % n_folds];
    free(p);
    return fold;
}

static const uint64_t seeds[] = {0, 1, 2, 12345, UINT64_MAX};
static const size_t folds_tried[] = {2, 3, 10, 17, 100};
enum { N_SEEDS = sizeof seeds / sizeof seeds[0], N_FOLDS = sizeof folds_tried / sizeof folds_tried[0] };

START_TEST(the_key_is_of_purpose_1) {
    for (size_t s = 0; s < N_SEEDS; s++)
        for (uint64_t repeat = 0; repeat < 3; repeat++)
            ck_assert_uint_eq(bal_fold_key(seeds[s], repeat), own_splitmix64(own_splitmix64(seeds[s], 1), repeat));
}
END_TEST

START_TEST(folds_are_those_of_the_rule) {
    size_t n_folds = folds_tried[_i], *folds = malloc(n_folds * sizeof *folds);
    ck_assert_ptr_nonnull(folds);
    for (size_t s = 0; s < N_SEEDS; s++) {
        uint64_t key = bal_fold_key(seeds[s], 0);
        for (uint64_t run = 0; run < 5; run++) {
            bal_fold_run(key, run, n_folds, folds);
            for (size_t t = 0; t < n_folds; t++) ck_assert_uint_eq(folds[t], own_fold(key, n_folds, run * n_folds + t));
        }
        bal_fold_run(key, (uint64_t)1 << 40, n_folds, folds);
        ck_assert_uint_eq(folds[1], own_fold(key, n_folds, ((uint64_t)1 << 40) * n_folds + 1));
    }
    free(folds);
}
END_TEST

START_TEST(folds_differ_in_size_by_at_most_one) {
    size_t n_folds = folds_tried[_i], *folds = malloc(n_folds * sizeof *folds), *sizes = calloc(n_folds, sizeof *sizes);
    ck_assert(folds && sizes);
    uint64_t key = bal_fold_key(1, 0);
    for (uint64_t record = 0; record < 537; record++) {
        if (record % n_folds == 0) bal_fold_run(key, record / n_folds, n_folds, folds);
        sizes[folds[record % n_folds]]++;
        size_t least = SIZE_MAX, most = 0;
        for (size_t f = 0; f < n_folds; f++) {
            if (sizes[f] < least) least = sizes[f];
            if (sizes[f] > most) most = sizes[f];
        }
        ck_assert_uint_le(most - least, 1);
    }
    free(folds);
    free(sizes);
}
END_TEST

/* A shuffle that preferred some place would give itself away over many runs. (K - 1)/K times the usual sum over the K x K places is
 * chi-square with (K - 1)^2 degrees of freedom, since every run is a permutation; 39.34 is the 99.999 % point for 9 (Python's mpmath). */
START_TEST(every_fold_is_as_likely_in_every_place) {
    enum { K = 4, RUNS = 40000 };
    size_t seen[K][K] = {{0}}, folds[K];
    for (uint64_t run = 0; run < RUNS; run++) {
        bal_fold_run(bal_fold_key(5, 0), run, K, folds);
        for (size_t t = 0; t < K; t++) seen[t][folds[t]]++;
    }
    double chi_square = 0, expected = (double)RUNS / K;
    for (size_t t = 0; t < K; t++)
        for (size_t f = 0; f < K; f++) chi_square += ((double)seen[t][f] - expected) * ((double)seen[t][f] - expected) / expected;
    ck_assert_msg(chi_square * (K - 1) / K < 39.34, "%g", chi_square);
}
END_TEST

START_TEST(the_key_of_a_holdout_is_of_purpose_2) {
    for (size_t s = 0; s < N_SEEDS; s++)
        for (uint64_t repeat = 0; repeat < 3; repeat++)
            ck_assert_uint_eq(bal_holdout_key(seeds[s], repeat), own_splitmix64(own_splitmix64(seeds[s], 2), repeat));
}
END_TEST

/* F 2^64 as a whole number, or the next one above it: F = 0.mantissa x 2^exponent, shifted by hand. */
static uint64_t own_threshold(double fraction) {
    int exponent;
    uint64_t mantissa = (uint64_t)ldexp(frexp(fraction, &exponent), 53); /* fraction = mantissa x 2^(exponent - 53) */
    int shift = exponent - 53 + 64;
    if (shift >= 0) return mantissa << shift;
    if (-shift >= 64) return 1;
    return (mantissa >> -shift) + ((mantissa & (((uint64_t)1 << -shift) - 1)) != 0);
}

static const double fractions[] = {0.5, 0.2, 1.0 / 3, 0.9999, 1 - 0x1p-53, 0x1p-64, 0x1.8p-64, 0x1p-70, 0x1.8p-60, 0x1p-1074};

START_TEST(a_record_is_held_out_below_the_fraction) {
    double fraction = fractions[_i];
    uint64_t threshold = own_threshold(fraction);
    for (size_t s = 0; s < N_SEEDS; s++) {
        uint64_t key = bal_holdout_key(seeds[s], 1);
        for (uint64_t record = 0; record < 2000; record++)
            ck_assert_int_eq(bal_is_held_out(key, record, fraction), own_splitmix64(key, record) < threshold);
    }
}
END_TEST

/* The nearest fractions on both sides of a record's own number: z x 2^-64 itself leaves it in training. */
START_TEST(the_fraction_is_compared_without_rounding) {
    size_t exact = 0;
    for (uint64_t record = 0; record < 20000; record++) {
        uint64_t z = own_splitmix64(3, record);
        double own = ldexp((double)z, -64); /* rounded to 53 bits, unless the last 11 are 0 */
        uint64_t back = own < 1 ? (uint64_t)ldexp(own, 64) : 0;
        exact += own < 1 && back == z;
        if (own < 1) ck_assert_int_eq(bal_is_held_out(3, record, own), z < back);
        if (own < 1) ck_assert(bal_is_held_out(3, record, nextafter(own, 1)) && !bal_is_held_out(3, record, nextafter(own, 0)));
    }
    ck_assert_uint_gt(exact, 0); /* about 20000 / 2048 */
}
END_TEST

START_TEST(none_and_all_are_held_out_at_the_ends) {
    for (uint64_t record = 0; record < 100; record++) {
        ck_assert(!bal_is_held_out(1, record, 0) && !bal_is_held_out(1, record, -1) && !bal_is_held_out(1, record, NAN));
        ck_assert(bal_is_held_out(1, record, 1) && bal_is_held_out(1, record, 2) && bal_is_held_out(1, record, INFINITY));
    }
}
END_TEST

/* Every way, over places that have gaps. */
START_TEST(every_record_gets_its_part) {
    enum { N = 50 };
    uint64_t places[N];
    uint32_t groups[N];
    size_t parts[N];
    for (size_t t = 0; t < N; t++) {
        places[t] = 7 * t + t % 3;
        groups[t] = (uint32_t)(t * t % 4);
    }
    bal_block block = {.n_records = N, .groups = groups, .places = places};
    for (bal_heldout_method method = BAL_HELDOUT_FOLDS; method <= BAL_HELDOUT_TEST; method++)
        for (size_t repeat = 0; repeat < 3; repeat++) {
            bal_heldout_options options = {.method = method, .folds = 6, .fraction = 0.4, .repeats = 3, .seed = 11};
            bali_partition partition;
            ck_assert_int_eq(bali_partition_create(&options, 4, &partition, NULL), BAL_OK);
            ck_assert_uint_eq(partition.n_parts, method == BAL_HELDOUT_FOLDS ? 6 : method == BAL_HELDOUT_GROUPS ? 4 : 1);
            bali_partition_repeat(&partition, &options, repeat);
            bali_partition_assign(&partition, &block, parts);
            uint64_t key_1 = own_splitmix64(own_splitmix64(11, 1), repeat), key_2 = own_splitmix64(own_splitmix64(11, 2), repeat);
            for (size_t t = 0; t < N; t++) {
                size_t held = own_splitmix64(key_2, places[t]) < own_threshold(0.4) ? 0 : BALI_NOT_HELD_OUT;
                const size_t wanted[] = {own_fold(key_1, 6, places[t]), groups[t], held, 0};
                ck_assert_uint_eq(parts[t], wanted[method]);
            }
            bali_partition_free(&partition);
        }
}
END_TEST

static bal_status divide(void *context, bal_error *err) {
    bali_partition partition;
    bal_status status = bali_partition_create(context, 0, &partition, err);
    bali_partition_free(&partition);
    return status;
}

START_TEST(a_partition_survives_failing_allocations) {
    bal_heldout_options options = bal_heldout_options_defaults();
    ck_assert_uint_ge(survive_allocations(divide, &options), 1);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("partition");
    TCase *c = tcase_create("partition");
    tcase_add_test(c, the_key_of_a_holdout_is_of_purpose_2);
    tcase_add_loop_test(c, a_record_is_held_out_below_the_fraction, 0, sizeof fractions / sizeof fractions[0]);
    tcase_add_test(c, the_fraction_is_compared_without_rounding);
    tcase_add_test(c, none_and_all_are_held_out_at_the_ends);
    tcase_add_test(c, every_record_gets_its_part);
    tcase_add_test(c, a_partition_survives_failing_allocations);
    tcase_add_test(c, the_key_is_of_purpose_1);
    tcase_add_loop_test(c, folds_are_those_of_the_rule, 0, N_FOLDS);
    tcase_add_loop_test(c, folds_differ_in_size_by_at_most_one, 0, N_FOLDS);
    tcase_add_test(c, every_fold_is_as_likely_in_every_place);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
