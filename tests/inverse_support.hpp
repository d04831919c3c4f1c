// SPDX-License-Identifier: GPL-3.0-or-later
// A small case for tests of inverses: a cap of 31 sites, exactly symmetric in x, a coarse grid, and
// noise that is far from spherical but symmetric.
#pragma once
#include <headwater/base/random.hpp>
#include <headwater/inverse/subspace.hpp>
#include <headwater/model/head.hpp>
#include <headwater/model/lead_field.hpp>
#include <headwater/model/source_grid.hpp>
#include <headwater/signal/electrodes.hpp>
#include <headwater/signal/reference.hpp>

#include <Eigen/Cholesky>
#include <Eigen/Core>

#include <cmath>
#include <string>
#include <vector>

namespace headwater {

struct InverseCase {
  Labels labels{"Fp1", "Fpz", "Fp2", "F7", "F3",  "Fz",  "F4",  "F8",  "FC5", "FC1", "FC2",
                "FC6", "T7",  "C3",  "Cz", "C4",  "T8",  "CP5", "CP1", "CP2", "CP6", "P7",
                "P3",  "Pz",  "P4",  "P8", "PO3", "PO4", "O1",  "Oz",  "O2"};
  Eigen::Matrix3Xd electrodes;
  std::vector<Eigen::Index> channel_mirror;
  SourceGrid grid;
  Eigen::Matrix3Xd outward;
  Eigen::MatrixXd gain;          // M by 3N
  Eigen::MatrixXd sensor_noise;  // M by M, V^2, of a single trial
  Subspace subspace;

  explicit InverseCase(double spacing_m = 12e-3) : grid(lattice_grid(spacing_m, 0.092)) {
    electrodes = standard_montage(labels, 0.092).positions;
    make_symmetric();
    outward = grid.head_m.colwise().normalized();
    gain = compute_gain(default_head(), electrodes, grid.head_m);
    // Noise that neighbours share over some 40 degrees, on top of each electrode's own.
    const Eigen::Matrix3Xd u = electrodes.colwise().normalized();
    const Eigen::ArrayXXd angle = (u.transpose() * u).array().min(1).max(-1).acos();
    sensor_noise = (64e-12 * (-angle / 0.7).exp()).matrix();
    sensor_noise.diagonal().array() += 4e-12;
    subspace = make_subspace(labels, gain, subspace_noise(sensor_noise));
  }

  Eigen::Index channels() const { return gain.rows(); }
  Eigen::MatrixXd subspace_noise(const Eigen::MatrixXd& covariance) const {
    const Eigen::MatrixXd basis = reference_free_basis(covariance.rows());
    return basis.transpose() * covariance * basis;
  }
  /// Sensor map (V) of a dipole at a point.
  Eigen::VectorXd map_of(Eigen::Index point, const Eigen::Vector3d& moment_Am) const {
    return gain.middleCols<3>(3 * point) * moment_Am;
  }
  /// Point nearest to an MNI place (mm).
  Eigen::Index nearest(double x, double y, double z) const {
    Eigen::Index point = 0;
    (grid.mni_m.colwise() - Eigen::Vector3d(x, y, z) * 1e-3).colwise().norm().minCoeff(&point);
    return point;
  }
  /// Noise maps of the given covariance: M by count.
  Eigen::MatrixXd noise_maps(RandomStream& random, Eigen::Index count) const {
    return sensor_noise.llt().matrixL() * random.normal_matrix(channels(), count);
  }
  Eigen::MatrixXd mirrored_data(const Eigen::MatrixXd& data) const {
    Eigen::MatrixXd result(data.rows(), data.cols());
    for (Eigen::Index m = 0; m < data.rows(); ++m)
      result.row(m) = data.row(channel_mirror[static_cast<std::size_t>(m)]);
    return result;
  }

 private:
  /// The rule is symmetric to rounding; here to the last bit.
  void make_symmetric() {
    for (Eigen::Index m = 0; m < electrodes.cols(); ++m) {
      Eigen::Vector3d image = electrodes.col(m);
      image.x() = -image.x();
      Eigen::Index partner = 0;
      (electrodes.colwise() - image).colwise().norm().minCoeff(&partner);
      channel_mirror.push_back(partner);
      electrodes.col(partner) = image;
      if (partner == m) electrodes(0, m) = 0;
    }
  }
};

/// One case for all tests of a program: made once.
inline const InverseCase& coarse_case() {
  static const InverseCase shared;
  return shared;
}

}  // namespace headwater
