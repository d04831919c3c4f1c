// SPDX-License-Identifier: GPL-3.0-or-later
// An appended block of compressed data is, in unsigned 64-bit numbers: #blocks, size of a block
// before compression, size of the last block (0: it is full), compressed size of each block; then
// the zlib streams. It follows an underscore; offsets count from the byte after it.
#include "base/zlib_streams.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/vtk_grid.hpp>

#include <fmt/core.h>

#include <bit>
#include <cstdint>
#include <stdexcept>

namespace headwater {
namespace {

constexpr std::size_t kBlock = 1 << 18;

std::string escaped(std::string_view text) {
  std::string result;
  for (const char c : text) switch (c) {
      case '&':
        result += "&amp;";
        break;
      case '<':
        result += "&lt;";
        break;
      case '>':
        result += "&gt;";
        break;
      case '"':
        result += "&quot;";
        break;
      default:
        result += c;
    }
  return result;
}

/// Text as VTK's string arrays hold it in ASCII form: the codes of its bytes and a final 0.
std::string character_codes(std::string_view text) {
  std::string result;
  for (const char c : text)
    result += fmt::format("{} ", static_cast<int>(static_cast<unsigned char>(c)));
  return result + "0";
}

std::string compressed_blocks(std::string_view bytes) {
  std::vector<std::uint64_t> head{0, kBlock, bytes.size() % kBlock};
  std::string streams;
  for (std::size_t start = 0; start < bytes.size(); start += kBlock) {
    const std::string stream = deflate_block(bytes.substr(start, kBlock));
    head.push_back(stream.size());
    streams += stream;
    ++head[0];
  }
  return std::string(reinterpret_cast<const char*>(head.data()), 8 * head.size()) + streams;
}

void check(const Volume& volume, Eigen::Index time) {
  const Eigen::Index voxels = Eigen::Index{1} * volume.size[0] * volume.size[1] * volume.size[2];
  if (voxels < 1 || volume.values.rows() != voxels)
    throw std::logic_error(fmt::format("volume of {} x {} x {} voxels with {} values",
                                       volume.size[0], volume.size[1], volume.size[2],
                                       volume.values.rows()));
  if (time < 0 || time >= volume.values.cols())
    throw std::logic_error(fmt::format("map {} of a volume with {}", time, volume.values.cols()));
  Eigen::Matrix4d expected = Eigen::Matrix4d::Identity();
  for (int i = 0; i < 3; ++i) {
    expected(i, i) = volume.affine_mm(i, i);
    expected(i, 3) = volume.affine_mm(i, 3);
  }
  if (volume.affine_mm != expected || (expected.diagonal().array() <= 0).any())
    throw std::logic_error("write_vti needs an affine of positive spacings and a shift");
}

std::string field_data(const Volume& volume, Eigen::Index time) {
  std::string result = "    <FieldData>\n";
  if (volume.time_step_s > 0)
    result += fmt::format(
        "      <DataArray type=\"Float64\" Name=\"TimeValue\" NumberOfTuples=\"1\" "
        "format=\"ascii\">{}"
        "</DataArray>\n",
        volume.first_time_s + static_cast<double>(time) * volume.time_step_s);
  const auto text = [&](std::string_view name, std::string_view content) {
    result += fmt::format(
        "      <Array type=\"String\" Name=\"{}\" NumberOfTuples=\"1\" "
        "format=\"ascii\">{}</Array>\n",
        name, character_codes(content));
  };
  text("space", "MNI152 mm RAS");
  if (!volume.description.empty()) text("description", volume.description);
  return result + "    </FieldData>\n";
}

}  // namespace

void write_vti(const std::filesystem::path& path, const Volume& volume, Eigen::Index time) {
  check(volume, time);
  const auto& a = volume.affine_mm;
  const std::string extent =
      fmt::format("0 {} 0 {} 0 {}", volume.size[0] - 1, volume.size[1] - 1, volume.size[2] - 1);
  const std::string name =
      escaped(volume.unit.empty() ? volume.name : fmt::format("{} [{}]", volume.name, volume.unit));
  std::string text = fmt::format(
      "<?xml version=\"1.0\"?>\n"
      "<VTKFile type=\"ImageData\" version=\"1.0\" byte_order=\"{}\" header_type=\"UInt64\" "
      "compressor=\"vtkZLibDataCompressor\">\n"
      "  <ImageData WholeExtent=\"{}\" Origin=\"{} {} {}\" Spacing=\"{} {} {}\" "
      "Direction=\"1 0 0 0 1 0 0 0 1\">\n",
      std::endian::native == std::endian::little ? "LittleEndian" : "BigEndian", extent, a(0, 3),
      a(1, 3), a(2, 3), a(0, 0), a(1, 1), a(2, 2));
  text += field_data(volume, time);
  text += fmt::format(
      "    <Piece Extent=\"{}\">\n"
      "      <PointData Scalars=\"{}\">\n"
      "        <DataArray type=\"Float32\" Name=\"{}\" format=\"appended\" offset=\"0\"/>\n"
      "      </PointData>\n"
      "      <CellData/>\n"
      "    </Piece>\n"
      "  </ImageData>\n"
      "  <AppendedData encoding=\"raw\">\n_",
      extent, name, name);
  const Eigen::VectorXf values = volume.values.col(time).cast<float>();
  text += compressed_blocks({reinterpret_cast<const char*>(values.data()),
                             sizeof(float) * static_cast<std::size_t>(values.size())});
  text += "\n  </AppendedData>\n</VTKFile>\n";
  write_file(path, text);
}

void write_pvd(const std::filesystem::path& path,
               const std::vector<std::pair<double, std::string>>& steps) {
  std::string text =
      "<?xml version=\"1.0\"?>\n<VTKFile type=\"Collection\" version=\"0.1\">\n  <Collection>\n";
  for (const auto& [time, file] : steps)
    text +=
        fmt::format("    <DataSet timestep=\"{}\" part=\"0\" file=\"{}\"/>\n", time, escaped(file));
  write_file(path, text + "  </Collection>\n</VTKFile>\n");
}

}  // namespace headwater
