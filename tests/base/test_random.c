/* Counted random numbers against a second derivation and a published sequence. */
#include "base/random.h"
#include "support/harness.h"

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#define LENGTH(array) (sizeof(array) / sizeof *(array))

/* The finaliser again, in small steps of 32-bit limbs, so that nothing is shared with the code under test. */
static uint64_t product(uint64_t x, uint64_t y) {
    uint64_t x_low = x & 0xFFFFFFFFu, y_low = y & 0xFFFFFFFFu;
    uint64_t cross = (x >> 32) * y_low + x_low * (y >> 32);
    return x_low * y_low + (cross << 32);
}

static uint64_t finaliser(uint64_t z) {
    z = product(z ^ (z >> 30), UINT64_C(13787848793156543929)); /* BF58476D1CE4E5B9 */
    z = product(z ^ (z >> 27), UINT64_C(10723151780598845931)); /* 94D049BB133111EB */
    return z ^ (z >> 31);
}

static const uint64_t gamma_step = UINT64_C(11400714819323198485); /* 9E3779B97F4A7C15, 2^64 over the golden ratio */

/* The published generator: add gamma to the state, then finalise it. */
static uint64_t plain_next(uint64_t *state) {
    *state += gamma_step;
    return finaliser(*state);
}

/* Seed 1234567 of SplitMix64 (Steele, Lea & Flood, OOPSLA 2014), as generally published; recalled from memory. */
static const uint64_t published[] = {UINT64_C(6457827717110365317), UINT64_C(3203168211198807973),
                                     UINT64_C(9817491932198370423), UINT64_C(4593380528125082431),
                                     UINT64_C(16408922859458223821)};

START_TEST(the_twin_gives_the_published_sequence) {
    uint64_t state = 1234567;
    for (size_t i = 0; i < LENGTH(published); i++) ck_assert_uint_eq(plain_next(&state), published[i]);
}
END_TEST

static const uint64_t keys[] = {
    0, 1, 2, 1234567, UINT64_C(0x9E3779B97F4A7C15), UINT64_C(0x61C8864680B583EB), UINT64_MAX};

/* Number i of key s is output i of the plain generator whose seed is the first output of the plain generator for s. */
START_TEST(a_stream_is_the_plain_generator_reseeded) {
    uint64_t seed = keys[_i], state = plain_next(&seed);
    for (uint64_t i = 0; i < 1000; i++) ck_assert_uint_eq(bali_splitmix64(keys[_i], i), plain_next(&state));
}
END_TEST

/* The finaliser is one to one, so it can be run backwards: the key whose stream is the published sequence. */
static uint64_t undo_shift(uint64_t z, unsigned shift) {
    uint64_t x = z;
    for (int i = 0; i < 3; i++) x = z ^ (x >> shift);
    return x;
}

static uint64_t inverse(uint64_t odd) { /* modulo 2^64, by Newton's method */
    uint64_t x = odd;
    for (int i = 0; i < 6; i++) x *= 2 - odd * x;
    return x;
}

static uint64_t undo_finaliser(uint64_t z) {
    z = undo_shift(z, 31) * inverse(UINT64_C(10723151780598845931));
    z = undo_shift(z, 27) * inverse(UINT64_C(13787848793156543929));
    return undo_shift(z, 30);
}

START_TEST(the_published_sequence_is_a_stream) {
    uint64_t key = undo_finaliser(1234567) - gamma_step;
    for (size_t i = 0; i < LENGTH(published); i++) ck_assert_uint_eq(bali_splitmix64(key, i), published[i]);
}
END_TEST

START_TEST(numbers_wrap_around) {
    ck_assert_uint_eq(bali_splitmix64(7, UINT64_MAX), finaliser(finaliser(7 + gamma_step)));
}
END_TEST

START_TEST(a_key_is_two_draws_deep) {
    for (uint64_t seed = 0; seed < 20; seed++)
        for (uint64_t repeat = 0; repeat < 20; repeat++) {
            uint64_t key = bali_random_key(seed, BALI_FOR_HOLDOUT, repeat);
            ck_assert_uint_eq(key, bali_splitmix64(bali_splitmix64(seed, 2), repeat));
        }
    ck_assert_uint_ne(bali_random_key(1, BALI_FOR_FOLDS, 0), bali_random_key(1, BALI_FOR_DRAW, 0));
}
END_TEST

START_TEST(purposes_keep_their_numbers) { /* they are part of every published split */
    ck_assert_int_eq(BALI_FOR_FOLDS, 1);
    ck_assert_int_eq(BALI_FOR_HOLDOUT, 2);
    ck_assert_int_eq(BALI_FOR_DRAW, 3);
    ck_assert_int_eq(BALI_FOR_QUERY, 4);
    ck_assert_int_eq(BALI_FOR_PLAN, 5);
    ck_assert_int_eq(BALI_FOR_CURVE, 6);
}
END_TEST

START_TEST(uniforms_lie_in_the_half_open_interval) {
    ck_assert_double_eq(bali_uniform(0), 0);
    ck_assert_double_eq(bali_uniform(2047), 0); /* the low 11 bits do not count */
    ck_assert_double_eq(bali_uniform(2048), 0x1p-53);
    ck_assert_double_eq(bali_uniform(UINT64_C(1) << 63), 0.5);
    ck_assert_double_eq(bali_uniform(UINT64_MAX), 1 - 0x1p-53);
    ck_assert(bali_uniform(UINT64_MAX) < 1);
}
END_TEST

/* 2^20 draws in 16 boxes: chi-square on 15 degrees of freedom, whose 99.999 % point is 50.5 (scipy 1.10.1). */
START_TEST(uniforms_fill_the_interval_evenly) {
    double boxes[16] = {0}, mean = 0, chi_square = 0;
    bool inside = true;
    const uint64_t n = UINT64_C(1) << 20;
    for (uint64_t i = 0; i < n; i++) {
        double u = bali_uniform(bali_splitmix64(keys[_i], i));
        inside = inside && u >= 0 && u < 1;
        if (!inside) break;
        boxes[(size_t)(u * 16)]++;
        mean += u / (double)n;
    }
    ck_assert(inside);
    for (size_t k = 0; k < 16; k++) chi_square += (boxes[k] - 65536) * (boxes[k] - 65536) / 65536;
    ck_assert_double_lt(chi_square, 50.5);
    ck_assert_double_eq_tol(mean, 0.5, 5 * 0.2886751345948129 / 1024); /* five standard errors, 12^-1/2 2^-10 */
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("random");
    TCase *tc = tcase_create("random");
    tcase_set_timeout(tc, 60);
    tcase_add_test(tc, the_twin_gives_the_published_sequence);
    tcase_add_loop_test(tc, a_stream_is_the_plain_generator_reseeded, 0, (int)LENGTH(keys));
    tcase_add_test(tc, the_published_sequence_is_a_stream);
    tcase_add_test(tc, numbers_wrap_around);
    tcase_add_test(tc, a_key_is_two_draws_deep);
    tcase_add_test(tc, purposes_keep_their_numbers);
    tcase_add_test(tc, uniforms_lie_in_the_half_open_interval);
    tcase_add_loop_test(tc, uniforms_fill_the_interval_evenly, 0, (int)LENGTH(keys));
    suite_add_tcase(s, tc);
    return s;
}

int main(void) {
    return run_suite(suite());
}
