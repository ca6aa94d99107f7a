#include "base/numbers.h"
#include "base/random.h"
#include "support/harness.h"

#include <float.h>
#include <locale.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const struct {
    const char *text;
    bool valid;
    double value;
} decimals[] = {
    {"0", true, 0},
    {"-0", true, 0},
    {"0.25", true, 0.25},
    {".5", true, 0.5},
    {"5.", true, 5},
    {"+1.5", true, 1.5},
    {"-2", true, -2},
    {"1e3", true, 1000},
    {"1E+3", true, 1000},
    {"25e-2", true, 0.25},
    {"007", true, 7},
    {"1e-400", true, 0}, /* underflow */
    {"1.7976931348623157e308", true, DBL_MAX},
    {"4.9406564584124654e-324", true, 0x1p-1074},
    {"", false, 0},
    {"+", false, 0},
    {".", false, 0},
    {"e5", false, 0},
    {".e5", false, 0},
    {"1e", false, 0},
    {"1e+", false, 0},
    {".5.", false, 0},
    {"0,5", false, 0},
    {" 5", false, 0},
    {"5 ", false, 0},
    {"5\n", false, 0},
    {"10x", false, 0},
    {"1_000", false, 0},
    {"1,000", false, 0},
    {"0x1p-1", false, 0},
    {"nan", false, 0},
    {"NaN", false, 0},
    {"inf", false, 0},
    {"-infinity", false, 0},
    {"1e400", false, 0},
    {"-1e999", false, 0},
    {"--1", false, 0},
    {"1e5.0", false, 0},
    {"\xD9\xA1", false, 0}, /* an Arabic-Indic one */
};

static void check_decimal(const char *text, bool valid, double value) {
    double read = 42;
    ck_assert_msg(bali_number_read(text, strlen(text), &read) == valid, "%s", text);
    ck_assert_msg(read == (valid ? value : 42), "%s read as %.17g", text, read);
}

START_TEST(decimals_read_whole_or_not_at_all) {
    check_decimal(decimals[_i].text, decimals[_i].valid, decimals[_i].value);
}
END_TEST

START_TEST(only_the_given_bytes_are_read) {
    double value;
    ck_assert(bali_number_read("12345", 2, &value));
    ck_assert(value == 12);
    ck_assert(!bali_number_read("1\0002", 3, &value));
    ck_assert(!bali_number_read("1\0", 2, &value));
    ck_assert(!bali_number_read(NULL, 0, &value));
}
END_TEST

START_TEST(long_numbers_have_a_limit) {
    char digits[600];
    double value;
    memset(digits, '0', sizeof digits);
    digits[0] = '1';
    digits[1] = '.';
    ck_assert(bali_number_read(digits, 511, &value));
    ck_assert(value == 1);
    ck_assert(!bali_number_read(digits, 512, &value));
    ck_assert(!bali_number_read(digits, 600, &value));
}
END_TEST

static const struct {
    const char *text;
    bool valid;
    uint64_t value;
} wholes[] = {
    {"0", true, 0},
    {"18446744073709551615", true, UINT64_MAX},
    {"18446744073709551616", false, 0},
    {"18446744073709551620", false, 0},
    {"99999999999999999999", false, 0},
    {"00012", true, 12},
    {"", false, 0},
    {"-1", false, 0},
    {"+1", false, 0},
    {"1.0", false, 0},
    {"1e3", false, 0},
    {" 5", false, 0},
    {"5x", false, 0},
};

START_TEST(whole_numbers_read_whole_or_not_at_all) {
    uint64_t value = 42;
    ck_assert_int_eq(bali_whole_read(wholes[_i].text, strlen(wholes[_i].text), &value), wholes[_i].valid);
    ck_assert_uint_eq(value, wholes[_i].valid ? wholes[_i].value : 42);
}
END_TEST

static const struct {
    double value;
    const char *text;
} written[] = {
    {0, "0"},
    {-0.0, "-0"},
    {1, "1"},
    {0.1, "0.1"},
    {0.1 + 0.2, "0.30000000000000004"},
    {1.0 / 3, "0.3333333333333333"},
    {2.0 / 3, "0.6666666666666666"},
    {1e23, "1e+23"},
    {-2.5e-7, "-2.5e-07"},
    {9007199254740992.0, "9007199254740992"},
    {-DBL_MAX, "-1.7976931348623157e+308"},
    {DBL_MIN, "2.2250738585072014e-308"},
};

