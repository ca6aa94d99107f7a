/* A network is built once, checked once, then read-only. Families lie one after another in every array of cells. */
#include "base/memory.h"
#include "model/domain.h"
#include "model/graph.h"
#include "model/shape.h"

#include <stdatomic.h>
#include <stdio.h>
#include <string.h>

typedef struct family {
    size_t *parents;
    size_t n_parents, rows, outcomes, offset;
} family;

struct bal_network {
    atomic_size_t holds;
    bal_domain *domain;
    size_t n, arcs, cells, free_parameters;
    family *families;
    size_t *parent_store; /* all parents, family after family */
    size_t *order;
};

static bal_status check_parents(const bal_domain *domain, const bal_family_spec *spec, size_t v, size_t *mark, bal_error *err) {
    size_t n = bal_domain_variables(domain);
    const char *name = bal_domain_name(domain, v);
    for (size_t p = 0; p < spec->n_parents; p++) {
        size_t parent = spec->parents[p];
        if (parent >= n)
            return bal_error_set(err, BAL_ERR_DATA, "unknown-parent", "parent %zu of %s does not exist; there are %zu variables",
                                 parent, name, n);
        if (mark[parent] == v + 1)
            return bal_error_set(err, BAL_ERR_DATA, "duplicate-parent", "%s has the parent %s twice; remove one", name,
                                 bal_domain_name(domain, parent));
        mark[parent] = v + 1;
    }
    return BAL_OK;
}

/* Sizes every family, with overflow checks, before anything of that size is allocated. */
static bal_status size_family(bal_network *network, size_t v, size_t max_cells, bal_error *err) {
    family *f = &network->families[v];
    f->outcomes = bal_domain_outcomes(network->domain, v);
    f->rows = 1;
    f->offset = network->cells;
    size_t cells = f->outcomes;
    bool fits = true;
    for (size_t p = 0; p < f->n_parents && fits; p++) {
        size_t outcomes = bal_domain_outcomes(network->domain, f->parents[p]);
        fits = bali_multiply(cells, outcomes, &cells) && bali_multiply(f->rows, outcomes, &f->rows);
    }
    if (!fits || cells > max_cells || network->cells > max_cells - cells)
        return bal_error_set(err, BAL_ERR_DATA, "too-many-cells",
                             "the table of %s with its %zu parents takes the network over %zu cells; "
                             "use fewer parents or outcomes, or raise --max-cells",
                             bal_domain_name(network->domain, v), f->n_parents, max_cells);
    network->cells += cells;
    network->free_parameters += f->rows * (f->outcomes - 1);
    return BAL_OK;
}

/* How many bytes of a name a path shows: 36 at most, whole characters. */
static int shown_bytes(const char *name) {
    size_t length = strlen(name);
    if (length <= 36) return (int)length;
    for (length = 36; length > 0 && ((unsigned char)name[length] & 0xC0) == 0x80; length--) continue;
    return (int)length;
}

static bal_status refuse_cycle(const bal_domain *domain, const size_t *cycle, size_t n_cycle, bal_error *err) {
    char path[440] = ""; /* eight names, two more behind the dots, and the arrows */
    size_t at = 0;
    for (size_t i = 0; i <= n_cycle && at < sizeof path - 1; i++) {
        if (i == 8 && n_cycle > 9) {
            i = n_cycle - 1;
            at += (size_t)snprintf(path + at, sizeof path - at, " -> ... (%zu arcs)", n_cycle);
        }
        const char *name = bal_domain_name(domain, cycle[i % n_cycle]);
        if (at < sizeof path - 1) at += (size_t)snprintf(path + at, sizeof path - at, "%s%.*s", i ? " -> " : "", shown_bytes(name), name);
    }
    bal_status status = bal_error_set(err, BAL_ERR_DATA, "cycle", "the arcs run in a circle: %s; remove one of them", path);
    bal_error_context(err, 0, bal_domain_name(domain, cycle[0]));
    return status;
}

static bal_status order_variables(bal_network *network, const bal_family_spec *families, bal_error *err) {
    size_t *cycle = bali_allocate(network->n, sizeof *cycle);
    if (!cycle) return bali_out_of_memory(err);
    size_t n_cycle;
    bal_status status = bali_graph_order(families, network->n, network->order, cycle, &n_cycle, err);
    if (status == BAL_OK && n_cycle > 0) status = refuse_cycle(network->domain, cycle, n_cycle, err);
    bali_free(cycle);
    return status;
}

