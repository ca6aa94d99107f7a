#include "judge/partition.h"

#include "base/memory.h"
#include "base/random.h"

#include <math.h>

uint64_t bal_fold_key(uint64_t seed, uint64_t repeat) {
    return bali_random_key(seed, BALI_FOR_FOLDS, repeat);
}

uint64_t bal_holdout_key(uint64_t seed, uint64_t repeat) {
    return bali_random_key(seed, BALI_FOR_HOLDOUT, repeat);
}

void bal_fold_run(uint64_t key, uint64_t run, size_t n_folds, size_t *folds) {
    for (size_t t = 0; t < n_folds; t++) folds[t] = t;
    for (size_t t = n_folds - 1; t > 0; t--) {
        size_t other = (size_t)(bali_splitmix64(key, run * n_folds + t) % (t + 1));
        size_t fold = folds[t];
        folds[t] = folds[other];
        folds[other] = fold;
    }
}

bool bal_is_held_out(uint64_t key, uint64_t record, double fraction) {
    if (!(fraction > 0)) return false;
    if (fraction >= 1) return true;
    /* A whole number is below F x 2^64 when it is below that rounded up, which is compared without rounding. */
    return bali_splitmix64(key, record) < (uint64_t)ceil(fraction * 0x1p64);
}

static bal_status check_options(const bal_heldout_options *options, size_t n_groups, bal_error *err) {
    if (options->repeats < 1) return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-repeats", "the records are held out at least once, not 0 times");
    switch (options->method) {
    case BAL_HELDOUT_FOLDS:
        if (options->folds >= 2 && options->folds <= BAL_HELDOUT_MOST_FOLDS) return BAL_OK;
        return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-folds", "%zu folds are not possible; use 2 to %zu", options->folds,
                             BAL_HELDOUT_MOST_FOLDS);
    case BAL_HELDOUT_GROUPS:
        if (n_groups >= 2 && n_groups <= BAL_HELDOUT_MOST_FOLDS) return BAL_OK;
        return bal_error_set(err, BAL_ERR_DATA, "bad-groups", "the fold column has %zu label%s; it takes 2 to %zu to hold one part out at a time",
                             n_groups, n_groups == 1 ? "" : "s", BAL_HELDOUT_MOST_FOLDS);
    case BAL_HELDOUT_HOLDOUT:
        if (options->fraction > 0 && options->fraction < 1) return BAL_OK;
        return bal_error_set(err, BAL_ERR_ARGUMENT, "bad-fraction", "a share of %g cannot be held out; use one between 0 and 1",
                             options->fraction);
    case BAL_HELDOUT_TEST: return BAL_OK;
    }
    return BAL_OK;
}

bal_status bali_partition_create(const bal_heldout_options *options, size_t n_groups, bali_partition *partition, bal_error *err) {
    *partition = (bali_partition){.method = options->method, .fraction = options->fraction, .n_parts = 1};
    bal_status status = check_options(options, n_groups, err);
    if (status != BAL_OK) return status;
    if (options->method == BAL_HELDOUT_FOLDS) partition->n_parts = options->folds;
    if (options->method == BAL_HELDOUT_GROUPS) partition->n_parts = n_groups;
    partition->folds = bali_allocate(partition->n_parts, sizeof *partition->folds);
    return partition->folds ? BAL_OK : bali_out_of_memory(err);
}

void bali_partition_free(bali_partition *partition) {
    bali_free(partition->folds);
    partition->folds = NULL;
}

void bali_partition_repeat(bali_partition *partition, const bal_heldout_options *options, size_t repeat) {
    bool folds = partition->method == BAL_HELDOUT_FOLDS;
    partition->key = folds ? bal_fold_key(options->seed, repeat) : bal_holdout_key(options->seed, repeat);
    partition->run = UINT64_MAX;
}

static size_t fold_of(bali_partition *p, uint64_t place) {
    if (place / p->n_parts != p->run) {
        p->run = place / p->n_parts;
        bal_fold_run(p->key, p->run, p->n_parts, p->folds);
    }
    return p->folds[place % p->n_parts];
}

void bali_partition_assign(bali_partition *p, const bal_block *block, size_t *parts) {
    for (size_t t = 0; t < block->n_records; t++) {
        uint64_t place = bal_block_place(block, t);
        switch (p->method) {
        case BAL_HELDOUT_FOLDS: parts[t] = fold_of(p, place); break;
        case BAL_HELDOUT_GROUPS: parts[t] = block->groups ? block->groups[t] : BALI_NOT_HELD_OUT; break;
        case BAL_HELDOUT_HOLDOUT: parts[t] = bal_is_held_out(p->key, place, p->fraction) ? 0 : BALI_NOT_HELD_OUT; break;
        case BAL_HELDOUT_TEST: parts[t] = 0; break;
        }
    }
}
