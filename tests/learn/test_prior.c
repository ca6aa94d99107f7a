#include "ballast/prior.h"

#include "model/cells.h"
#include "model/document.h"
#include "support/fixtures.h"

#include <math.h>
#include <string.h>

static bal_cells *filled(const bal_prior *prior, const bal_network *network, double strength) {
    bal_cells *alpha = equal_cells(network, NAN); /* every cell has to be written */
    bal_prior_fill(prior, strength, alpha);
    return alpha;
}

/* Families of every shape, and what a prior gives a cell of theirs: ESS/(q r), 1 or 1/2 times the scale. */
static const char *const shapes = "A:#2 ; B:#3 | A ; C:#4 | A,B ; D:#1 | C ; E:#5 | D";
static const size_t q[] = {1, 2, 6, 4, 1}, r[] = {2, 3, 4, 1, 5};

START_TEST(pseudo_counts_are_as_defined) {
    static const double strengths[] = {0.01, 1, 3, 8, 15.4, 10000};
    bal_network *network = network_of(shapes);
    for (bal_prior_kind kind = BAL_PRIOR_BDEU; kind <= BAL_PRIOR_JEFFREYS; kind++)
        for (size_t s = 0; s < sizeof strengths / sizeof strengths[0]; s++) {
            bal_prior *prior = simple_prior(network, kind, strengths[s]);
            bal_cells *alpha = filled(prior, network, strengths[s]);
            for (size_t v = 0; v < 5; v++) {
                double expected = kind == BAL_PRIOR_BDEU ? strengths[s] / (double)(q[v] * r[v])
                                  : kind == BAL_PRIOR_K2 ? strengths[s]
                                                         : strengths[s] / 2;
                for (size_t c = 0; c < q[v] * r[v]; c++) ck_assert_double_eq(bal_cells_family(alpha, v)[c], expected);
            }
            bal_cells_free(alpha);
            bal_prior_free(prior);
        }
    bal_network_free(network);
}
END_TEST

/* Buntine 1991: the ESS is spread over a family's cells, so twice the parent configurations halve each, and every
 * family sums to the ESS. */
START_TEST(bdeu_spreads_the_ess_over_a_family) {
    bal_network *few = network_of("A:#2 ; B:#2 ; C:#3 | A"), *many = network_of("A:#2 ; B:#2 ; C:#3 | A,B");
    bal_prior *prior_few = simple_prior(few, BAL_PRIOR_BDEU, 7), *prior_many = simple_prior(many, BAL_PRIOR_BDEU, 7);
    bal_cells *alpha_few = filled(prior_few, few, 7), *alpha_many = filled(prior_many, many, 7);
    ck_assert_double_eq(bal_cells_family(alpha_few, 2)[0], 2 * bal_cells_family(alpha_many, 2)[0]);
    for (size_t v = 0; v < 3; v++) {
        size_t cells = bal_network_rows(many, v) * bal_network_outcomes(many, v);
        ck_assert(near(bali_row_sum(bal_cells_family(alpha_many, v), cells), 7, 1e-14));
    }
    bal_cells_free(alpha_few);
    bal_cells_free(alpha_many);
    bal_prior_free(prior_few);
    bal_prior_free(prior_many);
    bal_network_free(few);
    bal_network_free(many);
}
END_TEST

static const char *const expert_network = "A:#2 ; B:#3 | A";
static const double expert_tables[] = {0.25, 0.75, /**/ 0.5, 0.5, 0, /**/ 0.125, 0.25, 0.625};

static bal_document *expert_document(const bal_network *network, bool with_row_ess) {
    bal_cells *tables = cells_of(network, expert_tables);
    bal_document *document = NULL;
    ck_assert_int_eq(bal_document_create(network, NULL, &document, NULL), BAL_OK);
    ck_assert_int_eq(bal_document_set_cells(document, BAL_CARRIED_TABLES, tables, NULL), BAL_OK);
    if (with_row_ess) {
        ck_assert_int_eq(bali_document_set_row_ess(document, 0, (const double[]){40}, NULL), BAL_OK);
        ck_assert_int_eq(bali_document_set_row_ess(document, 1, (const double[]){10, 200}, NULL), BAL_OK);
    }
    bal_cells_free(tables);
    return document;
}

