// SPDX-License-Identifier: GPL-3.0-or-later
#include "image_fit.hpp"

#include <algorithm>
#include <cmath>

#include "line_transform.hpp"
#include "segments.hpp"
#include "tonewalk/maths/distribution.hpp"

namespace tonewalk {
namespace {

constexpr std::size_t far_bins = 8;  // from 0 Hz: no lobe of ±4 bins meets that of DC
constexpr std::size_t lobe_bins = 4; // half of a line
constexpr std::size_t most_lines = 8;
const double least_over_mirror = decibel::from_db(10.0).power_ratio();
const double least_over_noise = decibel::from_db(20.0).power_ratio();
constexpr double own_variance = 1e-12; // single precision's: -120 dB
constexpr double steady_p = 0.999, alike_p = 0.99;
constexpr double noise_doubt = 1.3; // how far the noise beside a line may be off

/// Which lines of a survey show an image at their mirror place and nothing else.
class reference_lines {
public:
    explicit reference_lines(const line_spectrum& survey) : survey_{survey} {
        for (std::size_t k = far_bins; k + far_bins < survey.size(); ++k) {
            if (survey.is_line(k)) {
                lines_.push_back(k);
            }
        }
        std::sort(lines_.begin(), lines_.end(), [&](std::size_t a, std::size_t b) {
            return survey_.power(a) > survey_.power(b);
        });
    }
    /// Bins, strongest first.
    [[nodiscard]] std::vector<std::size_t> choose() const {
        std::vector<std::size_t> chosen;
        for (const std::size_t k : lines_) {
            if (chosen.size() < most_lines && is_strong(k) && is_alone(mirror(k)) &&
                !is_sideband(mirror(k))) {
                chosen.push_back(k);
            }
        }
        return chosen;
    }
    [[nodiscard]] std::size_t mirror(std::size_t k) const noexcept { // the middle bin is 0 Hz
        return 2 * (survey_.size() / 2) - k;
    }

private:
    [[nodiscard]] bool is_strong(std::size_t k) const {
        const std::size_t middle = survey_.size() / 2;
        const std::size_t from_centre = k > middle ? k - middle : middle - k;
        return from_centre >= far_bins &&
               survey_.power(k) > least_over_mirror * survey_.power(mirror(k)) &&
               survey_.power(k) > least_over_noise * survey_.noise(mirror(k));
    }
    /// No other line leaks into this place.
    [[nodiscard]] bool is_alone(std::size_t place) const {
        const double most = std::max(survey_.power(place), line_ratio * survey_.noise(place));
        const std::size_t first = place > 2 * lobe_bins ? place - 2 * lobe_bins : 0;
        const std::size_t last = std::min(place + 2 * lobe_bins, survey_.size() - 1);
        for (std::size_t b = first; b <= last; ++b) {
            const bool beside = b + 1 < place || b > place + 1;
            if (beside && survey_.power(b) > most) {
                return false;
            }
        }
        return true;
    }
    /// The line at this place has a partner on the other side of a stronger one.
    [[nodiscard]] bool is_sideband(std::size_t place) const {
        return survey_.is_line(place) &&
               std::any_of(lines_.begin(), lines_.end(), [&](std::size_t carrier) {
                   return survey_.power(carrier) > survey_.power(place) &&
                          has_partner(place, carrier);
               });
    }
    [[nodiscard]] bool has_partner(std::size_t place, std::size_t carrier) const {
        const std::size_t twice = 2 * carrier;
        if (twice < place + 1 || twice - place + 1 >= survey_.size()) {
            return false;
        }
        for (std::size_t b = twice - place - 1; b <= twice - place + 1; ++b) {
            const double ratio = survey_.power(b) / survey_.power(place);
            if (survey_.is_line(b) && ratio < mirror_ratio && ratio * mirror_ratio > 1.0) {
                return true;
            }
        }
        return false;
    }

    const line_spectrum& survey_;
    std::vector<std::size_t> lines_; // strongest first
};

/// One line's image in one segment.
struct observation {
    cf64 ratio;
    double weight = 0.0; ///< 1 / variance from the noise
};

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

/// Whether complex values scatter as their weights say: 2 x scatter is chi-square.
bool within_noise(const weighted_mean& m, std::size_t count, double p) {
    const double degrees = 2.0 * static_cast<double>(count - 1);
    return 2.0 * m.scatter < chi_square_quantile(p, degrees);
}

} // namespace

void image_fit::add(const looked_at& what, const line_spectrum& survey) {
    if (!what.facts->format.is_complex) {
        return;
    }
    const reference_lines references{survey};
    const std::vector<std::size_t> chosen = references.choose();
    if (chosen.empty()) {
        return;
    }
    line_transform transform{survey.size()};
    const double share = lobe_noise(transform.weights());
    std::vector<std::vector<observation>> seen(chosen.size());
    for_each_segment(what, [&](std::span<const cf32> segment) {
        const std::span<const cf32> lines = transform.run(segment);
        for (std::size_t k = 0; k < chosen.size(); ++k) {
            const double noise = survey.noise(references.mirror(chosen[k]));
            const std::size_t place = chosen[k] + survey.size() - survey.size() / 2;
            seen[k].push_back(observe(lines, place, share * noise));
        }
    });
    for (const std::vector<observation>& of_line : seen) {
        if (of_line.size() < 2) {
            continue;
        }
        weighted_mean mean = mean_of(of_line);
        const double count = static_cast<double>(of_line.size());
        const double spread = mean.scatter / mean.weight * count / (count - 1.0);
        mean.scatter /= noise_doubt;
        const bool steady = within_noise(mean, of_line.size(), steady_p);
        groups_.push_back({mean.value, 1.0 / mean.weight + (steady ? 0.0 : spread), steady});
    }
}

/// Lines whose image keeps still, if any. Where they disagree by more than their noise, the
/// variance between them counts whole: it may be one thing that pulls at one line.
std::optional<iq_balance> image_fit::result() const {
    std::vector<observation> used;
    const bool any_steady =
        std::any_of(groups_.begin(), groups_.end(), [](const group& g) { return g.steady; });
    for (const group& g : groups_) {
        if (g.steady || !any_steady) {
            used.push_back({g.ratio, 1.0 / g.variance});
        }
    }
    if (used.empty()) {
        return std::nullopt;
    }
    weighted_mean mean = mean_of(used);
    double between = 0.0;
    if (used.size() > 1 && !within_noise(mean, used.size(), alike_p)) {
        double squares = 0.0;
        for (const observation& o : used) {
            squares += o.weight * o.weight;
        }
        const double expected = static_cast<double>(used.size() - 1);
        between = (mean.scatter - expected) / (mean.weight - squares / mean.weight);
        for (observation& o : used) {
            o.weight = 1.0 / (1.0 / o.weight + between);
        }
        mean = mean_of(used);
    }
    const double variance = 1.0 / mean.weight + between;
    return balance_from_image(mean.value, normal_quantile(0.975) * std::sqrt(variance / 2.0));
}

} // namespace tonewalk
