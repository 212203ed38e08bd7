// SPDX-License-Identifier: GPL-3.0-or-later
// sha256: FIPS 180-4, sections 4.1.2, 5.1.1, 5.3.3 and 6.2.
#include "halfplane/link/sha256.h"

#include <array>
#include <cstddef>
#include <cstdint>

namespace halfplane::link {

namespace {

using word = std::uint32_t;

/// First 32 bits of the fractional parts of the cube roots of the first 64 primes (section 4.2.2).
constexpr std::array<word, 64> constants = {
    0x428a2f98, 0x71374491, 0xb5c0fbcf, 0xe9b5dba5, 0x3956c25b, 0x59f111f1, 0x923f82a4, 0xab1c5ed5,
    0xd807aa98, 0x12835b01, 0x243185be, 0x550c7dc3, 0x72be5d74, 0x80deb1fe, 0x9bdc06a7, 0xc19bf174,
    0xe49b69c1, 0xefbe4786, 0x0fc19dc6, 0x240ca1cc, 0x2de92c6f, 0x4a7484aa, 0x5cb0a9dc, 0x76f988da,
    0x983e5152, 0xa831c66d, 0xb00327c8, 0xbf597fc7, 0xc6e00bf3, 0xd5a79147, 0x06ca6351, 0x14292967,
    0x27b70a85, 0x2e1b2138, 0x4d2c6dfc, 0x53380d13, 0x650a7354, 0x766a0abb, 0x81c2c92e, 0x92722c85,
    0xa2bfe8a1, 0xa81a664b, 0xc24b8b70, 0xc76c51a3, 0xd192e819, 0xd6990624, 0xf40e3585, 0x106aa070,
    0x19a4c116, 0x1e376c08, 0x2748774c, 0x34b0bcb5, 0x391c0cb3, 0x4ed8aa4a, 0x5b9cca4f, 0x682e6ff3,
    0x748f82ee, 0x78a5636f, 0x84c87814, 0x8cc70208, 0x90befffa, 0xa4506ceb, 0xbef9a3f7, 0xc67178f2};

constexpr word rotated(word x, int by)
{
    return x >> by | x << (32 - by);
}

void compress(std::array<word, 8>& hash, const unsigned char* block)
{
    std::array<word, 64> w;
    for (std::size_t t = 0; t < 16; ++t)
        w[t] = word{block[4 * t]} << 24 | word{block[4 * t + 1]} << 16 | word{block[4 * t + 2]} << 8 |
               word{block[4 * t + 3]};
    for (std::size_t t = 16; t < 64; ++t) {
        const word s0 = rotated(w[t - 15], 7) ^ rotated(w[t - 15], 18) ^ w[t - 15] >> 3;
        const word s1 = rotated(w[t - 2], 17) ^ rotated(w[t - 2], 19) ^ w[t - 2] >> 10;
        w[t] = w[t - 16] + s0 + w[t - 7] + s1;
    }
    auto [a, b, c, d, e, f, g, h] = hash;
    for (std::size_t t = 0; t < 64; ++t) {
        const word s1 = rotated(e, 6) ^ rotated(e, 11) ^ rotated(e, 25);
        const word t1 = h + s1 + ((e & f) ^ (~e & g)) + constants[t] + w[t];
        const word s0 = rotated(a, 2) ^ rotated(a, 13) ^ rotated(a, 22);
        const word t2 = s0 + ((a & b) ^ (a & c) ^ (b & c));
        h = g;
        g = f;
        f = e;
        e = d + t1;
        d = c;
        c = b;
        b = a;
        a = t1 + t2;
    }
    const std::array<word, 8> added = {a, b, c, d, e, f, g, h};
    for (std::size_t k = 0; k < 8; ++k)
        hash[k] += added[k];
}

} // namespace

std::string sha256(std::string_view bytes)
{
    // The message, a one bit, zeros, and the length in bits as 64 bits: a multiple of 64 bytes
    // (section 5.1.1).
    std::string padded(bytes);
    padded += '\x80';
    padded.append((120 - padded.size() % 64) % 64, '\0');
    for (int shift = 56; shift >= 0; shift -= 8)
        padded += static_cast<char>(std::uint64_t{bytes.size()} * 8 >> shift & 0xff);

    std::array<word, 8> hash = {
        0x6a09e667, 0xbb67ae85, 0x3c6ef372, 0xa54ff53a, 0x510e527f, 0x9b05688c, 0x1f83d9ab, 0x5be0cd19};
    for (std::size_t k = 0; k < padded.size(); k += 64)
        compress(hash, reinterpret_cast<const unsigned char*>(padded.data()) + k);

    std::string text;
    for (const word x : hash)
        for (int shift = 28; shift >= 0; shift -= 4)
            text += "0123456789abcdef"[x >> shift & 0xf];
    return text;
}

} // namespace halfplane::link
