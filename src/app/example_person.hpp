// SPDX-License-Identifier: GPL-3.0-or-later
// A participant of the invented example: head, electrodes and sources, all drawn from named
// streams.
#pragma once
#include "example_recipe.hpp"

#include <headwater/model/head.hpp>

#include <Eigen/Core>

#include <cstdint>
#include <string>
#include <vector>

namespace headwater {

struct PersonSource {
  std::string name;
  Eigen::Vector3d mni_m;
  Eigen::Vector3d direction;
  double latency_s = 0, width_s = 0;
  double factor = 1;              ///< of the recipe's strengths
  std::vector<double> moment_Am;  ///< in the order of the conditions
};

struct ExamplePerson {
  std::string name;  ///< "sub-01"
  int age_years = 0, hearing_loss_dB = 0;
  HeadModel head;
  double skull_ratio = 0, background_rms_V = 0;
  Labels channels;              ///< the leads, then the reference
  Eigen::Matrix3Xd electrodes;  ///< 3 by #channels, head frame, m
  std::vector<PersonSource> sources;
  std::vector<int> trials;  ///< in the order of the conditions

  double head_radius_m() const { return head.radii_m[head.radii_m.size() - 1]; }
};

/// number: from 1.
ExamplePerson draw_person(const ExampleRecipe& recipe, std::uint64_t seed, int number);

/// What the sources alone give: #channels by #times, V, zero mean over the sphere.
Eigen::MatrixXd response_of(const ExamplePerson& person, std::size_t condition,
                            const Eigen::VectorXd& times_s);

}  // namespace headwater
