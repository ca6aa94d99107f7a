#include "base/memory.h"
#include "model/block.h"
#include "support/fixtures.h"

#include <stdlib.h>
#include <string.h>

enum { RECORDS = 1000, VARIABLES = 3, BLOCK = 64 };

/* Records with every part a block can have. */
typedef struct given {
    bal_network *network;
    int *codes;
    uint64_t places[RECORDS];
    uint32_t groups[RECORDS];
    fixture_table table;
} given;

static void set_up(given *g, const char *text) {
    dice d = dice_of(7);
    g->network = network_of(text);
    bal_cells *tables = random_tables(&d, g->network, 0);
    g->codes = random_codes(&d, tables, RECORDS, 0.1);
    for (size_t i = 0; i < RECORDS; i++) g->places[i] = 3 * i + 1;
    for (size_t i = 0; i < RECORDS; i++) g->groups[i] = (uint32_t)(i * i % 11);
    g->table = (fixture_table){.codes = g->codes, .n_records = RECORDS, .block_records = BLOCK};
    bal_cells_free(tables);
}

static void tear_down(given *g) {
    free(g->codes);
    bal_network_free(g->network);
}

static bal_source *keep(const given *g, size_t limit) {
    bal_source *kept;
    ck_assert_int_eq(bal_source_keep_take(source_of(bal_network_domain(g->network), &g->table), limit, &kept, NULL), BAL_OK);
    return kept;
}

/* How many parts of a record of a block differ from what went in as record number at. */
static size_t count_differences(const bal_block *block, size_t t, const given *g, size_t at) {
    size_t wrong = 0;
    for (size_t v = g->table.narrow; v < VARIABLES; v++) {
        int code = g->codes[at * VARIABLES + v];
        wrong += bal_block_code(block, v, t) != (code < 0 ? BAL_NONE : (size_t)code);
    }
    wrong += bal_block_place(block, t) != (g->table.places ? g->places[at] : at);
    wrong += g->table.groups && block->groups[t] != g->groups[at];
    return wrong + (g->table.weighted && block->weights[t] != (double)at + 1);
}

/* One pass, every part of every record compared with what went in. */
static void check_pass(bal_source *source, const given *g) {
    size_t at = 0, wrong = 0;
    for (;;) {
        bal_block block;
        ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK);
        if (block.n_records == 0) break;
        ck_assert_uint_eq(block.n_columns, VARIABLES);
        ck_assert_int_eq(block.columns[0] == NULL, g->table.narrow);
        ck_assert_int_eq(block.weights != NULL, g->table.weighted);
        ck_assert_int_eq(block.groups != NULL, g->table.groups != NULL);
        for (size_t t = 0; t < block.n_records; t++, at++) wrong += count_differences(&block, t, g, at);
    }
    ck_assert_uint_eq(wrong, 0);
    ck_assert_uint_eq(at, RECORDS);
    bal_block block;
    ck_assert_int_eq(bal_source_next(source, &block, NULL), BAL_OK); /* the end stays */
    ck_assert_uint_eq(block.n_records, 0);
    bal_source_summary summary;
    bal_source_summary_get(source, &summary);
    ck_assert_uint_eq(summary.records, RECORDS);
}

/* A pass, and whether the medium was read for it. */
static bool reads_medium(bal_source *source, const given *g) {
    size_t before = fixture_blocks();
    check_pass(source, g);
    return fixture_blocks() != before;
}

static const struct {
    const char *network;
    bool weighted, narrow, places, groups;
    size_t block_records; /* 0 = BLOCK */
} shapes[] = {
    {"A:#3 ; B:#4 | A ; C:#2", false, false, false, false, 0}, {"A:#3 ; B:#4 | A ; C:#300", false, false, false, false, 0},
    {"A:#3 ; B:#4 ; C:#2", true, false, true, true, 0},        {"A:#3 ; B:#4 ; C:#300", true, true, true, true, 0},
    {"A:#3 ; B:#4 ; C:#2", false, true, true, true, 0},        {"A:#3 ; B:#4 ; C:#2", true, false, false, false, 999}, /* and 1 */
    {"A:#3 ; B:#4 ; C:#300", false, false, false, true, 0},
};

