#include "base/memory.h"
#include "base/names.h"
#include "formats/label_codes.h"
#include "support/harness.h"

#include <stdio.h>
#include <string.h>

/* Looks a text up as it would stand in a read buffer: with other bytes behind it. */
static uint32_t find(const bali_label_codes *codes, const char *text) {
    char buffer[600];
    size_t length = strlen(text);
    memset(buffer, 'z', sizeof buffer);
    memcpy(buffer, text, length);
    return bali_label_codes_find(codes, buffer, length);
}

START_TEST(labels_are_told_apart) {
    static const char *const labels[] = {
        "a", "b", "ab", "ba", "aaaaaaa", "aaaaaaaa", "aaaaaaaaa", "aaaaaaaab", "aaaaaaaac", "baaaaaaaa",
        "0123456789abcdef", "0123456789abcdeg", "0123456789abcdefg", "X123456789abcdef0123456789abcdef", "0123456789abcdef0123456789abcdeX",
        "caf\xC3\xA9", "cafe", " a", "a ", "A"};
    enum { N = sizeof labels / sizeof labels[0] };
    bali_label_codes codes = {0};
    ck_assert(bali_label_codes_build(&codes, labels, N));
    for (uint32_t k = 0; k < N; k++) ck_assert_uint_eq(find(&codes, labels[k]), k);
    static const char *const others[] = {"", "c", "aa", "aaaaaa", "aaaaaaaad", "aaaaaaaaaa", "0123456789abcde", "0123456789abcdef0",
                                         "X123456789abcdef0123456789abcdeX", "caf", "z", "az", "B"};
    for (size_t i = 0; i < sizeof others / sizeof others[0]; i++) ck_assert_uint_eq(find(&codes, others[i]), BALI_NO_CODE);
    bali_label_codes_free(&codes);
    bali_label_codes_free(&codes);
}
END_TEST

START_TEST(the_first_of_equal_labels_counts) {
    static const char *const labels[] = {"NA", "?", "NA", ""};
    bali_label_codes codes = {0};
    ck_assert(bali_label_codes_build(&codes, labels, 4));
    ck_assert_uint_eq(find(&codes, "NA"), 0);
    ck_assert_uint_eq(find(&codes, ""), 3);
    bali_label_codes_free(&codes);
    ck_assert(bali_label_codes_build(&codes, NULL, 0));
    ck_assert_uint_eq(find(&codes, "NA"), BALI_NO_CODE);
    bali_label_codes_free(&codes);
}
END_TEST

START_TEST(as_many_labels_as_a_variable_may_have) {
    enum { N = BAL_MAX_OUTCOMES };
    char (*texts)[24] = bali_allocate(N, sizeof *texts);
    const char **labels = bali_allocate(N, sizeof *labels);
    for (size_t k = 0; k < N; k++) {
        (void)snprintf(texts[k], sizeof texts[k], k % 2 ? "%zu" : "outcome number %zu", k);
        labels[k] = texts[k];
    }
    bali_label_codes codes = {0};
    ck_assert(bali_label_codes_build(&codes, labels, N));
    for (uint32_t k = 0; k < N; k++) ck_assert_uint_eq(find(&codes, labels[k]), k);
    /* In so full a table many texts meet the slots of others; each text without its last byte is one, most are no labels. */
    bali_names names = {0};
    size_t first;
    for (size_t k = 0; k < N; k++) ck_assert(bali_names_add(&names, labels[k], &first));
    for (size_t k = 0; k < N; k++) {
        texts[k][strlen(texts[k]) - 1] = '\0';
        char shorter[24];
        memcpy(shorter, texts[k], sizeof shorter);
        texts[k][strlen(texts[k])] = (char)('0' + k % 10);
        size_t known = bali_names_find(&names, shorter, strlen(shorter));
        ck_assert_uint_eq(find(&codes, shorter), known == BALI_NO_NAME ? BALI_NO_CODE : known);
    }
    bali_names_free(&names);
    bali_label_codes_free(&codes);
    bali_free(labels);
    bali_free(texts);
}
END_TEST

static bal_status build(void *context, bal_error *err) {
    static const char *const labels[] = {"no", "yes", "perhaps"};
    (void)context;
    bali_label_codes codes = {0};
    bool built = bali_label_codes_build(&codes, labels, 3);
    bali_label_codes_free(&codes);
    return built ? BAL_OK : bali_out_of_memory(err);
}

START_TEST(memory_may_run_out_anywhere) {
    ck_assert_uint_eq(survive_allocations(build, NULL), 4);
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("label_codes");
    TCase *tests = tcase_create("label_codes");
    tcase_add_test(tests, labels_are_told_apart);
    tcase_add_test(tests, the_first_of_equal_labels_counts);
    tcase_add_test(tests, as_many_labels_as_a_variable_may_have);
    tcase_add_test(tests, memory_may_run_out_anywhere);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
