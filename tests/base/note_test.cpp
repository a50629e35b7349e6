// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/base/note.hpp"

#include <set>

namespace {

using namespace tonewalk;

TEST(NoteName, SpellsEveryCodeWithHyphensAsInTheEnumeration) {
    EXPECT_EQ(name(note_code::clipped), "clipped");
    EXPECT_EQ(name(note_code::agc_suspected), "agc-suspected");
    EXPECT_EQ(name(note_code::dc_in_channel), "dc-in-channel");
    EXPECT_EQ(name(note_code::carrier_reference_line), "carrier-reference-line");
    EXPECT_EQ(name(note_code::non_finite_samples), "non-finite-samples");
    EXPECT_EQ(name(note_code::window_bound), "window-bound");
    EXPECT_EQ(name(note_code::late_carrier), "late-carrier");
    EXPECT_EQ(name(note_code::residual_too_large), "residual-too-large");
    std::set<std::string_view> names;
    for (int code = 0; code <= static_cast<int>(note_code::residual_too_large); ++code)
        names.insert(name(static_cast<note_code>(code)));
    EXPECT_EQ(names.size(), 39U); // the codes of the design, each once
    EXPECT_EQ(name(severity::info), "info");
    EXPECT_EQ(name(severity::warning), "warning");
}

TEST(NoteSet, KeepsTheFirstNoteOfACodeInOrderOfArrival) {
    note_set notes;
    notes.add({note_code::no_tone, severity::info, "first", ""});
    notes.add({note_code::clipped, severity::warning, "second", ""});
    notes.add({note_code::no_tone, severity::warning, "again", ""});
    note_set others;
    others.add({note_code::clipped, severity::info, "other", ""});
    others.add({note_code::partial, severity::info, "third", ""});
    notes.merge(others);
    ASSERT_EQ(notes.all().size(), 3U);
    EXPECT_EQ(notes.all()[0].text, "first");
    EXPECT_EQ(notes.all()[1].text, "second");
    EXPECT_EQ(notes.all()[2].text, "third");
    EXPECT_TRUE(notes.has(note_code::partial));
    EXPECT_FALSE(notes.has(note_code::weak_tone));
}

TEST(GeneralCautions, SpeakOfFieldsHeightsVoltageLicenceAndOfNoVerdict) {
    std::string all;
    for (const std::string& line : general_cautions())
        all += line + '\n';
    for (const char* word :
         {"RF near", "Climb", "high voltage", "licence", "local rules", "no certificate"})
        EXPECT_NE(all.find(word), all.npos) << word;
}

} // namespace
