// SPDX-License-Identifier: GPL-3.0-or-later
// sha256: the examples of FIPS 180-4 (NIST, "Secure Hash Standard examples", SHA256.pdf) and every padding
// length.
#include "halfplane/link/sha256.h"

#include <gtest/gtest.h>

using halfplane::link::sha256;

TEST(Sha256, PublishedExamples)
{
    // NIST CSRC, Cryptographic Standards and Guidelines, Examples with Intermediate Values: SHA-256, one and
    // two blocks; the empty and the million-letter message from the NIST CAVP short and long message vectors.
    EXPECT_EQ(sha256("abc"), "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    EXPECT_EQ(sha256("abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq"),
              "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1");
    EXPECT_EQ(sha256(""), "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
    EXPECT_EQ(sha256(std::string(1000000, 'a')),
              "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0");
}

TEST(Sha256, EveryPaddingLength)
{
    // The digests of 'x' * n for n = 0 … 129, one after another as text, hashed again. Expected value from
    // Python's hashlib:
    //   h = hashlib.sha256; h("".join(h(b"x" * n).hexdigest() for n in range(130)).encode()).hexdigest()
    std::string all;
    for (std::size_t n = 0; n < 130; ++n)
        all += sha256(std::string(n, 'x'));
    EXPECT_EQ(sha256(all), "199af942eba7fa5d1e16d475169eb24018b14e69339c93d26a9ea6d873b4ace6");
}
