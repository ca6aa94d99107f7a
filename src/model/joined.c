/* Several sources one after another, as one. Places run on: a record of the second source stands behind all of the first. */
#include "base/memory.h"
#include "base/names.h"
#include "model/block.h"
#include "model/domain.h"

#include <string.h>

typedef struct joined {
    bal_source head;
    bal_source **parts;
    uint64_t *first; /* place of each part's first record, known once the part before it has ended */
    size_t n_parts, at;
    size_t n_known; /* parts of which the first place is known: as far as any pass has come */
    uint64_t *places; /* of the current block, where they do not follow one another */
    size_t capacity;
    uint64_t *missing;    /* summed over the parts; one a variable */
    bali_names ignored;   /* columns of all parts, each name once */
    size_t n_noted;       /* parts whose ignored columns are among them */
    bal_source_summary summary;
} joined;

/* Adds the names that are not among those ignored yet. A name that finds no room is left out: it was told already. */
static void add_ignored(joined *j, const bal_source_summary *part) {
    size_t first;
    for (size_t i = 0; i < part->n_ignored; i++)
        if (!bali_names_add(&j->ignored, part->ignored[i], &first)) return;
}

/* The sums over all parts as far as they were read. */
static void sum_up(joined *j) {
    size_t n = bal_domain_variables(j->head.domain);
    bool has_missing = false;
    j->summary = (bal_source_summary){0};
    memset(j->missing, 0, n * sizeof *j->missing);
    for (size_t p = 0; p <= j->at; p++) {
        bal_source_summary part;
        bal_source_summary_get(j->parts[p], &part);
        j->summary.records += part.records;
        j->summary.dropped += part.dropped;
        j->summary.incomplete += part.incomplete;
        j->summary.places += part.places;
        j->summary.weight += part.weight;
        j->summary.fractional |= part.fractional;
        if (part.n_groups > j->summary.n_groups) j->summary.n_groups = part.n_groups;
        has_missing |= part.missing != NULL;
        for (size_t v = 0; part.missing && v < n; v++) j->missing[v] += part.missing[v];
        if (p >= j->n_noted) add_ignored(j, &part);
    }
    j->summary.missing = has_missing ? j->missing : NULL;
    if (j->n_noted <= j->at) j->n_noted = j->at + 1;
    j->summary.ignored = j->ignored.names;
    j->summary.n_ignored = j->ignored.n_names;
}

static bal_status shift_places(joined *j, bal_block *block, bal_error *err) {
    uint64_t first = j->first[j->at];
    block->first_record += first;
    if (!block->places || first == 0) return BAL_OK;
    if (!bali_grow((void **)&j->places, &j->capacity, block->n_records, sizeof *j->places)) return bali_out_of_memory(err);
    for (size_t t = 0; t < block->n_records; t++) j->places[t] = block->places[t] + first;
    block->places = j->places;
    return BAL_OK;
}

static bal_status joined_next(bal_source *source, bal_block *block, bal_error *err) {
    joined *j = (joined *)source;
    for (;;) {
        bal_status status = bal_source_next(j->parts[j->at], block, err);
        if (status != BAL_OK) return status;
        if (block->n_records > 0) return shift_places(j, block, err);
        sum_up(j);
        if (j->at + 1 == j->n_parts) return BAL_OK;
        j->first[j->at + 1] = j->summary.places;
        j->at++;
        if (j->n_known <= j->at) j->n_known = j->at + 1;
    }
}

static bal_status joined_rewind(bal_source *source, bal_error *err) {
    joined *j = (joined *)source;
    bal_status status = BAL_OK;
    for (size_t p = 0; p < j->n_parts && status == BAL_OK; p++) status = bal_source_rewind(j->parts[p], err);
    j->at = 0;
    return status;
}

static void joined_locate(bal_source *source, uint64_t place, bal_error *err) {
    joined *j = (joined *)source;
    size_t p = j->n_known - 1;
    while (p > 0 && j->first[p] > place) p--;
    bal_source_locate(j->parts[p], place - j->first[p], err);
}

static void joined_summary(const bal_source *source, bal_source_summary *out) {
    *out = ((const joined *)source)->summary;
}

static void joined_free(bal_source *source) {
    joined *j = (joined *)source;
    for (size_t p = 0; j->parts && p < j->n_parts; p++) bal_source_free(j->parts[p]);
    bali_free(j->parts);
    bali_free(j->first);
    bali_free(j->places);
    bali_free(j->missing);
    bali_names_free(&j->ignored);
    bali_free(j);
}

/* The parts of all sources one after another, where every one can be read in parts. */
static size_t joined_parts(bal_source *source) {
    joined *j = (joined *)source;
    size_t all = 0;
    for (size_t p = 0; p < j->n_parts; p++) {
        const bali_source_parts *parts = j->parts[p]->methods->parts;
        size_t n = parts ? parts->count(j->parts[p]) : 0;
        if (n == 0) return 0;
        all += n;
    }
    return all;
}

/* The source that a part belongs to, and its number there. */
static bal_source *owner_of(joined *j, size_t *part) {
    size_t p = 0;
    for (size_t n; *part >= (n = j->parts[p]->methods->parts->count(j->parts[p])); p++) *part -= n;
    return j->parts[p];
}

static bal_status joined_open_part(bal_source *source, size_t part, bal_source **out, bal_error *err) {
    bal_source *owner = owner_of((joined *)source, &part);
    return owner->methods->parts->open(owner, part, out, err);
}

static void joined_close_part(bal_source *source, size_t part, bal_source *opened) {
    bal_source *owner = owner_of((joined *)source, &part);
    owner->methods->parts->close(owner, part, opened);
}

static bool joined_join_parts(bal_source *source) {
    joined *j = (joined *)source;
    for (size_t p = 0; p < j->n_parts; p++)
        if (!j->parts[p]->methods->parts->join(j->parts[p])) return false;
    j->at = j->n_parts - 1;
    sum_up(j);
    return true;
}

static const bali_source_parts parts = {joined_parts, joined_open_part, joined_close_part, joined_join_parts};

static const bali_source_methods methods = {joined_next, joined_rewind, joined_locate, joined_summary, joined_free, &parts};

static bal_status fill(joined *j, bal_source *const *sources, size_t n, bal_error *err) {
    j->parts = bali_allocate(n, sizeof *j->parts);
    j->first = bali_allocate(n, sizeof *j->first);
    j->missing = bali_allocate(bal_domain_variables(j->head.domain), sizeof *j->missing);
    if (!j->parts || !j->first || !j->missing) return bali_out_of_memory(err);
    for (size_t p = 1; p < n; p++)
        if (!bali_domain_equal(j->head.domain, bal_source_domain(sources[p])))
            return bal_error_set(err, BAL_ERR_ARGUMENT, "other-network",
                                 "source %zu follows other variables than the first; join sources of the same variables", p + 1);
    memcpy(j->parts, sources, n * sizeof *j->parts);
    j->n_parts = n;
    j->n_known = 1;
    return BAL_OK;
}

bal_status bal_source_join_take(bal_source *const *sources, size_t n, bal_source **out, bal_error *err) {
    *out = NULL;
    joined *j = bali_allocate(1, sizeof *j);
    bal_status status = j ? BAL_OK : bali_out_of_memory(err);
    if (j) {
        bali_source_init(&j->head, &methods, bal_source_domain(sources[0]));
        status = fill(j, sources, n, err);
    }
    if (status == BAL_OK) {
        *out = &j->head;
        return BAL_OK;
    }
    for (size_t p = 0; p < n; p++) bal_source_free(sources[p]);
    if (j) bal_source_free(&j->head);
    return status;
}
