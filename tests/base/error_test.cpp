// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/error.hpp"

namespace {

using namespace tonewalk;

TEST(Error, IsOneLineOfWhereWhatAndMend) {
    const error failure{fault::malformed, "is not JSON", "a.sigmf-meta, byte 36", "mend the file"};
    EXPECT_STREQ(failure.what(), "a.sigmf-meta, byte 36: is not JSON; mend the file");
    EXPECT_STREQ((error{fault::malformed, "what", "", ""}.what()), "what");
}

TEST(Error, StaysOneLineWhateverItQuotes) {
    const error failure{fault::malformed, "is\n\x1B[31mred", "a\r\x7F.toml", "mend\tit"};
    EXPECT_STREQ(failure.what(), "a??.toml: is??[31mred; mend?it");
}

TEST(Error, MapsEveryFaultToItsExitStatus) {
    const auto status = [](fault kind) { return error{kind, "", "", ""}.exit_status(); };
    EXPECT_EQ(status(fault::bad_request), 2);
    EXPECT_EQ(status(fault::unreadable), 3);
    EXPECT_EQ(status(fault::malformed), 3);
    EXPECT_EQ(status(fault::unsupported), 3);
    EXPECT_EQ(status(fault::unwritable), 4);
}

} // namespace
