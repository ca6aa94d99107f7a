/* How a table spells the outcomes of a variable. */
#ifndef FORMATS_CODEBOOK_H
#define FORMATS_CODEBOOK_H

#include "ballast/formats.h"

/** The spellings of one variable. */
typedef struct bali_spellings {
    char **codes;     /* "" is the empty cell; no code stands twice */
    size_t *outcomes; /* of each code */
    size_t *lines;    /* where each stands */
    size_t n, capacity;
} bali_spellings;

/** The domain that a codebook follows. */
const bal_domain *bali_codebook_domain(const bal_codebook *codebook);
/** Its file, as the user named it. */
const char *bali_codebook_file(const bal_codebook *codebook);
const bali_spellings *bali_codebook_spellings(const bal_codebook *codebook, size_t variable);

#endif
