#include "model/expanded.h"

#include "base/memory.h"
#include "model/block.h"

#include <math.h>
#include <string.h>

typedef struct expanded {
    bal_source head;
    bal_source *inner;
    bal_block block;      /* of the inner source */
    size_t at;            /* record of the inner block that is being repeated */
    uint64_t repeated;    /* how often it was given already */
    void **columns;       /* one a variable, BALI_BLOCK_RECORDS codes each; made when first needed */
    const void **wanted;  /* of them, those the inner block has */
    uint64_t *places;
    uint32_t *groups;
} expanded;

static bal_status make_room(expanded *e, bal_error *err) {
    if (e->places) return BAL_OK;
    size_t n = bal_domain_variables(e->head.domain);
    e->columns = bali_allocate(n, sizeof *e->columns);
    e->wanted = bali_allocate(n, sizeof *e->wanted);
    e->groups = bali_allocate(BALI_BLOCK_RECORDS, sizeof *e->groups);
    if (!e->columns || !e->wanted || !e->groups) return bali_out_of_memory(err);
    for (size_t v = 0; v < n; v++) {
        e->columns[v] = bali_allocate(BALI_BLOCK_RECORDS, 2);
        if (!e->columns[v]) return bali_out_of_memory(err);
    }
    e->places = bali_allocate(BALI_BLOCK_RECORDS, sizeof *e->places);
    return e->places ? BAL_OK : bali_out_of_memory(err);
}

static void copy_record(expanded *e, size_t from, size_t to) {
    unsigned width = e->block.width;
    for (size_t v = 0; v < e->block.n_columns; v++) {
        e->wanted[v] = e->block.columns[v] ? e->columns[v] : NULL;
        if (e->block.columns[v])
            memcpy((char *)e->columns[v] + to * width, (const char *)e->block.columns[v] + from * width, width);
    }
    if (e->block.groups) e->groups[to] = e->block.groups[from];
}

/* Repeats records of the inner block until a block is full or the inner one is used up; *n is how many there are. */
static bal_status repeat(expanded *e, size_t *n, bal_error *err) {
    while (*n < BALI_BLOCK_RECORDS && e->at < e->block.n_records) {
        double weight = e->block.weights[e->at];
        if (weight != floor(weight))
            return bal_error_set(err, BAL_ERR_DATA, "fractional-weight",
                                 "a weight of %g is no whole number of records; records are held out only with whole weights", weight);
        if ((double)e->repeated >= weight) {
            e->at++;
            e->repeated = 0;
            continue;
        }
        copy_record(e, e->at, *n);
        e->places[(*n)++] = bal_block_place(&e->block, e->at) + e->repeated++;
    }
    return BAL_OK;
}

static bal_status expanded_next(bal_source *source, bal_block *block, bal_error *err) {
    expanded *e = (expanded *)source;
    size_t n = 0;
    while (n == 0) {
        bal_status status = BAL_OK;
        if (e->at >= e->block.n_records) {
            status = bal_source_next(e->inner, &e->block, err);
            e->at = 0;
            e->repeated = 0;
            if (status != BAL_OK || e->block.n_records == 0) return status;
            if (!e->block.weights) {
                *block = e->block;
                e->at = e->block.n_records;
                return BAL_OK;
            }
            status = make_room(e, err);
        }
        if (status == BAL_OK) status = repeat(e, &n, err);
        if (status != BAL_OK) return status;
    }
    *block = (bal_block){.n_records = n,
                         .n_columns = e->block.n_columns,
                         .width = e->block.width,
                         .columns = e->wanted,
                         .groups = e->block.groups ? e->groups : NULL,
                         .first_record = e->places[0],
                         .places = e->places};
    return BAL_OK;
}

static bal_status expanded_rewind(bal_source *source, bal_error *err) {
    expanded *e = (expanded *)source;
    e->block = (bal_block){0};
    e->at = 0;
    e->repeated = 0;
    return bal_source_rewind(e->inner, err);
}

static void expanded_locate(bal_source *source, uint64_t place, bal_error *err) {
    bal_source_locate(((expanded *)source)->inner, place, err);
}

static void expanded_summary(const bal_source *source, bal_source_summary *out) {
    bal_source_summary_get(((const expanded *)source)->inner, out);
}

static void expanded_free(bal_source *source) {
    expanded *e = (expanded *)source;
    for (size_t v = 0; e->columns && v < bal_domain_variables(e->head.domain); v++) bali_free(e->columns[v]);
    bali_free(e->columns);
    bali_free(e->wanted);
    bali_free(e->places);
    bali_free(e->groups);
    bali_free(e);
}

static const bali_source_methods methods = {
    .next = expanded_next, .rewind = expanded_rewind, .locate = expanded_locate, .summary = expanded_summary, .free = expanded_free};

bal_status bali_expanded_open(bal_source *source, bal_source **out, bal_error *err) {
    *out = NULL;
    expanded *e = bali_allocate(1, sizeof *e);
    if (!e) return bali_out_of_memory(err);
    bali_source_init(&e->head, &methods, bal_source_domain(source));
    e->inner = source;
    *out = &e->head;
    return BAL_OK;
}
