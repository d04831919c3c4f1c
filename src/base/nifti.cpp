// SPDX-License-Identifier: GPL-3.0-or-later
// nifticlib makes and reads headers. Bytes go through our own files: the library's writer cannot
// tell a full disk from success, and its reader allocates what a header promises before it looks at
// the data. The unit of the values has no field in NIfTI-1: it stands in front of the description,
// "amplitude [nA m]: ...", and is read back from there.
#include "base/zlib_streams.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/nifti.hpp>

#include <Eigen/LU>
#include <fmt/core.h>
#include <nifti1_io.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <cstring>
#include <memory>
#include <stdexcept>

namespace headwater {
namespace {

constexpr std::size_t kHeaderBytes = 348;
static_assert(sizeof(nifti_1_header) == kHeaderBytes);
using Image = std::unique_ptr<nifti_image, decltype(&nifti_image_free)>;

// ---- writing

mat44 to_mat44(const Eigen::Matrix4d& affine) {
  mat44 result;
  for (int i = 0; i < 4; ++i)
    for (int j = 0; j < 4; ++j) result.m[i][j] = static_cast<float>(affine(i, j));
  return result;
}

Eigen::Matrix4d to_matrix(const mat44& affine) {
  Eigen::Matrix4d result;
  for (int i = 0; i < 4; ++i)
    for (int j = 0; j < 4; ++j) result(i, j) = static_cast<double>(affine.m[i][j]);
  return result;
}

/// Copies text into a field of the header, leaving a final 0 and cutting no UTF-8 character.
template <std::size_t N>
void set_text(char (&field)[N], std::string_view text) {
  std::size_t length = std::min(text.size(), N - 1);
  if (length < text.size())
    while (length > 0 && (static_cast<unsigned char>(text[length]) & 0xc0) == 0x80) --length;
  std::memset(field, 0, N);
  std::memcpy(field, text.data(), length);
}

void set_affine(nifti_1_header& header, const Eigen::Matrix4d& affine_mm) {
  const mat44 affine = to_mat44(affine_mm);
  header.sform_code = NIFTI_XFORM_MNI_152;
  std::copy_n(affine.m[0], 4, header.srow_x);
  std::copy_n(affine.m[1], 4, header.srow_y);
  std::copy_n(affine.m[2], 4, header.srow_z);
  float d[3], qfac = 1;
  nifti_mat44_to_quatern(affine, &header.quatern_b, &header.quatern_c, &header.quatern_d,
                         &header.qoffset_x, &header.qoffset_y, &header.qoffset_z, &d[0], &d[1],
                         &d[2], &qfac);
  header.pixdim[0] = qfac;
  std::copy_n(d, 3, header.pixdim + 1);
  // A quaternion holds rotations only: an affine that shears goes into the sform alone.
  const mat44 back =
      nifti_quatern_to_mat44(header.quatern_b, header.quatern_c, header.quatern_d, header.qoffset_x,
                             header.qoffset_y, header.qoffset_z, d[0], d[1], d[2], qfac);
  const double error = (to_matrix(back) - affine_mm).cwiseAbs().maxCoeff();
  header.qform_code = error < 1e-5 * affine_mm.cwiseAbs().maxCoeff() ? NIFTI_XFORM_MNI_152 : 0;
}

void check(const Volume& volume) {
  Eigen::Index voxels = 1;
  for (const int n : volume.size) voxels *= n;
  if (*std::min_element(volume.size.begin(), volume.size.end()) < 1 ||
      *std::max_element(volume.size.begin(), volume.size.end()) > INT16_MAX ||
      volume.values.rows() != voxels || volume.values.cols() < 1 ||
      volume.values.cols() > INT16_MAX)
    throw std::logic_error(fmt::format(
        "NIfTI volume of {} x {} x {} voxels with {} x {} values; at most 32767 along each side",
        volume.size[0], volume.size[1], volume.size[2], volume.values.rows(),
        volume.values.cols()));
}

nifti_1_header make_header(const Volume& volume) {
  const bool series = volume.values.cols() > 1 || volume.time_step_s > 0;
  const int dim[8] = {series ? 4 : 3,
                      volume.size[0],
                      volume.size[1],
                      volume.size[2],
                      static_cast<int>(volume.values.cols()),
                      1,
                      1,
                      1};
  const std::unique_ptr<nifti_1_header, decltype(&std::free)> made(
      nifti_make_new_header(dim, DT_FLOAT32), &std::free);
  if (!made) throw std::bad_alloc();
  nifti_1_header header = *made;
  std::memcpy(header.magic, "n+1", 4);
  header.vox_offset = kHeaderBytes + 4;  // 4 bytes say that no extension follows
  header.scl_slope = 1;
  set_affine(header, volume.affine_mm);
  header.xyzt_units = NIFTI_UNITS_MM | NIFTI_UNITS_SEC;
  header.pixdim[4] = static_cast<float>(volume.time_step_s);
  header.toffset = static_cast<float>(volume.first_time_s);
  set_text(header.intent_name, volume.name);
  const std::string colon = volume.description.empty() ? "" : ": ";
  set_text(header.descrip,
           volume.unit.empty()
               ? volume.description
               : fmt::format("{} [{}]{}{}", volume.name, volume.unit, colon, volume.description));
  return header;
}

// ---- reading

[[noreturn]] void refuse(const std::filesystem::path& path, const std::string& reason) {
  throw InputError(path.string() + ": " + reason);
}

std::string unpacked(const std::filesystem::path& path, const std::string& bytes,
                     std::size_t most) {
  if (!is_gzip(bytes)) return bytes.substr(0, most);
  try {
    return gunzip(bytes, most);
  } catch (const std::runtime_error& error) {
    refuse(path, fmt::format("{}. Copy or download the file again.", error.what()));
  }
}

bool is_plain_number(int datatype) {
  constexpr std::array plain{DT_INT8,   DT_UINT8, DT_INT16,  DT_UINT16,  DT_INT32,
                             DT_UINT32, DT_INT64, DT_UINT64, DT_FLOAT32, DT_FLOAT64};
  return std::find(plain.begin(), plain.end(), datatype) != plain.end();
}

struct OwnHeader {
  nifti_1_header header;
  bool swapped;  ///< the file, and so its data, is in the other byte order
};

/// The header in this machine's byte order, checked so far that nifticlib has nothing to complain
/// of.
OwnHeader checked_header(const std::filesystem::path& path, const std::string& bytes) {
  nifti_1_header header;
  if (bytes.size() < kHeaderBytes)
    refuse(path, fmt::format("is not NIfTI: {} bytes found, a header has 348.", bytes.size()));
  std::memcpy(&header, bytes.data(), kHeaderBytes);
  if (header.sizeof_hdr == 540 || header.sizeof_hdr == 0x1c020000)
    refuse(path, "is NIfTI-2; NIfTI-1 is expected. Convert it.");
  if (std::memcmp(header.magic, "ni1", 4) == 0)
    refuse(
        path,
        "is one of a pair (.hdr and .img); one file is expected. Convert it to .nii or .nii.gz.");
  if (std::memcmp(header.magic, "n+1", 4) != 0)
    refuse(path, "is not NIfTI-1: its header lacks the mark 'n+1'.");
  const bool swapped = header.dim[0] < 1 || header.dim[0] > 7;
  nifti_1_header own = header;
  if (swapped) swap_nifti_header(&own, 1);
  if (own.sizeof_hdr != static_cast<int>(kHeaderBytes) || own.dim[0] < 3 || own.dim[0] > 7)
    refuse(path, fmt::format("has {} dimensions, 3 or 4 are expected.", own.dim[0]));
  for (int i = 1; i <= own.dim[0]; ++i)
    if (own.dim[i] < 1 || (i > 4 && own.dim[i] > 1))
      refuse(path, fmt::format("has size {} along dimension {}; sizes of 1 or more along 3 or 4 "
                               "dimensions are expected.",
                               own.dim[i], i));
  if (!(own.vox_offset >= 0 && own.vox_offset < 1e9f))
    refuse(path, fmt::format("its header puts the data at byte {}.", own.vox_offset));
  if (!is_plain_number(own.datatype))
    refuse(path, fmt::format("holds values of type {} ({}); plain numbers are expected.",
                             nifti_datatype_string(own.datatype), own.datatype));
  return {own, swapped};
}

/// Numbers of type T in the file's byte order, scaled.
template <typename T>
void convert(const char* bytes, const nifti_image& image, Eigen::MatrixXd& values) {
  const double slope = image.scl_slope != 0 ? static_cast<double>(image.scl_slope) : 1;
  const double shift = image.scl_slope != 0 ? static_cast<double>(image.scl_inter) : 0;
  for (Eigen::Index i = 0; i < values.size(); ++i) {
    T value;
    std::memcpy(&value, bytes + static_cast<std::size_t>(i) * sizeof(T), sizeof(T));
    values.data()[i] = slope * static_cast<double>(value) + shift;
  }
}

void convert_any(const char* bytes, const nifti_image& image, Eigen::MatrixXd& values) {
  switch (image.datatype) {
    case DT_INT8:
      return convert<std::int8_t>(bytes, image, values);
    case DT_UINT8:
      return convert<std::uint8_t>(bytes, image, values);
    case DT_INT16:
      return convert<std::int16_t>(bytes, image, values);
    case DT_UINT16:
      return convert<std::uint16_t>(bytes, image, values);
    case DT_INT32:
      return convert<std::int32_t>(bytes, image, values);
    case DT_UINT32:
      return convert<std::uint32_t>(bytes, image, values);
    case DT_INT64:
      return convert<std::int64_t>(bytes, image, values);
    case DT_UINT64:
      return convert<std::uint64_t>(bytes, image, values);
    case DT_FLOAT32:
      return convert<float>(bytes, image, values);
    case DT_FLOAT64:
      return convert<double>(bytes, image, values);
    default:
      throw std::logic_error("NIfTI type that the header check should have refused");
  }
}

Eigen::Matrix4d affine_of(const std::filesystem::path& path, const nifti_image& image) {
  if (image.sform_code <= 0 && image.qform_code <= 0)
    refuse(path,
           "says nowhere where its voxels lie (sform and qform code are both 0); coordinates in "
           "MNI mm are expected.");
  Eigen::Matrix4d affine = to_matrix(image.sform_code > 0 ? image.sto_xyz : image.qto_xyz);
  if (image.xyz_units == NIFTI_UNITS_METER) affine.topRows<3>() *= 1e3;
  if (image.xyz_units == NIFTI_UNITS_MICRON) affine.topRows<3>() *= 1e-3;
  if (!affine.allFinite() || affine.topLeftCorner<3, 3>().determinant() == 0)
    refuse(path, "its affine is singular or not finite: voxels have no place.");
  return affine;
}

double seconds_per_unit(int time_units) {
  if (time_units == NIFTI_UNITS_MSEC) return 1e-3;
  if (time_units == NIFTI_UNITS_USEC) return 1e-6;
  return 1;
}

/// Takes "<name> [<unit>]: <description>" apart where write_nifti has put it together.
void split_description(Volume& volume) {
  const std::string& text = volume.description;
  const auto open = text.find(" ["), close = text.find(']', open == std::string::npos ? 0 : open);
  if (volume.name.empty() || open == std::string::npos || close == std::string::npos ||
      text.compare(0, volume.name.size(), volume.name) != 0 || open < volume.name.size())
    return;
  if (close + 1 != text.size() && text.compare(close + 1, 2, ": ") != 0) return;
  volume.name = text.substr(0, open);
  volume.unit = text.substr(open + 2, close - open - 2);
  volume.description = close + 3 < text.size() ? text.substr(close + 3) : "";
}

}  // namespace

void write_nifti(const std::filesystem::path& path, const Volume& volume) {
  check(volume);
  const nifti_1_header header = make_header(volume);
  const Eigen::MatrixXf values = volume.values.cast<float>();
  std::string bytes(reinterpret_cast<const char*>(&header), kHeaderBytes);
  bytes.append(4, '\0');
  bytes.append(reinterpret_cast<const char*>(values.data()),
               sizeof(float) * static_cast<std::size_t>(values.size()));
  write_file(path, gzip(bytes));
}

Volume read_nifti(const std::filesystem::path& path) {
  const std::string packed = read_file(path, "NIfTI volume");
  const auto [header, swapped] = checked_header(path, unpacked(path, packed, kHeaderBytes));
  const Image image(nifti_convert_nhdr2nim(header, nullptr), &nifti_image_free);
  if (!image) refuse(path, "its header is damaged.");

  // Sizes are below 2^15 in at most 4 dimensions: the product fits 64 bits.
  const auto offset = static_cast<std::size_t>(image->iname_offset);
  std::size_t promised = static_cast<std::size_t>(image->nbyper);
  for (int i = 1; i <= header.dim[0]; ++i) promised *= static_cast<std::size_t>(header.dim[i]);
  std::string bytes = unpacked(path, packed, offset + promised);
  if (bytes.size() < offset + promised)
    refuse(path,
           fmt::format("holds {} bytes, but its header promises {}: the file is cut short or its "
                       "header is wrong.",
                       bytes.size(), offset + promised));
  if (swapped && image->swapsize > 1)
    nifti_swap_Nbytes(promised / static_cast<std::size_t>(image->swapsize), image->swapsize,
                      bytes.data() + offset);

  Volume volume;
  volume.size = {image->nx, image->ny, image->nz};
  volume.affine_mm = affine_of(path, *image);
  const Eigen::Index voxels = Eigen::Index{1} * image->nx * image->ny * image->nz;
  const Eigen::Index times = header.dim[0] > 3 ? header.dim[4] : 1;
  volume.values.resize(voxels, times);
  convert_any(bytes.data() + offset, *image, volume.values);
  const double second = seconds_per_unit(image->time_units);
  volume.first_time_s = second * static_cast<double>(image->toffset);
  volume.time_step_s = header.dim[0] > 3 ? second * static_cast<double>(image->dt) : 0;
  volume.name =
      std::string(image->intent_name, strnlen(image->intent_name, sizeof image->intent_name));
  volume.description = std::string(image->descrip, strnlen(image->descrip, sizeof image->descrip));
  split_description(volume);
  return volume;
}

}  // namespace headwater