static bal_status copy_families(bal_network *network, const bal_family_spec *families, bal_error *err) {
    size_t *mark = bali_allocate(network->n, sizeof *mark);
    if (!mark) return bali_out_of_memory(err);
    bal_status status = BAL_OK;
    for (size_t v = 0; v < network->n && status == BAL_OK; v++) {
        status = check_parents(network->domain, &families[v], v, mark, err);
        if (status != BAL_OK) bal_error_context(err, 0, bal_domain_name(network->domain, v));
        network->arcs += families[v].n_parents;
    }
    bali_free(mark);
    if (status != BAL_OK) return status;

    network->parent_store = bali_allocate(network->arcs, sizeof *network->parent_store);
    if (!network->parent_store) return bali_out_of_memory(err);
    size_t *store = network->parent_store;
    for (size_t v = 0; v < network->n; v++) {
        family *f = &network->families[v];
        f->n_parents = families[v].n_parents;
        f->parents = store;
        if (f->n_parents) memcpy(store, families[v].parents, f->n_parents * sizeof *store);
        store += f->n_parents;
    }
    return BAL_OK;
}

bal_status bal_network_create(const bal_domain *domain, const bal_family_spec *families, size_t max_cells, bal_network **out,
                              bal_error *err) {
    *out = NULL;
    if (max_cells == 0) max_cells = BAL_DEFAULT_MAX_CELLS;
    if (max_cells > BAL_LARGEST_MAX_CELLS) max_cells = BAL_LARGEST_MAX_CELLS; /* cells of a family are counted in 32 bits */
    bal_network *network = bali_allocate(1, sizeof *network);
    if (!network) return bali_out_of_memory(err);
    atomic_init(&network->holds, 1);
    network->domain = bali_domain_hold(domain);
    network->n = bal_domain_variables(domain);
    network->families = bali_allocate(network->n, sizeof *network->families);
    network->order = bali_allocate(network->n, sizeof *network->order);
    bal_status status = network->families && network->order ? BAL_OK : bali_out_of_memory(err);
    if (status == BAL_OK) status = copy_families(network, families, err);
    if (status == BAL_OK) status = order_variables(network, families, err);
    for (size_t v = 0; v < network->n && status == BAL_OK; v++) {
        status = size_family(network, v, max_cells, err);
        if (status != BAL_OK) bal_error_context(err, 0, bal_domain_name(domain, v));
    }
    if (status == BAL_OK) {
        *out = network;
    } else {
        bal_network_free(network);
    }
    return status;
}

void bal_network_free(bal_network *network) {
    if (!network || atomic_fetch_sub(&network->holds, 1) > 1) return;
    bali_free(network->families);
    bali_free(network->parent_store);
    bali_free(network->order);
    bal_domain_free(network->domain);
    bali_free(network);
}

bal_network *bali_network_hold(const bal_network *network) {
    bal_network *held = (bal_network *)network; /* only the count of holders changes */
    atomic_fetch_add(&held->holds, 1);
    return held;
}

const bal_domain *bal_network_domain(const bal_network *network) {
    return network->domain;
}

size_t bal_network_variables(const bal_network *network) {
    return network->n;
}

size_t bal_network_arcs(const bal_network *network) {
    return network->arcs;
}

size_t bal_network_cells(const bal_network *network) {
    return network->cells;
}

size_t bal_network_free_parameters(const bal_network *network) {
    return network->free_parameters;
}

const size_t *bal_network_parents(const bal_network *network, size_t variable, size_t *n_parents) {
    *n_parents = network->families[variable].n_parents;
    return network->families[variable].parents;
}

size_t bal_network_rows(const bal_network *network, size_t variable) {
    return network->families[variable].rows;
}

size_t bal_network_outcomes(const bal_network *network, size_t variable) {
    return network->families[variable].outcomes;
}

size_t bal_network_offset(const bal_network *network, size_t variable) {
    return network->families[variable].offset;
}

const size_t *bal_network_order(const bal_network *network) {
    return network->order;
}

bool bal_network_equal(const bal_network *a, const bal_network *b) {
    if (a == b) return true;
    if (!bali_domain_equal(a->domain, b->domain)) return false;
    for (size_t v = 0; v < a->n; v++) {
        const family *fa = &a->families[v], *fb = &b->families[v];
        if (fa->n_parents != fb->n_parents) return false;
        if (fa->n_parents && memcmp(fa->parents, fb->parents, fa->n_parents * sizeof *fa->parents) != 0) return false;
    }
    return true;
}
