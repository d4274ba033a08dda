// Pictures over the session: returns, heat and pack, the pairs of the confirmation. See charts.h.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <functional>

#include "tools/pastern/follow.h"
#include "tools/report/charts.h"
#include "tools/report/svg.h"

namespace pastern::tools {
namespace {

constexpr Pen kStartLine{"#6a6a6a", 1.8, "6 4"};
constexpr Pen kAdaptedLine{"#1a1a1a", 2.2, ""};
constexpr Pen kDivider{"#9a9a9a", 1, "2 3"};

Mark mark_of(v1::Part part) {
  switch (part) {
    case v1::SEARCH:
      return Mark::disc;
    case v1::CONFIRMATION_START:
      return Mark::square;
    case v1::CONFIRMATION_ADAPTED:
      return Mark::block;
    default:
      return Mark::ring;
  }
}

int stage(v1::Part part) {
  return part == v1::BASELINE ? 0 : part == v1::SEARCH ? 1 : part == v1::SINGLE ? 3 : 2;
}

const char* stage_name(int stage) {
  constexpr const char* kNames[] = {"baseline", "search", "confirmation", "single walks"};
  return kNames[stage];
}

/// Dotted lines between the session's parts, and their names above the plot.
void divide(Plot& plot, const std::vector<v1::Episode>& walks) {
  std::size_t first = 0;
  for (std::size_t i = 1; i <= walks.size(); ++i) {
    if (i < walks.size() && stage(walks[i].part()) == stage(walks[first].part())) continue;
    const double from = static_cast<double>(walks[first].walk()) - 0.5;
    const double to = static_cast<double>(walks[i - 1].walk()) + 0.5;
    plot.sheet().text({(plot.x(from) + plot.x(to)) / 2, plot.corner().y - 8},
                      stage_name(stage(walks[first].part())), Align::middle, 12, true);
    if (i < walks.size()) {
      plot.sheet().line({plot.x(to), plot.corner().y}, {plot.x(to), plot.corner().y + plot.height()},
                        kDivider);
    }
    first = i;
  }
}

/// Mean of some walks as a line across them, with its number at the end.
void mean_line(Plot& plot, const std::vector<const v1::Episode*>& walks, const Pen& pen, double label_shift) {
  if (walks.empty()) return;
  const double mean = means_of(walks).terms.total();
  const double from = static_cast<double>(walks.front()->walk()) - 0.5;
  const double to = static_cast<double>(walks.back()->walk()) + 0.5;
  plot.sheet().line({plot.x(from), plot.y(mean)}, {plot.x(to), plot.y(mean)}, pen);
  plot.sheet().text({plot.x(to) + 5, plot.y(mean) + 4 + label_shift}, fmt::format("{:.2f}", mean),
                    Align::left, 12, true);
}

void legend(Sheet& sheet, double x, double y, const std::vector<std::pair<Mark, std::string>>& entries) {
  for (const auto& [mark, words] : entries) {
    sheet.mark(mark, {x, y - 4});
    sheet.text({x + 10, y}, words);
    x += 34 + 6.6 * static_cast<double>(words.size());
  }
}

Range walk_range(const Facts& facts) {
  return {static_cast<double>(facts.walks.front().walk()) - 0.7,
          static_cast<double>(facts.walks.back().walk()) + 0.7};
}

}  // namespace

std::string returns_chart(const Facts& facts) {
  if (facts.walks.empty()) return "";
  Sheet sheet(980, 372, "Return of every walk of the session");
  Range y{0, 0};
  for (const v1::Episode& walk : facts.walks) {
    if (walk.outcome() != v1::VOID) y.hold(walk.terms().total());
  }
  y.low = std::max(y.low, -3.0);  // one fall far below must not flatten the rest; it is drawn at the edge
  Plot plot(sheet, {60, 28}, 866, 250, walk_range(facts), y.padded(0.06));
  plot.axes("walk", "return", true);
  divide(plot, facts.walks);
  for (const v1::Episode& walk : facts.walks) {
    const auto number = static_cast<double>(walk.walk());
    const Point at = plot.at(number, walk.terms().total());
    if (walk.outcome() == v1::VOID) {
      sheet.mark(Mark::diamond, {plot.x(number), plot.corner().y + plot.height() - 7}, 4);
    } else if (walk.outcome() == v1::FELL) {
      sheet.mark(Mark::cross, at, 5);
    } else if (walk.outcome() == v1::LEFT_LANE) {
      sheet.mark(Mark::triangle, at);
    } else {
      sheet.mark(mark_of(walk.part()), at);
    }
  }
  mean_line(plot, facts.counted(v1::BASELINE), kStartLine, 0);
  const auto start = facts.counted(v1::CONFIRMATION_START);
  const auto adapted = facts.counted(v1::CONFIRMATION_ADAPTED);
  const double apart = plot.y(means_of(start).terms.total()) - plot.y(means_of(adapted).terms.total());
  const double shift = std::abs(apart) < 13 ? (13 - std::abs(apart)) / 2 * (apart < 0 ? 1 : -1) : 0;
  mean_line(plot, start, kStartLine, -shift);
  mean_line(plot, adapted, kAdaptedLine, shift);
  legend(sheet, 66, 340,
         {{Mark::ring, "start policy, baseline"},
          {Mark::disc, "search"},
          {Mark::square, "confirmation, start policy"},
          {Mark::block, "confirmation, adapted policy"}});
  legend(sheet, 66, 362,
         {{Mark::cross, "fell"}, {Mark::triangle, "left the lane"}, {Mark::diamond, "void, does not count"}});
  sheet.line({430, 358}, {466, 358}, kStartLine);
  sheet.text({474, 362}, "mean, start policy");
  sheet.line({610, 358}, {646, 358}, kAdaptedLine);
  sheet.text({654, 362}, "mean, adapted policy");
  return sheet.svg();
}

std::string pairs_chart(const Facts& facts) {
  const std::vector<Pair> pairs = facts.pairs();
  if (pairs.empty()) return "";
  const double rows = static_cast<double>(pairs.size());
  Sheet sheet(980, 54 + 20 * (rows + 2), "Differences of the confirmation's pairs");
  Range x{0, 0};
  for (const Pair& pair : pairs) x.hold(pair.adapted - pair.start);
  const bool judged = facts.verdict && facts.verdict->pairs() > 0;
  if (judged) x.hold(facts.verdict->effect_low()), x.hold(facts.verdict->effect_high());
  Plot plot(sheet, {140, 10}, 780, 20 * (rows + 2), x.padded(0.08), {0, rows + 2});
  plot.x_axis("adapted less start policy, return of a walk");
  const double top = plot.corner().y;
  const double bottom = top + plot.height();
  sheet.line({plot.x(0), top}, {plot.x(0), bottom}, {"#1a1a1a", 1, ""});
  for (const Pair& pair : pairs) {
    const double y = top + 20 * (static_cast<double>(pair.number) - 0.5);
    const double difference = pair.adapted - pair.start;
    sheet.text({132, y + 4}, fmt::format("pair {}", pair.number), Align::right, 11);
    sheet.line({plot.x(0), y}, {plot.x(difference), y}, {"#8a8a8a", 1.2, ""});
    sheet.mark(difference >= 0 ? Mark::block : Mark::ring, {plot.x(difference), y}, 4);
  }
  if (judged) {
    const double y = top + 20 * (rows + 1);
    sheet.text({132, y + 4}, "mean, interval", Align::right, 12, true);
    sheet.line({plot.x(facts.verdict->effect_low()), y}, {plot.x(facts.verdict->effect_high()), y},
               {"#1a1a1a", 3, ""});
    for (const double end : {facts.verdict->effect_low(), facts.verdict->effect_high()}) {
      sheet.line({plot.x(end), y - 6}, {plot.x(end), y + 6}, {"#1a1a1a", 2, ""});
    }
    sheet.mark(Mark::diamond, {plot.x(facts.verdict->effect()), y}, 6);
  }
  return sheet.svg();
}

std::string heat_chart(const Facts& facts) {
  const auto first = std::find_if(facts.walks.begin(), facts.walks.end(), walked);
  if (first == facts.walks.end()) return "";
  Sheet sheet(980, 236, "Heat and pack over the session");
  const auto draw = [&](double left, const char* name, const std::function<double(const v1::Episode&)>& value,
                        Mark mark) {
    Range y{value(*first), value(*first)};
    std::vector<Point> curve;
    for (const v1::Episode& walk : facts.walks) {
      if (!walked(walk)) continue;
      y.hold(value(walk));
      curve.push_back({static_cast<double>(walk.walk()), value(walk)});
    }
    Plot plot(sheet, {left, 28}, 400, 160, walk_range(facts), y.padded(0.12));
    plot.axes("walk", name, true);
    divide(plot, facts.walks);
    plot.curve(curve, {"#6a6a6a", 1.2, ""});
    for (const Point& point : curve) sheet.mark(mark, plot.at(point.x, point.y), 2.2);
  };
  draw(
      60, "hottest winding, deg C", [](const v1::Episode& walk) { return walk.summary().winding_max_c(); },
      Mark::disc);
  draw(
      556, "lowest pack voltage, V", [](const v1::Episode& walk) { return walk.summary().pack_min_v(); },
      Mark::block);
  return sheet.svg();
}

}  // namespace pastern::tools
