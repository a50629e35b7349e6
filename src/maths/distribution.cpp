// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/distribution.hpp"

#include <algorithm>
#include <cmath>
#include <span>
#include <utility>

#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/distributions/fisher_f.hpp>
#include <boost/math/distributions/non_central_chi_squared.hpp>
#include <boost/math/distributions/normal.hpp>
#include <boost/math/distributions/students_t.hpp>
#include <boost/math/tools/toms748_solve.hpp>

namespace tonewalk {

namespace bm = boost::math;

double normal_quantile(double p) {
    return bm::quantile(bm::normal{}, p);
}
double student_t_quantile(double p, double degrees) {
    return bm::quantile(bm::students_t{degrees}, p);
}
double chi_square_quantile(double p, double degrees) {
    return bm::quantile(bm::chi_squared{degrees}, p);
}
double chi_square_cdf(double x, double degrees) {
    return bm::cdf(bm::chi_squared{degrees}, x);
}
double f_quantile(double p, double degrees_above, double degrees_below) {
    return bm::quantile(bm::fisher_f{degrees_above, degrees_below}, p);
}

double noncentral_chi_square_cdf(double x, double degrees, double noncentrality) {
    if (x <= 0.0) {
        return 0.0;
    }
    if (noncentrality <= 0.0) {
        return bm::cdf(bm::chi_squared{degrees}, x);
    }
    return bm::cdf(bm::non_central_chi_squared{degrees, noncentrality}, x);
}

double line_power_cdf(double x, double degrees, double noise_degrees, double line) {
    // Mean over what the true noise may be: estimate over truth is chi-square over its degrees,
    // whose cube root is all but normal (Wilson and Hilferty), so Gauss and Hermite's rule serves.
    struct node {
        double z, weight;
    };
    constexpr node nodes[] = {{0.0, 0.4571428571428571},
                              {1.1544053947399682, 0.2401231786050127},
                              {2.3667594107345415, 0.0307571239675865},
                              {3.7504397177257425, 0.0005482688559722}};
    const double variance = 2.0 / (9.0 * noise_degrees);
    const auto given = [&](double z) {
        const double root = std::max(0.0, 1.0 - variance + z * std::sqrt(variance));
        const double scale = root * root * root;
        return noncentral_chi_square_cdf(degrees * x * scale, degrees, line * scale);
    };
    double p = nodes[0].weight * given(0.0);
    for (const node& n : std::span{nodes}.subspan(1)) {
        p += n.weight * (given(n.z) + given(-n.z));
    }
    return p;
}

namespace {

/// Where a falling probability, above zero at 0, crosses zero.
template <class Excess>
double crossing(Excess excess, double guess) {
    if (excess(0.0) <= 0.0) {
        return 0.0;
    }
    double high = std::max(1.0, guess);
    while (excess(high) > 0.0) {
        high *= 2.0;
    }
    std::uintmax_t steps = 200;
    const auto bracket =
        bm::tools::toms748_solve(excess, 0.0, high, bm::tools::eps_tolerance<double>(40), steps);
    return 0.5 * (bracket.first + bracket.second);
}

} // namespace

double line_power_inverse(double x, double p, double degrees, double noise_degrees) {
    return crossing(
        [&](double line) { return line_power_cdf(x, degrees, noise_degrees, line) - p; },
        2.0 * degrees * x);
}

} // namespace tonewalk
