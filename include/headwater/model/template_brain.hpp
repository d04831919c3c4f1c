// SPDX-License-Identifier: GPL-3.0-or-later
// The template brain: the convex hull of the cerebrum as a surface about the head centre, fitted to
// a measured MNI-space volume (spherical harmonics of degree 6, symmetric in x;
// templates/hull.tsv). Real convention in templates/README.md. Fit: rms 0.98 mm, largest 4.7 mm.
#pragma once
#include <Eigen/Core>

namespace headwater {

/// Radius (m) of the hull about the head centre in a direction (any length > 0, head-frame axes).
double hull_radius(const Eigen::Vector3d& direction);

/// Radius (m) of the hull with the longitudinal and lateral grooves cut in: a surface that reads as
/// a brain from above, front and side. For pictures only.
double drawn_brain_radius(const Eigen::Vector3d& direction);

}  // namespace headwater