/* s theta, s the one given, else the row's own; times the scale; the rows mixed with the floor's share of the uniform row. */
static const struct {
    double row_ess, scale, floor;
    double alpha[8];
} experts[] = {
    {8, 1, 0, {2, 6, 4, 4, 0, 1, 2, 5}},
    {0, 1, 0, {10, 30, 5, 5, 0, 25, 50, 125}},
    {8, 3, 0, {6, 18, 12, 12, 0, 3, 6, 15}},
    {0, 0.5, 0, {5, 15, 2.5, 2.5, 0, 12.5, 25, 62.5}},
    {0.5, 1, 0, {0.125, 0.375, 0.25, 0.25, 0, 0.0625, 0.125, 0.3125}}, /* worth less than a case */
    {24, 1, 0.5, {9, 15, 10, 10, 4, 5.5, 7, 11.5}},
};

START_TEST(an_experts_row_is_worth_its_cases) {
    bal_network *network = network_of(expert_network);
    bal_document *document = expert_document(network, true);
    bal_prior_options options = {.kind = BAL_PRIOR_EXPERT, .strength = experts[_i].scale, .expert = document};
    options.row_ess = experts[_i].row_ess;
    options.floor = experts[_i].floor;
    bal_prior *prior = prior_of(network, &options);
    bal_document_free(document); /* borrowed only while the prior was made */
    bal_cells *alpha = filled(prior, network, experts[_i].scale);
    for (size_t c = 0; c < 8; c++) ck_assert(near(bali_cells_values(alpha)[c], experts[_i].alpha[c], 1e-14));
    ck_assert_int_eq(bali_cells_values(alpha)[4] == 0, experts[_i].floor == 0); /* a structural zero, exactly */
    bal_cells_free(alpha);
    bal_prior_free(prior);
    bal_network_free(network);
}
END_TEST

typedef enum refused {
    STRENGTH_0, STRENGTH_BELOW, STRENGTH_NAN, STRENGTH_INF, ROW_ESS_BELOW, ROW_ESS_NAN, ROW_ESS_INF, FLOOR_BELOW,
    FLOOR_1, FLOOR_NAN, NO_EXPERT, NO_TABLES, ONE_TABLE, NO_ROW_ESS, ROW_ESS_OF_0, ROW_ESS_OF_NAN, ROW_ESS_OF_INF,
    FITTED, OTHER_NETWORK
} refused;

static const struct {
    refused what;
    bal_status status;
    const char *code, *variable;
} refusals[] = {
    {STRENGTH_0, BAL_ERR_ARGUMENT, "bad-strength", ""},   {STRENGTH_BELOW, BAL_ERR_ARGUMENT, "bad-strength", ""},
    {STRENGTH_NAN, BAL_ERR_ARGUMENT, "bad-strength", ""}, {STRENGTH_INF, BAL_ERR_ARGUMENT, "bad-strength", ""},
    {ROW_ESS_BELOW, BAL_ERR_ARGUMENT, "bad-row-ess", ""}, {ROW_ESS_NAN, BAL_ERR_ARGUMENT, "bad-row-ess", ""},
    {ROW_ESS_INF, BAL_ERR_ARGUMENT, "bad-row-ess", ""},   {FLOOR_BELOW, BAL_ERR_ARGUMENT, "bad-floor", ""},
    {FLOOR_1, BAL_ERR_ARGUMENT, "bad-floor", ""},         {FLOOR_NAN, BAL_ERR_ARGUMENT, "bad-floor", ""},
    {NO_EXPERT, BAL_ERR_ARGUMENT, "no-expert", ""},       {NO_TABLES, BAL_ERR_DATA, "no-tables", ""},
    {ONE_TABLE, BAL_ERR_DATA, "no-tables", ""},       {NO_ROW_ESS, BAL_ERR_ARGUMENT, "no-row-ess", "A"},
    {ROW_ESS_OF_0, BAL_ERR_ARGUMENT, "bad-row-ess", "B"}, {ROW_ESS_OF_NAN, BAL_ERR_ARGUMENT, "bad-row-ess", "B"},
    {ROW_ESS_OF_INF, BAL_ERR_ARGUMENT, "bad-row-ess", "B"}, {FITTED, BAL_ERR_DATA, "fitted-tables", ""},
    {OTHER_NETWORK, BAL_ERR_DATA, "other-network", ""},
};

