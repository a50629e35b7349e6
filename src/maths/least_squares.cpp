// SPDX-License-Identifier: GPL-3.0-or-later
#include "tonewalk/maths/least_squares.hpp"

#include <cassert>
#include <cmath>

#define EIGEN_MPL2_ONLY
#include <eigen3/Eigen/Dense>

namespace tonewalk {
namespace {

using row_major = Eigen::Matrix<double, Eigen::Dynamic, Eigen::Dynamic, Eigen::RowMajor>;

/// Divides each column by its length and returns the lengths (1 for a column of zeros).
Eigen::VectorXd balance(row_major& columns) {
    Eigen::VectorXd lengths = columns.colwise().norm().transpose();
    for (double& length : lengths) {
        length = length > 0.0 ? length : 1.0;
    }
    columns.array().rowwise() /= lengths.transpose().array();
    return lengths;
}

} // namespace

double linear_fit::sigma_of(std::size_t column) const noexcept {
    return std::sqrt(covariance_of(column, column));
}

std::optional<linear_fit> fit_linear(std::span<const double> design, std::span<const double> y,
                                     std::span<const double> sigmas) {
    assert(!y.empty() && design.size() % y.size() == 0);
    assert(sigmas.empty() || sigmas.size() == y.size());
    const auto rows = static_cast<Eigen::Index>(y.size());
    const auto columns = static_cast<Eigen::Index>(design.size() / y.size());
    if (columns == 0 || rows < columns) {
        return std::nullopt;
    }
    row_major a = Eigen::Map<const row_major>(design.data(), rows, columns);
    Eigen::VectorXd b = Eigen::Map<const Eigen::VectorXd>(y.data(), rows);
    if (!sigmas.empty()) {
        const auto weights = Eigen::Map<const Eigen::ArrayXd>(sigmas.data(), rows).inverse();
        a.array().colwise() *= weights;
        b.array() *= weights;
    }
    const Eigen::VectorXd lengths = balance(a);
    const Eigen::ColPivHouseholderQR<row_major> solver{a};
    if (solver.rank() < columns) {
        return std::nullopt;
    }
    const Eigen::VectorXd x = solver.solve(b);
    const Eigen::MatrixXd upper =
        solver.matrixQR().topLeftCorner(columns, columns).triangularView<Eigen::Upper>();
    const Eigen::MatrixXd inverse =
        solver.colsPermutation() *
        upper.triangularView<Eigen::Upper>().solve(Eigen::MatrixXd::Identity(columns, columns));
    const Eigen::MatrixXd scaled = lengths.cwiseInverse().asDiagonal() * inverse;

    linear_fit fit;
    fit.chi_square = (b - a * x).squaredNorm();
    fit.degrees = static_cast<std::size_t>(rows - columns);
    fit.coefficients.resize(static_cast<std::size_t>(columns));
    Eigen::Map<Eigen::VectorXd>(fit.coefficients.data(), columns) = x.cwiseQuotient(lengths);
    fit.covariance.resize(static_cast<std::size_t>(columns * columns));
    Eigen::Map<row_major>(fit.covariance.data(), columns, columns) = scaled * scaled.transpose();
    return fit;
}

} // namespace tonewalk
