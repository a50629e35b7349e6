// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/recording/sample_format.hpp"

#include <set>

#include <gtest/gtest.h>

namespace tonewalk {
namespace {

// SIG-3: SigMF specification 1.2.5, datatype grammar.
TEST(SampleFormat, NamesEveryTypeOfTheGrammarAndNothingElse) {
    const std::pair<const char*, std::size_t> widths[] = {{"f32", 4}, {"f64", 8}, {"i32", 4},
                                                          {"i16", 2}, {"u32", 4}, {"u16", 2},
                                                          {"i8", 1},  {"u8", 1}};
    std::set<std::string> seen;
    for (const std::string kind : {"c", "r"})
        for (const auto& [type, width] : widths)
            for (const std::string order : {"", "_le", "_be"}) {
                const std::string name = kind + type + order;
                const auto format = parse_sample_format(name);
                const bool valid = (width == 1) == order.empty();
                ASSERT_EQ(format.has_value(), valid) << name;
                if (!valid)
                    continue;
                EXPECT_EQ(format->name(), name);
                EXPECT_EQ(format->component_bytes(), width);
                EXPECT_EQ(format->sample_bytes(), kind == "c" ? 2 * width : width);
                EXPECT_EQ(format->is_float(), type[0] == 'f');
                EXPECT_EQ(format->big_endian, order == "_be");
                seen.insert(name);
            }
    EXPECT_EQ(seen.size(), 28U);
}

// SIG-4: the published schema's pattern has no end anchor and lets these pass; the grammar does
// not.
TEST(SampleFormat, RefusesWhatTheLooseSchemaPatternAccepts) {
    for (const char* name : {"cf32", "cu8_le", "ci16_lex", "ci16_le ", "ri8_be", "cf32_le_be"})
        EXPECT_FALSE(parse_sample_format(name)) << name;
    for (const char* name : {"", "c", "r", "ci", "ci24_le", "xi16_le", "CI16_LE", "i16_le", " ci8"})
        EXPECT_FALSE(parse_sample_format(name)) << name;
}

} // namespace
} // namespace tonewalk
