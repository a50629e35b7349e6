// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/parabola_fit.hpp"

#include <cmath>

#define EIGEN_MPL2_ONLY
#include <eigen3/Eigen/Dense>

namespace tonewalk {

std::optional<parabola_vertex> fit_parabola(std::span<const weighted_value> points,
                                            double correlation_factor) {
    if (points.size() < 4) {
        return std::nullopt;
    }
    // Centred and scaled, so that the normal matrix is well conditioned whatever the unit of x.
    const double middle = 0.5 * (points.front().x + points.back().x);
    double reach = 0.0;
    for (const weighted_value& p : points) {
        reach = std::fmax(reach, std::abs(p.x - middle));
    }
    if (reach <= 0.0) {
        return std::nullopt;
    }
    Eigen::Matrix3d normal = Eigen::Matrix3d::Zero();
    Eigen::Vector3d right = Eigen::Vector3d::Zero();
    for (const weighted_value& p : points) {
        const double u = (p.x - middle) / reach;
        const Eigen::Vector3d row{1.0, u, u * u};
        const double weight = 1.0 / (p.sigma * p.sigma);
        normal += weight * row * row.transpose();
        right += weight * p.y * row;
    }
    const Eigen::LDLT<Eigen::Matrix3d> solver{normal};
    const Eigen::Vector3d c = solver.solve(right);
    if (solver.info() != Eigen::Success || !(std::abs(c[2]) > 0.0)) {
        return std::nullopt;
    }
    const Eigen::Matrix3d covariance =
        solver.solve(Eigen::Matrix3d::Identity()) * correlation_factor;
    const double u0 = -c[1] / (2.0 * c[2]);
    const Eigen::Vector3d by_place{0.0, -1.0 / (2.0 * c[2]), c[1] / (2.0 * c[2] * c[2])};
    const Eigen::Vector3d by_height{1.0, u0, u0 * u0};
    parabola_vertex v;
    v.x = middle + reach * u0;
    v.y = c[0] + c[1] * u0 + c[2] * u0 * u0;
    v.x_sigma = reach * std::sqrt(std::fmax(0.0, by_place.dot(covariance * by_place)));
    v.y_sigma = std::sqrt(std::fmax(0.0, by_height.dot(covariance * by_height)));
    v.bend = 2.0 * c[2] / (reach * reach);
    return v;
}

} // namespace tonewalk
