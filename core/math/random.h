/* random.h - a seeded generator with the same sequence everywhere.
 *
 * For rehearsals and tests, never for the filter.  xoshiro256** seeded by
 * splitmix64 [BLA21]; normals by the polar method on core/math functions.
 */
/* SPDX-License-Identifier: Apache-2.0 */
#ifndef CORE_MATH_RANDOM_H
#define CORE_MATH_RANDOM_H

#include <stdint.h>

struct random {
    uint64_t s[4];
    double spare; /* second normal of the last pair, NaN when used */
};

/* Streams with different (seed, stream) are independent for our purposes. */
void random_init(struct random *r, uint64_t seed, uint64_t stream);
uint64_t random_bits(struct random *r);

/* Uniform in [0, 1), 53 bits. */
double random_uniform(struct random *r);

/* Uniform integer in [0, n), n > 0, without bias. */
uint64_t random_below(struct random *r, uint64_t n);

/* Standard normal. */
double random_normal(struct random *r);

/* Exponential with mean 1. */
double random_exponential(struct random *r);

#endif
