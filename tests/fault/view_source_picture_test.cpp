// SPDX-License-Identifier: GPL-3.0-or-later
#include "base_scratch.hpp"

#include <headwater/base/error.hpp>
#include <headwater/view/source_picture.hpp>

#include <gtest/gtest.h>

#include <cmath>
#include <cstdlib>
#include <limits>
#include <string>

namespace headwater {
namespace {

SourcePicture small_picture() {
  SourcePicture p;
  p.points_mni_mm = Eigen::Vector3d(-55, -20, 5);
  p.values = Eigen::VectorXd::Ones(1);
  p.value_name = "amplitude";
  return p;
}

std::string problem_of(const SourcePicture& picture) {
  return message_of<ExperimentError>([&] { write_source_picture("unwritten.png", picture); });
}

TEST(ViewSourcePicture, ListsEveryProblemAtOnce) {
  SourcePicture p = small_picture();
  p.values = (Eigen::VectorXd(2) << 1, -2).finished();
  p.spacing_mm = 0.007;
  p.width_px = 10;
  p.marks = {{Eigen::Vector3d(0, std::nan(""), 0), "M", "", false}};
  const std::string problem = problem_of(p);
  for (const char* part : {"1 source points but 2 values", "source value 2 is -2", "0.007 mm",
                           "mark 'M'", "width of 10 px"})
    EXPECT_NE(problem.find(part), std::string::npos) << part << " in:\n" << problem;
}

TEST(ViewSourcePicture, NamesWhatIsNotFinite) {
  SourcePicture p = small_picture();
  p.values(0) = std::numeric_limits<double>::infinity();
  EXPECT_NE(problem_of(p).find("source values: column 1"), std::string::npos);
  p = small_picture();
  p.points_mni_mm(2, 0) = std::nan("");
  EXPECT_NE(problem_of(p).find("source points: column 1"), std::string::npos);
}

TEST(ViewSourcePicture, WantsPoints) {
  SourcePicture p;
  EXPECT_NE(problem_of(p).find("no source points"), std::string::npos);
}

TEST(ViewSourcePicture, ScalpMapNeedsAgreeingChannels) {
  SourcePicture p = small_picture();
  p.channels = {"Fz", "Cz", "Pz", "Oz"};
  p.directions = Eigen::Matrix3Xd::Identity(3, 3);
  p.scalp_uV = Eigen::VectorXd::Zero(4);
  EXPECT_NE(problem_of(p).find("4 channels, 3 electrode directions, 4 scalp values"),
            std::string::npos);
  p.directions.resize(3, 4);
  p.directions << 0, 0, 0, 0, 1, 0, 2, 0, 1, 1, 2, 0;
  const std::string problem = problem_of(p);
  EXPECT_NE(problem.find("channels Fz and Pz lie at the same place"), std::string::npos) << problem;
  EXPECT_NE(problem.find("channel Oz: its direction has no length"), std::string::npos) << problem;
}

TEST(ViewSourcePicture, SaysWhereTheModuleIsMissing) {
  const Scratch scratch;
  ::setenv("HEADWATER_VIEW_MODULE", "/nowhere/headwater_view.so", 1);
  const std::string problem = message_of<ResourceError>(
      [&] { write_source_picture(scratch.folder / "a.png", small_picture()); });
  ::unsetenv("HEADWATER_VIEW_MODULE");
  EXPECT_NE(problem.find("/nowhere/headwater_view.so"), std::string::npos) << problem;
  EXPECT_NE(problem.find("libegl1"), std::string::npos) << problem;
  EXPECT_FALSE(std::filesystem::exists(scratch.folder / "a.png"));
}

}  // namespace
}  // namespace headwater
