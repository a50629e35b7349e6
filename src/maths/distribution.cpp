// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/distribution.hpp"

#include <algorithm>
#include <utility>

#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/distributions/fisher_f.hpp>
#include <boost/math/distributions/non_central_f.hpp>
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

double noncentral_f_cdf(double x, double degrees_above, double degrees_below,
                        double noncentrality) {
    if (x <= 0.0) {
        return 0.0;
    }
    if (noncentrality <= 0.0) {
        return bm::cdf(bm::fisher_f{degrees_above, degrees_below}, x);
    }
    return bm::cdf(bm::non_central_f{degrees_above, degrees_below, noncentrality}, x);
}

double noncentral_f_noncentrality(double x, double p, double degrees_above, double degrees_below) {
    const auto excess = [&](double noncentrality) {
        return noncentral_f_cdf(x, degrees_above, degrees_below, noncentrality) - p;
    };
    if (excess(0.0) <= 0.0) {
        return 0.0;
    }
    double high = std::max(1.0, 2.0 * degrees_above * x);
    while (excess(high) > 0.0) { // the distribution moves up with its noncentrality
        high *= 2.0;
    }
    std::uintmax_t steps = 200;
    const auto bracket =
        bm::tools::toms748_solve(excess, 0.0, high, bm::tools::eps_tolerance<double>(40), steps);
    return 0.5 * (bracket.first + bracket.second);
}

} // namespace tonewalk
