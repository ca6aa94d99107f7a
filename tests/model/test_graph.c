#include "model/graph.h"

#include "support/fixtures.h"

#include <string.h>

enum { MOST = 12 };

/* Parents as text, one word a variable, each a list of digits: "- 0 01" is a chain with a shortcut. */
typedef struct graph {
    bal_family_spec families[MOST];
    size_t parents[MOST][MOST], n;
} graph;

static void read_graph(graph *g, const char *text) {
    memset(g, 0, sizeof *g);
    size_t v = 0;
    for (; *text; text++) {
        if (*text == ' ') v++;
        if (*text >= '0' && *text <= '9') g->parents[v][g->families[v].n_parents++] = (size_t)(*text - '0');
    }
    g->n = v + 1;
    for (v = 0; v < g->n; v++) g->families[v].parents = g->families[v].n_parents ? g->parents[v] : NULL;
}

static bool has_parent(const graph *g, size_t v, size_t parent) {
    for (size_t p = 0; p < g->families[v].n_parents; p++)
        if (g->parents[v][p] == parent) return true;
    return false;
}

/* The order the header promises, found by trying the smallest number again and again. Returns how many were placed. */
static size_t slow_order(const graph *g, size_t *order) {
    bool placed[MOST] = {false};
    size_t n_placed = 0;
    for (bool found = true; found;) {
        found = false;
        for (size_t v = 0; v < g->n && !found; v++) {
            bool ready = !placed[v];
            for (size_t p = 0; p < g->families[v].n_parents; p++) ready = ready && placed[g->parents[v][p]];
            if (!ready) continue;
            placed[v] = found = true;
            order[n_placed++] = v;
        }
    }
    return n_placed;
}

static void check_cycle(const graph *g, const size_t *cycle, size_t n_cycle) {
    bool seen[MOST] = {false};
    ck_assert_uint_le(n_cycle, g->n);
    for (size_t i = 0; i < n_cycle; i++) {
        ck_assert_uint_lt(cycle[i], g->n);
        ck_assert_msg(!seen[cycle[i]], "variable %zu stands twice in the cycle", cycle[i]);
        seen[cycle[i]] = true;
        ck_assert_msg(has_parent(g, cycle[(i + 1) % n_cycle], cycle[i]), "no arc %zu -> %zu", cycle[i], cycle[(i + 1) % n_cycle]);
    }
}

static void check_graph(const graph *g) {
    size_t order[MOST], cycle[MOST], expected[MOST], n_cycle = 99, n_placed = slow_order(g, expected);
    ck_assert_int_eq(bali_graph_order(g->families, g->n, order, cycle, &n_cycle, NULL), BAL_OK);
    if (n_placed == g->n) {
        ck_assert_uint_eq(n_cycle, 0);
        for (size_t i = 0; i < g->n; i++) ck_assert_uint_eq(order[i], expected[i]);
    } else {
        ck_assert_uint_gt(n_cycle, 0);
        check_cycle(g, cycle, n_cycle);
    }
}

static const struct {
    const char *graph;
    size_t n_cycle; /* 0 = none */
} cases[] = {
    {"-", 0}, {"0", 1}, {"- - -", 0}, {"1 2 -", 0}, {"- 0 01 012", 0}, {"3 0 1 -", 0}, {"1 0", 2}, {"2 0 1", 3},
    {"- 2 0 5 3 4 1", 3},          /* 3 <- 5 <- 4 <- 3, beside what is fine */
    {"- 0 3 1 2", 0},              /* 0 -> 1 -> 3 -> 2 -> 4 */
    {"1 2 3 4 5 6 7 8 9 0", 10}, {"9 0 1 2 3 4 5 6 7 8", 10},
    {"- 1", 1},                    /* its own parent */
    {"1 0 1 2", 2},                /* what hangs below a cycle is not on it */
};

START_TEST(known_graphs) {
    graph g;
    read_graph(&g, cases[_i].graph);
    check_graph(&g);
    size_t order[MOST], cycle[MOST], n_cycle;
    ck_assert_int_eq(bali_graph_order(g.families, g.n, order, cycle, &n_cycle, NULL), BAL_OK);
    ck_assert_uint_eq(n_cycle, cases[_i].n_cycle);
}
END_TEST

START_TEST(random_graphs_agree_with_the_slow_way) {
    dice d = dice_of(_i);
    for (int round = 0; round < 200; round++) {
        graph g = {.n = 1 + roll(&d, MOST)};
        bool acyclic = chance(&d) < 0.5;
        for (size_t v = 0; v < g.n; v++) {
            for (size_t p = 0; p < g.n; p++)
                if (chance(&d) < 0.2 && (!acyclic || p > v)) g.parents[v][g.families[v].n_parents++] = p;
            g.families[v].parents = g.families[v].n_parents ? g.parents[v] : NULL;
        }
        check_graph(&g);
    }
}
END_TEST

START_TEST(a_long_chain_is_ordered) {
    enum { N = 20000 };
    static bal_family_spec families[N];
    static size_t parents[N], order[N], cycle[N];
    for (size_t v = 0; v + 1 < N; v++) {
        parents[v] = v + 1;
        families[v] = (bal_family_spec){&parents[v], 1};
    }
    families[N - 1] = (bal_family_spec){0};
    size_t n_cycle;
    ck_assert_int_eq(bali_graph_order(families, N, order, cycle, &n_cycle, NULL), BAL_OK);
    ck_assert_uint_eq(n_cycle, 0);
    for (size_t i = 0; i < N; i++) ck_assert_uint_eq(order[i], N - 1 - i);

    parents[N - 1] = 0;
    families[N - 1] = (bal_family_spec){&parents[N - 1], 1};
    ck_assert_int_eq(bali_graph_order(families, N, order, cycle, &n_cycle, NULL), BAL_OK);
    ck_assert_uint_eq(n_cycle, N);
}
END_TEST

static bal_status order_chain(void *context, bal_error *err) {
    graph *g = context;
    size_t order[MOST], cycle[MOST], n_cycle;
    return bali_graph_order(g->families, g->n, order, cycle, &n_cycle, err);
}

START_TEST(ordering_survives_failing_allocations) {
    graph g;
    read_graph(&g, "- 0 01 012");
    ck_assert_uint_ge(survive_allocations(order_chain, &g), 3);
    read_graph(&g, "2 0 1");
    ck_assert_uint_ge(survive_allocations(order_chain, &g), 3);
}
END_TEST

static Suite *suite(void) {
    Suite *s = suite_create("graph");
    TCase *c = tcase_create("graph");
    tcase_add_loop_test(c, known_graphs, 0, sizeof cases / sizeof cases[0]);
    tcase_add_loop_test(c, random_graphs_agree_with_the_slow_way, 1, 11);
    tcase_add_test(c, a_long_chain_is_ordered);
    tcase_add_test(c, ordering_survives_failing_allocations);
    suite_add_tcase(s, c);
    return s;
}

int main(void) {
    return run_suite(suite());
}
