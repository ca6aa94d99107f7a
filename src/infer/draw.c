/* Simulated records as a source of blocks. */
#include "ballast/infer.h"

#include "base/memory.h"
#include "base/random.h"
#include "model/block.h"
#include "model/cells.h"
#include "model/shape.h"

typedef struct draw {
    bal_source head;
    bal_network *network;
    bal_cells *tables;
    uint64_t key, n_records, at;
    unsigned width;
    void **columns; /* n variables, BALI_BLOCK_RECORDS codes each */
    size_t *rows;   /* of one family, for the records of a block */
} draw;

static size_t code_at(const draw *d, size_t variable, size_t t) {
    return d->width == 1 ? ((const uint8_t *)d->columns[variable])[t] : ((const uint16_t *)d->columns[variable])[t];
}

/* The outcome at a point of [0, 1). Where the row's sum is a hair below the point, the last outcome that can happen. */
static size_t choose(const double *row, size_t r, double point) {
    double reached = 0;
    size_t last = 0;
    for (size_t k = 0; k < r; k++) {
        reached += row[k];
        if (point < reached) return k;
        if (row[k] > 0) last = k;
    }
    return last;
}

static void draw_column(draw *d, size_t v, size_t n) {
    size_t n_parents, r = bal_network_outcomes(d->network, v);
    const size_t *parents = bal_network_parents(d->network, v, &n_parents);
    const double *table = bal_cells_family(d->tables, v);
    for (size_t t = 0; t < n; t++) d->rows[t] = 0;
    for (size_t p = 0; p < n_parents; p++) {
        size_t outcomes = bal_network_outcomes(d->network, parents[p]);
        for (size_t t = 0; t < n; t++) d->rows[t] = d->rows[t] * outcomes + code_at(d, parents[p], t);
    }
    for (size_t t = 0; t < n; t++) {
        double point = bali_uniform(bali_splitmix64(bali_splitmix64(d->key, d->at + t), v));
        size_t k = choose(table + d->rows[t] * r, r, point);
        if (d->width == 1) {
            ((uint8_t *)d->columns[v])[t] = (uint8_t)k;
        } else {
            ((uint16_t *)d->columns[v])[t] = (uint16_t)k;
        }
    }
}

static bal_status draw_next(bal_source *source, bal_block *block, bal_error *err) {
    (void)err;
    draw *d = (draw *)source;
    uint64_t left = d->n_records - d->at;
    size_t n = left < BALI_BLOCK_RECORDS ? (size_t)left : BALI_BLOCK_RECORDS;
    size_t n_variables = bal_network_variables(d->network);
    for (size_t i = 0; i < n_variables && n > 0; i++) draw_column(d, bal_network_order(d->network)[i], n);
    *block = (bal_block){.n_records = n,
                         .n_columns = n_variables,
                         .width = d->width,
                         .columns = (const void *const *)d->columns,
                         .first_record = d->at};
    d->at += n;
    return BAL_OK;
}

static bal_status draw_rewind(bal_source *source, bal_error *err) {
    (void)err;
    ((draw *)source)->at = 0;
    return BAL_OK;
}

static void draw_summary(const bal_source *source, bal_source_summary *out) {
    out->records = out->places = ((const draw *)source)->at;
    out->weight = (double)out->records;
}

static void draw_free(bal_source *source) {
    draw *d = (draw *)source;
    for (size_t v = 0; d->columns && v < bal_network_variables(d->network); v++) bali_free(d->columns[v]);
    bali_free(d->columns);
    bali_free(d->rows);
    bal_cells_free(d->tables);
    bal_network_free(d->network);
    bali_free(d);
}

static const bali_source_methods methods = {.next = draw_next, .rewind = draw_rewind, .summary = draw_summary, .free = draw_free};

bal_status bal_draw_open(const bal_cells *tables, uint64_t n_records, uint64_t seed, bal_source **out, bal_error *err) {
    *out = NULL;
    const bal_network *network = bal_cells_network(tables);
    draw *d = bali_allocate(1, sizeof *d);
    if (!d) return bali_out_of_memory(err);
    bali_source_init(&d->head, &methods, bal_network_domain(network));
    d->network = bali_network_hold(network);
    d->n_records = n_records;
    d->key = bali_random_key(seed, BALI_FOR_DRAW, 0);
    d->width = bali_code_width(bal_network_domain(network));
    d->rows = bali_allocate(BALI_BLOCK_RECORDS, sizeof *d->rows);
    d->columns = bali_allocate(bal_network_variables(network), sizeof *d->columns);
    bal_status status = d->rows && d->columns ? bal_cells_copy(tables, &d->tables, err) : bali_out_of_memory(err);
    for (size_t v = 0; v < bal_network_variables(network) && status == BAL_OK; v++) {
        d->columns[v] = bali_allocate(BALI_BLOCK_RECORDS, d->width);
        if (!d->columns[v]) status = bali_out_of_memory(err);
    }
    if (status == BAL_OK) {
        *out = &d->head;
    } else {
        bal_source_free(&d->head);
    }
    return status;
}