START_TEST(later_passes_are_the_same_from_memory) {
    given g;
    set_up(&g, shapes[_i].network);
    g.table.weighted = shapes[_i].weighted;
    g.table.narrow = shapes[_i].narrow;
    g.table.places = shapes[_i].places ? g.places : NULL;
    g.table.groups = shapes[_i].groups ? g.groups : NULL;
    if (shapes[_i].block_records > 0) g.table.block_records = shapes[_i].block_records;
    bal_source *kept = keep(&g, SIZE_MAX);
    ck_assert(reads_medium(kept, &g));
    for (int pass = 0; pass < 3; pass++) {
        ck_assert_int_eq(bal_source_rewind(kept, NULL), BAL_OK);
        ck_assert(!reads_medium(kept, &g));
    }
    bal_source_free(kept);
    tear_down(&g);
}
END_TEST

START_TEST(a_pipe_can_be_gone_over_again) {
    given g;
    set_up(&g, shapes[0].network);
    g.table.pipe = true;
    bal_source *kept = keep(&g, SIZE_MAX);
    check_pass(kept, &g);
    ck_assert_int_eq(bal_source_rewind(kept, NULL), BAL_OK);
    check_pass(kept, &g);
    bal_source_free(kept);

    kept = keep(&g, 0);
    check_pass(kept, &g);
    bal_error err = {0};
    ck_assert_int_eq(bal_source_rewind(kept, &err), BAL_ERR_IO);
    ck_assert_str_eq(err.code, "cannot-reread");
    bal_source_free(kept);
    tear_down(&g);
}
END_TEST

/* The least limit at which a second pass comes from memory, by bisection. */
static size_t least_limit(const given *g) {
    size_t low = 0, high = (size_t)1 << 20;
    while (high - low > 1) {
        size_t limit = low + (high - low) / 2;
        bal_source *kept = keep(g, limit);
        ck_assert(reads_medium(kept, g));
        ck_assert_int_eq(bal_source_rewind(kept, NULL), BAL_OK);
        *(reads_medium(kept, g) ? &low : &high) = limit;
        ck_assert_int_eq(bal_source_rewind(kept, NULL), BAL_OK);
        check_pass(kept, g); /* also the third time */
        bal_source_free(kept);
    }
    return high;
}

START_TEST(a_limit_lets_everything_or_nothing_be_kept) {
    given g;
    set_up(&g, shapes[0].network);
    size_t least = least_limit(&g), cells = RECORDS * VARIABLES;
    ck_assert_uint_ge(least, cells); /* a byte a cell, and what the blocks themselves need */
    ck_assert_uint_le(least, cells + 200 * (RECORDS / BLOCK + 1));
    g.table.weighted = true;
    ck_assert_uint_eq(least_limit(&g), least + 8 * RECORDS);
    tear_down(&g);
}
END_TEST

START_TEST(no_limit_at_all_keeps_nothing) {
    given g;
    set_up(&g, shapes[0].network);
    bal_source *kept = keep(&g, 0);
    for (int pass = 0; pass < 3; pass++) {
        ck_assert(reads_medium(kept, &g));
        ck_assert_int_eq(bal_source_rewind(kept, NULL), BAL_OK);
    }
    bal_source_free(kept);
    tear_down(&g);
}
END_TEST

START_TEST(a_broken_off_pass_starts_again) {
    given g;
    set_up(&g, shapes[0].network);
    bal_source *kept = keep(&g, SIZE_MAX);
    ck_assert_int_eq(bal_source_rewind(kept, NULL), BAL_OK); /* before anything was read */
    for (size_t blocks = 1; blocks < 5; blocks++) {
        for (size_t b = 0; b < blocks; b++) {
            bal_block block;
            ck_assert_int_eq(bal_source_next(kept, &block, NULL), BAL_OK);
        }
        ck_assert_int_eq(bal_source_rewind(kept, NULL), BAL_OK);
    }
    check_pass(kept, &g);
    ck_assert_int_eq(bal_source_rewind(kept, NULL), BAL_OK);
    ck_assert(!reads_medium(kept, &g));
    bal_block block; /* a pass from memory may be broken off too */
    ck_assert_int_eq(bal_source_rewind(kept, NULL), BAL_OK);
    ck_assert_int_eq(bal_source_next(kept, &block, NULL), BAL_OK);
    ck_assert_int_eq(bal_source_rewind(kept, NULL), BAL_OK);
    ck_assert(!reads_medium(kept, &g));
    bal_source_free(kept);
    tear_down(&g);
}
END_TEST

