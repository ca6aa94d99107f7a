/* Case weights as whole multiples of 2^-32, and their exact sum. */
#ifndef FORMATS_WEIGHTS_H
#define FORMATS_WEIGHTS_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#define BALI_LARGEST_WEIGHT 1e15
#define BALI_LARGEST_WEIGHT_SUM ((uint64_t)1 << 53) /* up to here every whole count is a double */

/** Reads a whole text as a weight: a decimal number from 0 to BALI_LARGEST_WEIGHT, rounded once to the nearest multiple of 2^-32. */
bool bali_weight_read(const char *text, size_t length, double *weight);

/** How many places a record of this weight takes: that many where it is whole; a fraction takes one more. */
uint64_t bali_weight_places(double weight);

/** A sum of weights. Start it with = {0}. */
typedef struct bali_weight_sum {
    uint64_t whole;
    uint64_t parts; /* of 2^-32; less than 2^32 */
} bali_weight_sum;

void bali_weight_add(bali_weight_sum *sum, double weight);
void bali_weight_join(bali_weight_sum *sum, const bali_weight_sum *more);
/** The sum, rounded once. */
double bali_weight_value(const bali_weight_sum *sum);

#endif
