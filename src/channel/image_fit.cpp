// SPDX-License-Identifier: GPL-3.0-or-later
#include "image_fit.hpp"

#include <algorithm>
#include <cmath>

#include "line_transform.hpp"
#include "reference_lines.hpp"
#include "search_survey.hpp"
#include "segments.hpp"
#include "tonewalk/maths/distribution.hpp"

namespace tonewalk {
namespace {

constexpr double own_variance = 1e-12; // single precision's: -120 dB
constexpr double steady_p = 0.999, alike_p = 0.99;
constexpr double noise_doubt = 1.3;     // how far the noise beside a line may be off
constexpr double least_weight = 0.0025; // of the best line's: fainter ones are not asked

using observation = image_fit::observation;

/// Over the line's lobe: sum Z(-f) Z(f) / sum |Z(f)|^2. `place` counts bins from 0 Hz.
observation observe(std::span<const cf32> lines, std::size_t place, double noise) {
    const auto at = [&](std::size_t k) { return cf64{lines[k % lines.size()]}; };
    cf64 product{};
    double energy = 0.0;
    for (std::size_t k = place - lobe_bins; k <= place + lobe_bins; ++k) {
        product += at(k) * at(2 * lines.size() - k);
        energy += std::norm(at(k));
    }
    energy = std::max(energy, 1e-300);
    return {product / energy, 1.0 / (noise / energy + own_variance)};
}

/// How much the noise of the lobe's bins, which overlap, exceeds that of one bin: the noise
/// bandwidth of the squared window.
double lobe_noise(std::span<const float> weights) {
    double squares = 0.0, fourths = 0.0;
    for (const float w : weights) {
        const double square = static_cast<double>(w) * static_cast<double>(w);
        squares += square;
        fourths += square * square;
    }
    return static_cast<double>(weights.size()) * fourths / (squares * squares);
}

struct weighted_mean {
    cf64 value;
    double weight = 0.0;  ///< sum
    double scatter = 0.0; ///< sum of weight x |difference|^2
};

weighted_mean mean_of(std::span<const observation> all) {
    weighted_mean m;
    cf64 sum{};
    for (const observation& o : all) {
        sum += o.weight * o.ratio;
        m.weight += o.weight;
    }
    m.value = sum / m.weight;
    for (const observation& o : all) {
        m.scatter += o.weight * std::norm(o.ratio - m.value);
    }
    return m;
}

/// Whether so many complex values scatter as their weights say: 2 x scatter is chi-square.
bool within_noise(double scatter, std::size_t count, double p) {
    return 2.0 * scatter < chi_square_quantile(p, 2.0 * static_cast<double>(count - 1));
}

/// What is left of the scatter when that of the noise is taken off, by moments.
double variance_between(std::span<const observation> all, const weighted_mean& mean) {
    double squares = 0.0;
    for (const observation& o : all) {
        squares += o.weight * o.weight;
    }
    const double expected = static_cast<double>(all.size() - 1);
    return (mean.scatter - expected) / (mean.weight - squares / mean.weight);
}

} // namespace

/// Where the strongest line's mirror place is crowded, narrower bins may clear it; at least three
/// segments remain.
void image_fit::add(const looked_at& what, const line_spectrum& survey) {
    if (!what.facts->format.is_complex) {
        return;
    }
    const reference_lines references{survey};
    if (!references.has_strongest()) {
        const std::size_t most = finest_segment(what.frames);
        for (std::size_t size = 2 * survey.size(); size <= most; size *= 2) {
            const line_spectrum finer = survey_of(what, size);
            const reference_lines resolved{finer};
            if (resolved.has_strongest()) {
                add_lines(what, finer, resolved);
                return;
            }
        }
    }
    add_lines(what, survey, references);
}

void image_fit::add_lines(const looked_at& what, const line_spectrum& survey,
                          const reference_lines& references) {
    const std::vector<std::size_t>& chosen = references.chosen();
    if (chosen.empty()) {
        return;
    }
    line_transform transform{survey.size()};
    const double share = lobe_noise(transform.weights());
    std::vector<std::vector<observation>> seen(chosen.size());
    for_each_segment(what, survey.size(), [&](std::span<const cf32> segment) {
        const std::span<const cf32> lines = transform.run(segment);
        for (std::size_t k = 0; k < chosen.size(); ++k) {
            const double noise = survey.noise(references.mirror(chosen[k]));
            const std::size_t place = chosen[k] + survey.size() - survey.size() / 2;
            seen[k].push_back(observe(lines, place, share * noise));
        }
    });
    for (const std::vector<observation>& of_line : seen) {
        add_group(of_line);
    }
}

void image_fit::add_group(std::span<const observation> of_line) {
    if (of_line.size() < 2) {
        return;
    }
    const weighted_mean mean = mean_of(of_line);
    const double count = static_cast<double>(of_line.size());
    const double spread = mean.scatter / mean.weight * count / (count - 1.0);
    const bool steady = within_noise(mean.scatter / noise_doubt, of_line.size(), steady_p);
    groups_.push_back({mean.value, 1.0 / mean.weight + (steady ? 0.0 : spread), steady});
}

/// Lines whose image keeps still, if any, and that are not too faint to matter.
std::vector<image_fit::observation> image_fit::trusted() const {
    const bool any_steady =
        std::any_of(groups_.begin(), groups_.end(), [](const group& g) { return g.steady; });
    std::vector<observation> used;
    double best = 0.0;
    for (const group& g : groups_) {
        if (g.steady || !any_steady) {
            used.push_back({g.ratio, 1.0 / g.variance});
            best = std::max(best, used.back().weight);
        }
    }
    used.erase(
        std::remove_if(used.begin(), used.end(),
                       [best](const observation& o) { return o.weight < least_weight * best; }),
        used.end());
    return used;
}

/// Where lines disagree by more than their noise, the variance between them counts whole: it may be
/// one thing that pulls at one line.
std::optional<iq_balance> image_fit::result() const {
    std::vector<observation> used = trusted();
    if (used.empty()) {
        return std::nullopt;
    }
    weighted_mean mean = mean_of(used);
    double between = 0.0;
    if (used.size() > 1 && !within_noise(mean.scatter, used.size(), alike_p)) {
        between = variance_between(used, mean);
        for (observation& o : used) {
            o.weight = 1.0 / (1.0 / o.weight + between);
        }
        mean = mean_of(used);
    }
    const double variance = 1.0 / mean.weight + between;
    return balance_from_image(mean.value, normal_quantile(0.975) * std::sqrt(variance / 2.0));
}

} // namespace tonewalk
