// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/recording/convert.hpp"

#include <cmath>
#include <limits>
#include <numeric>
#include <string>

#include <gtest/gtest.h>

#include "recording_support.hpp"

namespace tonewalk {
namespace {

using test::read_file;
using test::run_python;
using test::temporary_folder;

stream_facts facts_of(const std::string& format) {
    stream_facts facts;
    facts.format = parse_sample_format(format).value();
    return facts;
}

// What Python's struct packs: `pack` is its format string, `values` its arguments.
std::string packed(const std::string& pack, const std::string& values) {
    const temporary_folder folder;
    run_python(folder.path(), "open('x', 'wb').write(struct.pack('" + pack + "', " + values + "))");
    return read_file(folder / "x");
}

std::vector<cf32> converted(const stream_facts& facts, const std::string& bytes) {
    std::vector<cf32> out(bytes.size() / facts.frame_bytes());
    sample_converter{facts}.convert(std::as_bytes(std::span{bytes}), out);
    return out;
}

struct counted {
    std::vector<cf32> samples;
    raw_counts counts;
};
counted counted_of(const stream_facts& facts, const std::string& bytes, std::size_t cell,
                   sample_index first = 0) {
    counted result;
    result.samples.resize(bytes.size() / facts.frame_bytes());
    result.counts.cells.reserve(result.samples.size() / cell + 1);
    result.counts.non_finite.reserve(result.samples.size() / cell + 2);
    sample_converter{facts}.convert(std::as_bytes(std::span{bytes}), result.samples, first, cell,
                                    result.counts);
    return result;
}

template <class Number>
std::string bytes_of(const std::vector<Number>& numbers) {
    const auto bytes = std::as_bytes(std::span{numbers});
    std::string text(bytes.size(), '\0');
    std::transform(bytes.begin(), bytes.end(), text.begin(),
                   [](std::byte byte) { return static_cast<char>(byte); });
    return text;
}

// SIG-3 and the definition of full scale: integers by 2^(bits-1), unsigned less 2^(bits-1) first.
TEST(SampleConverter, ScalesEveryDatatypeToFullScale) {
    struct row {
        const char* format;
        const char* pack;
        const char* values;
        cf32 expected;
    };
    const row rows[] = {
        {"ci8", "2b", "-128, 64", {-1.0F, 0.5F}},
        {"cu8", "2B", "0, 192", {-1.0F, 0.5F}},
        {"ci16_le", "<2h", "-32768, 16384", {-1.0F, 0.5F}},
        {"ci16_be", ">2h", "-32768, 1", {-1.0F, 1.0F / 32768}},
        {"cu16_le", "<2H", "0, 49152", {-1.0F, 0.5F}},
        {"cu16_be", ">2H", "32769, 0", {1.0F / 32768, -1.0F}},
        {"ci32_le", "<2i", "-2147483648, 1073741824", {-1.0F, 0.5F}},
        {"ci32_be", ">2i", "65536, -1073741824", {1.0F / 32768, -0.5F}},
        {"cu32_le", "<2I", "0, 3221225472", {-1.0F, 0.5F}},
        {"cu32_be", ">2I", "2147483648, 0", {0.0F, -1.0F}},
        {"cf32_le", "<2f", "0.25, -1.5", {0.25F, -1.5F}},
        {"cf32_be", ">2f", "0.25, -1.5", {0.25F, -1.5F}},
        {"cf64_le", "<2d", "0.25, -1.5", {0.25F, -1.5F}},
        {"cf64_be", ">2d", "0.25, -1.5", {0.25F, -1.5F}},
        // Real r is the real part of an analytic signal: 2r + 0j.
        {"ri8", "b", "-64", {-1.0F, 0.0F}},
        {"ru8", "B", "160", {0.5F, 0.0F}},
        {"ri16_le", "<h", "8192", {0.5F, 0.0F}},
        {"ri16_be", ">h", "8192", {0.5F, 0.0F}},
        {"ru16_le", "<H", "24576", {-0.5F, 0.0F}},
        {"ru16_be", ">H", "24576", {-0.5F, 0.0F}},
        {"ri32_le", "<i", "536870912", {0.5F, 0.0F}},
        {"ri32_be", ">i", "536870912", {0.5F, 0.0F}},
        {"ru32_le", "<I", "1610612736", {-0.5F, 0.0F}},
        {"ru32_be", ">I", "1610612736", {-0.5F, 0.0F}},
        {"rf32_le", "<f", "0.25", {0.5F, 0.0F}},
        {"rf32_be", ">f", "0.25", {0.5F, 0.0F}},
        {"rf64_le", "<d", "-0.25", {-0.5F, 0.0F}},
        {"rf64_be", ">d", "-0.25", {-0.5F, 0.0F}},
    };
    for (const auto& row : rows) {
        const auto out = converted(facts_of(row.format), packed(row.pack, row.values));
        ASSERT_EQ(out.size(), 1U) << row.format;
        EXPECT_EQ(out[0], row.expected) << row.format;
    }
}

TEST(SampleConverter, PicksTheLaneExchangesAndMirrors) {
    // Two frames of three lanes: lane k of frame n is (100 n + 10 k + 1, 100 n + 10 k + 2).
    const std::string bytes = packed("<12h", "1, 2, 11, 12, 21, 22, 101, 102, 111, 112, 121, 122");
    stream_facts facts = facts_of("ci16_le");
    facts.lanes = 3;
    for (unsigned lane = 0; lane < 3; ++lane) {
        facts.lane = lane;
        for (std::size_t n = 0; n < 2; ++n) {
            const auto i = static_cast<float>(100 * n + 10 * lane + 1) / 32768.0F;
            const auto q = i + 1.0F / 32768.0F;
            facts.swap_iq = facts.inverted = false;
            EXPECT_EQ(converted(facts, bytes)[n], (cf32{i, q}));
            facts.swap_iq = true;
            EXPECT_EQ(converted(facts, bytes)[n], (cf32{q, i}));
            facts.inverted = true;
            EXPECT_EQ(converted(facts, bytes)[n], (cf32{q, -i}));
            facts.swap_iq = false;
            EXPECT_EQ(converted(facts, bytes)[n], (cf32{i, -q}));
        }
    }
}

TEST(SampleConverter, ReadsFramesAtAnyAlignment) {
    std::vector<std::int16_t> numbers(2 * 300);
    std::iota(numbers.begin(), numbers.end(), std::int16_t{-300});
    const std::string bytes = bytes_of(numbers);
    const auto expected = converted(facts_of("ci16_le"), bytes);
    for (std::size_t shift = 1; shift < 4; ++shift) {
        const std::string moved = std::string(shift, 'x') + bytes;
        std::vector<cf32> out(300);
        sample_converter{facts_of("ci16_le")}.convert(
            std::as_bytes(std::span{moved}).subspan(shift), out);
        EXPECT_EQ(out, expected);
    }
}

// Integer sums have closed forms: n = -32768 .. 32767 once each as I, Q = -1 - I.
TEST(RawCounts, SumsOfEveryI16CodeAreExact) {
    std::vector<std::int16_t> numbers;
    for (int code = -32768; code <= 32767; ++code) {
        numbers.push_back(static_cast<std::int16_t>(code));
        numbers.push_back(static_cast<std::int16_t>(-1 - code));
    }
    const auto result = counted_of(facts_of("ci16_le"), bytes_of(numbers), 65536);
    ASSERT_EQ(result.counts.cells.size(), 1U);
    const cell_sums& sums = result.counts.cells[0];
    constexpr double n = 65536.0, unit = 1.0 / 32768.0;
    constexpr double sum = -n / 2, squares = n * (n * n + 2) / 12; // of -n/2 .. n/2 - 1
    EXPECT_EQ(sums.i, sum * unit);
    EXPECT_EQ(sums.q, sum * unit);
    EXPECT_EQ(sums.ii, squares * unit * unit);
    EXPECT_EQ(sums.qq, squares * unit * unit);
    EXPECT_EQ(sums.iq, (-sum - squares) * unit * unit);
    EXPECT_EQ(sums.peak_component, 1.0);
    EXPECT_EQ(sums.peak_power, (32768.0 * 32768.0 + 32767.0 * 32767.0) * unit * unit);
}

// 32-bit products need more than 64 bits in the sum: 4096 times the most negative code squared is
// 4096.
TEST(RawCounts, SumsOfExtremeI32CodesAreExact) {
    const std::vector<std::int32_t> numbers(8192, std::numeric_limits<std::int32_t>::min());
    const auto result = counted_of(facts_of("ci32_le"), bytes_of(numbers), 4096);
    const cell_sums& sums = result.counts.cells.at(0);
    EXPECT_EQ(sums.i, -4096.0);
    EXPECT_EQ(sums.ii, 4096.0);
    EXPECT_EQ(sums.iq, 4096.0);
    EXPECT_EQ(sums.peak_power, 2.0);
    EXPECT_EQ(result.counts.negative.outermost(), std::int64_t{1} << 31);
    EXPECT_EQ(result.counts.negative.counts[0], 8192U);
    EXPECT_EQ(result.counts.positive.outermost(), -1);
}

TEST(RawCounts, FollowExchangeAndMirrorAndKeepRealSamplesAsStored) {
    const std::string bytes = packed("<4h", "16384, 8192, 16384, 8192"); // 0.5, 0.25
    stream_facts facts = facts_of("ci16_le");
    facts.swap_iq = facts.inverted = true;
    const cell_sums sums = counted_of(facts, bytes, 8).counts.cells.at(0);
    EXPECT_EQ(sums.i, 0.5);
    EXPECT_EQ(sums.q, -1.0);
    EXPECT_EQ(sums.iq, -0.25);
    EXPECT_EQ(sums.peak_component, 0.5);
    const auto real = counted_of(facts_of("ri16_le"), bytes, 8);
    EXPECT_EQ(real.counts.cells.at(0).i, 1.5);
    EXPECT_EQ(real.counts.cells.at(0).ii, 2 * (0.25 + 0.0625));
    EXPECT_EQ(real.counts.cells.at(0).qq, 0.0);
    EXPECT_EQ(real.samples[0], (cf32{1.0F, 0.0F}));
}

TEST(RawCounts, FloatSumsAreDoubleSums) {
    std::vector<float> numbers(2 * 1000);
    for (std::size_t n = 0; n < numbers.size(); ++n)
        numbers[n] = std::sin(static_cast<float>(n) * 0.37F) * 0.9F;
    const auto result = counted_of(facts_of("cf32_le"), bytes_of(numbers), 400);
    ASSERT_EQ(result.counts.cells.size(), 3U);
    for (std::size_t cell = 0; cell < 3; ++cell) {
        double ii = 0.0, iq = 0.0, peak = 0.0;
        for (std::size_t n = 400 * cell; n < std::min<std::size_t>(400 * (cell + 1), 1000); ++n) {
            const double i = double{numbers[2 * n]}, q = double{numbers[2 * n + 1]};
            ii += i * i;
            iq += i * q;
            peak = std::max(peak, i * i + q * q);
        }
        EXPECT_NEAR(result.counts.cells[cell].ii, ii, 1e-12);
        EXPECT_NEAR(result.counts.cells[cell].iq, iq, 1e-12);
        EXPECT_EQ(result.counts.cells[cell].peak_power, peak);
    }
}

TEST(RawCounts, AreTheSameHoweverTheInputIsCutIntoWholeCells) {
    std::vector<float> numbers(2 * 4096);
    for (std::size_t n = 0; n < numbers.size(); ++n)
        numbers[n] = std::sin(static_cast<float>(n * n) * 1e-4F);
    const std::string bytes = bytes_of(numbers);
    constexpr std::size_t cell = 256;
    const auto whole = counted_of(facts_of("cf32_le"), bytes, cell);
    for (const std::size_t cells_a_block : {1U, 3U, 5U}) {
        raw_counts counts;
        std::vector<cf32> samples;
        const std::size_t size = cells_a_block * cell * 8;
        for (std::size_t at = 0; at < bytes.size(); at += size) {
            const auto part = counted_of(facts_of("cf32_le"), bytes.substr(at, size), cell);
            samples.insert(samples.end(), part.samples.begin(), part.samples.end());
            counts.cells.insert(counts.cells.end(), part.counts.cells.begin(),
                                part.counts.cells.end());
            counts.positive.merge(part.counts.positive);
            counts.negative.merge(part.counts.negative);
        }
        EXPECT_EQ(samples, whole.samples);
        ASSERT_EQ(counts.cells.size(), whole.counts.cells.size());
        for (std::size_t k = 0; k < counts.cells.size(); ++k) {
            EXPECT_EQ(counts.cells[k].ii, whole.counts.cells[k].ii);
            EXPECT_EQ(counts.cells[k].iq, whole.counts.cells[k].iq);
        }
        EXPECT_EQ(counts.positive.outermost(), whole.counts.positive.outermost());
        EXPECT_EQ(counts.positive.counts, whole.counts.positive.counts);
        EXPECT_EQ(counts.negative.counts, whole.counts.negative.counts);
    }
}

// z = s + k conj(s) recorded; swap and mirror come first, as the receiver is seen through them.
TEST(SampleConverter, TakesTheImageOut) {
    const cf64 k{0.2, -0.1};
    const std::vector<cf64> signal{{0.5, 0.25}, {-0.125, 0.75}, {0.0, -0.5}};
    for (const bool swapped : {false, true}) {
        stream_facts facts = facts_of("cf64_le");
        facts.swap_iq = facts.inverted = swapped;
        std::vector<double> stored;
        for (const cf64 s : signal) {
            const cf64 z = s + k * std::conj(s);
            stored.push_back(swapped ? -z.imag() : z.real());
            stored.push_back(swapped ? z.real() : z.imag());
        }
        const std::string bytes = bytes_of(stored);
        std::vector<cf32> out(signal.size());
        sample_converter{facts, k}.convert(std::as_bytes(std::span{bytes}), out);
        for (std::size_t n = 0; n < out.size(); ++n) {
            EXPECT_NEAR(static_cast<double>(out[n].real()), signal[n].real(), 1e-7);
            EXPECT_NEAR(static_cast<double>(out[n].imag()), signal[n].imag(), 1e-7);
        }
    }
}

TEST(RawCounts, WithAnImageTakenOutAreThoseOfTheSamplesAsRecorded) {
    const stream_facts facts = facts_of("ci16_le");
    std::vector<std::int16_t> stored;
    for (int n = 0; n < 600; ++n) {
        stored.push_back(static_cast<std::int16_t>(n * 101 % 20011 - 9000));
    }
    const std::string bytes = bytes_of(stored);
    const counted plain = counted_of(facts, bytes, 128);
    counted mended;
    mended.samples.resize(plain.samples.size());
    mended.counts.cells.reserve(8);
    sample_converter{facts, {0.2, -0.1}}.convert(std::as_bytes(std::span{bytes}), mended.samples, 0,
                                                 128, mended.counts);
    EXPECT_NE(mended.samples, plain.samples);
    ASSERT_EQ(mended.counts.cells.size(), plain.counts.cells.size());
    for (std::size_t c = 0; c < plain.counts.cells.size(); ++c) {
        EXPECT_EQ(mended.counts.cells[c].iq, plain.counts.cells[c].iq);
        EXPECT_EQ(mended.counts.cells[c].peak_power, plain.counts.cells[c].peak_power);
    }
    EXPECT_EQ(mended.counts.positive.counts, plain.counts.positive.counts);
    EXPECT_EQ(mended.counts.negative.outermost(), plain.counts.negative.outermost());
}

using codes = std::array<std::int64_t, 4>;
using counts = std::array<std::uint64_t, 4>;

TEST(RailTally, CountsTheOutermostFourCodesThatOccurOnEachRail) {
    // Positive: 7 twice, 6 once, 4 three times, 3 once (2 is too far in, 0 on no rail). Negative:
    // -2 and -1.
    const auto result =
        counted_of(facts_of("ci8"), packed("14b", "7,7,6,4, 4,4,3,2, 2,0,-2,-1,-1,0"), 64);
    const rail_tally& positive = result.counts.positive;
    EXPECT_EQ(positive.codes, (codes{7, 6, 4, 3}));
    EXPECT_EQ(positive.counts, (counts{2, 1, 3, 1}));
    EXPECT_EQ(result.counts.negative.codes, (codes{2, 1, -1, -1}));
    EXPECT_EQ(result.counts.negative.counts, (counts{1, 2, 0, 0}));
}

TEST(RailTally, OfANarrowerResolutionCountsItsOwnSteps) {
    stream_facts facts = facts_of("ci32_le"); // 24 bits in 32: codes 256 apart
    facts.code_bits = 24;
    const auto result = counted_of(facts, packed("<4i", "1280, 1024, -512, 256"), 64);
    EXPECT_EQ(result.counts.positive.codes, (codes{5, 4, 1, -1}));
    EXPECT_EQ(result.counts.positive.counts, (counts{1, 1, 1, 0}));
    EXPECT_EQ(result.counts.negative.outermost(), 2);
}

TEST(RailTally, OfFloatsHasStepsOfTwoToMinusFifteenOrLess) {
    // Below 1.0 the step is 2^-16 (15 of 23 mantissa bits kept, exponent -1): 1 - 2^-16 is one step
    // in.
    const float one_in = 1.0F - std::exp2(-16.0F), two_in = 1.0F - std::exp2(-15.0F);
    const auto result =
        counted_of(facts_of("cf32_le"), bytes_of<float>({1.0F, one_in, two_in, -0.5F}), 64);
    const std::int64_t top = result.counts.positive.outermost();
    EXPECT_EQ(result.counts.positive.codes, (codes{top, top - 1, top - 2, -1}));
    EXPECT_EQ(result.counts.positive.counts, (counts{1, 1, 1, 0}));
    EXPECT_EQ(result.counts.negative.counts, (counts{1, 0, 0, 0}));
}

TEST(RailTally, MergesExactlyInAnyOrder) {
    const rail_tally a{{10, 9, 8, 7}, {1, 2, 3, 4}}, b{{12, 9, 3, -1}, {5, 6, 7, 0}},
        c{{30, -1, -1, -1}, {7, 0, 0, 0}}, none;
    const rail_tally all[] = {a, b, c, none};
    for (std::array<std::size_t, 4> order :
         {std::array<std::size_t, 4>{0, 1, 2, 3}, {3, 2, 1, 0}, {1, 0, 3, 2}, {2, 3, 0, 1}}) {
        rail_tally merged;
        for (const std::size_t k : order)
            merged.merge(all[k]);
        EXPECT_EQ(merged.codes, (codes{30, 12, 10, 9}));
        EXPECT_EQ(merged.counts, (counts{7, 5, 1, 8}));
    }
}

TEST(NonFinite, SamplesAreZeroedLeftOutOfSumsAndListed) {
    const float nan = std::numeric_limits<float>::quiet_NaN();
    const float inf = std::numeric_limits<float>::infinity();
    std::vector<float> numbers(2 * 300, 0.5F);
    numbers[2 * 10] = nan;
    numbers[2 * 12 + 1] = inf;
    numbers[2 * 250] = -inf;
    const auto result = counted_of(facts_of("cf32_le"), bytes_of(numbers), 100, 1000);
    EXPECT_EQ(result.samples[10], cf32{});
    EXPECT_EQ(result.samples[12], cf32{});
    EXPECT_EQ(result.samples[11], (cf32{0.5F, 0.5F}));
    EXPECT_EQ(result.counts.cells.at(0).i, 98 * 0.5);
    EXPECT_EQ(result.counts.cells.at(1).i, 100 * 0.5);
    EXPECT_EQ(result.counts.cells.at(2).qq, 99 * 0.25);
    EXPECT_EQ(result.counts.zeroed, 3U);
    // 10 and 12 lie in one cell and are one range; 250 is another.
    ASSERT_EQ(result.counts.non_finite.size(), 2U);
    EXPECT_EQ(result.counts.non_finite[0].first, 1010);
    EXPECT_EQ(result.counts.non_finite[0].count, 3);
    EXPECT_EQ(result.counts.non_finite[1].first, 1250);
    EXPECT_EQ(result.counts.non_finite[1].count, 1);
}

TEST(NonFinite, DoublesThatSinglePrecisionCannotHoldCountAsSuch) {
    const auto result =
        counted_of(facts_of("cf64_le"), bytes_of<double>({1e300, 0.0, 0.25, 0.5}), 8);
    EXPECT_EQ(result.samples[0], cf32{});
    EXPECT_EQ(result.samples[1], (cf32{0.25F, 0.5F}));
    EXPECT_EQ(result.counts.non_finite.size(), 1U);
}

} // namespace
} // namespace tonewalk
