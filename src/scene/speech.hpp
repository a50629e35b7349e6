// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <array>
#include <cstddef>
#include <cstdint>

#include "tonewalk/base/random.hpp"

namespace tonewalk {

/// Speech-like modulation in [-1, 1]: syllables of a tenth to a fifth of a second, each a gliding
/// voice of harmonics shaped by two resonances, with pauses. No line stands still for 1 s; nothing
/// above 3.4 kHz. A pure function of seed, voice and time.
class speech_like {
public:
    static constexpr double highest_hz = 3400.0;

    speech_like(std::uint64_t seed, std::uint64_t voice) noexcept;
    [[nodiscard]] double at(double time_s) noexcept; ///< fast where times stay in one syllable

private:
    static constexpr double slot_s = 0.2;
    static constexpr std::size_t most_partials = 40;
    struct syllable {
        double start_s, length_s; // from the slot's start; length 0: a pause
        double pitch_hz, glide_hz_s;
        std::size_t partials;
        std::array<double, most_partials> weights; // magnitudes sum to the loudness
    };
    void enter(std::int64_t slot) noexcept;
    void shape(random_stream&) noexcept;

    std::uint64_t seed_, voice_;
    std::int64_t slot_;
    syllable now_{};
};

} // namespace tonewalk
