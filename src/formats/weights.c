#include "formats/weights.h"

#include "base/numbers.h"

#include <math.h>

static const double parts_of_one = 0x1p32;

bool bali_weight_read(const char *text, size_t length, double *weight) {
    double read;
    if (!bali_number_read(text, length, &read) || !(read >= 0 && read <= BALI_LARGEST_WEIGHT)) return false;
    /* Scaling by a power of two is exact. From 2^20 on doubles lie at least 2^-32 apart: nothing is left to round there. */
    *weight = read < 0x1p20 ? nearbyint(read * parts_of_one) / parts_of_one : read;
    *weight += 0; /* -0 is 0 */
    return true;
}

uint64_t bali_weight_places(double weight) {
    return (uint64_t)ceil(weight);
}

void bali_weight_add(bali_weight_sum *sum, double weight) {
    double whole = floor(weight);
    uint64_t parts = sum->parts + (uint64_t)((weight - whole) * parts_of_one);
    sum->whole += (uint64_t)whole + (parts >> 32);
    sum->parts = parts & UINT32_MAX;
}

void bali_weight_join(bali_weight_sum *sum, const bali_weight_sum *more) {
    uint64_t parts = sum->parts + more->parts;
    sum->whole += more->whole + (parts >> 32);
    sum->parts = parts & UINT32_MAX;
}

double bali_weight_value(const bali_weight_sum *sum) {
    return (double)sum->whole + (double)sum->parts / parts_of_one;
}
