/* Which part of the records each record is in. */
#ifndef JUDGE_PARTITION_H
#define JUDGE_PARTITION_H

#include "ballast/judge.h"

#define BALI_NOT_HELD_OUT ((size_t)-1)

/** Made by bali_partition_create. */
typedef struct bali_partition {
    bal_heldout_method method;
    size_t n_parts;
    double fraction;
    uint64_t key;  /* of the repeat at hand */
    uint64_t run;  /* whose folds stand in folds */
    size_t *folds; /* of one run of n_parts records */
} bali_partition;

/** n_groups: labels of the fold column. Fails: ARGUMENT for options out of range; MEMORY. */
BAL_MUST_CHECK bal_status bali_partition_create(const bal_heldout_options *options, size_t n_groups, bali_partition *partition,
                                                bal_error *err);
void bali_partition_free(bali_partition *partition);

/** Makes ready for a repeat, from 0. */
void bali_partition_repeat(bali_partition *partition, const bal_heldout_options *options, size_t repeat);

/** The part of every record of a block, or BALI_NOT_HELD_OUT. */
void bali_partition_assign(bali_partition *partition, const bal_block *block, size_t *parts);

#endif
