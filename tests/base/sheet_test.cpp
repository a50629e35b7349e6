// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/sheet.hpp"

#include <cmath>

namespace {

using namespace tonewalk;

std::vector<std::string> keys(const sheet& page) {
    std::vector<std::string> found;
    for (const auto& item : page.items)
        if (const auto* entry = std::get_if<sheet_entry>(&item))
            found.push_back(entry->key);
    return found;
}

TEST(Sheet, GivesAnEstimateItsU95AndAnIntervalItsEnds) {
    sheet page;
    page.add("depth_percent", "%", estimate{30.0, 0.1});
    page.add("carrier_dbfs", "dBFS", interval_estimate{-20.0, -20.5, -19.6, not_measured});
    const std::vector<std::string> expected{"depth_percent",       "depth_percent_u95",
                                            "carrier_dbfs",        "carrier_dbfs_low95",
                                            "carrier_dbfs_high95", "carrier_dbfs_u95"};
    EXPECT_EQ(keys(page), expected);
    EXPECT_EQ(std::get<double>(*page.find("depth_percent_u95")), 0.1);
    EXPECT_EQ(std::get<double>(*page.find("carrier_dbfs_high95")), -19.6);
    EXPECT_TRUE(std::isnan(std::get<double>(*page.find("carrier_dbfs_u95"))));
    EXPECT_EQ(page.find("absent"), nullptr);
}

TEST(Sheet, KeepsTextWholeNumbersAndTruthApart) {
    sheet page;
    page.add("name", "", cell{std::string{"a"}});
    page.add("count", "", cell{std::int64_t{3}});
    page.add("suspected", "", cell{true});
    EXPECT_TRUE(std::holds_alternative<std::string>(*page.find("name")));
    EXPECT_TRUE(std::holds_alternative<std::int64_t>(*page.find("count")));
    EXPECT_TRUE(std::holds_alternative<bool>(*page.find("suspected")));
}

} // namespace
