// SPDX-License-Identifier: GPL-3.0-or-later
// Leaving a lead out by a downdate is what the leads that stay give when everything is made anew.
#include "inverse_support.hpp"

#include <headwater/inverse/dipole_scan.hpp>
#include <headwater/inverse/eloreta.hpp>
#include <headwater/inverse/estimate.hpp>
#include <headwater/inverse/influence.hpp>
#include <headwater/inverse/lcmv.hpp>
#include <headwater/inverse/minimum_norm.hpp>
#include <headwater/inverse/sloreta.hpp>

#include <gtest/gtest.h>

namespace headwater {
namespace {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

/// Three samples of two sources in noise.
MatrixXd window_of(const InverseCase& c, std::uint64_t seed) {
  RandomStream random(seed, "influence window");
  MatrixXd data = 0.1 * c.noise_maps(random, 3);
  data.col(0) += c.map_of(c.nearest(45, -20, 8), {5e-9, 3e-9, 20e-9});
  data.col(1) += c.map_of(c.nearest(-45, -20, 8), {-4e-9, 2e-9, 18e-9});
  return data;
}

MatrixXd without(const MatrixXd& matrix, Index lead, bool columns_too) {
  const auto kept = [&](Index size) {
    std::vector<Index> rows;
    for (Index i = 0; i < size; ++i)
      if (i != lead) rows.push_back(i);
    return rows;
  };
  if (columns_too) return matrix(kept(matrix.rows()), kept(matrix.cols()));
  return matrix(kept(matrix.rows()), Eigen::all);
}

Subspace subspace_without(const InverseCase& c, Index lead) {
  Labels labels = c.labels;
  labels.erase(labels.begin() + lead);
  return make_subspace(labels, without(c.gain, lead, false),
                       c.subspace_noise(without(c.sensor_noise, lead, true)));
}

VectorXd power_of(const SourceOperator& inverse, const MatrixXd& data) {
  return estimate_sources(inverse, data).amplitude.rowwise().squaredNorm() /
         static_cast<double>(data.cols());
}

double relative_difference(const VectorXd& a, const VectorXd& b) {
  return (a - b).cwiseAbs().maxCoeff() / b.cwiseAbs().maxCoeff();
}

TEST(Influence, RidgeEstimatesEqualThoseMadeAnew) {
  const InverseCase& c = coarse_case();
  const MatrixXd data = window_of(c, 1);
  const MinimumNorm minimum_norm(c.subspace, 0);  // depth weights would change with the leads
  const Sloreta sloreta(c.subspace);
  const double lambda_norm = minimum_norm.spectrum().values.mean() / 9;
  const double lambda_standard = sloreta.spectrum().values.mean() / 9;
  const LeadDeletion norm = delete_leads(minimum_norm.at(lambda_norm, 1), data);
  const LeadDeletion standard = delete_leads(sloreta.at(lambda_standard, 1), data);
  ASSERT_EQ(norm.power.cols(), c.channels());
  for (const Index lead : {Index{0}, Index{7}, Index{14}, c.channels() - 1}) {
    const Subspace rest = subspace_without(c, lead);
    const MatrixXd rest_data = without(data, lead, false);
    // Condition of the whitened gram matrix plus lambda: below 1e5, so 1e-9 leaves room.
    EXPECT_LT(relative_difference(norm.power.col(lead),
                                  power_of(MinimumNorm(rest, 0).at(lambda_norm, 1), rest_data)),
              1e-9);
    EXPECT_LT(relative_difference(standard.power.col(lead),
                                  power_of(Sloreta(rest).at(lambda_standard, 1), rest_data)),
              1e-9);
  }
}

TEST(Influence, ALeadLeftOutHasNoSayByAnyMethod) {
  const InverseCase& c = coarse_case();
  const MatrixXd data = window_of(c, 2);
  const Sloreta sloreta(c.subspace);
  const double lambda = sloreta.spectrum().values.mean() / 9;
  Eloreta eloreta(c.subspace);
  const MatrixXd covariance = c.subspace.noise_V2 / 100;
  const Lcmv lcmv(c.subspace, covariance, c.outward, c.grid.mirror, {});
  const SourceOperator operators[] = {MinimumNorm(c.subspace, 0.8).at(1e10 * lambda, 1),
                                      sloreta.at(lambda, 1), eloreta.at(lambda, 1), lcmv.at(1)};
  const Index lead = 9;
  MatrixXd spoiled = data;
  spoiled.row(lead).array() += 200e-6;
  for (const auto& inverse : operators) {
    const LeadDeletion before = delete_leads(inverse, data), after = delete_leads(inverse, spoiled);
    // The spoiled value is subtracted again: rounding of 200 uV against a few uV of the rest.
    EXPECT_LT(relative_difference(after.power.col(lead), before.power.col(lead)), 1e-6)
        << inverse.method;
    EXPECT_GT(relative_difference(after.power.col(lead + 1), before.power.col(lead + 1)), 1)
        << inverse.method;
    Index worst = -1;
    after.misfit.maxCoeff(&worst);
    EXPECT_EQ(worst, lead) << inverse.method;
    EXPECT_GT(after.misfit[lead], 10 * before.misfit[lead]) << inverse.method;
  }
}

TEST(Influence, DipolesWithoutALeadEqualAScanMadeAnew) {
  const InverseCase& c = coarse_case();
  const VectorXd map = window_of(c, 3).rowwise().mean();
  const auto verdicts = DipoleScan(c.subspace, c.grid).judge_without_leads(map);
  ASSERT_EQ(static_cast<Index>(verdicts.size()), c.channels());
  for (Index lead = 0; lead < c.channels(); lead += 5) {
    const Subspace rest = subspace_without(c, lead);
    const DipoleVerdict anew = DipoleScan(rest, c.grid).judge(without(map, lead, false));
    const DipoleVerdict& quick = verdicts[static_cast<std::size_t>(lead)];
    EXPECT_EQ(quick.one.point, anew.one.point);
    EXPECT_EQ(quick.pair.point, anew.pair.point);
    EXPECT_EQ(quick.pair_preferred, anew.pair_preferred);
    EXPECT_NEAR(quick.one.unexplained, anew.one.unexplained, 1e-10);
    EXPECT_NEAR(quick.pair.unexplained, anew.pair.unexplained, 1e-10);
    EXPECT_NEAR(quick.pair.criterion, anew.pair.criterion, 1e-6);
    const double scale = anew.pair.moment_Am.norm();
    EXPECT_LT((quick.pair.moment_Am - anew.pair.moment_Am).norm(), 1e-8 * scale);
    EXPECT_LT((quick.pair.partner_moment_Am - anew.pair.partner_moment_Am).norm(), 1e-8 * scale);
  }
}

}  // namespace
}  // namespace headwater
