#include "model/document.h"

#include "model/cells.h"
#include "support/fixtures.h"

#include <string.h>

static const char *const structure = "A:a,b ; B:x,y,z | A";

static bal_document *document_of(const bal_network *network, const char *name) {
    bal_document *document = NULL;
    bal_error err = {0};
    ck_assert_msg(bal_document_create(network, name, &document, &err) == BAL_OK, "%s", err.message);
    return document;
}

static void set_property(bal_document *document, bal_property_of of, size_t variable, const char *name, const char *value) {
    ck_assert_int_eq(bal_document_set_property(document, of, variable, name, value, NULL), BAL_OK);
}

START_TEST(a_new_document_carries_nothing) {
    bal_network *n = network_of(structure);
    bal_document *d = document_of(n, NULL);
    bal_network_free(n); /* the document holds it */
    size_t n_properties;
    ck_assert_str_eq(bal_document_name(d), "");
    ck_assert_uint_eq(bal_network_variables(bal_document_network(d)), 2);
    for (bal_carried what = BAL_CARRIED_TABLES; what <= BAL_CARRIED_PSEUDO_COUNTS; what++)
        ck_assert_ptr_null(bal_document_cells(d, what));
    ck_assert_ptr_null(bali_document_table(d, 1));
    ck_assert_ptr_null(bal_document_row_ess(d, 1));
    (void)bali_document_properties(d, &n_properties);
    ck_assert_uint_eq(n_properties, 0);
    ck_assert_ptr_null(bal_document_property(d, BAL_OF_NETWORK, BAL_NONE, "ballast.records"));
    bal_document_free(d);
    bal_document_free(NULL);
}
END_TEST

START_TEST(cells_are_copied_in_and_taken_out) {
    bal_network *n = network_of(structure), *same = network_of(structure), *other = network_of("A:a,b ; B:x,y,z");
    bal_document *d = document_of(n, "net");
    bal_cells *counts = equal_cells(same, 3), *foreign = equal_cells(other, 1);
    ck_assert_int_eq(bal_document_set_cells(d, BAL_CARRIED_COUNTS, counts, NULL), BAL_OK);
    bali_cells_all(counts)[0] = 99;
    ck_assert_double_eq(bali_cells_values(bal_document_cells(d, BAL_CARRIED_COUNTS))[0], 3);
    ck_assert_ptr_null(bal_document_cells(d, BAL_CARRIED_TABLES));
    ck_assert_int_eq(bal_document_set_cells(d, BAL_CARRIED_COUNTS, bal_document_cells(d, BAL_CARRIED_COUNTS), NULL),
                     BAL_OK); /* its own */
    ck_assert_double_eq(bali_cells_values(bal_document_cells(d, BAL_CARRIED_COUNTS))[7], 3);

    bal_error err = {0};
    ck_assert_int_eq(bal_document_set_cells(d, BAL_CARRIED_COUNTS, foreign, &err), BAL_ERR_ARGUMENT);
    ck_assert_str_eq(err.code, "other-network");
    ck_assert_double_eq(bali_cells_values(bal_document_cells(d, BAL_CARRIED_COUNTS))[0], 3); /* as it was */
    ck_assert_int_eq(bal_document_set_cells(d, BAL_CARRIED_COUNTS, NULL, NULL), BAL_OK);
    ck_assert_ptr_null(bal_document_cells(d, BAL_CARRIED_COUNTS));
    bal_cells_free(counts);
    bal_cells_free(foreign);
    bal_document_free(d);
    bal_network_free(n);
    bal_network_free(same);
    bal_network_free(other);
}
END_TEST

