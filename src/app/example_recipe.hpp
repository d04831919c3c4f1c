// SPDX-License-Identifier: GPL-3.0-or-later
// The recipe of the invented example (templates/example.toml) in SI units.
#pragma once
#include <headwater/base/labels.hpp>

#include <Eigen/Core>

#include <string>
#include <vector>

namespace headwater {

struct NormalSpread {
  double mean = 0, sd = 0;
};

struct EvenSpread {
  double from = 0, to = 0;
};

struct ExamplePeople {
  int count = 0;
  NormalSpread age_years, hearing_loss_dB, head_radius_m;
  EvenSpread skull_ratio;  ///< on a logarithmic scale
  double electrode_sd_m = 0, position_sd_m = 0, latency_sd_s = 0, strength_sd = 0, balance_sd = 0;
};

struct ExampleBackground {
  double lattice_m = 0, patch_m = 0, alpha_behind_m = 0;
  int patches = 0, alpha_patches = 0;
  EvenSpread rms_V;
  double alpha_share = 0;
  EvenSpread band_Hz;
  NormalSpread alpha_Hz;
  double sensor_V = 0;
};

struct ExampleCondition {
  std::string name;
  EvenSpread trials;  ///< whole numbers, both ends included
};

struct ExampleSource {
  std::string name;
  Eigen::Vector3d mni_m;
  Eigen::Vector3d direction;  ///< unit
  double share = 1;
};

/// Sources that act together: one time course, one strength in each condition.
struct ExampleComponent {
  std::string name;
  double latency_s = 0, width_s = 0;
  std::vector<double> moment_Am;  ///< in the order of the conditions
  Labels shows_in;                ///< contrasts
  std::vector<ExampleSource> sources;

  bool is_pair() const { return sources.size() == 2; }
};

/// The single-trial part: see templates/example.toml.
struct ExampleRecordings {
  int people = 0, blocks = 0, beats = 0;
  double interval_s = 0, steady_sd_s = 0, loose_sd_s = 0, late_share = 0, late_s = 0;
  double forgetting = 1;
  double n1_Am = 0, mismatch_Am = 0, mismatch_per_bit_Am = 0;
  int bad_person = 0;
  std::string bad_lead;
  double bad_V = 0;
};

struct ExampleRecipe {
  Labels leads;  ///< as recorded: without the reference
  std::string reference;
  Eigen::VectorXd times_s;
  ExamplePeople people;
  ExampleBackground background;
  ExampleRecordings recordings;
  std::vector<ExampleCondition> conditions;
  std::vector<ExampleComponent> components;
};

/// Throws std::logic_error that names a key which the recipe lacks or has wrong: it is part of the
/// program.
ExampleRecipe read_example_recipe();

}  // namespace headwater
