// SPDX-License-Identifier: GPL-3.0-or-later
// Grids against VTK's own reader of XML image data (vtkXMLImageDataReader).
#include "base_scratch.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/vtk_grid.hpp>

#include <gtest/gtest.h>
#include <vtkDataArray.h>
#include <vtkFieldData.h>
#include <vtkImageData.h>
#include <vtkNew.h>
#include <vtkPointData.h>
#include <vtkStringArray.h>
#include <vtkXMLImageDataReader.h>

namespace headwater {
namespace {

Volume marked_volume(std::array<int, 3> size) {
  Volume volume;
  volume.size = size;
  volume.affine_mm.diagonal() << 7, 6, 5, 1;
  volume.affine_mm.col(3) << -70, -105.5, -49, 1;
  const Eigen::Index voxels = Eigen::Index{1} * size[0] * size[1] * size[2];
  volume.values = Eigen::MatrixXd::Random(voxels, 2);
  volume.first_time_s = 0.1;
  volume.time_step_s = 0.004;
  volume.name = "amplitude <&\">";
  volume.unit = "nA m";
  volume.description = "late minus steady";
  return volume;
}

// The sizes span one partial block, one full block of 2^18 bytes, and several.
TEST(BaseVtkGrid, VtkReadsEveryValueAtItsPlace) {
  for (const std::array<int, 3> size : {std::array{1, 1, 1}, std::array{21, 25, 19},
                                        std::array{64, 64, 16}, std::array{61, 73, 61}}) {
    const Scratch scratch;
    const auto path = scratch.folder / "v.vti";
    Volume volume = marked_volume(size);
    const Eigen::Index i = size[0] - 1, j = size[1] / 2, k = size[2] / 3;
    const Eigen::Index voxel = i + size[0] * (j + size[1] * k);
    volume.values(voxel, 1) = 12.5;
    write_vti(path, volume, 1);

    vtkNew<vtkXMLImageDataReader> reader;
    ASSERT_TRUE(reader->CanReadFile(path.c_str()));
    reader->SetFileName(path.c_str());
    reader->Update();
    ASSERT_EQ(reader->GetErrorCode(), 0u);
    vtkImageData* image = reader->GetOutput();
    EXPECT_EQ(image->GetNumberOfPoints(), volume.values.rows());
    vtkDataArray* array = image->GetPointData()->GetScalars();
    ASSERT_NE(array, nullptr);
    EXPECT_STREQ(array->GetName(), "amplitude <&\"> [nA m]");
    EXPECT_EQ(array->GetDataType(), VTK_FLOAT);
    for (vtkIdType n = 0; n < array->GetNumberOfTuples(); ++n)
      ASSERT_EQ(array->GetTuple1(n), static_cast<double>(static_cast<float>(volume.values(n, 1))));
    double place[3] = {-70 + 7.0 * static_cast<double>(i), -105.5 + 6.0 * static_cast<double>(j),
                       -49 + 5.0 * static_cast<double>(k)};
    EXPECT_EQ(image->FindPoint(place), voxel);
    EXPECT_EQ(array->GetTuple1(image->FindPoint(place)), 12.5);
  }
}

TEST(BaseVtkGrid, VtkFindsTimeAndSpace) {
  const Scratch scratch;
  const auto path = scratch.folder / "v.vti";
  Volume volume = marked_volume({3, 4, 5});
  for (const bool series : {true, false}) {
    if (!series) volume.time_step_s = 0;
    write_vti(path, volume, 1);
    vtkNew<vtkXMLImageDataReader> reader;
    reader->SetFileName(path.c_str());
    reader->Update();
    vtkFieldData* fields = reader->GetOutput()->GetFieldData();
    auto* space = vtkStringArray::SafeDownCast(fields->GetAbstractArray("space"));
    ASSERT_NE(space, nullptr);
    EXPECT_EQ(space->GetValue(0), "MNI152 mm RAS");
    auto* description = vtkStringArray::SafeDownCast(fields->GetAbstractArray("description"));
    ASSERT_NE(description, nullptr);
    EXPECT_EQ(description->GetValue(0), "late minus steady");
    vtkDataArray* time = fields->GetArray("TimeValue");
    ASSERT_EQ(time != nullptr, series);
    if (time) {
      EXPECT_DOUBLE_EQ(time->GetTuple1(0), 0.104);
    }
  }
}

TEST(BaseVtkGrid, IndexNamesTimesAndFiles) {
  const Scratch scratch;
  write_pvd(scratch.folder / "s.pvd", {{0.1, "a_0.vti"}, {0.104, "a&b.vti"}});
  EXPECT_EQ(
      read_file(scratch.folder / "s.pvd", "index"),
      "<?xml version=\"1.0\"?>\n<VTKFile type=\"Collection\" version=\"0.1\">\n  <Collection>\n"
      "    <DataSet timestep=\"0.1\" part=\"0\" file=\"a_0.vti\"/>\n"
      "    <DataSet timestep=\"0.104\" part=\"0\" file=\"a&amp;b.vti\"/>\n"
      "  </Collection>\n</VTKFile>\n");
}

}  // namespace
}  // namespace headwater