/* Spoils options that were good. */
static void spoil_options(refused what, bal_prior_options *options) {
    static const double strengths[] = {0, -1, NAN, INFINITY}, row_ess[] = {-5, NAN, INFINITY}, floors[] = {-0.1, 1, NAN};
    if (what <= STRENGTH_INF) options->strength = strengths[what];
    else if (what <= ROW_ESS_INF) options->row_ess = row_ess[what - ROW_ESS_BELOW];
    else if (what <= FLOOR_NAN) options->floor = floors[what - FLOOR_BELOW];
    else if (what == NO_EXPERT) options->expert = NULL;
}

static void spoil_document(refused what, bal_document *document) {
    bal_cells *cells = equal_cells(bal_document_network(document), 0.5);
    bal_status status = BAL_OK;
    double ess = what == ROW_ESS_OF_0 ? 0 : what == ROW_ESS_OF_NAN ? NAN : INFINITY;
    if (what == NO_TABLES) status = bal_document_set_cells(document, BAL_CARRIED_TABLES, NULL, NULL);
    if (what == ONE_TABLE) status = bali_document_set_tables(document, cells, (const bool[]){true, false}, NULL);
    if (what == FITTED) status = bal_document_set_cells(document, BAL_CARRIED_PSEUDO_COUNTS, cells, NULL);
    if (what >= ROW_ESS_OF_0 && what <= ROW_ESS_OF_INF)
        status = bali_document_set_row_ess(document, 1, (const double[]){10, ess}, NULL);
    ck_assert_int_eq(status, BAL_OK);
    bal_cells_free(cells);
}

START_TEST(a_prior_that_cannot_be_is_refused) {
    bal_network *network = network_of(expert_network), *other = network_of("A:#2 ; B:#3");
    bal_document *document = expert_document(network, refusals[_i].what != NO_ROW_ESS);
    bal_prior_options options = {.kind = BAL_PRIOR_EXPERT, .strength = 1, .expert = document};
    spoil_options(refusals[_i].what, &options);
    spoil_document(refusals[_i].what, document);
    bal_prior *prior = (bal_prior *)network;
    bal_error err = {0};
    bal_status status = bal_prior_create(refusals[_i].what == OTHER_NETWORK ? other : network, &options, &prior, &err);
    ck_assert_msg(status == refusals[_i].status, "%d: %s", _i, err.message);
    ck_assert_ptr_null(prior);
    ck_assert_str_eq(err.code, refusals[_i].code);
    ck_assert_str_eq(err.variable, refusals[_i].variable);
    ck_assert_ptr_nonnull(bal_code_find(err.code));
    bal_document_free(document);
    bal_network_free(network);
    bal_network_free(other);
}
END_TEST

START_TEST(a_prior_says_what_it_is) {
    bal_network *network = network_of("A:#2");
    bal_prior_options defaults = bal_prior_options_defaults();
    ck_assert_int_eq(defaults.kind, BAL_PRIOR_BDEU);
    ck_assert_int_eq(defaults.choice, BAL_STRENGTH_BY_MARGINAL_LIKELIHOOD);
    ck_assert_double_eq(defaults.strength, 1);
    bal_prior *prior = open_prior(network, BAL_PRIOR_JEFFREYS, BAL_STRENGTH_BY_LEAVE_ONE_OUT);
    bal_network_free(network); /* the prior holds it */
    ck_assert_int_eq(bal_prior_kind_of(prior), BAL_PRIOR_JEFFREYS);
    ck_assert_int_eq(bal_prior_choice(prior), BAL_STRENGTH_BY_LEAVE_ONE_OUT);
    bal_prior_free(prior);
    bal_prior_free(NULL);
    static const char *const names[] = {"bdeu", "k2", "jeffreys", "expert", "carried"};
    for (bal_prior_kind kind = BAL_PRIOR_BDEU; kind <= BAL_PRIOR_CARRIED; kind++) ck_assert_str_eq(bal_prior_kind_name(kind), names[kind]);
}
END_TEST

