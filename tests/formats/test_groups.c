#include "formats/groups.h"

#include "base/memory.h"
#include "support/harness.h"

#include <stdio.h>
#include <string.h>

START_TEST(labels_are_numbered_as_they_come) {
    static const char *const labels[] = {"B", "A", "B", "", "b", "A", "Bb"};
    static const uint32_t numbers[] = {0, 1, 0, 2, 3, 1, 4};
    bal_groups *groups = NULL;
    ck_assert_int_eq(bal_groups_create(&groups, NULL), BAL_OK);
    for (size_t i = 0; i < sizeof labels / sizeof labels[0]; i++) {
        char text[8]; /* copied: what stands in a buffer goes */
        uint32_t number;
        (void)snprintf(text, sizeof text, "%sxxx", labels[i]);
        ck_assert(bali_groups_number(groups, text, strlen(labels[i]), &number));
        ck_assert_uint_eq(number, numbers[i]);
    }
    ck_assert_uint_eq(bali_groups_count(groups), 5);
    bal_groups_free(groups);
    bal_groups_free(NULL);
}
END_TEST

START_TEST(there_is_an_end_to_labels) {
    bal_groups *groups = NULL;
    ck_assert_int_eq(bal_groups_create(&groups, NULL), BAL_OK);
    uint32_t number = 0;
    for (size_t i = 0; i <= BALI_MOST_GROUPS; i++) {
        char text[16];
        int length = snprintf(text, sizeof text, "%zu", i);
        ck_assert(bali_groups_number(groups, text, (size_t)length, &number));
        if (i < BALI_MOST_GROUPS && number != i) ck_assert_uint_eq(number, i);
    }
    ck_assert_uint_eq(number, UINT32_MAX);
    ck_assert(bali_groups_number(groups, "77", 2, &number));
    ck_assert_uint_eq(number, 77);
    ck_assert_uint_eq(bali_groups_count(groups), BALI_MOST_GROUPS);
    bal_groups_free(groups);
}
END_TEST

static bal_status number_some(void *context, bal_error *err) {
    (void)context;
    bal_groups *groups = NULL;
    uint32_t number;
    bal_status status = bal_groups_create(&groups, err);
    for (size_t i = 0; i < 20 && status == BAL_OK; i++)
        if (!bali_groups_number(groups, &"abcdefghijklmnopqrstuvwxyz"[i], 1, &number)) status = bali_out_of_memory(err);
    bal_groups_free(groups);
    return status;
}

START_TEST(memory_may_run_out) {
    ck_assert_uint_ge(survive_allocations(number_some, NULL), 20);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("groups");
    TCase *c = tcase_create("groups");
    tcase_set_timeout(c, 60); /* a million labels */
    tcase_add_test(c, labels_are_numbered_as_they_come);
    tcase_add_test(c, there_is_an_end_to_labels);
    tcase_add_test(c, memory_may_run_out);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
