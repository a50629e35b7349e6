// SPDX-License-Identifier: GPL-3.0-or-later
#include "search_survey.hpp"

#include <algorithm>
#include <cmath>

#include "close_look.hpp"
#include "segments.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t most_close_looks = 10;
const double image_ratio_limit = decibel::from_db(-20.0).power_ratio();

struct candidate {
    double hz = 0.0, power = 0.0;
    bool at_centre = false;
};

/// Lines 12 dB over the noise, strongest first; not images; those at the centre are marked.
std::vector<candidate> candidates_in(const line_spectrum& survey, bool is_complex) {
    std::vector<candidate> found;
    for (std::size_t k = is_complex ? 0 : survey.bin_of(0.0); k < survey.size(); ++k) {
        if (!survey.is_line(k)) {
            continue;
        }
        const double hz = survey.peak_at(k).hz, mirrored = survey.power(survey.bin_of(-hz));
        const bool centre = std::abs(hz) <= centre_bins * survey.bin_hz();
        const bool image = is_complex && !centre && survey.power(k) < image_ratio_limit * mirrored;
        if (!image && (is_complex || !centre)) {
            found.push_back({centre ? 0.0 : hz, survey.power(k), centre});
        }
    }
    std::sort(found.begin(), found.end(),
              [](const candidate& a, const candidate& b) { return a.power > b.power; });
    return found;
}

/// Knows which lines are a carrier's own: itself, and what its modulation puts on both sides.
class sideband_judge {
public:
    explicit sideband_judge(const line_spectrum& survey)
        : survey_{survey}, tolerance_hz_{2.0 * survey.bin_hz() + 2.0} {}

    [[nodiscard]] bool is_same(const found_carrier& c, double hz) const {
        return std::abs(c.offset_hz - hz) < tolerance_hz_;
    }
    [[nodiscard]] bool is_sideband(const found_carrier& c, double hz) const {
        return may_be_sideband(c, std::abs(hz - c.offset_hz)) && is_mirrored(c.offset_hz, hz);
    }

private:
    /// A multiple of a tone away, or within reach of speech.
    [[nodiscard]] bool may_be_sideband(const found_carrier& c, double away_hz) const {
        constexpr double speech_reach_hz = 6000.0, most_orders = 10.0;
        const auto is_multiple = [&](const found_tone& tone) {
            const double order = std::round(away_hz / tone.frequency_hz);
            return order >= 1.0 && order <= most_orders &&
                   std::abs(away_hz - order * tone.frequency_hz) < tolerance_hz_;
        };
        return (c.modulated_unsteadily && away_hz < speech_reach_hz) ||
               std::any_of(c.tones.begin(), c.tones.end(), is_multiple);
    }
    /// A line without its mirror is another carrier; where the band ends nobody can tell.
    [[nodiscard]] bool is_mirrored(double carrier_hz, double hz) const {
        const double mirror_hz = 2.0 * carrier_hz - hz;
        if (std::abs(mirror_hz) > survey_.hz_of(static_cast<double>(survey_.size() - 1))) {
            return true;
        }
        double mirrored = 0.0;
        for (std::size_t k = survey_.bin_of(mirror_hz - tolerance_hz_);
             k <= survey_.bin_of(mirror_hz + tolerance_hz_); ++k) {
            mirrored = std::max(mirrored, survey_.power(k));
        }
        return mirrored * mirror_ratio > survey_.power(survey_.bin_of(hz));
    }

    const line_spectrum& survey_;
    double tolerance_hz_;
};

} // namespace

line_spectrum survey(const looked_at& what) {
    return survey_of(what, segment_size(what.frames));
}

line_spectrum survey_of(const looked_at& what, std::size_t size) {
    line_spectrum spectrum{size, what.facts->sample_rate_hz};
    for_each_segment(what, size, [&](std::span<const cf32> segment) { spectrum.add(segment); });
    spectrum.finish();
    return spectrum;
}

std::vector<found_carrier> carriers_in(const searched& s) {
    const looked_at& what = s.look.what;
    const line_spectrum& survey = s.spectrum;
    std::vector<found_carrier> carriers;
    const sideband_judge judge{survey};
    std::size_t looks = 0;
    for (const candidate& c : candidates_in(survey, what.facts->format.is_complex)) {
        const bool known =
            std::any_of(carriers.begin(), carriers.end(), [&](const found_carrier& f) {
                return judge.is_same(f, c.hz) || judge.is_sideband(f, c.hz);
            });
        if (known || ++looks > most_close_looks) {
            continue;
        }
        const close_look look{what, c.hz};
        const double reach_bins = c.at_centre ? centre_bins + 1.0 : 2.0;
        const auto hz = look.strongest(reach_bins * survey.bin_hz() + 1.0);
        if (!hz) {
            continue;
        }
        found_carrier found = look.describe(*hz, std::nullopt);
        if (std::abs(found.offset_hz) > centre_bins * survey.bin_hz() || !found.tones.empty()) {
            carriers.push_back(std::move(found));
        }
    }
    // A carrier that came later may explain lines that were stronger than itself.
    const std::vector<found_carrier> all = carriers;
    const auto is_explained = [&](const found_carrier& c) {
        return c.tones.empty() && std::any_of(all.begin(), all.end(), [&](const found_carrier& o) {
                   return o.offset_hz != c.offset_hz && judge.is_sideband(o, c.offset_hz);
               });
    };
    carriers.erase(std::remove_if(carriers.begin(), carriers.end(), is_explained), carriers.end());
    std::sort(carriers.begin(), carriers.end(), [](const found_carrier& a, const found_carrier& b) {
        return a.level_dbfs > b.level_dbfs;
    });
    for (found_carrier& c : carriers) {
        c.offset_hz += what.centre_shift_hz;
    }
    return carriers;
}

} // namespace tonewalk