START_TEST(tables_count_once_every_family_has_one) {
    bal_network *n = network_of(structure);
    bal_document *d = document_of(n, "net");
    bal_cells *tables = equal_cells(n, 0.5);
    ck_assert_int_eq(bali_document_set_tables(d, tables, (const bool[]){true, false}, NULL), BAL_OK);
    ck_assert_ptr_null(bal_document_cells(d, BAL_CARRIED_TABLES));
    ck_assert_double_eq(bali_document_table(d, 0)[1], 0.5);
    ck_assert_ptr_null(bali_document_table(d, 1));
    ck_assert_int_eq(bali_document_set_tables(d, tables, (const bool[]){true, true}, NULL), BAL_OK);
    ck_assert_ptr_nonnull(bal_document_cells(d, BAL_CARRIED_TABLES));
    ck_assert_int_eq(bali_document_set_tables(d, tables, (const bool[]){false, true}, NULL), BAL_OK);
    ck_assert_int_eq(bal_document_set_cells(d, BAL_CARRIED_TABLES, tables, NULL), BAL_OK); /* whole cells give every family's */
    ck_assert_ptr_nonnull(bali_document_table(d, 0));
    ck_assert_int_eq(bal_document_set_cells(d, BAL_CARRIED_TABLES, NULL, NULL), BAL_OK);
    ck_assert_ptr_null(bali_document_table(d, 0));
    ck_assert_ptr_null(bal_document_cells(d, BAL_CARRIED_TABLES));
    bal_cells_free(tables);
    bal_document_free(d);
    bal_network_free(n);
}
END_TEST

START_TEST(row_ess_has_one_number_a_row) {
    bal_network *n = network_of(structure);
    bal_document *d = document_of(n, "net");
    double rows[] = {20, 30};
    ck_assert_int_eq(bali_document_set_row_ess(d, 1, rows, NULL), BAL_OK);
    rows[1] = 0;
    ck_assert_double_eq(bal_document_row_ess(d, 1)[0], 20);
    ck_assert_double_eq(bal_document_row_ess(d, 1)[1], 30);
    ck_assert_ptr_null(bal_document_row_ess(d, 0));
    ck_assert_int_eq(bali_document_set_row_ess(d, 1, (const double[]){5, 6}, NULL), BAL_OK);
    ck_assert_double_eq(bal_document_row_ess(d, 1)[1], 6);
    bal_document_free(d);
    bal_network_free(n);
}
END_TEST

START_TEST(properties_are_set_replaced_and_removed) {
    bal_network *n = network_of(structure);
    bal_document *d = document_of(n, "net");
    set_property(d, BAL_OF_NETWORK, BAL_NONE, "ballast.records", "12");
    set_property(d, BAL_OF_VARIABLE, 0, "ballast.column", "temp");
    set_property(d, BAL_OF_DEFINITION, 0, "ballast.column", "other place");
    set_property(d, BAL_OF_NETWORK, 5, "ballast.records", "13"); /* the network has no variable */
    ck_assert_str_eq(bal_document_property(d, BAL_OF_NETWORK, BAL_NONE, "ballast.records"), "13");
    ck_assert_str_eq(bal_document_property(d, BAL_OF_VARIABLE, 0, "ballast.column"), "temp");
    ck_assert_str_eq(bal_document_property(d, BAL_OF_DEFINITION, 0, "ballast.column"), "other place");
    ck_assert_ptr_null(bal_document_property(d, BAL_OF_VARIABLE, 1, "ballast.column"));
    ck_assert_ptr_null(bal_document_property(d, BAL_OF_NETWORK, BAL_NONE, "ballast.record"));
    ck_assert_ptr_null(bal_document_property(d, BAL_OF_NETWORK, BAL_NONE, "ballast.records2"));
    set_property(d, BAL_OF_VARIABLE, 0, "ballast.column", NULL);
    set_property(d, BAL_OF_VARIABLE, 0, "ballast.column", NULL); /* not there: fine */
    size_t n_properties;
    const bali_property *properties = bali_document_properties(d, &n_properties);
    ck_assert_uint_eq(n_properties, 2);
    ck_assert_str_eq(properties[0].text, "ballast.records = 13"); /* in its old place */
    ck_assert_uint_eq(properties[0].variable, BAL_NONE);
    ck_assert_str_eq(properties[1].text, "ballast.column = other place");
    bal_document_free(d);
    bal_network_free(n);
}
END_TEST

START_TEST(a_foreign_property_is_kept_as_it_stands) {
    bal_network *n = network_of(structure);
    bal_document *d = document_of(n, "net");
    const char text[] = "  position = (10, 20)\n and more";
    ck_assert_int_eq(bali_document_add_property(d, BAL_OF_VARIABLE, 1, text, 20, NULL), BAL_OK);
    size_t n_properties;
    ck_assert_str_eq(bali_document_properties(d, &n_properties)[0].text, "  position = (10, 20");
    ck_assert_str_eq(bal_document_property(d, BAL_OF_VARIABLE, 1, "position"), "(10, 20");
    bal_document_free(d);
    bal_network_free(n);
}
END_TEST

