// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/eigenproblem.hpp>

#include <Eigen/Eigenvalues>
#include <Spectra/MatOp/DenseSymMatProd.h>
#include <Spectra/SymEigsSolver.h>

namespace headwater {
namespace {

constexpr Eigen::Index kWholeBelow = 24;  // smaller ones are as fast solved whole
constexpr Eigen::Index kLanczosVectors = 12;
constexpr double kTolerance = 1e-10;

}  // namespace

Eigenpair largest_eigenpair(const Eigen::MatrixXd& symmetric) {
  const double scale = symmetric.cwiseAbs().maxCoeff();
  if (symmetric.rows() >= kWholeBelow && scale > 0) {
    // Spectra holds residuals against an absolute floor too: numbers of 1e-18, as SI units make
    // them, would pass for converged at once.
    const Eigen::MatrixXd scaled = symmetric / scale;
    Spectra::DenseSymMatProd<double> product(scaled);
    Spectra::SymEigsSolver<Spectra::DenseSymMatProd<double>> solver(product, 1, kLanczosVectors);
    solver.init();
    if (solver.compute(Spectra::SortRule::LargestAlge, 200, kTolerance) == 1)
      return {scale * solver.eigenvalues()[0], solver.eigenvectors().col(0)};
  }
  const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> solver(symmetric);
  const Eigen::Index last = symmetric.rows() - 1;
  return {solver.eigenvalues()[last], solver.eigenvectors().col(last)};
}

}  // namespace headwater
