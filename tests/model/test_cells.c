#include "model/cells.h"

#include "support/fixtures.h"

static bal_cells *counting_cells(const bal_network *network, double first) {
    bal_cells *cells = equal_cells(network, 0);
    for (size_t c = 0; c < bal_network_cells(network); c++) bali_cells_all(cells)[c] = first + (double)c;
    return cells;
}

START_TEST(families_lie_one_after_another) {
    bal_network *n = network_of("A:a,b ; B:x,y,z | A");
    bal_cells *cells = counting_cells(n, 0);
    ck_assert_ptr_eq(bal_cells_family(cells, 0), bali_cells_values(cells));
    ck_assert_ptr_eq(bal_cells_family(cells, 1), bali_cells_values(cells) + 2);
    ck_assert_ptr_eq(bal_cells_edit(cells, 1), bal_cells_family(cells, 1));
    ck_assert_double_eq(bal_cells_family(cells, 1)[1 * 3 + 2], 7); /* row A=b, outcome z */
    ck_assert(bal_network_equal(bal_cells_network(cells), n));
    bal_cells_free(cells);
    bal_network_free(n);
}
END_TEST

START_TEST(new_cells_are_zero) {
    bal_network *n = network_of("A:#300 ; B:x,y,z | A");
    bal_cells *cells;
    ck_assert_int_eq(bal_cells_create(n, &cells, NULL), BAL_OK);
    for (size_t c = 0; c < bal_network_cells(n); c++) ck_assert_double_eq(bali_cells_values(cells)[c], 0);
    bal_network_free(n); /* the cells hold it */
    ck_assert_uint_eq(bal_network_cells(bal_cells_network(cells)), 1200);
    bal_cells_free(cells);
    bal_cells_free(NULL);
}
END_TEST

START_TEST(sums_and_differences_go_cell_by_cell) {
    bal_network *n = network_of("A:a,b ; B:x,y,z | A");
    bal_cells *a = counting_cells(n, 1), *b = counting_cells(n, 100), *c = NULL;
    ck_assert_int_eq(bal_cells_copy(a, &c, NULL), BAL_OK);
    bali_cells_add(c, b);
    for (size_t i = 0; i < 8; i++) ck_assert_double_eq(bali_cells_values(c)[i], 101 + 2 * (double)i);
    bali_cells_subtract(c, b);
    ck_assert_mem_eq(bali_cells_values(c), bali_cells_values(a), 8 * sizeof(double));
    bali_cells_assign(c, b);
    ck_assert_mem_eq(bali_cells_values(c), bali_cells_values(b), 8 * sizeof(double));
    ck_assert_double_eq(bali_cells_values(a)[0], 1); /* a copy is apart from what it was made of */
    bal_cells_free(a);
    bal_cells_free(b);
    bal_cells_free(c);
    bal_network_free(n);
}
END_TEST

START_TEST(a_row_sums_up) {
    const double row[] = {1, 2, 4, 0x1p53};
    ck_assert_double_eq(bali_row_sum(row, 0), 0);
    ck_assert_double_eq(bali_row_sum(row, 3), 7);
    ck_assert_double_eq(bali_row_sum(row + 3, 1), 0x1p53);
}
END_TEST

static bal_status make_and_copy(void *context, bal_error *err) {
    const bal_network *network = context;
    bal_cells *cells = (bal_cells *)network, *copy = cells;
    bal_status status = bal_cells_create(network, &cells, err);
    if (status != BAL_OK) {
        ck_assert_ptr_null(cells);
        return status;
    }
    status = bal_cells_copy(cells, &copy, err);
    if (status != BAL_OK) ck_assert_ptr_null(copy);
    bal_cells_free(copy);
    bal_cells_free(cells);
    return status;
}

START_TEST(cells_survive_failing_allocations) {
    bal_network *n = network_of("A:a,b");
    ck_assert_uint_eq(survive_allocations(make_and_copy, n), 4);
    bal_network_free(n);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("cells");
    TCase *c = tcase_create("cells");
    tcase_add_test(c, families_lie_one_after_another);
    tcase_add_test(c, new_cells_are_zero);
    tcase_add_test(c, sums_and_differences_go_cell_by_cell);
    tcase_add_test(c, a_row_sums_up);
    tcase_add_test(c, cells_survive_failing_allocations);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
