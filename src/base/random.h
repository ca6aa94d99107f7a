/* Random numbers by counting: number i of a stream is a function of the stream's key and i. */
#ifndef BASE_RANDOM_H
#define BASE_RANDOM_H

#include <stdint.h>

/* What a stream of random numbers is for; part of its key, so that no two uses share numbers. */
typedef enum bali_purpose {
    BALI_FOR_FOLDS = 1,
    BALI_FOR_HOLDOUT = 2,
    BALI_FOR_DRAW = 3,
    BALI_FOR_QUERY = 4,
    BALI_FOR_PLAN = 5,
    BALI_FOR_CURVE = 6
} bali_purpose;

/**
 * mix(mix(s + g) + (i + 1) g) with g = 0x9E3779B97F4A7C15 and mix the SplitMix64 finaliser, modulo 2^64.
 * Source: Steele, Lea & Flood, Fast splittable pseudorandom number generators, OOPSLA 2014.
 */
uint64_t bali_splitmix64(uint64_t s, uint64_t i);

/** splitmix64(splitmix64(seed, purpose), repeat). */
uint64_t bali_random_key(uint64_t seed, bali_purpose purpose, uint64_t repeat);

/** The top 53 bits as a number in [0, 1). */
double bali_uniform(uint64_t bits);

#endif