/* ---- carried ---- */

static const double earlier_counts[] = {0.25, 3, /**/ 0.5, 0, 1e-6, /**/ 7, 1e9, 0.125};

static bal_document *fitted_document(const bal_network *network, const double *pseudo_counts) {
    bal_document *document = expert_document(network, false);
    bal_cells *cells = cells_of(network, pseudo_counts);
    ck_assert_int_eq(bal_document_set_cells(document, BAL_CARRIED_PSEUDO_COUNTS, cells, NULL), BAL_OK);
    bal_cells_free(cells);
    return document;
}

/* They are the prior as they stand, whatever the options say of a strength and whatever the counts would ask for. */
START_TEST(carried_pseudo_counts_are_the_prior) {
    bal_network *network = network_of(expert_network);
    bal_document *document = fitted_document(network, earlier_counts);
    bal_cells *counts = cells_of(network, (const double[]){5, 50, 1, 0, 4, 0, 30, 20});
    for (bal_strength_choice choice = BAL_STRENGTH_GIVEN; choice <= BAL_STRENGTH_BY_LEAVE_ONE_OUT; choice++) {
        bal_prior_options options = {.kind = BAL_PRIOR_CARRIED, .choice = choice, .strength = 3, .carried = document};
        bal_prior *prior = prior_of(network, &options);
        bal_strength strength;
        ck_assert_int_eq(bal_prior_kind_of(prior), BAL_PRIOR_CARRIED);
        ck_assert_int_eq(bal_prior_choice(prior), BAL_STRENGTH_GIVEN);
        ck_assert_int_eq(bal_prior_settle(prior, counts, &strength, NULL), BAL_OK);
        ck_assert(strength.value == 1 && !strength.chosen);
        bal_cells *alpha = filled(prior, network, strength.value);
        ck_assert_mem_eq(bali_cells_values(alpha), earlier_counts, sizeof earlier_counts);
        bal_cells_free(alpha);
        bal_prior_free(prior);
    }
    bal_cells_free(counts);
    bal_document_free(document);
    bal_network_free(network);
}
END_TEST

static const struct {
    bool no_document, no_pseudo_counts, other_network;
    double pseudo_counts[8];
    bal_status status;
    const char *code, *variable;
} carried_refusals[] = {
    {.no_document = true, .pseudo_counts = {1, 1, 1, 1, 1, 1, 1, 1}, .status = BAL_ERR_ARGUMENT, .code = "no-pseudo-counts", .variable = ""},
    {.no_pseudo_counts = true, .pseudo_counts = {1, 1, 1, 1, 1, 1, 1, 1}, .status = BAL_ERR_ARGUMENT, .code = "no-pseudo-counts", .variable = ""},
    {.other_network = true, .pseudo_counts = {1, 1, 1, 1, 1, 1, 1, 1}, .status = BAL_ERR_DATA, .code = "other-network", .variable = ""},
    {.pseudo_counts = {1, 1, 1, 1, 1, 0, 0, 0}, .status = BAL_ERR_DATA, .code = "no-pseudo-counts", .variable = "B"},
    {.pseudo_counts = {0, 0, 1, 1, 1, 1, 1, 1}, .status = BAL_ERR_DATA, .code = "no-pseudo-counts", .variable = "A"},
    {.pseudo_counts = {1e308, 1e308, 1, 1, 1, 1, 1, 1}, .status = BAL_ERR_DATA, .code = "no-pseudo-counts", .variable = "A"}, /* no finite sum */
    {.pseudo_counts = {1, 0, 0, 1, 0, 0, 0, 1}, .status = BAL_OK}, /* structural zeros */
};

