/* Records kept in memory as they pass by, so that a second pass need not read the medium again.
 *
 * A kept block is one piece of memory: the codes of every wanted column one after another, then weights and places
 * where the block has them. Once the limit is reached all of them are let go and later passes read the medium. */
#include "base/memory.h"
#include "model/block.h"

#include <string.h>

typedef struct kept_block {
    bal_block block;      /* columns, weights, places and groups point into bytes */
    const void **columns;
    char *bytes;
} kept_block;

typedef struct kept {
    bal_source head;
    bal_source *inner;
    size_t limit, used;
    kept_block *blocks;
    size_t n_blocks, capacity, at;
    bool keeping; /* the first pass is on and all so far is kept */
    bool serving; /* the first pass ended with everything kept */
} kept;

static void let_go(kept *k) {
    for (size_t b = 0; b < k->n_blocks; b++) {
        bali_free(k->blocks[b].columns);
        bali_free(k->blocks[b].bytes);
    }
    k->n_blocks = 0;
    k->used = 0;
    k->keeping = k->serving = false;
}

static size_t count_columns(const bal_block *block) {
    size_t n = 0;
    for (size_t v = 0; v < block->n_columns; v++) n += block->columns[v] != NULL;
    return n;
}

/* Copies the parts of a block behind one another, the widest first so that they are aligned. */
static void copy_parts(kept_block *k, const bal_block *from) {
    char *at = k->bytes;
    if (from->weights) {
        k->block.weights = memcpy(at, from->weights, from->n_records * sizeof *from->weights);
        at += from->n_records * sizeof *from->weights;
    }
    if (from->places) {
        k->block.places = memcpy(at, from->places, from->n_records * sizeof *from->places);
        at += from->n_records * sizeof *from->places;
    }
    if (from->groups) {
        k->block.groups = memcpy(at, from->groups, from->n_records * sizeof *from->groups);
        at += from->n_records * sizeof *from->groups;
    }
    for (size_t v = 0; v < from->n_columns; v++) {
        if (!from->columns[v]) continue;
        k->columns[v] = memcpy(at, from->columns[v], from->n_records * from->width);
        at += from->n_records * from->width;
    }
}

/* Keeps a copy of a block if memory and the limit allow; otherwise lets everything go. */
static void keep_block(kept *k, const bal_block *from) {
    size_t bytes = from->n_records * (count_columns(from) * from->width + (from->weights ? sizeof(double) : 0) +
                                      (from->places ? sizeof(uint64_t) : 0) + (from->groups ? sizeof(uint32_t) : 0));
    kept_block copy = {.block = *from};
    size_t all = bytes + from->n_columns * sizeof *copy.columns + sizeof copy;
    if (all > k->limit - k->used || !bali_grow((void **)&k->blocks, &k->capacity, k->n_blocks + 1, sizeof *k->blocks)) {
        let_go(k);
        return;
    }
    copy.columns = bali_allocate(from->n_columns, sizeof *copy.columns);
    copy.bytes = bali_allocate(bytes, 1);
    k->blocks[k->n_blocks++] = copy;
    if (!copy.columns || !copy.bytes) {
        let_go(k);
        return;
    }
    k->used += all;
    kept_block *to = &k->blocks[k->n_blocks - 1];
    copy_parts(to, from);
    to->block.columns = to->columns;
}

static bal_status kept_next(bal_source *source, bal_block *block, bal_error *err) {
    kept *k = (kept *)source;
    if (k->serving) {
        if (k->at < k->n_blocks) *block = k->blocks[k->at++].block;
        return BAL_OK;
    }
    bal_status status = bal_source_next(k->inner, block, err);
    if (status == BAL_OK && k->keeping) {
        if (block->n_records > 0) {
            keep_block(k, block);
        } else {
            k->serving = true;
            k->keeping = false;
            k->at = k->n_blocks;
        }
    }
    return status;
}

static bal_status kept_rewind(bal_source *source, bal_error *err) {
    kept *k = (kept *)source;
    k->at = 0;
    if (k->serving) return BAL_OK;
    bool all_kept = k->keeping;
    let_go(k); /* a first pass that was broken off begins anew, so that no block is kept twice */
    k->keeping = all_kept;
    return bal_source_rewind(k->inner, err);
}

static void kept_locate(bal_source *source, uint64_t place, bal_error *err) {
    bal_source_locate(((kept *)source)->inner, place, err);
}

static void kept_summary(const bal_source *source, bal_source_summary *out) {
    bal_source_summary_get(((const kept *)source)->inner, out);
}

static void kept_free(bal_source *source) {
    kept *k = (kept *)source;
    let_go(k);
    bali_free(k->blocks);
    bal_source_free(k->inner);
    bali_free(k);
}

/* Parts are those of the inner source while nothing is kept; to be kept, records have to come in order. */
static size_t kept_parts(bal_source *source) {
    kept *k = (kept *)source;
    const bali_source_parts *parts = k->inner->methods->parts;
    return parts && !k->keeping && !k->serving ? parts->count(k->inner) : 0;
}

static bal_status kept_open_part(bal_source *source, size_t part, bal_source **out, bal_error *err) {
    bal_source *inner = ((kept *)source)->inner;
    return inner->methods->parts->open(inner, part, out, err);
}

static void kept_close_part(bal_source *source, size_t part, bal_source *opened) {
    bal_source *inner = ((kept *)source)->inner;
    inner->methods->parts->close(inner, part, opened);
}

static bool kept_join_parts(bal_source *source) {
    bal_source *inner = ((kept *)source)->inner;
    return inner->methods->parts->join(inner);
}

static const bali_source_parts parts = {kept_parts, kept_open_part, kept_close_part, kept_join_parts};

static const bali_source_methods methods = {kept_next, kept_rewind, kept_locate, kept_summary, kept_free, &parts};

bal_status bal_source_keep_take(bal_source *source, size_t memory_limit, bal_source **out, bal_error *err) {
    *out = NULL;
    kept *k = bali_allocate(1, sizeof *k);
    if (!k) {
        bal_source_free(source);
        return bali_out_of_memory(err);
    }
    bali_source_init(&k->head, &methods, bal_source_domain(source));
    k->inner = source;
    k->limit = memory_limit;
    k->keeping = memory_limit > 0;
    *out = &k->head;
    return BAL_OK;
}
