// Side view, view from above, strip of stills.
#include "tools/draw/picture.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "tools/report/svg.h"

namespace pastern::tools {
namespace {

constexpr double kWide = 1200;  // px
constexpr double kMargin = 40;
constexpr double kMostScale = 260;     // px a metre
constexpr double kForceLength = 0.25;  // m of a bar as long as the robot is heavy
constexpr int kStrip = 10;
constexpr Pen kTrunkPen{"#1a1a1a", 2, ""};
constexpr Pen kLeftPen{"#1a1a1a", 3, ""};
constexpr Pen kRightPen{"#6a6a6a", 3, "5 4"};
constexpr Pen kForcePen{"#1a1a1a", 5, "1.5 1.5"};
constexpr Pen kGround{"#5a5a5a", 1.5, ""};
constexpr Pen kMarkPen{"#c8c8c8", 1, ""};
constexpr Pen kTrack{"#8a8a8a", 1.2, "2 3"};

/// Metres to the sheet: `across` is the axis that points up on paper (1: y, from above; 2: z, from the side).
struct View {
  double left_m{0};
  double scale{1};
  double x_px{0};
  double zero_px{0};  // where `across` is zero
  std::size_t across{2};

  [[nodiscard]] Point at(const Place& place) const {
    return {x_px + (place[0] - left_m) * scale, zero_px - place[across] * scale};
  }
};

std::vector<Point> line_of(const View& view, const std::vector<Place>& places) {
  std::vector<Point> points;
  for (const Place& place : places) points.push_back(view.at(place));
  return points;
}

Place middle(const Place& a, const Place& b) {
  return {(a[0] + b[0]) / 2, (a[1] + b[1]) / 2, (a[2] + b[2]) / 2};
}

/// The trunk's outline as seen: of its middle plane.
std::vector<Point> trunk_of(const View& view, const Still& still) {
  const auto& c = still.trunk;
  const unsigned other = view.across == 2 ? 2 : 4;  // corner bit of the axis that is looked along
  const unsigned up = view.across == 2 ? 4 : 2;
  std::vector<Point> outline;
  for (const unsigned corner : {0U, 1U, 1U | up, up, 0U}) {
    outline.push_back(view.at(middle(c[corner], c[corner | other])));
  }
  return outline;
}

/// A bar from the foot down into the ground, as long as the force is large.
std::vector<Point> force_of(const View& view, const DrawnLeg& leg, double weight_n) {
  const Point foot = view.at(leg.points.back());
  const double share = weight_n > 0 ? std::clamp(leg.force_n / weight_n, 0.0, 3.0) : 0;
  return {foot, {foot.x, foot.y + share * kForceLength * view.scale}};
}

void draw_still(Sheet& sheet, const View& view, const Scene& scene, const Still& still) {
  for (std::size_t l = 0; l < still.legs.size(); ++l) {
    if (scene.forces && view.across == 2) {
      sheet.path(force_of(view, still.legs[l], scene.weight_n), kForcePen);
    }
    sheet.path(line_of(view, still.legs[l].points), scene.left[l] ? kLeftPen : kRightPen);
  }
  sheet.path(trunk_of(view, still), kTrunkPen);
}

void draw_moving(Sheet& sheet, const View& view, const Scene& scene) {
  const double lasts = scene.period_s * static_cast<double>(scene.stills.size());
  for (std::size_t l = 0; l < scene.left.size(); ++l) {
    std::vector<std::vector<Point>> leg;
    std::vector<std::vector<Point>> force;
    for (const Still& still : scene.stills) {
      leg.push_back(line_of(view, still.legs[l].points));
      force.push_back(force_of(view, still.legs[l], scene.weight_n));
    }
    if (scene.forces && view.across == 2) sheet.moving_path(force, lasts, kForcePen);
    sheet.moving_path(leg, lasts, scene.left[l] ? kLeftPen : kRightPen);
  }
  std::vector<std::vector<Point>> trunk;
  for (const Still& still : scene.stills) trunk.push_back(trunk_of(view, still));
  sheet.moving_path(trunk, lasts, kTrunkPen);
}

void draw_track(Sheet& sheet, const View& view, const Scene& scene) {
  std::vector<Point> track;
  for (const Still& still : scene.stills) track.push_back(view.at(still.centre));
  sheet.path(track, kTrack);
}

/// Half metres along the lane, and the ground or the lane's middle.
void draw_lane(Sheet& sheet, const View& view, const Scene& scene, double from_m, double to_m) {
  const double rise = view.across == 2 ? std::tan(scene.slope_rad) : 0;
  const auto at = [&](double x) { return view.at({x, 0, rise * x}); };
  sheet.line(at(from_m), at(to_m), kGround);
  for (int n = static_cast<int>(std::ceil(from_m * 2)); n <= static_cast<int>(std::floor(to_m * 2)); ++n) {
    const Point point = at(0.5 * n);
    sheet.line({point.x, point.y}, {point.x, point.y + 6}, kGround);
    sheet.text({point.x, point.y + 20}, fmt::format("{:g} m", 0.5 * n), Align::middle, 11);
  }
}

struct Extent {
  Range along;
  Range aside;
  Range height;
};

Extent extent_of(const Scene& scene) {
  Extent extent{{0, 0}, {0, 0}, {0, 0}};
  for (const Still& still : scene.stills) {
    for (const Place& corner : still.trunk) {
      extent.along.hold(corner[0]);
      extent.aside.hold(corner[1]);
      extent.height.hold(corner[2]);
    }
    for (const DrawnLeg& leg : still.legs) {
      extent.along.hold(leg.points.back()[0]);
      extent.aside.hold(leg.points.back()[1]);
    }
  }
  return extent;
}

void draw_key(Sheet& sheet, double y, bool forces) {
  sheet.path({{kMargin, y}, {kMargin + 36, y}}, kLeftPen);
  sheet.text({kMargin + 44, y + 4}, "left legs");
  sheet.path({{kMargin + 130, y}, {kMargin + 166, y}}, kRightPen);
  sheet.text({kMargin + 174, y + 4}, "right legs");
  sheet.path({{kMargin + 260, y}, {kMargin + 296, y}}, kTrack);
  sheet.text({kMargin + 304, y + 4}, "path of the trunk");
  if (!forces) return;
  sheet.path({{kMargin + 440, y}, {kMargin + 476, y}}, kForcePen);
  sheet.text(
      {kMargin + 484, y + 4},
      fmt::format("force of the ground, along its normal: {:g} m of bar = the robot's weight", kForceLength));
}

/// The stills of the strip, side by side, each about the robot.
void draw_strip(Sheet& sheet, double top, double cell_height, const Scene& scene, const Extent& extent) {
  const double cell = (kWide - 2 * kMargin) / kStrip;
  const double scale = std::min(cell / 0.95, cell_height / (extent.height.high + 0.3));
  for (int n = 0; n < kStrip; ++n) {
    const auto i = static_cast<std::size_t>(
        std::lround(static_cast<double>(n) * static_cast<double>(scene.stills.size() - 1) / (kStrip - 1)));
    const Still& still = scene.stills[i];
    const double ground = std::tan(scene.slope_rad) * still.centre[0];
    const View view{still.centre[0] - cell / 2 / scale, scale, kMargin + cell * n,
                    top + cell_height - 0.28 * scale + ground * scale, 2};
    sheet.line({kMargin + cell * n, view.zero_px - ground * scale},
               {kMargin + cell * (n + 1) - 8, view.zero_px - ground * scale}, kMarkPen);
    draw_still(sheet, view, scene, still);
    sheet.text({kMargin + cell * (n + 0.5), top + cell_height + 16}, fmt::format("{:.2f} s", still.time_s),
               Align::middle, 12);
  }
}

}  // namespace

std::string picture_of(const Scene& scene) {
  const Extent extent = extent_of(scene);
  const double from = extent.along.low - 0.1;
  const double to = extent.along.high + 0.1;
  const double scale = std::min(kMostScale, (kWide - 2 * kMargin) / (to - from));
  const double facts = 46 + 18 * static_cast<double>(scene.lines.size());
  const double side_zero = facts + 40 + (extent.height.high + 0.1) * scale;
  const double side_end = side_zero + (kForceLength + 0.05) * scale + 40;
  const double above_top = side_end + 24;
  const double above_zero = above_top + (extent.aside.high + 0.1) * scale;
  const double above_end = above_zero + (0.1 - extent.aside.low) * scale + 40;
  const double strip_top = above_end + 30;
  const double strip_height = 150;
  const double height = strip_top + strip_height + 40;
  Sheet sheet(kWide, height, scene.title);
  sheet.text({kMargin, 34}, scene.title, Align::left, 20, true);
  for (std::size_t i = 0; i < scene.lines.size(); ++i) {
    sheet.text({kMargin, 54 + 18 * static_cast<double>(i)}, scene.lines[i], Align::left, 13);
  }
  draw_key(sheet, facts + 14, scene.forces);
  const View side{from, scale, kMargin, side_zero, 2};
  const View above{from, scale, kMargin, above_zero, 1};
  sheet.text({kMargin, facts + 40}, "From the side", Align::left, 14, true);
  draw_lane(sheet, side, scene, from, to);
  draw_track(sheet, side, scene);
  draw_moving(sheet, side, scene);
  sheet.text({kMargin, above_top - 6}, "From above, left is up", Align::left, 14, true);
  draw_lane(sheet, above, scene, from, to);
  draw_track(sheet, above, scene);
  draw_moving(sheet, above, scene);
  sheet.text({kMargin, strip_top - 6}, "Stills", Align::left, 14, true);
  draw_strip(sheet, strip_top, strip_height, scene, extent);
  return sheet.file();
}

}  // namespace pastern::tools
