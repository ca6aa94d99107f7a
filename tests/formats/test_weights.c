#include "formats/weights.h"

#include "support/fixtures.h"

#include <math.h>
#include <string.h>

typedef struct weight_case {
    const char *text;
    bool right;
    double weight;
} weight_case;

/* Rounded to the nearest multiple of 2^-32 = 2.328e-10, halves to the even one (IEEE 754-2019, 4.3.1). */
static const weight_case cases[] = {
    {"0", true, 0},
    {"-0", true, 0},
    {"1", true, 1},
    {"+2.50", true, 2.5},
    {".5", true, 0.5},
    {"1e3", true, 1000},
    {"0.1", true, 429496730 * 0x1p-32},
    {"1e-12", true, 0},
    {"1.2e-10", true, 0x1p-32},
    {"0.000000000116415321826934814453125", true, 0},           /* half of 2^-32 */
    {"0.000000000349245965480804443359375", true, 2 * 0x1p-32}, /* one and a half */
    {"1048575.99999999976716935634613037109375", true, 1048576 - 0x1p-32},
    {"2097151.5000000002", true, 2097151.5 + 0x1p-32},
    {"4503599627370495.5", false, 0},
    {"1e15", true, 1e15},
    {"999999999999999.875", true, 999999999999999.875},
    {"1.0000001e15", false, 0},
    {"1e400", false, 0},
    {"-1", false, 0},
    {"-1e-300", false, 0},
    {"", false, 0},
    {" 1", false, 0},
    {"1_000", false, 0},
    {"1,5", false, 0},
    {"nan", false, 0},
    {"inf", false, 0},
    {"Infinity", false, 0},
    {"0x10", false, 0},
    {"1e", false, 0},
    {"one", false, 0},
};

START_TEST(weights_are_read_or_refused) {
    const weight_case *c = &cases[_i];
    double weight = -1;
    ck_assert_msg(bali_weight_read(c->text, strlen(c->text), &weight) == c->right, "%s", c->text);
    if (!c->right) return;
    ck_assert_msg(!(weight < c->weight) && !(weight > c->weight), "%s is %.17g, not %.17g", c->text, weight, c->weight);
    ck_assert(!signbit(weight));
    double parts = weight < 0x1p21 ? weight * 0x1p32 : 0;
    ck_assert(!(parts < floor(parts)) && !(parts > floor(parts)));
}
END_TEST

START_TEST(places_are_whole) {
    static const double weights[] = {0, 1, 3, 0.25, 2.5, 1e15};
    static const uint64_t places[] = {0, 1, 3, 1, 3, 1000000000000000};
    for (size_t i = 0; i < sizeof weights / sizeof weights[0]; i++) ck_assert_uint_eq(bali_weight_places(weights[i]), places[i]);
}
END_TEST

/* Against integers of 128 bits, of which the compiler knows how to do sums. */
START_TEST(sums_are_exact_in_any_order) {
    enum { N = 2000 };
    __extension__ typedef unsigned __int128 wide;
    dice d = dice_of(_i);
    double weights[N];
    wide expected = 0;
    for (size_t i = 0; i < N; i++) {
        weights[i] = floor(chance(&d) * 0x1p32) * 0x1p-32 + (double)roll(&d, _i == 0 ? 3 : 1000000);
        expected += (wide)(weights[i] * 0x1p32);
    }
    bali_weight_sum forth = {0}, back = {0};
    for (size_t i = 0; i < N; i++) bali_weight_add(&forth, weights[i]);
    for (size_t i = N; i-- > 0;) bali_weight_add(&back, weights[i]);
    ck_assert(((wide)forth.whole << 32 | forth.parts) == expected);
    ck_assert_uint_eq(forth.whole, back.whole);
    ck_assert_uint_eq(forth.parts, back.parts);
    double value = bali_weight_value(&forth), rounded = (double)expected * 0x1p-32;
    ck_assert(!(value < rounded) && !(value > rounded));
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("weights");
    TCase *c = tcase_create("weights");
    tcase_add_loop_test(c, weights_are_read_or_refused, 0, sizeof cases / sizeof cases[0]);
    tcase_add_test(c, places_are_whole);
    tcase_add_loop_test(c, sums_are_exact_in_any_order, 0, 10);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
