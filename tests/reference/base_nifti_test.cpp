// SPDX-License-Identifier: GPL-3.0-or-later
// Volumes against an outside reader and writer, nibabel (Debian's python3-nibabel), and against the
// NIfTI-1 standard (nifti.nimh.nih.gov/nifti-1: xyzt_units 2 = mm, 8 = s; sform code 4 = MNI 152).
#include "base_scratch.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/nifti.hpp>
#include <headwater/base/units.hpp>

#include <fmt/core.h>
#include <gtest/gtest.h>

#include <cstdio>
#include <cstdlib>
#include <sstream>

namespace headwater {
namespace {

constexpr auto kPython = "/usr/bin/python3";

bool has_nibabel() {
  return std::system(fmt::format("{} -c 'import nibabel' 2>/dev/null", kPython).c_str()) == 0;
}

/// What the script prints; its standard error goes to the test's.
std::string run_python(const Scratch& scratch, const std::string& script) {
  write_file(scratch.folder / "script.py", script);
  const auto command = fmt::format("cd '{}' && {} script.py", scratch.folder.string(), kPython);
  std::FILE* pipe = ::popen(command.c_str(), "r");
  if (!pipe) return "";
  std::string output;
  char buffer[4096];
  for (std::size_t got; (got = std::fread(buffer, 1, sizeof buffer, pipe)) > 0;)
    output.append(buffer, got);
  EXPECT_EQ(::pclose(pipe), 0) << command;
  return output;
}

/// Asymmetrical along every axis: 0 everywhere but for one voxel on the right, in front, on top.
Volume marked_volume() {
  Volume volume;
  volume.size = {21, 25, 19};
  volume.affine_mm.diagonal() << 7, 7, 7, 1;
  volume.affine_mm.col(3) << -70, -105, -49, 1;
  volume.values = Eigen::MatrixXd::Zero(21 * 25 * 19, 3);
  const Eigen::Index i = 17, j = 20, k = 14;  // 49, 35, 49 mm
  volume.values(i + 21 * (j + 25 * k), 1) = 12.5;
  volume.first_time_s = 0.1;
  volume.time_step_s = 0.004;
  volume.name = "amplitude";
  volume.unit = "nA m";
  volume.description = "late minus steady, minimum-norm";
  return volume;
}

TEST(BaseNifti, NibabelFindsTheValueAtItsMniPlaceAndTime) {
  if (!has_nibabel()) GTEST_SKIP() << "python3-nibabel is missing";
  const Scratch scratch;
  write_nifti(scratch.folder / "v.nii.gz", marked_volume());
  const std::string output = run_python(scratch, R"(
import nibabel, numpy
v = nibabel.load("v.nii.gz")
d = v.get_fdata()
h = v.header
at = numpy.unravel_index(numpy.argmax(d), d.shape)
print(*d.shape, d.dtype.name, h.get_data_dtype().name)
print(*at, d[at], numpy.count_nonzero(d))
print(*nibabel.affines.apply_affine(v.affine, at[:3]))
print(*nibabel.aff2axcodes(v.affine), int(h["sform_code"]), int(h["qform_code"]))
print(*h.get_xyzt_units())
print(round(float(h["pixdim"][4]), 7), round(float(h["toffset"]), 7))
print(numpy.allclose(h.get_qform(), h.get_sform(), atol=1e-4), numpy.allclose(h.get_zooms()[:3], 7))
print(h["intent_name"].item().decode(), "|", h["descrip"].item().decode())
)");
  EXPECT_EQ(output,
            "21 25 19 3 float64 float32\n"
            "17 20 14 1 12.5 1\n"
            "49.0 35.0 49.0\n"
            "R A S 4 4\n"
            "mm sec\n"
            "0.004 0.1\n"
            "True True\n"
            "amplitude | amplitude [nA m]: late minus steady, minimum-norm\n");
}

TEST(BaseNifti, ASingleMapHasThreeDimensions) {
  if (!has_nibabel()) GTEST_SKIP() << "python3-nibabel is missing";
  const Scratch scratch;
  Volume volume = marked_volume();
  volume.values = volume.values.col(1).eval();
  volume.time_step_s = volume.first_time_s = 0;
  volume.description = std::string(78, 'x') + "\xc3\xa9";
  volume.unit = "";
  volume.name = "a name of more than fifteen bytes";
  write_nifti(scratch.folder / "v.nii.gz", volume);
  EXPECT_EQ(run_python(scratch, R"(
import nibabel
v = nibabel.load("v.nii.gz")
print(*v.shape, len(v.header["descrip"].item()), v.header["intent_name"].item().decode())
)"),
            "21 25 19 78 a name of more \n");
}

TEST(BaseNifti, ReadsBackWhatItWrote) {
  const Scratch scratch;
  Volume volume = marked_volume();
  volume.values.setRandom();
  volume.affine_mm(0, 0) = -3;   // to the left
  volume.affine_mm(0, 1) = 0.5;  // sheared: the sform holds it, a quaternion cannot
  write_nifti(scratch.folder / "v.nii.gz", volume);
  const Volume back = read_nifti(scratch.folder / "v.nii.gz");
  EXPECT_EQ(back.size, volume.size);
  EXPECT_EQ(back.affine_mm, volume.affine_mm);
  EXPECT_EQ(back.values, volume.values.cast<float>().cast<double>());
  EXPECT_NEAR(back.time_step_s, 0.004, 0.004 * 1e-7);  // float32
  EXPECT_NEAR(back.first_time_s, 0.1, 0.1 * 1e-7);
  EXPECT_EQ(back.name, "amplitude");
  EXPECT_EQ(back.unit, "nA m");
  EXPECT_EQ(back.description, volume.description);
}

// nibabel writes every type in both byte orders, with scaling, qform only, and other units.
TEST(BaseNifti, ReadsNibabelsFilesOfEveryTypeAndByteOrder) {
  if (!has_nibabel()) GTEST_SKIP() << "python3-nibabel is missing";
  const Scratch scratch;
  run_python(scratch, R"(
import nibabel, numpy
from numpy import int8, uint8, int16, uint16, int32, uint32, int64, uint64, float32, float64
affine = numpy.array([[0, -2, 0, 10], [3, 0, 0, -20], [0, 0, 4, 5], [0, 0, 0, 1.]])
for order in "<>":
    for t in (int8, uint8, int16, uint16, int32, uint32, int64, uint64, float32, float64):
        header = nibabel.Nifti1Header(endianness=order)
        header.set_data_dtype(numpy.dtype(t))
        data = (numpy.arange(2 * 3 * 4 * 5) % 100).reshape((2, 3, 4, 5), order="F").astype(t)
        image = nibabel.Nifti1Image(data, None, header)
        image.set_sform(None, 0)
        image.set_qform(affine, 4)
        image.header.set_xyzt_units("mm", "msec")
        image.header["pixdim"][4] = 20
        image.header["toffset"] = -100
        image.header.set_slope_inter(0.5, -3)
        name = ("little" if order == "<" else "big") + numpy.dtype(t).name + ".nii"
        image.to_filename(name if t != int16 else name + ".gz")
)");
  Eigen::Matrix4d affine;
  affine << 0, -2, 0, 10, 3, 0, 0, -20, 0, 0, 4, 5, 0, 0, 0, 1;
  int files = 0;
  for (const auto& entry : std::filesystem::directory_iterator(scratch.folder)) {
    if (entry.path().extension() == ".py") continue;
    ++files;
    const Volume volume = read_nifti(entry.path());
    EXPECT_EQ(volume.size, (std::array<int, 3>{2, 3, 4})) << entry.path();
    ASSERT_EQ(volume.values.rows(), 24);
    ASSERT_EQ(volume.values.cols(), 5);
    EXPECT_LT((volume.affine_mm - affine).cwiseAbs().maxCoeff(),
              1e-5);  // float32 quaternion of 20 mm
    EXPECT_DOUBLE_EQ(volume.time_step_s, 20 * kMillisecond);
    EXPECT_DOUBLE_EQ(volume.first_time_s, -100 * kMillisecond);
    for (Eigen::Index n = 0; n < 120; ++n)
      ASSERT_NEAR(volume.values.data()[n], 0.5 * static_cast<double>(n % 100) - 3, 1e-12)
          << entry.path();
  }
  EXPECT_EQ(files, 20);
}

}  // namespace
}  // namespace headwater
