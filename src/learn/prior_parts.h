/* What a prior is made of, for those who settle and report it. */
#ifndef LEARN_PRIOR_PARTS_H
#define LEARN_PRIOR_PARTS_H

#include "ballast/prior.h"

struct bal_prior {
    bal_network *network;
    bal_prior_kind kind;
    bal_strength_choice choice;
    double strength;  /* the given one */
    bal_cells *units; /* EXPERT, CARRIED: pseudo-counts at strength 1; NULL for the others, whose families are constant */
};

/** Pseudo-count of every cell of a family at strength 1, for priors without units. */
double bali_prior_unit(const bal_prior *prior, size_t variable);

#endif
