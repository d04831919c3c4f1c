// SPDX-License-Identifier: GPL-3.0-or-later
// Draws pictures without a display and reads their pixels back.
#include "base_scratch.hpp"
#include "view/colour.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/view/source_picture.hpp>

#include <gtest/gtest.h>
#include <vtkImageData.h>
#include <vtkNew.h>
#include <vtkPNGReader.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <string>

namespace headwater {
namespace {

struct Pixels {
  vtkNew<vtkPNGReader> reader;
  int width = 0, height = 0;
  explicit Pixels(const std::filesystem::path& path) {
    reader->SetFileName(path.c_str());
    reader->Update();
    width = reader->GetOutput()->GetDimensions()[0];
    height = reader->GetOutput()->GetDimensions()[1];
  }
  /// Row 0 is the top.
  Oklab at(int x, int y) const {
    const auto* c = static_cast<const unsigned char*>(
        reader->GetOutput()->GetScalarPointer(x, height - 1 - y, 0));
    return to_oklab({c[0] / 255.0, c[1] / 255.0, c[2] / 255.0});
  }
};

struct Box {
  int left, top, right, bottom;  ///< right and bottom not included
  int width() const { return right - left; }
  int height() const { return bottom - top; }
};

/// Text and marks are grey; every colour of the brain has some chroma.
bool is_brain(const Oklab& c) {
  return std::hypot(c.a, c.b) > 0.007;
}
/// The upper half of the amplitude scale, shaded or not.
bool is_hot(const Oklab& c) {
  return c.a > 0.06;
}

/// The smallest box around the coloured pixels of a part of the picture.
Box brain_in(const Pixels& p, const Box& part) {
  Box box{part.right, part.bottom, part.left, part.top};
  for (int y = part.top; y < part.bottom; ++y)
    for (int x = part.left; x < part.right; ++x)
      if (is_brain(p.at(x, y)))
        box = {std::min(box.left, x), std::min(box.top, y), std::max(box.right, x + 1),
               std::max(box.bottom, y + 1)};
  return box;
}

/// The four views of a picture without title and marks: two columns left of 0.6 of the width, the
/// border between the rows where no brain is.
struct Views {
  Box left, right, top, front;
  explicit Views(const Pixels& p) {
    const int middle = static_cast<int>(0.31 * p.width), end = static_cast<int>(0.6 * p.width);
    const auto coloured = [&](int y) {
      for (int x = 0; x < end; ++x)
        if (is_brain(p.at(x, y))) return true;
      return false;
    };
    int y = 0;
    std::array<int, 4> edges{};  // of the two rows of brains
    for (std::size_t k = 0; k < edges.size(); ++k) {
      while (y < p.height && coloured(y) != (k % 2 == 0)) ++y;
      edges[k] = y;
    }
    left = brain_in(p, {0, edges[0], middle, edges[1]});
    right = brain_in(p, {middle, edges[0], end, edges[1]});
    top = brain_in(p, {0, edges[2], middle, edges[3]});
    front = brain_in(p, {middle, edges[2], end, edges[3]});
  }
};

template <typename Predicate>
int count(const Pixels& p, const Box& box, Predicate&& predicate) {
  int sum = 0;
  for (int y = box.top; y < box.bottom; ++y)
    for (int x = box.left; x < box.right; ++x) sum += predicate(p.at(x, y)) ? 1 : 0;
  return sum;
}

Box left_half(Box b) {
  b.right = b.left + b.width() / 2;
  return b;
}
Box right_half(Box b) {
  b.left = b.right - b.width() / 2;
  return b;
}

/// One hot point and its cold mirror image.
SourcePicture one_point(const Eigen::Vector3d& hot) {
  SourcePicture p;
  p.points_mni_mm.resize(3, 2);
  p.points_mni_mm << hot, hot.cwiseProduct(Eigen::Vector3d(-1, 1, 1));
  p.values = (Eigen::VectorXd(2) << 1, 0).finished();
  p.value_name = "amplitude";
  p.width_px = 1000;
  return p;
}

class ViewPicture : public testing::Test {
 protected:
  void SetUp() override { ::unsetenv("DISPLAY"); }
  std::filesystem::path file(const std::string& name) const { return scratch_.folder / name; }
  Scratch scratch_;
};

TEST_F(ViewPicture, LeftTemporalPointIsHotOnTheLeft) {
  write_source_picture(file("a.png"), one_point({-55, -20, 5}));
  const Pixels p(file("a.png"));
  EXPECT_EQ(p.width, 1000);
  const Views views(p);
  EXPECT_GT(count(p, views.left, is_hot), 500);
  EXPECT_EQ(count(p, views.right, is_hot), 0);
  EXPECT_GT(count(p, left_half(views.top), is_hot), 20);  // from above, left is on the left
  EXPECT_EQ(count(p, right_half(views.top), is_hot), 0);
  EXPECT_GT(count(p, right_half(views.front), is_hot), 20);  // face to face, it is on the right
  EXPECT_EQ(count(p, left_half(views.front), is_hot), 0);
}

// Anterior is on the viewer's left in the view from the left, and up in the view from above.
TEST_F(ViewPicture, LeftFrontalPointIsAnterior) {
  write_source_picture(file("a.png"), one_point({-40, 40, 15}));
  const Pixels p(file("a.png"));
  const Views views(p);
  EXPECT_GT(count(p, left_half(views.left), is_hot), 500);
  EXPECT_EQ(count(p, right_half(views.left), is_hot), 0);
  Box posterior = views.top;
  posterior.top = (posterior.top + posterior.bottom) / 2;
  EXPECT_GT(count(p, left_half(views.top), is_hot), 50);
  EXPECT_EQ(count(p, posterior, is_hot), 0);
}

TEST_F(ViewPicture, MirroredMapIsTheMirroredPicture) {
  const Eigen::Vector3d hot(-55, 10, 20);
  write_source_picture(file("a.png"), one_point(hot));
  write_source_picture(file("b.png"), one_point(hot.cwiseProduct(Eigen::Vector3d(-1, 1, 1))));
  const Pixels a(file("a.png")), b(file("b.png"));
  const Box left = Views(a).left, right = Views(b).right;
  ASSERT_NEAR(left.width(), right.width(), 1);
  ASSERT_NEAR(left.height(), right.height(), 1);
  // One pixel of shift at the slope of the colours: a mean difference below 0.01 in Oklab; the
  // wrong side would differ by 0.1 over the spot's tenth of the picture alone.
  double sum = 0;
  const int width = std::min(left.width(), right.width());
  const int height = std::min(left.height(), right.height());
  for (int y = 0; y < height; ++y)
    for (int x = 0; x < width; ++x) {
      const Oklab c = a.at(left.left + x, left.top + y);
      const Oklab d = b.at(right.right - 1 - x, right.top + y);
      sum += std::hypot(c.L - d.L, c.a - d.a, c.b - d.b);
    }
  EXPECT_LT(sum / width / height, 0.01);
}

TEST_F(ViewPicture, SameInputSameBytes) {
  SourcePicture p = one_point({-55, -20, 5});
  p.title = "Novel minus standard";
  p.marks = {{Eigen::Vector3d(-50, -20, 8), "A", "A  left HG", true}};
  p.channels = {"Cz", "Fz", "Pz", "C3", "C4"};
  p.directions.resize(3, 5);
  p.directions << 0, 0, 0, -0.7, 0.7, 0, 0.7, -0.7, 0, 0, 1, 0.7, 0.7, 0.7, 0.7;
  p.scalp_uV = (Eigen::VectorXd(5) << -3, -2, 1, 1.5, 2.5).finished();
  write_source_picture(file("a.png"), p);
  write_source_picture(file("b.png"), p);
  EXPECT_EQ(read_file(file("a.png"), "picture"), read_file(file("b.png"), "picture"));
}

TEST_F(ViewPicture, ScalpMapHasLeftOnTheLeft) {
  SourcePicture p = one_point({-55, -20, 5});
  p.channels = {"Cz", "Fz", "Pz", "C3", "C4"};
  p.directions.resize(3, 5);
  p.directions << 0, 0, 0, -0.7, 0.7, 0, 0.7, -0.7, 0, 0, 1, 0.7, 0.7, 0.7, 0.7;
  p.scalp_uV = (Eigen::VectorXd(5) << 0, 0, 0, 4, -4).finished();
  write_source_picture(file("a.png"), p);
  const Pixels pixels(file("a.png"));
  const int start = static_cast<int>(0.62 * pixels.width), end = pixels.width;
  const Box map = brain_in(pixels, {start, 0, end, pixels.height / 2});  // the bar stands lower
  const auto positive = [](const Oklab& c) { return c.b > 0.05; };
  const auto negative = [](const Oklab& c) { return c.b < -0.05; };
  EXPECT_GT(count(pixels, left_half(map), positive), 300);
  EXPECT_EQ(count(pixels, left_half(map), negative), 0);
  EXPECT_GT(count(pixels, right_half(map), negative), 300);
  EXPECT_EQ(count(pixels, right_half(map), positive), 0);
}

// A mark is nearly black; nothing else within the brain is.
TEST_F(ViewPicture, SideViewsShowTheMarksOfTheirOwnSide) {
  SourcePicture p = one_point({-55, -20, 5});
  p.values.setZero();
  const auto dark = [](const Oklab& c) { return c.L < 0.3; };
  p.marks = {{Eigen::Vector3d(50, -20, 8), "", "", false}};
  write_source_picture(file("a.png"), p);
  const Pixels pixels(file("a.png"));
  const Views views(pixels);
  EXPECT_EQ(count(pixels, views.left, dark), 0);
  EXPECT_GT(count(pixels, views.right, dark), 50);
  EXPECT_EQ(count(pixels, left_half(views.top), dark), 0);
  EXPECT_GT(count(pixels, right_half(views.top), dark), 20);
  EXPECT_GT(count(pixels, left_half(views.front), dark), 20);
  EXPECT_EQ(count(pixels, right_half(views.front), dark), 0);
}

TEST_F(ViewPicture, PrintsNothing) {
  testing::internal::CaptureStdout();
  testing::internal::CaptureStderr();
  write_source_picture(file("a.png"), one_point({-55, -20, 5}));
  EXPECT_EQ(testing::internal::GetCapturedStdout(), "");
  EXPECT_EQ(testing::internal::GetCapturedStderr(), "");
}

TEST_F(ViewPicture, MissingFontsAreNamed) {
  ::setenv("HEADWATER_FONT_FOLDER", "/nowhere", 1);
  const std::string problem = message_of<ResourceError>([&] {
    write_source_picture(file("a.png"), one_point({-55, -20, 5}));
  });
  ::unsetenv("HEADWATER_FONT_FOLDER");
  EXPECT_NE(problem.find("fonts-dejavu-core"), std::string::npos) << problem;
  EXPECT_NE(problem.find("/nowhere"), std::string::npos) << problem;
  EXPECT_FALSE(std::filesystem::exists(file("a.png")));
}

// In a process of its own: EGL is asked for its display once.
TEST_F(ViewPicture, MissingRendererIsNamed) {
  testing::FLAGS_gtest_death_test_style = "threadsafe";
  EXPECT_EXIT(
      {
        ::setenv("__EGL_VENDOR_LIBRARY_FILENAMES", "/nowhere/vendor.json", 1);
        try {
          write_source_picture(file("a.png"), one_point({-55, -20, 5}));
        } catch (const ResourceError& error) {
          std::fputs(error.what(), stderr);
          std::exit(static_cast<int>(error.trouble()));
        }
        std::exit(0);
      },
      testing::ExitedWithCode(static_cast<int>(Trouble::resource)), "libegl1");
}

TEST_F(ViewPicture, UnwritablePlaceIsNamed) {
  write_file(file("plain"), "a file, not a folder");
  const std::string problem = message_of<ResourceError>([&] {
    write_source_picture(file("plain") / "a.png", one_point({-55, -20, 5}));
  });
  EXPECT_NE(problem.find("plain"), std::string::npos) << problem;
}

}  // namespace
}  // namespace headwater
