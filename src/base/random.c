#include "base/random.h"

static uint64_t mix(uint64_t z) {
    z ^= z >> 30;
    z *= 0xBF58476D1CE4E5B9u;
    z ^= z >> 27;
    z *= 0x94D049BB133111EBu;
    z ^= z >> 31;
    return z;
}

uint64_t bali_splitmix64(uint64_t s, uint64_t i) {
    const uint64_t g = 0x9E3779B97F4A7C15u;
    return mix(mix(s + g) + (i + 1) * g);
}

uint64_t bali_random_key(uint64_t seed, bali_purpose purpose, uint64_t repeat) {
    return bali_splitmix64(bali_splitmix64(seed, purpose), repeat);
}

double bali_uniform(uint64_t bits) {
    return (double)(bits >> 11) * 0x1p-53;
}
