#include "model/block.h"
#include "support/fixtures.h"

#include <stdlib.h>
#include <string.h>

enum { PARTS = 4, MOST = 700, VARIABLES = 3, BLOCK = 64 };

/* Sources whose records are random, one with places of its own. */
typedef struct given {
    bal_network *network;
    int *codes[PARTS];
    size_t n[PARTS];
    uint64_t places[MOST];
    double weights[MOST];
    uint32_t groups[MOST];
    bool pipe;
} given;

static void set_up(given *g, int seed) {
    dice d = dice_of(seed);
    *g = (given){.network = network_of("A:#3 ; B:#4 | A ; C:#2")};
    bal_cells *tables = random_tables(&d, g->network, 0);
    for (size_t p = 0; p < PARTS; p++) {
        g->n[p] = roll(&d, 4) == 0 ? 0 : roll(&d, MOST);
        g->codes[p] = random_codes(&d, tables, g->n[p] + 1, 0.1);
    }
    for (size_t i = 0; i < MOST; i++) {
        g->weights[i] = (double)roll(&d, 4) + 1;
        g->groups[i] = (uint32_t)roll(&d, 5);
        g->places[i] = i == 0 ? 0 : g->places[i - 1] + (uint64_t)g->weights[i - 1];
    }
    bal_cells_free(tables);
}

static void tear_down(given *g) {
    for (size_t p = 0; p < PARTS; p++) free(g->codes[p]);
    bal_network_free(g->network);
}

static bal_source *part_of(const given *g, size_t p) {
    fixture_table table = {.codes = g->codes[p], .n_records = g->n[p], .block_records = BLOCK, .places = g->places, .weighted = true,
                           .weights = g->weights, .groups = g->groups, .n_groups = p + 1, .pipe = g->pipe};
    return source_of(bal_network_domain(g->network), &table);
}

static bal_source *join(const given *g) {
    bal_source *parts[PARTS], *joined = NULL;
    for (size_t p = 0; p < PARTS; p++) parts[p] = part_of(g, p);
    ck_assert_int_eq(bal_source_join_take(parts, PARTS, &joined, NULL), BAL_OK);
    return joined;
}

/* Places that the records of a part take. */
static uint64_t places_of(const given *g, size_t p) {
    return g->n[p] ? g->places[g->n[p] - 1] + (uint64_t)g->weights[g->n[p] - 1] : 0;
}

static void check_pass(const given *g, bal_source *joined) {
    size_t p = 0, at = 0, wrong = 0;
    uint64_t before = 0, records = 0;
    for (;;) {
        bal_block block;
        ck_assert_int_eq(bal_source_next(joined, &block, NULL), BAL_OK);
        if (block.n_records == 0) break;
        for (size_t t = 0; t < block.n_records; t++, at++, records++) {
            while (at == g->n[p]) {
                before += places_of(g, p++);
                at = 0;
            }
            for (size_t v = 0; v < VARIABLES; v++) {
                int code = g->codes[p][at * VARIABLES + v];
                wrong += bal_block_code(&block, v, t) != (code < 0 ? BAL_NONE : (size_t)code);
            }
            wrong += bal_block_place(&block, t) != before + g->places[at];
            wrong += block.weights[t] < g->weights[at] || block.weights[t] > g->weights[at] || block.groups[t] != g->groups[at];
        }
    }
    ck_assert_uint_eq(wrong, 0);
    bal_source_summary summary;
    bal_source_summary_get(joined, &summary);
    uint64_t all = 0, places = 0;
    for (size_t i = 0; i < PARTS; i++) all += g->n[i], places += places_of(g, i);
    ck_assert_uint_eq(records, all);
    ck_assert_uint_eq(summary.records, all);
    ck_assert_uint_eq(summary.places, places);
    ck_assert_double_eq(summary.weight, (double)places);
    ck_assert(!summary.fractional);
    ck_assert_uint_eq(summary.n_groups, PARTS);
}

START_TEST(parts_come_one_after_another) {
    given g;
    set_up(&g, _i);
    bal_source *joined = join(&g);
    check_pass(&g, joined);
    bal_block block;
    ck_assert_int_eq(bal_source_next(joined, &block, NULL), BAL_OK); /* the end stays */
    ck_assert_uint_eq(block.n_records, 0);
    ck_assert_int_eq(bal_source_rewind(joined, NULL), BAL_OK);
    check_pass(&g, joined);
    bal_source_free(joined);
    tear_down(&g);
}
END_TEST

/* Kept in memory, the joined source of pipes can be gone over again. */
START_TEST(a_joined_source_can_be_kept) {
    given g;
    set_up(&g, _i);
    g.pipe = true;
    bal_source *kept = NULL;
    ck_assert_int_eq(bal_source_keep_take(join(&g), SIZE_MAX, &kept, NULL), BAL_OK);
    for (int pass = 0; pass < 3; pass++) {
        check_pass(&g, kept);
        ck_assert_int_eq(bal_source_rewind(kept, NULL), BAL_OK);
    }
    bal_source_free(kept);
    tear_down(&g);
}
END_TEST

/* A source that says which of its places it was asked for. */
typedef struct asked {
    bal_source head;
    size_t n, at;
    char name[8];
} asked;

static bal_status asked_next(bal_source *source, bal_block *block, bal_error *err) {
    asked *a = (asked *)source;
    static const uint8_t codes[64];
    static const void *const columns[] = {codes};
    (void)err;
    *block = (bal_block){.n_records = a->n - a->at, .n_columns = 1, .width = 1, .columns = columns};
    a->at = a->n;
    return BAL_OK;
}