START_TEST(memory_that_runs_out_is_no_failure) {
    given g;
    set_up(&g, shapes[0].network);
    size_t served = 0, refused = 0;
    for (size_t n = 1; served == 0; n++) {
        bal_source *kept = keep(&g, SIZE_MAX);
        bali_memory_fail_at(n);
        check_pass(kept, &g);
        bali_memory_fail_at(0);
        ck_assert_int_eq(bal_source_rewind(kept, NULL), BAL_OK);
        *(reads_medium(kept, &g) ? &refused : &served) += 1;
        bal_source_free(kept);
    }
    ck_assert_uint_ge(refused, 2 * (RECORDS / BLOCK)); /* two a block, and the list of blocks */
    tear_down(&g);
}
END_TEST

START_TEST(what_a_source_meets_goes_through) {
    given g;
    set_up(&g, shapes[0].network);
    g.table.fail_at = 3;
    bal_source *kept = keep(&g, SIZE_MAX);
    bal_block block;
    bal_error err = {0};
    ck_assert_int_eq(bal_source_next(kept, &block, &err), BAL_OK);
    ck_assert_int_eq(bal_source_next(kept, &block, &err), BAL_OK);
    ck_assert_int_eq(bal_source_next(kept, &block, &err), BAL_ERR_IO);
    bal_error where = {0};
    bal_source_locate(kept, 9, &where);
    ck_assert_str_eq(where.file, "fixture.csv");
    ck_assert_uint_eq(where.line, 11);
    bal_source_free(kept);
    tear_down(&g);
}
END_TEST

START_TEST(an_empty_table_is_kept_too) {
    given g;
    set_up(&g, shapes[0].network);
    g.table.n_records = 0;
    bal_source *kept = keep(&g, 1);
    for (int pass = 0; pass < 2; pass++) {
        bal_block block;
        ck_assert_int_eq(bal_source_next(kept, &block, NULL), BAL_OK);
        ck_assert_uint_eq(block.n_records, 0);
        ck_assert_int_eq(bal_source_rewind(kept, NULL), BAL_OK);
    }
    bal_source_free(kept);
    tear_down(&g);
}
END_TEST

static bal_status keep_and_free(void *context, bal_error *err) {
    const given *g = context;
    bal_source *source = source_of(bal_network_domain(g->network), &g->table), *kept = source;
    bal_status status = bal_source_keep_take(source, 100, &kept, err); /* takes the source also when it fails */
    if (status != BAL_OK) ck_assert_ptr_null(kept);
    bal_source_free(kept);
    return status;
}

START_TEST(keeping_survives_failing_allocations) {
    given g;
    set_up(&g, shapes[0].network);
    ck_assert_uint_eq(survive_allocations(keep_and_free, &g), 1);
    tear_down(&g);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("kept");
    TCase *c = tcase_create("kept");
    tcase_add_loop_test(c, later_passes_are_the_same_from_memory, 0, sizeof shapes / sizeof shapes[0]);
    tcase_add_test(c, a_pipe_can_be_gone_over_again);
    tcase_add_test(c, a_limit_lets_everything_or_nothing_be_kept);
    tcase_add_test(c, no_limit_at_all_keeps_nothing);
    tcase_add_test(c, a_broken_off_pass_starts_again);
    tcase_add_test(c, memory_that_runs_out_is_no_failure);
    tcase_add_test(c, what_a_source_meets_goes_through);
    tcase_add_test(c, an_empty_table_is_kept_too);
    tcase_add_test(c, keeping_survives_failing_allocations);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
