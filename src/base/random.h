/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_BASE_RANDOM_H
#define TARRY_BASE_RANDOM_H

#include <stdint.h>

/* Random streams: xoshiro256++ (Blackman & Vigna 2021, ACM Trans. Math. Softw. 47:36), its state
 * filled by SplitMix64 (Steele, Lea & Flood 2014, OOPSLA) from (seed, cell, purpose), so that every
 * cell and every purpose has a stream of its own that does not depend on any other. */

typedef enum tarry_stream_purpose {
    TARRY_STREAM_EVENTS = 0,
    TARRY_STREAM_START = 1,
    TARRY_STREAM_NOISE = 2,
    TARRY_STREAM_PARAMETERS = 3,
} tarry_stream_purpose;

typedef struct tarry_stream {
    uint64_t s[4];
} tarry_stream;

/* The finaliser of SplitMix64: a bijection of 64 bits in which every bit moves every other. */
static inline uint64_t tarry_mix64(uint64_t z) {
    z = (z ^ (z >> 30)) * UINT64_C(0xbf58476d1ce4e5b9);
    z = (z ^ (z >> 27)) * UINT64_C(0x94d049bb133111eb);
    return z ^ (z >> 31);
}

/* One number out of (seed, cell, purpose), the start of a stream. */
static inline uint64_t tarry_stream_key(uint64_t seed, uint64_t cell, uint64_t purpose) {
    uint64_t key = tarry_mix64(seed + UINT64_C(0x9e3779b97f4a7c15));
    key = tarry_mix64(key ^ (cell + UINT64_C(0xd1b54a32d192ed03)));
    return tarry_mix64(key ^ (purpose * UINT64_C(0x8cb92ba72f3d8dd7)));
}

static inline void tarry_stream_init(tarry_stream *stream, uint64_t seed, uint64_t cell,
                                     tarry_stream_purpose purpose) {
    uint64_t z = tarry_stream_key(seed, cell, (uint64_t)purpose);
    for (int i = 0; i < 4; i++)
        stream->s[i] = tarry_mix64(z += UINT64_C(0x9e3779b97f4a7c15));
}

static inline uint64_t tarry_stream_next(tarry_stream *stream) {
    uint64_t *s = stream->s;
    const uint64_t sum = s[0] + s[3];
    const uint64_t result = ((sum << 23) | (sum >> 41)) + s[0];
    const uint64_t t = s[1] << 17;
    s[2] ^= s[0];
    s[3] ^= s[1];
    s[1] ^= s[2];
    s[0] ^= s[3];
    s[2] ^= t;
    s[3] = (s[3] << 45) | (s[3] >> 19);
    return result;
}

/* A number strictly between 0 and 1, (k + 1/2) / 2^52: never 0 or 1, and 1 - u is exact. */
static inline double tarry_unit(uint64_t bits) {
    return ((double)(bits >> 12) + 0.5) * 0x1p-52;
}

#endif
