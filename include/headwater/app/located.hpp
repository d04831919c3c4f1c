// SPDX-License-Identifier: GPL-3.0-or-later
// The estimates of one contrast of one participant by one method, and the dipole scan that goes
// with them.
#pragma once
#include <headwater/app/participant.hpp>
#include <headwater/inverse/dipole_scan.hpp>
#include <headwater/inverse/indices.hpp>
#include <headwater/inverse/peaks.hpp>
#include <headwater/inverse/region_courses.hpp>
#include <headwater/inverse/ridge.hpp>

#include <memory>
#include <string>
#include <vector>

namespace headwater {

/// Second opinion for a window: of its mean scalp map, and of each of its samples.
struct WindowDipoles {
  TimeWindow window;
  SampleRange samples;
  DipoleVerdict mean;
  std::vector<DipoleVerdict> at_sample;
};

struct LocatedWindow {
  TimeWindow window;
  SampleRange samples;
  Eigen::VectorXd map;  ///< N, rms over the window, SI
  std::vector<Peak> peaks;
  std::vector<PowerIndex> indices;
  FitQuality fit;  ///< explained_variance NaN where the method defines none
};

struct LocatedContrast {
  SourceOperator inverse;
  RegularisationChoice regularisation;  ///< used = NaN for LCMV
  int iterations = 0;                   ///< eLORETA
  bool converged = true;
  SourceEstimate estimate;
  RegionCourses courses;
  std::vector<LocatedWindow> windows;
};

/// Locates the contrasts of one participant, one at a time. Factorisations are shared between
/// contrasts whose noise covariances are proportional.
class Locator {
 public:
  Locator(const Experiment& experiment, const ParticipantData& participant);
  ~Locator();
  /// Contrast by its place in the experiment; windows: those meant for it.
  std::vector<WindowDipoles> dipoles(std::size_t place, const std::vector<TimeWindow>& windows);
  LocatedContrast locate(std::size_t place, const std::string& method,
                         const std::vector<TimeWindow>& windows);

 private:
  struct Engine;
  Engine& engine_for(const ContrastWaveform& contrast);

  const Experiment* experiment_;
  const ParticipantData* participant_;
  std::vector<std::unique_ptr<Engine>> engines_;
};

}  // namespace headwater
