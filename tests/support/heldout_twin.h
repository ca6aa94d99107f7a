/* K-fold held-out comparison the slow, obvious way: one record after another, every fold refitted from its records. */
#ifndef SUPPORT_HELDOUT_TWIN_H
#define SUPPORT_HELDOUT_TWIN_H

#include "ballast/judge.h"

enum { MOST_RECORDS = 400 };

/** What the records are, and how they are held out. */
typedef struct trial {
    bal_network *network;
    const bal_prior *prior;
    int *codes;                    /* as counts_of takes them */
    uint64_t places[MOST_RECORDS]; /* of each record, before dropping */
    size_t n_records, n_folds;
    uint64_t seed;
} trial;

/** Every number of a bal_heldout, by its definition. */
bal_heldout heldout_twin(const trial *t);

#endif