static bal_status asked_rewind(bal_source *source, bal_error *err) {
    (void)err;
    ((asked *)source)->at = 0;
    return BAL_OK;
}

static void asked_locate(bal_source *source, uint64_t place, bal_error *err) {
    bal_error_place(err, ((asked *)source)->name, (size_t)place + 2, 0);
    bal_error_context(err, (size_t)place + 1, NULL);
}

static void asked_summary(const bal_source *source, bal_source_summary *out) {
    out->records = out->places = ((const asked *)source)->at;
    out->weight = (double)out->records;
}

static void asked_free(bal_source *source) {
    free(source);
}

static const bali_source_methods asked_methods = {
    .next = asked_next, .rewind = asked_rewind, .locate = asked_locate, .summary = asked_summary, .free = asked_free};

START_TEST(places_are_located_in_their_part) {
    static const size_t sizes[] = {3, 0, 2, 4};
    bal_network *network = network_of("A:#2");
    bal_source *parts[4], *joined = NULL;
    for (size_t p = 0; p < 4; p++) {
        asked *a = calloc(1, sizeof *a);
        ck_assert_ptr_nonnull(a);
        bali_source_init(&a->head, &asked_methods, bal_network_domain(network));
        a->n = sizes[p];
        memcpy(a->name, (char[]){(char)('a' + p), '\0'}, 2);
        parts[p] = &a->head;
    }
    ck_assert_int_eq(bal_source_join_take(parts, 4, &joined, NULL), BAL_OK);
    for (int pass = 0; pass < 2; pass++) {
        bal_block block = {.n_records = 1};
        while (block.n_records > 0) ck_assert_int_eq(bal_source_next(joined, &block, NULL), BAL_OK);
        for (uint64_t place = 0; place < 9; place++) {
            bal_error err = {0};
            bal_source_locate(joined, place, &err);
            ck_assert_str_eq(err.file, place < 3 ? "a" : place < 5 ? "c" : "d");
            ck_assert_uint_eq(err.record, place < 3 ? place + 1 : place < 5 ? place - 2 : place - 4);
            ck_assert_uint_eq(err.line, err.record + 1);
        }
        ck_assert_int_eq(bal_source_rewind(joined, NULL), BAL_OK); /* and what was learned stays */
    }
    bal_error err = {0};
    bal_source_locate(joined, 6, &err);
    ck_assert_str_eq(err.file, "d");
    bal_source_free(joined);
    bal_network_free(network);
}
END_TEST

START_TEST(sources_of_other_variables_are_refused) {
    bal_network *network = network_of("A:#2"), *other = network_of("A:#3");
    const int codes[] = {0};
    bal_source *parts[] = {plain_source(network, codes, 1), plain_source(other, codes, 1)}, *joined = parts[0];
    bal_error err = {0};
    ck_assert_int_eq(bal_source_join_take(parts, 2, &joined, &err), BAL_ERR_ARGUMENT);
    ck_assert_str_eq(err.code, "other-network");
    ck_assert_ptr_null(joined);
    bal_network_free(network);
    bal_network_free(other);
}
END_TEST

START_TEST(what_a_part_meets_is_met) {
    bal_network *network = network_of("A:#2");
    const int codes[] = {0, 1, 0};
    bal_source *parts[] = {plain_source(network, codes, 3),
                           source_of(bal_network_domain(network), &(fixture_table){.codes = codes, .n_records = 3, .block_records = 1, .fail_at = 2})};
    bal_source *joined = NULL;
    bal_block block;
    bal_error err = {0};
    ck_assert_int_eq(bal_source_join_take(parts, 2, &joined, NULL), BAL_OK);
    ck_assert_int_eq(bal_source_next(joined, &block, &err), BAL_OK);
    ck_assert_int_eq(bal_source_next(joined, &block, &err), BAL_OK);
    ck_assert_int_eq(bal_source_next(joined, &block, &err), BAL_ERR_IO);
    bal_source_free(joined);
    bal_network_free(network);
}
END_TEST

static bal_status join_and_read(void *context, bal_error *err) {
    const given *g = context;
    bal_source *parts[PARTS], *joined = NULL;
    for (size_t p = 0; p < PARTS; p++) parts[p] = part_of(g, p);
    bal_status status = bal_source_join_take(parts, PARTS, &joined, err);
    ck_assert((status == BAL_OK) == (joined != NULL));
    bal_block block = {.n_records = 1};
    while (status == BAL_OK && block.n_records > 0) status = bal_source_next(joined, &block, err);
    bal_source_free(joined);
    return status;
}

START_TEST(memory_may_run_out) {
    given g;
    set_up(&g, 1);
    for (size_t p = 0; p < PARTS; p++) g.n[p] = g.n[p] > 100 ? 100 : g.n[p];
    ck_assert_uint_ge(survive_allocations(join_and_read, &g), 5);
    tear_down(&g);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("joined");
    TCase *c = tcase_create("joined");
    tcase_add_loop_test(c, parts_come_one_after_another, 1, 21);
    tcase_add_loop_test(c, a_joined_source_can_be_kept, 1, 6);
    tcase_add_test(c, places_are_located_in_their_part);
    tcase_add_test(c, sources_of_other_variables_are_refused);
    tcase_add_test(c, what_a_part_meets_is_met);
    tcase_add_test(c, memory_may_run_out);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