static const struct {
    const char *text, *name, *value;
} texts[] = {
    {"a = 1", "a", "1"}, {"a=1", "a", "1"},   {" \t\na \t= \n 1 ", "a", "1 "}, {"a =", "a", ""},   {"ab = 1", "a", NULL},
    {"a", "a", NULL},    {"a b = 1", "a", NULL}, {"", "a", NULL},              {"A = 1", "a", NULL}, {"a == 1", "a", "= 1"},
};

START_TEST(a_property_text_is_name_and_value) {
    const char *value = bali_property_value(texts[_i].text, texts[_i].name);
    if (!texts[_i].value) {
        ck_assert_ptr_null(value);
    } else {
        ck_assert_str_eq(value, texts[_i].value);
    }
}
END_TEST

static bal_document *full_document(const bal_network *network, bal_error *err) {
    bal_document *d = NULL;
    bal_cells *cells = NULL;
    bal_status status = bal_document_create(network, "net", &d, err);
    if (status != BAL_OK) ck_assert_ptr_null(d);
    if (status == BAL_OK) status = bal_cells_create(network, &cells, err);
    if (status == BAL_OK) status = bali_document_set_tables(d, cells, (const bool[]){true, false}, err);
    if (status == BAL_OK) status = bal_document_set_cells(d, BAL_CARRIED_PSEUDO_COUNTS, cells, err);
    if (status == BAL_OK) status = bali_document_set_row_ess(d, 1, (const double[]){5, 6}, err);
    if (status == BAL_OK) status = bal_document_set_property(d, BAL_OF_NETWORK, BAL_NONE, "ballast.ess", "1", err);
    if (status == BAL_OK) status = bal_document_set_property(d, BAL_OF_NETWORK, BAL_NONE, "ballast.ess", "10", err);
    if (status == BAL_OK) status = bali_document_add_property(d, BAL_OF_VARIABLE, 0, "note", 4, err);
    bal_cells_free(cells);
    if (status == BAL_OK) return d;
    bal_document_free(d);
    return NULL;
}

static void check_copy(const bal_document *copy) {
    ck_assert_str_eq(bal_document_name(copy), "net");
    ck_assert_ptr_null(bal_document_cells(copy, BAL_CARRIED_TABLES)); /* one family's was given */
    ck_assert_ptr_nonnull(bali_document_table(copy, 0));
    ck_assert_ptr_null(bali_document_table(copy, 1));
    ck_assert_ptr_nonnull(bal_document_cells(copy, BAL_CARRIED_PSEUDO_COUNTS));
    ck_assert_ptr_null(bal_document_cells(copy, BAL_CARRIED_COUNTS));
    ck_assert_double_eq(bal_document_row_ess(copy, 1)[1], 6);
    ck_assert_str_eq(bal_document_property(copy, BAL_OF_NETWORK, BAL_NONE, "ballast.ess"), "10");
    size_t n;
    ck_assert_str_eq(bali_document_properties(copy, &n)[1].text, "note");
    ck_assert_uint_eq(n, 2);
}

static bal_status make_and_copy(void *context, bal_error *err) {
    bal_document *made = full_document(context, err), *copy = made;
    if (!made) return err->status;
    bal_status status = bal_document_copy(made, &copy, err);
    bal_document_free(made);
    if (status != BAL_OK) {
        ck_assert_ptr_null(copy);
        return status;
    }
    check_copy(copy);
    bal_document_free(copy);
    return BAL_OK;
}

START_TEST(a_copy_is_the_same_and_survives_failing_allocations) {
    bal_network *n = network_of(structure);
    ck_assert_uint_gt(survive_allocations(make_and_copy, n), 20);
    bal_network_free(n);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("document");
    TCase *c = tcase_create("document");
    tcase_add_test(c, a_new_document_carries_nothing);
    tcase_add_test(c, cells_are_copied_in_and_taken_out);
    tcase_add_test(c, tables_count_once_every_family_has_one);
    tcase_add_test(c, row_ess_has_one_number_a_row);
    tcase_add_test(c, properties_are_set_replaced_and_removed);
    tcase_add_test(c, a_foreign_property_is_kept_as_it_stands);
    tcase_add_loop_test(c, a_property_text_is_name_and_value, 0, sizeof texts / sizeof texts[0]);
    tcase_add_test(c, a_copy_is_the_same_and_survives_failing_allocations);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
