// SPDX-License-Identifier: GPL-3.0-or-later
// The background of the invented example's averages.
//
// A patch is the Gaussian-weighted sum of the lattice points about a random one, all along one
// random direction: b(t) = P_broad a(t) + P_alpha c(t), the columns of P the patches' scalp maps. a
// has power that falls as 1/f, c power about the alpha frequency: sums of cosines and sines with
// normal amplitudes, unit variance. P is scaled so that the mean power over leads (average
// reference) is the person's.
#pragma once
#include "example_person.hpp"

#include <headwater/model/source_grid.hpp>

#include <Eigen/Core>

#include <cstdint>

namespace headwater {

/// Rows: cosines and sines of each frequency, #rows by #times, scaled to unit variance in all.
struct BackgroundSpectra {
  Eigen::MatrixXd broad, alpha;
};
BackgroundSpectra background_spectra(const ExampleBackground& background,
                                     const Eigen::VectorXd& times_s);

/// Scalp maps of a person's patches, #channels by #patches, V.
struct BackgroundMaps {
  Eigen::MatrixXd broad, alpha;
};
/// lattice: built for any head; its points scale with the person's.
BackgroundMaps background_maps(const ExampleBackground& background, const SourceGrid& lattice,
                               double lattice_radius_m, const ExamplePerson& person,
                               std::uint64_t seed);

/// Background and sensor noise of the average of person.trials[condition] trials, #channels by
/// #times.
Eigen::MatrixXd draw_background(const ExampleRecipe& recipe, const BackgroundSpectra& spectra,
                                const BackgroundMaps& maps, const ExamplePerson& person,
                                std::size_t condition, std::uint64_t seed);

}  // namespace headwater
