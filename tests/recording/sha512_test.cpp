// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/recording/sha512.hpp"

#include <string_view>

#include <gtest/gtest.h>

namespace tonewalk {
namespace {

void add_text(sha512_hash& hash, std::string_view text) {
    hash.add(std::as_bytes(std::span{text}));
}

// FIPS 180-4 example "abc"; from memory, checked by Python's hashlib.
constexpr std::string_view of_abc =
    "ddaf35a193617abacc417349ae20413112e6fa4e89a97ea20a9eeee64b55d39a"
    "2192992a274fc1a836ba3c23a3feebbd454d4423643ce80e2a9ac94fa54ca49f";

TEST(Sha512, MatchesThePublishedExampleHoweverItIsCut) {
    sha512_hash hash;
    add_text(hash, "abc");
    EXPECT_EQ(hash.finish(), of_abc);
    add_text(hash, "a");
    add_text(hash, "");
    add_text(hash, "bc");
    EXPECT_EQ(hash.finish(), of_abc) << "finish starts anew";
}

} // namespace
} // namespace tonewalk
