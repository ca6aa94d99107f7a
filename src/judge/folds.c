/* Which fold a record is in. */
#include "ballast/judge.h"

#include "base/random.h"

uint64_t bal_fold_key(uint64_t seed, uint64_t repeat) {
    return bali_random_key(seed, BALI_FOR_FOLDS, repeat);
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
