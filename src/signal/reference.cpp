// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/error.hpp>
#include <headwater/signal/reference.hpp>

#include <cmath>
#include <stdexcept>

namespace headwater {
namespace {

/// H = I - 1 w'.
Eigen::MatrixXd weighted_reference(const Eigen::VectorXd& weights) {
  const Eigen::Index channels = weights.size();
  return Eigen::MatrixXd::Identity(channels, channels) -
         Eigen::VectorXd::Ones(channels) * weights.transpose();
}

}  // namespace

Eigen::MatrixXd average_reference(Eigen::Index channels) {
  if (channels < 1) throw std::logic_error("average_reference: no channels");
  return weighted_reference(
      Eigen::VectorXd::Constant(channels, 1.0 / static_cast<double>(channels)));
}

Eigen::MatrixXd channel_reference(const Labels& labels, const Labels& reference) {
  if (reference.empty())
    throw InputError("The reference names no channel: give one or more channel names.");
  Eigen::VectorXd weights = Eigen::VectorXd::Zero(static_cast<Eigen::Index>(labels.size()));
  Labels missing;
  for (const std::string& name : reference) {
    const auto index = find_label_any_case(labels, name);
    if (index)
      weights[*index] = 1;  // set, not added: a name given twice counts once
    else
      missing.push_back(name);
  }
  if (!missing.empty())
    throw InputError("Reference: no channel named " + join_labels(missing) + "; the channels are " +
                     join_labels(labels) + ".");
  return weighted_reference(weights / weights.sum());
}

Eigen::MatrixXd reference_free_basis(Eigen::Index channels) {
  if (channels < 2) throw std::logic_error("reference_free_basis: fewer than 2 channels");
  Eigen::MatrixXd basis = Eigen::MatrixXd::Zero(channels, channels - 1);
  for (Eigen::Index column = 0; column + 1 < channels; ++column) {
    const auto k = static_cast<double>(column + 1);
    const double entry = 1 / std::sqrt(k * (k + 1));
    basis.col(column).head(column + 1).setConstant(entry);
    basis(column + 1, column) = -k * entry;
  }
  return basis;
}

}  // namespace headwater
