// Pictures of how the robot walked, start policy against adapted: attitude, path, terms of the return. See
// charts.h.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "tools/report/charts.h"
#include "tools/report/svg.h"

namespace pastern::tools {
namespace {

constexpr double kDegree = 3.14159265358979323846 / 180.0;
constexpr Pen kThin{"#b4b4b4", 0.8, ""};
constexpr Pen kStartBold{"#1a1a1a", 1.8, "5 2"};
constexpr Pen kAdaptedBold{"#1a1a1a", 1.8, ""};
constexpr Pen kLaneEdge{"#5a5a5a", 1.4, "10 4 2 4"};

using Walks = std::vector<const v1::Episode*>;
using Values = google::protobuf::RepeatedField<float>;
using Column = const Values& (v1::Trace::*)() const;

/// The walk whose return is in the middle (the lower of two); null for none.
const v1::Episode* middle(Walks walks) {
  if (walks.empty()) return nullptr;
  const auto place = walks.begin() + static_cast<std::ptrdiff_t>((walks.size() - 1) / 2);
  std::nth_element(walks.begin(), place, walks.end(),
                   [](const auto* a, const auto* b) { return a->terms().total() < b->terms().total(); });
  return *place;
}

std::vector<Point> curve_of(const v1::Trace& trace, Column x, Column y, double scale) {
  const Values& xs = (trace.*x)();
  const Values& ys = (trace.*y)();
  std::vector<Point> points;
  for (int i = 0; i < std::min(xs.size(), ys.size()); ++i) {
    points.push_back({static_cast<double>(xs[i]), scale * static_cast<double>(ys[i])});
  }
  return points;
}

std::string heading(const char* policy, const Walks& walks) {
  if (walks.empty()) return fmt::format("{}: did not walk", policy);
  return fmt::format("{}: {} walks; bold: walk {}", policy, walks.size(), middle(walks)->walk());
}

void hold_column(Range& range, const Walks& walks, Column column, double scale) {
  for (const v1::Episode* walk : walks) {
    for (const float value : (walk->trace().*column)()) range.hold(scale * static_cast<double>(value));
  }
}

void draw_all(Plot& plot, const Walks& walks, Column x, Column y, double scale, const Pen& bold) {
  for (const v1::Episode* walk : walks) plot.curve(curve_of(walk->trace(), x, y, scale), kThin);
  if (const v1::Episode* one = middle(walks)) plot.curve(curve_of(one->trace(), x, y, scale), bold);
}

}  // namespace

std::string attitude_chart(const Facts& facts) {
  const Walks before = facts.before();
  const Walks after = facts.after();
  if (before.empty()) return "";
  Sheet sheet(980, 412, "Roll and pitch before and after");
  Range time{0, 0.1};
  hold_column(time, before, &v1::Trace::time_s, 1);
  hold_column(time, after, &v1::Trace::time_s, 1);
  const auto row = [&](double top, const char* name, Column column) {
    Range y{-1, 1};
    hold_column(y, before, column, 1 / kDegree);
    hold_column(y, after, column, 1 / kDegree);
    const double most = std::min(std::max(-y.low, y.high), 60.0) * 1.05;
    const auto panel = [&](double left, const Walks& walks, const Pen& bold) {
      Plot plot(sheet, {left, top}, 410, 150, time, {-most, most});
      plot.axes(top > 100 ? "time, s" : "", left < 100 ? name : "");
      sheet.line(plot.at(time.low, 0), plot.at(time.high, 0), {"#9a9a9a", 1, ""});
      draw_all(plot, walks, &v1::Trace::time_s, column, 1 / kDegree, bold);
    };
    panel(60, before, kStartBold);
    panel(546, after, kAdaptedBold);
  };
  sheet.text({60, 16}, heading("start policy", before), Align::left, 12, true);
  sheet.text({546, 16}, heading("adapted policy", after), Align::left, 12, true);
  row(28, "roll, degrees", &v1::Trace::roll_rad);
  row(216, "pitch, degrees", &v1::Trace::pitch_rad);
  return sheet.svg();
}

std::string path_chart(const Facts& facts) {
  const Walks before = facts.before();
  const Walks after = facts.after();
  if (before.empty()) return "";
  Sheet sheet(980, 462, "Path from above, before and after");
  Range x{0, 0.5};
  Range y{-0.1, 0.1};
  for (const Walks& walks : {before, after}) {
    hold_column(x, walks, &v1::Trace::x_m, 1);
    hold_column(y, walks, &v1::Trace::y_m, 1);
  }
  const double lane = facts.robot ? facts.robot->lane().half_width_m() : 0;
  double most = std::max(-y.low, y.high) * 1.1;
  if (lane > 0 && lane < 1.6 * most) most = std::max(most, lane * 1.05);
  const auto panel = [&](double top, const char* name, const Walks& walks, const Pen& bold) {
    Plot plot(sheet, {60, top}, 890, 150, x.padded(0.02), {-most, most});
    plot.axes(top > 100 ? "along the lane, m" : "", "across, m");
    sheet.text({60, top - 10}, heading(name, walks), Align::left, 12, true);
    sheet.line({plot.x(x.padded(0.02).low), plot.y(0)}, {plot.x(x.padded(0.02).high), plot.y(0)},
               {"#9a9a9a", 1, ""});
    for (const double edge : {-lane, lane}) {
      if (lane > 0 && lane <= most) {
        sheet.line({plot.corner().x, plot.y(edge)}, {plot.corner().x + plot.width(), plot.y(edge)},
                   kLaneEdge);
      }
    }
    draw_all(plot, walks, &v1::Trace::x_m, &v1::Trace::y_m, 1, bold);
    for (const v1::Episode* walk : walks) {
      const int last = std::min(walk->trace().x_m_size(), walk->trace().y_m_size()) - 1;
      if (last < 0) continue;
      sheet.mark(
          walk->outcome() == v1::FELL ? Mark::cross : Mark::disc,
          plot.at(static_cast<double>(walk->trace().x_m(last)), static_cast<double>(walk->trace().y_m(last))),
          3.2);
    }
  };
  panel(26, "start policy", before, kStartBold);
  panel(236, "adapted policy", after, kAdaptedBold);
  const double scale = (150 / (2 * most)) / (890 / (x.padded(0.02).high - x.padded(0.02).low));
  sheet.text(
      {950, 452},
      fmt::format("left is up; scale across is {:.1f} times that along; dot: end of a walk, cross: fell{}",
                  scale, lane > 0 && lane <= most ? "; dash-dot: lane's edge" : ""),
      Align::right, 11);
  return sheet.svg();
}

std::string terms_chart(const Facts& facts) {
  const Walks before = facts.before();
  const Walks after = facts.after();
  if (before.empty()) return "";
  const v1::ReturnTerms a = means_of(before).terms;
  const v1::ReturnTerms b = means_of(after).terms;
  const std::vector<std::pair<std::string, std::pair<double, double>>> rows = {
      {"forward", {a.forward(), b.forward()}}, {"energy", {a.energy(), b.energy()}},
      {"drift", {a.drift(), b.drift()}},       {"turn", {a.turn(), b.turn()}},
      {"fall", {a.fall(), b.fall()}},          {"return", {a.total(), b.total()}}};
  Range x{0, 0};
  for (const auto& [name, values] : rows) x.hold(values.first), x.hold(values.second);
  Sheet sheet(980, 306, "Terms of the return, mean of a walk");
  Plot plot(sheet, {120, 8}, 790, 228, x.padded(0.09), {0, 6});
  plot.x_axis("mean of a walk, return units");
  for (std::size_t i = 0; i < rows.size(); ++i) {
    const double y = 8 + 38 * static_cast<double>(i);
    sheet.text({110, y + 23}, rows[i].first, Align::right, 12, rows[i].first == "return");
    const auto strip = [&](double value, double top, const char* fill, const Pen& pen) {
      const double from = std::min(plot.x(0), plot.x(value));
      sheet.box({from, top}, std::abs(plot.x(value) - plot.x(0)), 12, fill, pen);
      const bool right = value >= 0;
      sheet.text({plot.x(value) + (right ? 5 : -5), top + 10}, fmt::format("{:.2f}", value),
                 right ? Align::left : Align::right, 11);
    };
    strip(rows[i].second.first, y + 6, "#ffffff", {"#1a1a1a", 1.2, "4 2"});
    if (!after.empty()) strip(rows[i].second.second, y + 21, "#4a4a4a", {"#1a1a1a", 1.2, ""});
  }
  sheet.line({plot.x(0), 8}, {plot.x(0), 236}, {"#1a1a1a", 1, ""});
  sheet.box({120, 288}, 26, 11, "#ffffff", {"#1a1a1a", 1.2, "4 2"});
  sheet.text({154, 298}, "start policy");
  sheet.box({260, 288}, 26, 11, "#4a4a4a", {"#1a1a1a", 1.2, ""});
  sheet.text({294, 298}, after.empty() ? "adapted policy (did not walk)" : "adapted policy");
  return sheet.svg();
}

}  // namespace pastern::tools
