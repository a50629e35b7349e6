// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/fft.hpp"

#include <algorithm>
#include <complex>
#include <numbers>
#include <thread>
#include <vector>

#include <gtest/gtest.h>

#include "tonewalk/base/random.hpp"

namespace tonewalk {
namespace {

std::vector<cf32> random_samples(std::size_t size, std::uint64_t seed) {
    random_stream random{seed};
    std::vector<cf32> samples(size);
    for (cf32& z : samples) {
        const double re = random.gaussian(), im = random.gaussian();
        z = cf32{cf64{re, im}};
    }
    return samples;
}

/// The definition, in double: sum of x[n] e^(-j 2 pi k n / N).
cf64 defined_bin(const std::vector<cf32>& x, std::size_t k, double sign) {
    cf64 sum{};
    for (std::size_t n = 0; n < x.size(); ++n) {
        const double turns = static_cast<double>(k * n % x.size()) / static_cast<double>(x.size());
        sum += cf64{x[n]} * std::polar(1.0, sign * 2.0 * std::numbers::pi * turns);
    }
    return sum;
}

void expect_definition(std::size_t size, fft::direction way) {
    const std::vector<cf32> x = random_samples(size, size);
    fft transform{size, way};
    std::copy(x.begin(), x.end(), transform.input().begin());
    transform.run();
    const double sign = way == fft::direction::forward ? -1.0 : 1.0;
    const double tolerance = 4e-6 * std::sqrt(static_cast<double>(size));
    for (std::size_t k = 0; k < size; ++k) {
        EXPECT_LT(std::abs(cf64{transform.output()[k]} - defined_bin(x, k, sign)), tolerance)
            << size << " bin " << k;
    }
    EXPECT_TRUE(std::equal(x.begin(), x.end(), transform.input().begin())) << "input not kept";
}

} // namespace

TEST(Fft, FollowsItsDefinitionAtAnyLength) {
    for (const std::size_t size : {1U, 2U, 3U, 5U, 8U, 30U, 97U, 210U, 512U, 1009U}) {
        expect_definition(size, fft::direction::forward);
        expect_definition(size, fft::direction::inverse);
    }
}

TEST(Fft, InverseOfForwardMultipliesByItsSize) {
    constexpr std::size_t size = 6000;
    const std::vector<cf32> x = random_samples(size, 7);
    fft forward{size}, inverse{size, fft::direction::inverse};
    std::copy(x.begin(), x.end(), forward.input().begin());
    forward.run();
    std::copy(forward.output().begin(), forward.output().end(), inverse.input().begin());
    inverse.run();
    for (std::size_t n = 0; n < size; ++n) {
        EXPECT_LT(std::abs(inverse.output()[n] / 6000.0F - x[n]), 1e-5F);
    }
}

TEST(Fft, IsPlannedInSeveralThreadsAtOnceAndRepeatsExactly) {
    constexpr std::size_t threads = 8;
    const std::vector<cf32> x = random_samples(4320, 11);
    std::vector<std::vector<cf32>> results(threads);
    std::vector<std::thread> workers;
    for (std::vector<cf32>& result : results) {
        workers.emplace_back([&x, &result] {
            for (int round = 0; round < 20; ++round) {
                fft transform{x.size()};
                std::copy(x.begin(), x.end(), transform.input().begin());
                transform.run();
                result.assign(transform.output().begin(), transform.output().end());
            }
        });
    }
    for (std::thread& worker : workers) {
        worker.join();
    }
    for (const std::vector<cf32>& result : results) {
        EXPECT_EQ(result, results.front());
    }
}

TEST(Fft, FastSizesHoldNoPrimeAboveSevenAndAreTheNext) {
    EXPECT_EQ(fast_fft_size(0), 1U);
    EXPECT_EQ(fast_fft_size(1), 1U);
    EXPECT_EQ(fast_fft_size(11), 12U);
    EXPECT_EQ(fast_fft_size(97), 98U); // 2 x 7 x 7
    EXPECT_EQ(fast_fft_size(2048), 2048U);
    EXPECT_EQ(fast_fft_size(4802), 4802U); // 2 x 7^4
    EXPECT_EQ(fast_fft_size(10007), 10080U);
}

} // namespace tonewalk
