/* SPDX-License-Identifier: Apache-2.0 */
#include "core/math/random.h"

#include <math.h>

#include "core/math/real.h"

/* Output function of splitmix64; one to one, 0 stays 0. */
static uint64_t mix(uint64_t z)
{
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9;
    z = (z ^ (z >> 27)) * 0x94d049bb133111eb;
    return z ^ (z >> 31);
}

static uint64_t rotate(uint64_t x, int k)
{
    return x << k | x >> (64 - k);
}

/* Stream 0 is the usual seeding of xoshiro256** [BLA21]. */
void random_init(struct random *r, uint64_t seed, uint64_t stream)
{
    uint64_t x = seed ^ mix(stream);
    for (int i = 0; i < 4; i++) {
        x += 0x9e3779b97f4a7c15;
        r->s[i] = mix(x);
    }
    r->spare = real_nan();
}

uint64_t random_bits(struct random *r)
{
    uint64_t *s = r->s, y = rotate(s[1] * 5, 7) * 9, t = s[1] << 17;
    s[2] ^= s[0];
    s[3] ^= s[1];
    s[1] ^= s[2];
    s[0] ^= s[3];
    s[2] ^= t;
    s[3] = rotate(s[3], 45);
    return y;
}

double random_uniform(struct random *r)
{
    return (double)(random_bits(r) >> 11) * 0x1p-53;
}

uint64_t random_below(struct random *r, uint64_t n)
{
    uint64_t surplus = (0 - n) % n, bits; /* 2^64 mod n            */
    do
        bits = random_bits(r);
    while (bits < surplus);
    return bits % n;
}

double random_normal(struct random *r)
{
    double spare = r->spare, x, y, s;
    if (spare == spare) {
        r->spare = real_nan();
        return spare;
    }
    do {
        x = 2 * random_uniform(r) - 1;
        y = 2 * random_uniform(r) - 1;
        s = x * x + y * y;
    } while (s >= 1 || s == 0);
    double f = sqrt(-2 * real_log(s) / s);
    r->spare = y * f;
    return x * f;
}

double random_exponential(struct random *r)
{
    return 0 - real_log(1 - random_uniform(r)); /* 1 - u in (0, 1]       */
}
