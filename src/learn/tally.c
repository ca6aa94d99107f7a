#include "ballast/tally.h"

#include "base/memory.h"
#include "base/threads.h"
#include "learn/counter.h"
#include "model/block.h"
#include "model/cells.h"
#include "model/domain.h"

#include <pthread.h>

static bal_status count_source(bali_counter *counter, bal_source *source, bal_error *err) {
    for (;;) {
        bal_block block;
        bal_status status = bal_source_next(source, &block, err);
        if (status != BAL_OK || block.n_records == 0) return status;
        status = bali_counter_add(counter, &block, err);
        if (status != BAL_OK) return status;
    }
}

static bal_status check_domains(const bal_network *network, const bal_source *source, bal_error *err) {
    if (bali_domain_equal(bal_network_domain(network), bal_source_domain(source))) return BAL_OK;
    return bal_error_set(err, BAL_ERR_ARGUMENT, "other-network",
                         "the records follow other variables than the network; use records of the same variables");
}

bal_status bal_tally(const bal_network *network, bal_source *source, bal_cells **counts, bal_error *err) {
    *counts = NULL;
    bali_counter counter = {0};
    bal_cells *made = NULL;
    bal_status status = check_domains(network, source, err);
    if (status == BAL_OK) status = bali_counter_create(&counter, network, err);
    if (status == BAL_OK) status = bal_cells_create(network, &made, err);
    if (status == BAL_OK) status = count_source(&counter, source, err);
    if (status == BAL_OK) {
        bali_counter_write(&counter, made);
        *counts = made;
    } else {
        bal_cells_free(made);
    }
    bali_counter_free(&counter);
    return status;
}

/* Counters that threads take for a part and give back after it: no more of them than parts are counted at once. */
typedef struct parts_work {
    const bal_network *network;
    bal_source *source;
    const bali_source_parts *parts;
    pthread_mutex_t lock;
    bali_counter *counters; /* n_counters made so far, of at most n_threads */
    bool *taken;
    size_t n_counters;
} parts_work;

static bal_status take_counter(parts_work *w, bali_counter **counter, bal_error *err) {
    bal_status status = BAL_OK;
    (void)pthread_mutex_lock(&w->lock);
    size_t i = 0;
    while (i < w->n_counters && w->taken[i]) i++;
    if (i == w->n_counters) {
        status = bali_counter_create(&w->counters[i], w->network, err);
        w->n_counters += status == BAL_OK;
    }
    if (status == BAL_OK) {
        w->taken[i] = true;
        *counter = &w->counters[i];
    }
    (void)pthread_mutex_unlock(&w->lock);
    return status;
}

static void give_counter(parts_work *w, const bali_counter *counter) {
    (void)pthread_mutex_lock(&w->lock);
    w->taken[counter - w->counters] = false;
    (void)pthread_mutex_unlock(&w->lock);
}

static bal_status count_part(void *context, size_t part, bal_error *err) {
    parts_work *w = context;
    bali_counter *counter = NULL;
    bal_source *opened = NULL;
    bal_status status = take_counter(w, &counter, err);
    if (status != BAL_OK) return status;
    status = w->parts->open(w->source, part, &opened, err);
    if (status == BAL_OK) status = count_source(counter, opened, err);
    if (status == BAL_OK) {
        w->parts->close(w->source, part, opened);
    } else {
        bal_source_free(opened);
    }
    give_counter(w, counter);
    return status;
}

/* Adds the threads' counters up; the order does not matter, since all are exact. */
static bal_status add_up(parts_work *w, bal_cells **counts, bal_error *err) {
    bal_status status = bal_cells_create(w->network, counts, err);
    for (size_t i = 1; i < w->n_counters && status == BAL_OK; i++) status = bali_counter_merge(&w->counters[0], &w->counters[i], err);
    if (status == BAL_OK) {
        bali_counter_write(&w->counters[0], *counts);
    } else {
        bal_cells_free(*counts);
        *counts = NULL;
    }
    return status;
}

/* Counts all parts; *joined is false when something is to be told, and then the source is to be read in order. */
static bal_status count_parts(parts_work *w, size_t n_parts, unsigned n_threads, bool *fewer, bal_cells **counts, bool *joined,
                              bal_error *err) {
    bal_error own = {0};
    unsigned started;
    bal_status status = bali_run_tasks(count_part, w, n_parts, n_threads, &started, &own);
    if (fewer) *fewer = started < n_threads && started < n_parts;
    *joined = status == BAL_OK && w->parts->join(w->source);
    if (status == BAL_ERR_MEMORY) return bali_out_of_memory(err);
    return *joined ? add_up(w, counts, err) : BAL_OK;
}

bal_status bal_tally_threads(const bal_network *network, bal_source *source, unsigned n_threads, bool *fewer, bal_cells **counts,
                             bal_error *err) {
    *counts = NULL;
    parts_work w = {.network = network, .source = source, .parts = source->methods->parts};
    size_t n_parts = w.parts && n_threads > 1 ? w.parts->count(source) : 0;
    if (fewer) *fewer = false;
    if (n_parts < 2) return bal_tally(network, source, counts, err);
    bal_status status = check_domains(network, source, err);
    if (status != BAL_OK) return status;
    bool joined = false;
    (void)pthread_mutex_init(&w.lock, NULL);
    w.counters = bali_allocate(n_threads, sizeof *w.counters);
    w.taken = bali_allocate(n_threads, sizeof *w.taken);
    status = w.counters && w.taken ? count_parts(&w, n_parts, n_threads, fewer, counts, &joined, err) : bali_out_of_memory(err);
    for (size_t i = 0; i < w.n_counters; i++) bali_counter_free(&w.counters[i]);
    bali_free(w.counters);
    bali_free(w.taken);
    (void)pthread_mutex_destroy(&w.lock);
    if (status != BAL_OK || joined) return status;
    status = bal_source_rewind(source, err);
    return status == BAL_OK ? bal_tally(network, source, counts, err) : status;
}

double bal_tally_records(const bal_cells *counts) {
    const bal_network *network = bal_cells_network(counts);
    return bali_row_sum(bal_cells_family(counts, 0), bal_network_rows(network, 0) * bal_network_outcomes(network, 0));
}