START_TEST(numbers_are_written_short) {
    char text[BALI_NUMBER_BYTES];
    ck_assert_str_eq(bali_number_write(written[_i].value, text), written[_i].text);
}
END_TEST

static double random_double(uint64_t i) {
    uint64_t bits = bali_splitmix64(7, i);
    double value;
    memcpy(&value, &bits, sizeof value);
    return isfinite(value) ? value : (double)i;
}

START_TEST(what_is_written_reads_back_equal) {
    for (uint64_t i = 0; i < 100000; i++) {
        double value = i % 2 ? random_double(i) : bali_uniform(bali_splitmix64(8, i)), back = -1;
        char text[BALI_NUMBER_BYTES], shorter[64];
        bali_number_write(value, text);
        if (!bali_number_read(text, strlen(text), &back) || back != value) ck_abort_msg("%.17g written as %s", value, text);
        (void)snprintf(shorter, sizeof shorter, "%.15g", value);
        if (strtod(shorter, NULL) == value && strcmp(shorter, text) != 0) ck_abort_msg("%s would do for %s", shorter, text);
    }
}
END_TEST

/* Whole numbers go by a path of their own, both ways: it has to agree with the C library's at its ends. */
static const double wholes_written[] = {0, -0.0, 1, -1, 9, 10, 99, 100, 65535, 4294967295.0, 4294967296.0, 99999999999999, 100000000000000, 999999999999998,
                                        999999999999999, 999999999999999.5, 999999999999999.875, 1e15, 1e15 + 1, 9007199254740991.0, 9007199254740992.0,
                                        18446744073709551615.0, 1e22, 0.5, 0.9999999999999999, 1.0000000000000002, 1.5, 123456.5, 0x1p-32, 3 + 0x1p-32,
                                        DBL_MIN, DBL_MAX, -999999999999999.0};

START_TEST(whole_numbers_are_written_as_the_c_library_does) {
    double value = wholes_written[_i], back;
    char text[BALI_NUMBER_BYTES], wanted[64];
    for (int digits = 15; digits <= 17; digits++) {
        (void)snprintf(wanted, sizeof wanted, "%.*g", digits, value);
        if (strtod(wanted, NULL) == value) break;
    }
    ck_assert_str_eq(bali_number_write(value, text), wanted);
    ck_assert(bali_number_read(text, strlen(text), &back));
    ck_assert(back == value && signbit(back) == signbit(value));
}
END_TEST

static const char *const digit_runs[] = {"0", "00", "7", "000000000000007", "0000000000000007", "999999999999999", "9999999999999999", "100000000000000",
                                         "1000000000000000", "9007199254740993", "18446744073709551616", "123456789012345678901234567890"};

START_TEST(runs_of_digits_are_read_as_the_c_library_does) {
    double read = -1;
    ck_assert(bali_number_read(digit_runs[_i], strlen(digit_runs[_i]), &read));
    ck_assert(read == strtod(digit_runs[_i], NULL));
}
END_TEST

static const struct {
    uint64_t value;
    const char *text;
} thousands[] = {{0, "0"}, {999, "999"}, {1000, "1,000"}, {1234567, "1,234,567"}, {UINT64_MAX, "18,446,744,073,709,551,615"}};

START_TEST(thousands_are_set_apart) {
    bali_text text = {0};
    bali_text_put_thousands(&text, thousands[_i].value);
    ck_assert_str_eq(text.bytes, thousands[_i].text);
    bali_text_free(&text);
}
END_TEST

START_TEST(numbers_join_a_text) {
    bali_text text = {0};
    bali_text_puts(&text, "p = ");
    bali_text_put_number(&text, 0.125);
    ck_assert_str_eq(text.bytes, "p = 0.125");
    bali_text_free(&text);
}
END_TEST

static const struct {
    double value;
    int digits;
    double rounded;
} roundings[] = {
    {15.44, 3, 15.4},  {15.46, 3, 15.5},      {9.996, 3, 10},   {0.012345, 3, 0.0123}, {10000, 3, 10000},
    {-1.2349, 3, -1.23}, {123456, 3, 123000}, {0, 3, 0},        {2.5, 1, 2},           {1.0 / 3, 17, 1.0 / 3},
    {0.01, 3, 0.01},
};

