#include "base/numbers.h"

#include <limits.h>
#include <locale.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { LONGEST_NUMBER = 511 };

/* The C locale's decimal point is put in and taken out by hand, since strtod and printf follow the process's
 * locale and changing that is not a library's business. */
static const char *decimal_point(void) {
    const struct lconv *conventions = localeconv();
    return conventions && conventions->decimal_point && conventions->decimal_point[0] ? conventions->decimal_point : ".";
}

/* Puts one point in place of another within a text; some locales have one of several bytes. false when it does not fit. */
static bool replace_point(char *text, size_t size, const char *from, const char *to) {
    char *point = strstr(text, from);
    if (!point) return true;
    size_t length_from = strlen(from), length_to = strlen(to);
    if (strlen(text) - length_from + length_to >= size) return false;
    memmove(point + length_to, point + length_from, strlen(point + length_from) + 1);
    memcpy(point, to, length_to);
    return true;
}

static size_t skip_digits(const char *bytes, size_t length, size_t i) {
    while (i < length && bytes[i] >= '0' && bytes[i] <= '9') i++;
    return i;
}

/* Whether the bytes are [+-]digits[.digits][e[+-]digits] with at least one digit before or after the point. */
static bool is_decimal(const char *bytes, size_t length) {
    size_t i = length > 0 && (bytes[0] == '+' || bytes[0] == '-');
    size_t whole = skip_digits(bytes, length, i), digits = whole - i;
    i = whole;
    if (i < length && bytes[i] == '.') {
        size_t end = skip_digits(bytes, length, i + 1);
        digits += end - i - 1;
        i = end;
    }
    if (digits == 0) return false;
    if (i < length && (bytes[i] == 'e' || bytes[i] == 'E')) {
        i++;
        if (i < length && (bytes[i] == '+' || bytes[i] == '-')) i++;
        size_t end = skip_digits(bytes, length, i);
        if (end == i) return false;
        i = end;
    }
    return i == length;
}

/* Up to 15 digits and nothing else: the number is exact, and a tally of millions of counts is read at the speed of its bytes. */
static bool read_short_whole(const char *bytes, size_t length, double *value) {
    if (length == 0 || length > 15 || skip_digits(bytes, length, 0) != length) return false;
    uint64_t whole = 0;
    for (size_t i = 0; i < length; i++) whole = whole * 10 + (uint64_t)(bytes[i] - '0');
    *value = (double)whole;
    return true;
}

bool bali_number_read(const char *bytes, size_t length, double *value) {
    if (read_short_whole(bytes, length, value)) return true;
    char copy[LONGEST_NUMBER + MB_LEN_MAX + 1];
    if (length > LONGEST_NUMBER || !is_decimal(bytes, length)) return false;
    memcpy(copy, bytes, length);
    copy[length] = '\0';
    if (!replace_point(copy, sizeof copy, ".", decimal_point())) return false;
    char *end;
    double read = strtod(copy, &end);
    if (*end != '\0' || !isfinite(read)) return false;
    *value = read;
    return true;
}

bool bali_whole_read(const char *bytes, size_t length, uint64_t *value) {
    if (length == 0 || skip_digits(bytes, length, 0) != length) return false;
    uint64_t whole = 0;
    for (size_t i = 0; i < length; i++) {
        uint64_t digit = (uint64_t)(bytes[i] - '0');
        if (whole > (UINT64_MAX - digit) / 10) return false;
        whole = whole * 10 + digit;
    }
    *value = whole;
    return true;
}

/* What %.15g gives for a whole number of at most 15 digits. */
static void write_short_whole(uint64_t whole, char text[BALI_NUMBER_BYTES]) {
    char digits[16];
    size_t n = 0;
    do digits[n++] = (char)('0' + whole % 10);
    while ((whole /= 10) > 0);
    for (size_t i = 0; i < n; i++) text[i] = digits[n - 1 - i];
    text[n] = '\0';
}

const char *bali_number_write(double value, char text[BALI_NUMBER_BYTES]) {
    if (value >= 0 && value < 1e15 && value == floor(value) && !signbit(value)) {
        write_short_whole((uint64_t)value, text);
        return text;
    }
    for (int digits = 15; digits <= 17; digits++) {
        (void)snprintf(text, BALI_NUMBER_BYTES, "%.*g", digits, value);
        if (strtod(text, NULL) == value) break;
    }
    (void)replace_point(text, BALI_NUMBER_BYTES, decimal_point(), ".");
    return text;
}

void bali_text_put_number(bali_text *text, double value) {
    char number[BALI_NUMBER_BYTES];
    bali_text_puts(text, bali_number_write(value, number));
}

void bali_text_put_thousands(bali_text *text, uint64_t value) {
    char digits[24];
    int length = snprintf(digits, sizeof digits, "%llu", (unsigned long long)value);
    for (int i = 0; i < length; i++) {
        if (i > 0 && (length - i) % 3 == 0) bali_text_putc(text, ',');
        bali_text_putc(text, digits[i]);
    }
}

double bali_round_significant(double value, int digits) {
    char text[BALI_NUMBER_BYTES];
    (void)snprintf(text, sizeof text, "%.*e", digits - 1, value);
    return strtod(text, NULL);
}
