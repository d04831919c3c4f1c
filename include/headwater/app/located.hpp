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

/// What becomes of a window's answer when something is left out.
struct LeftOut {
  std::string kind;  ///< "lead", "trials", "participant"
  std::string name;
  Eigen::Index point = 0;       ///< where the answer is then
  double shift_m = 0;           ///< how far that is from the answer with all
  double misfit = 0;            ///< of a lead (influence.hpp); NaN for others
  std::vector<double> indices;  ///< then; in the order of WindowInfluence::indices
};

/// A lead, block of trials or participant matters when the answer moves by more than kLargeShift
/// without it - other than to its mirror image, which says only that both sides are as large - or
/// the laterality of all lobes or the temporal-parietal index by more than kLargeChange (a lobe's
/// size; the customary cut of such indices). What matters carries more than its share when few
/// others matter (at most one in twenty), or, a lead, when the others predict it three times worse
/// than the median lead.
struct WindowInfluence {
  static constexpr double kLargeShift = 20e-3, kLargeChange = 0.2, kLargeMisfit = 3;
  Eigen::Index point = 0;           ///< with all: largest point of the map, or of the scan
  std::vector<PowerIndex> indices;  ///< with all; empty for the dipole scan
  std::vector<LeftOut> left_out;
  Labels carriers;   ///< leads, blocks, participants that carry too much
  std::string note;  ///< one sentence for the peaks table, or ""
};

/// Second opinion for a window: of its mean scalp map, and of each of its samples.
struct WindowDipoles {
  TimeWindow window;
  SampleRange samples;
  DipoleVerdict mean;
  std::vector<DipoleVerdict> at_sample;
  WindowInfluence influence;  ///< of the mean map's verdict: the better model's (right) point
};

struct LocatedWindow {
  TimeWindow window;
  SampleRange samples;
  Eigen::VectorXd map;  ///< N, rms over the window, SI
  std::vector<Peak> peaks;
  std::vector<PowerIndex> indices;
  FitQuality fit;  ///< explained_variance NaN where the method defines none
  WindowInfluence influence;
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