START_TEST(what_cannot_be_carried_is_refused) {
    bal_network *network = network_of(expert_network), *other = network_of("A:#2 ; B:#3");
    bal_document *document = fitted_document(network, carried_refusals[_i].pseudo_counts);
    if (carried_refusals[_i].no_pseudo_counts)
        ck_assert_int_eq(bal_document_set_cells(document, BAL_CARRIED_PSEUDO_COUNTS, NULL, NULL), BAL_OK);
    bal_prior_options options = {.kind = BAL_PRIOR_CARRIED, .strength = 1, .carried = carried_refusals[_i].no_document ? NULL : document};
    bal_prior *prior = (bal_prior *)network;
    bal_error err = {0};
    bal_status status = bal_prior_create(carried_refusals[_i].other_network ? other : network, &options, &prior, &err);
    ck_assert_msg(status == carried_refusals[_i].status, "%d: %s", _i, err.message);
    if (status != BAL_OK) {
        ck_assert_ptr_null(prior);
        ck_assert_str_eq(err.code, carried_refusals[_i].code);
        ck_assert_str_eq(err.variable, carried_refusals[_i].variable);
        ck_assert_ptr_nonnull(bal_code_find(err.code));
    } else {
        bal_prior_free(prior);
    }
    bal_document_free(document);
    bal_network_free(network);
    bal_network_free(other);
}
END_TEST

/* Counts in one of its structural zeros are refused, as under an expert's. */
START_TEST(a_carried_zero_is_structural) {
    bal_network *network = network_of(expert_network);
    bal_cells *alpha = cells_of(network, earlier_counts), *counts = equal_cells(network, 1);
    bal_prior *prior = carried_prior(alpha);
    bal_error err = {0};
    ck_assert_int_eq(bal_prior_check(prior, counts, NULL, &err), BAL_ERR_DATA);
    ck_assert_str_eq(err.code, "structural-zero");
    bal_cells_edit(counts, 1)[1] = 0;
    ck_assert_int_eq(bal_prior_check(prior, counts, NULL, NULL), BAL_OK);
    bal_prior_free(prior);
    bal_cells_free(alpha);
    bal_cells_free(counts);
    bal_network_free(network);
}
END_TEST

static bal_status make_and_free(void *context, bal_error *err) {
    const bal_document *document = context;
    bool fitted = bal_document_cells(document, BAL_CARRIED_PSEUDO_COUNTS) != NULL;
    bal_prior_options options = {.kind = fitted ? BAL_PRIOR_CARRIED : BAL_PRIOR_EXPERT, .strength = 1, .expert = document, .carried = document};
    bal_prior *prior = context;
    bal_status status = bal_prior_create(bal_document_network(document), &options, &prior, err);
    if (status != BAL_OK) ck_assert_ptr_null(prior);
    bal_prior_free(prior);
    return status;
}

START_TEST(a_prior_survives_failing_allocations) {
    bal_network *network = network_of(expert_network);
    bal_document *document = expert_document(network, true), *fitted = fitted_document(network, earlier_counts);
    ck_assert_uint_eq(survive_allocations(make_and_free, document), 3);
    ck_assert_uint_eq(survive_allocations(make_and_free, fitted), 3);
    bal_document_free(fitted);
    bal_document_free(document);
    bal_network_free(network);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("prior");
    TCase *c = tcase_create("prior");
    tcase_add_test(c, pseudo_counts_are_as_defined);
    tcase_add_test(c, bdeu_spreads_the_ess_over_a_family);
    tcase_add_loop_test(c, an_experts_row_is_worth_its_cases, 0, sizeof experts / sizeof experts[0]);
    tcase_add_loop_test(c, a_prior_that_cannot_be_is_refused, 0, sizeof refusals / sizeof refusals[0]);
    tcase_add_test(c, a_prior_says_what_it_is);
    tcase_add_test(c, carried_pseudo_counts_are_the_prior);
    tcase_add_loop_test(c, what_cannot_be_carried_is_refused, 0, sizeof carried_refusals / sizeof carried_refusals[0]);
    tcase_add_test(c, a_carried_zero_is_structural);
    tcase_add_test(c, a_prior_survives_failing_allocations);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