START_TEST(rounds_as_decimal_text_would) {
    ck_assert_double_eq(bali_round_significant(roundings[_i].value, roundings[_i].digits), roundings[_i].rounded);
}
END_TEST

/* A decimal comma, and a decimal point of two bytes, as in Pashto. */
static const struct {
    const char *point, *locale; /* the C library remembers a locale by its name */
} points[] = {{"<U002C>", "xx_XX.UTF-8"}, {"<U066B>", "xx_YY.UTF-8"}};

/* Makes a locale with this decimal point in a scratch folder and turns it on. */
static bool use_point(const char *point, const char *locale) {
    char source[256], command[1600];
    const char *folder = scratch_dir();
    (void)snprintf(source, sizeof source,
                   "LC_CTYPE\ncopy \"POSIX\"\nEND LC_CTYPE\n"
                   "LC_NUMERIC\ndecimal_point \"%s\"\nthousands_sep \"\"\ngrouping -1\nEND LC_NUMERIC\n",
                   point);
    (void)scratch_file("locale", source, strlen(source));
    (void)snprintf(command, sizeof command, "localedef -c -i '%s/locale' -f UTF-8 '%s/%s' >'%s/log' 2>&1", folder, folder, locale, folder);
    (void)!system(command); /* it complains of the categories that are not there */
    (void)setenv("LOCPATH", folder, 1);
    bool usable = setlocale(LC_NUMERIC, locale) != NULL;
    (void)snprintf(command, sizeof command, "rm -rf '%s/%s'", folder, locale);
    (void)!system(command);
    return usable;
}

START_TEST(the_users_locale_changes_nothing) {
    if (!use_point(points[_i].point, points[_i].locale)) {
        (void)printf("the_users_locale_changes_nothing: skipped: localedef or its sources are not installed\n");
        return;
    }
    char proof[32], text[BALI_NUMBER_BYTES];
    (void)snprintf(proof, sizeof proof, "%.1f", 0.5);
    ck_assert_str_eq(proof, _i == 0 ? "0,5" : "0\xD9\xAB" "5"); /* the locale is on */
    for (size_t i = 0; i < sizeof decimals / sizeof decimals[0]; i++)
        check_decimal(decimals[i].text, decimals[i].valid, decimals[i].value);
    for (size_t i = 0; i < sizeof written / sizeof written[0]; i++)
        ck_assert_str_eq(bali_number_write(written[i].value, text), written[i].text);
    for (size_t i = 0; i < sizeof roundings / sizeof roundings[0]; i++)
        ck_assert_double_eq(bali_round_significant(roundings[i].value, roundings[i].digits), roundings[i].rounded);
    char digits[512];
    double value;
    memset(digits, '0', sizeof digits);
    digits[1] = '.';
    ck_assert(bali_number_read(digits, 511, &value)); /* the longest, whatever the point's length */
    (void)setlocale(LC_NUMERIC, "C");
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("numbers");
    TCase *tests = tcase_create("numbers");
    tcase_set_timeout(tests, 60);
    tcase_add_loop_test(tests, decimals_read_whole_or_not_at_all, 0, (int)(sizeof decimals / sizeof decimals[0]));
    tcase_add_test(tests, only_the_given_bytes_are_read);
    tcase_add_test(tests, long_numbers_have_a_limit);
    tcase_add_loop_test(tests, whole_numbers_read_whole_or_not_at_all, 0, (int)(sizeof wholes / sizeof wholes[0]));
    tcase_add_loop_test(tests, numbers_are_written_short, 0, (int)(sizeof written / sizeof written[0]));
    tcase_add_test(tests, what_is_written_reads_back_equal);
    tcase_add_loop_test(tests, whole_numbers_are_written_as_the_c_library_does, 0, (int)(sizeof wholes_written / sizeof wholes_written[0]));
    tcase_add_loop_test(tests, runs_of_digits_are_read_as_the_c_library_does, 0, (int)(sizeof digit_runs / sizeof digit_runs[0]));
    tcase_add_loop_test(tests, thousands_are_set_apart, 0, (int)(sizeof thousands / sizeof thousands[0]));
    tcase_add_test(tests, numbers_join_a_text);
    tcase_add_loop_test(tests, rounds_as_decimal_text_would, 0, (int)(sizeof roundings / sizeof roundings[0]));
    tcase_add_loop_test(tests, the_users_locale_changes_nothing, 0, (int)(sizeof points / sizeof points[0]));
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
