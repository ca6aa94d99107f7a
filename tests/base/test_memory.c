#include "base/memory.h"
#include "support/harness.h"

#include <stdint.h>
#include <string.h>

START_TEST(memory_is_zeroed) {
    unsigned char *bytes = bali_allocate(100, 3);
    ck_assert_ptr_nonnull(bytes);
    for (size_t i = 0; i < 300; i++) ck_assert_uint_eq(bytes[i], 0);
    bali_free(bytes);
    bali_free(NULL);
}
END_TEST

START_TEST(nothing_can_be_freed_too) {
    void *none = bali_allocate(0, 8), *no_size = bali_allocate(8, 0);
    ck_assert_ptr_nonnull(none);
    ck_assert_ptr_nonnull(no_size);
    none = bali_reallocate(none, 0, 1);
    ck_assert_ptr_nonnull(none);
    bali_free(none);
    bali_free(no_size);
}
END_TEST

static const struct {
    size_t a, b;
    bool fits;
} products[] = {
    {0, SIZE_MAX, true},
    {SIZE_MAX, 0, true},
    {SIZE_MAX, 1, true},
    {1, SIZE_MAX, true},
    {SIZE_MAX, 2, false},
    {SIZE_MAX / 2, 2, true},
    {SIZE_MAX / 2 + 1, 2, false},
    {(size_t)1 << 32, ((size_t)1 << 32) - 1, true},
    {(size_t)1 << 32, (size_t)1 << 32, false},
};

START_TEST(products_are_checked) {
    size_t product = 42;
    ck_assert_int_eq(bali_multiply(products[_i].a, products[_i].b, &product), products[_i].fits);
    ck_assert_uint_eq(product, products[_i].fits ? products[_i].a * products[_i].b : 42);
    if (products[_i].fits) return;
    ck_assert_ptr_null(bali_allocate(products[_i].a, products[_i].b));
    ck_assert_ptr_null(bali_reallocate(NULL, products[_i].a, products[_i].b));
}
END_TEST

START_TEST(copies_end_with_a_nul) {
    char *copy = bali_duplicate("a\0bc", 3);
    ck_assert(memcmp(copy, "a\0b\0", 4) == 0);
    bali_free(copy);
    copy = bali_duplicate("", 0);
    ck_assert_str_eq(copy, "");
    bali_free(copy);
    ck_assert_ptr_null(bali_duplicate("", SIZE_MAX));
}
END_TEST

START_TEST(arrays_grow_and_keep_what_they_hold) {
    int *items = NULL;
    size_t capacity = 0, moves = 0;
    for (size_t i = 0; i < 1000; i++) {
        size_t before = capacity;
        ck_assert(bali_grow((void **)&items, &capacity, i + 1, sizeof *items));
        ck_assert_uint_gt(capacity, i);
        moves += capacity != before;
        items[i] = (int)i;
    }
    for (int i = 0; i < 1000; i++) ck_assert_int_eq(items[i], i);
    ck_assert_uint_le(moves, 8); /* 8, 16, ... 1024: doubling, not one by one */

    const int *before = items;
    size_t kept = capacity;
    ck_assert(!bali_grow((void **)&items, &capacity, SIZE_MAX, sizeof *items));
    ck_assert(!bali_grow((void **)&items, &capacity, SIZE_MAX / 2, sizeof *items));
    ck_assert_ptr_eq(items, before);
    ck_assert_uint_eq(capacity, kept);
    ck_assert_int_eq(items[999], 999);
    bali_free(items);
}
END_TEST

START_TEST(the_nth_allocation_fails_once) {
    bali_memory_fail_at(2);
    void *first = bali_allocate(1, 1), *second = bali_allocate(1, 1), *third = bali_allocate(1, 1);
    ck_assert_ptr_nonnull(first);
    ck_assert_ptr_null(second);
    ck_assert_ptr_nonnull(third);
    bali_memory_fail_at(1);
    ck_assert_ptr_null(bali_reallocate(first, 100, 1));
    bali_memory_fail_at(1);
    ck_assert_ptr_null(bali_duplicate("x", 1));
    bali_memory_fail_at(1);
    bali_memory_fail_at(0);
    void *fourth = bali_allocate(1, 1);
    ck_assert_ptr_nonnull(fourth);
    bali_free(first);
    bali_free(third);
    bali_free(fourth);
}
END_TEST

START_TEST(running_out_is_reported) {
    bal_error err = {0};
    ck_assert_int_eq(bali_out_of_memory(&err), BAL_ERR_MEMORY);
    ck_assert_str_eq(err.code, "out-of-memory");
    ck_assert_int_eq(bali_out_of_memory(NULL), BAL_ERR_MEMORY);
    bal_error earlier = {0};
    (void)bal_error_set(&earlier, BAL_ERR_DATA, "first", "first");
    ck_assert_int_eq(bali_out_of_memory(&earlier), BAL_ERR_DATA);
}
END_TEST

static Suite *suite(void) {
    Suite *suite = suite_create("memory");
    TCase *tests = tcase_create("memory");
    tcase_add_test(tests, memory_is_zeroed);
    tcase_add_test(tests, nothing_can_be_freed_too);
    tcase_add_loop_test(tests, products_are_checked, 0, (int)(sizeof products / sizeof products[0]));
    tcase_add_test(tests, copies_end_with_a_nul);
    tcase_add_test(tests, arrays_grow_and_keep_what_they_hold);
    tcase_add_test(tests, the_nth_allocation_fails_once);
    tcase_add_test(tests, running_out_is_reported);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    return run_suite(suite());
}
