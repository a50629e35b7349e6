// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/sine_fit.hpp"

#include <algorithm>
#include <cassert>
#include <cmath>
#include <complex>

#define EIGEN_MPL2_ONLY
#include <eigen3/Eigen/Dense>

#include "two_pi.hpp"

namespace tonewalk {
namespace {

constexpr Eigen::Index run_rows = 256;

/// Where a column stands. Cosine and sine count from the middle of the record, so that frequency
/// and phase hardly depend on each other.
struct layout {
    std::size_t sines = 0;
    bool with_frequencies = false;
    [[nodiscard]] static Eigen::Index offset() { return 0; }
    [[nodiscard]] static Eigen::Index cosine(std::size_t k) {
        return static_cast<Eigen::Index>(1 + 2 * k);
    }
    [[nodiscard]] static Eigen::Index sine(std::size_t k) { return cosine(k) + 1; }
    [[nodiscard]] Eigen::Index frequency(std::size_t k) const {
        return static_cast<Eigen::Index>(1 + 2 * sines + k);
    }
    [[nodiscard]] Eigen::Index columns() const {
        return static_cast<Eigen::Index>(1 + (with_frequencies ? 3 : 2) * sines);
    }
};

struct estimate_state {
    double offset = 0.0;
    std::vector<double> turns;                 // a sample
    std::vector<std::complex<double>> phasors; // at the middle of the record
};

/// Normal equations of the samples against the columns at the state's frequencies; a frequency's
/// column is the slope of the state's own sine, scaled to half a record.
struct normal_equations {
    Eigen::MatrixXd matrix;
    Eigen::VectorXd right;
    double squares = 0.0, weight = 0.0, weight_squares = 0.0;
};

normal_equations build(std::span<const double> samples, std::span<const double> weights,
                       const layout& at, const estimate_state& s) {
    const Eigen::Index columns = at.columns();
    normal_equations eq{Eigen::MatrixXd::Zero(columns, columns), Eigen::VectorXd::Zero(columns)};
    const double middle = static_cast<double>(samples.size() - 1) / 2.0;
    const double half = std::max(middle, 1.0);
    Eigen::MatrixXd rows(run_rows, columns);
    Eigen::VectorXd y(run_rows);
    for (std::size_t first = 0; first < samples.size();) {
        const auto count = std::min(run_rows, static_cast<Eigen::Index>(samples.size() - first));
        for (Eigen::Index r = 0; r < count; ++r, ++first) {
            const double n = static_cast<double>(first) - middle;
            const double w = weights.empty() ? 1.0 : weights[first];
            const double root = std::sqrt(w);
            rows(r, layout::offset()) = root;
            for (std::size_t k = 0; k < at.sines; ++k) {
                const double angle = two_pi * std::remainder(s.turns[k] * n, 1.0);
                const double c = std::cos(angle), d = -std::sin(angle);
                rows(r, layout::cosine(k)) = root * c;
                rows(r, layout::sine(k)) = root * d;
                if (at.with_frequencies) {
                    rows(r, at.frequency(k)) =
                        root * n / half * (s.phasors[k].real() * d - s.phasors[k].imag() * c);
                }
            }
            y[r] = root * samples[first];
            eq.weight += w;
            eq.weight_squares += w * w;
        }
        eq.matrix.selfadjointView<Eigen::Lower>().rankUpdate(rows.topRows(count).transpose());
        eq.right.noalias() += rows.topRows(count).transpose() * y.head(count);
        eq.squares += y.head(count).squaredNorm();
    }
    eq.matrix.triangularView<Eigen::StrictlyUpper>() = eq.matrix.transpose();
    return eq;
}

/// Solution with the inverse matrix, columns balanced; nothing where they depend on each other.
struct solution {
    Eigen::VectorXd x;
    Eigen::MatrixXd inverse;
};

std::optional<solution> solve(const normal_equations& eq) {
    const Eigen::VectorXd diagonal = eq.matrix.diagonal();
    if (!(diagonal.minCoeff() > 0.0)) {
        return std::nullopt;
    }
    const Eigen::VectorXd scale = diagonal.cwiseSqrt().cwiseInverse();
    const Eigen::MatrixXd balanced = scale.asDiagonal() * eq.matrix * scale.asDiagonal();
    const Eigen::LDLT<Eigen::MatrixXd> solver{balanced};
    constexpr double least_pivot = 1e-10;
    if (solver.info() != Eigen::Success || !(solver.vectorD().minCoeff() > least_pivot)) {
        return std::nullopt;
    }
    const Eigen::MatrixXd unit = Eigen::MatrixXd::Identity(balanced.rows(), balanced.cols());
    return solution{scale.cwiseProduct(solver.solve(scale.cwiseProduct(eq.right))),
                    scale.asDiagonal() * solver.solve(unit) * scale.asDiagonal()};
}

void take(estimate_state& s, const Eigen::VectorXd& x) {
    s.offset = x[layout::offset()];
    for (std::size_t k = 0; k < s.turns.size(); ++k) {
        s.phasors[k] = {x[layout::cosine(k)], x[layout::sine(k)]};
    }
}

/// Moves the frequencies by the solution's last columns; returns the largest move in bins.
double move_frequencies(estimate_state& s, const Eigen::VectorXd& x, const layout& at,
                        std::size_t samples) {
    const double half = std::max(static_cast<double>(samples - 1) / 2.0, 1.0);
    double largest = 0.0;
    for (std::size_t k = 0; k < at.sines; ++k) {
        constexpr double most_bins = 0.5;
        const double bins = x[at.frequency(k)] / (two_pi * half) * static_cast<double>(samples);
        s.turns[k] += std::clamp(bins, -most_bins, most_bins) / static_cast<double>(samples);
        largest = std::max(largest, std::abs(bins));
    }
    return largest;
}

sine_fit describe(const estimate_state& s, const layout& at, const normal_equations& eq,
                  const solution& found, std::size_t samples, double rate_hz) {
    const double left = std::max(0.0, eq.squares - found.x.dot(eq.right));
    const double parameters = static_cast<double>(at.columns());
    // Weights leave this many samples' worth of information about the residual.
    const double effective = eq.weight * eq.weight / eq.weight_squares;
    const double variance = left / eq.weight * effective / std::max(1.0, effective - parameters);
    // Window weights are no variances: each column's estimate scatters as weight squares say.
    const double spread = variance * eq.weight_squares / eq.weight;
    const double middle = static_cast<double>(samples - 1) / 2.0;
    const double half = std::max(middle, 1.0);
    sine_fit fit{s.offset, {}, std::sqrt(left / eq.weight)};
    for (std::size_t k = 0; k < at.sines; ++k) {
        const auto c = layout::cosine(k), d = layout::sine(k);
        fitted_sine one;
        one.frequency_hz = s.turns[k] * rate_hz;
        one.amplitude = std::abs(s.phasors[k]);
        const double angle =
            std::arg(s.phasors[k]) - two_pi * std::remainder(s.turns[k] * middle, 1.0);
        one.phase_rad = std::remainder(angle, two_pi);
        const double a = s.phasors[k].real(), b = s.phasors[k].imag(), m = one.amplitude;
        if (m > 0.0) {
            const double v = (a * a * found.inverse(c, c) + 2.0 * a * b * found.inverse(c, d) +
                              b * b * found.inverse(d, d)) /
                             (m * m);
            one.amplitude_sigma = std::sqrt(spread * v);
        }
        if (at.with_frequencies) {
            const auto f = at.frequency(k);
            one.frequency_sigma_hz =
                std::sqrt(spread * found.inverse(f, f)) / (two_pi * half) * rate_hz;
        }
        fit.sines.push_back(one);
    }
    return fit;
}

} // namespace

std::optional<sine_fit> fit_sines(std::span<const double> samples, const sine_fit_request& r) {
    assert(r.rate_hz > 0.0 && (r.weights.empty() || r.weights.size() == samples.size()));
    layout at{r.frequencies_hz.size(), false};
    const std::size_t parameters = 1 + (r.refine_frequencies ? 3 : 2) * at.sines;
    if (samples.size() < parameters) {
        return std::nullopt;
    }
    estimate_state s{0.0, {}, std::vector<std::complex<double>>(at.sines)};
    for (const double hz : r.frequencies_hz) {
        s.turns.push_back(hz / r.rate_hz);
    }
    normal_equations eq = build(samples, r.weights, at, s);
    std::optional<solution> found = solve(eq);
    if (!found) {
        return std::nullopt;
    }
    take(s, found->x);
    at.with_frequencies = r.refine_frequencies;
    constexpr int most_rounds = 30;
    constexpr double settled_bins = 1e-9;
    for (int round = 0; r.refine_frequencies; ++round) {
        eq = build(samples, r.weights, at, s);
        found = solve(eq);
        if (!found || round == most_rounds) {
            return std::nullopt;
        }
        take(s, found->x);
        if (move_frequencies(s, found->x, at, samples.size()) < settled_bins) {
            break;
        }
    }
    return describe(s, at, eq, *found, samples.size(), r.rate_hz);
}

} // namespace tonewalk
