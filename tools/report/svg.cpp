// See svg.h.
#include "tools/report/svg.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace pastern::tools {
namespace {

constexpr const char* kInk = "#1a1a1a";
constexpr Pen kAxis{"#5a5a5a", 1, ""};
constexpr Pen kGrid{"#e4e4e4", 1, ""};

std::string stroke(const Pen& pen) {
  const std::string dash = *pen.dash == '\0' ? "" : fmt::format(" stroke-dasharray=\"{}\"", pen.dash);
  return fmt::format("stroke=\"{}\" stroke-width=\"{:g}\"{}", pen.colour, pen.width, dash);
}

const char* anchor(Align align) {
  switch (align) {
    case Align::left:
      return "start";
    case Align::middle:
      return "middle";
    case Align::right:
      return "end";
  }
  return "start";
}

std::string listed(const std::vector<Point>& points) {
  std::string list;
  for (const Point& point : points)
    list += fmt::format("{}{:.1f},{:.1f}", list.empty() ? "" : " ", point.x, point.y);
  return list;
}

/// Whole multiples of `step` in `range`.
std::vector<double> ticks_in(Range range, double step) {
  std::vector<double> ticks;
  const long last = std::lround(std::floor(range.high / step + 1e-9));
  for (long n = std::lround(std::ceil(range.low / step - 1e-9)); n <= last; ++n) {
    ticks.push_back(static_cast<double>(n) * step);
  }
  return ticks;
}

/// As few digits as the step needs; no minus before zero.
std::string tick_text(double value, double step) {
  const int digits = std::max(0, static_cast<int>(-std::floor(std::log10(step) + 1e-9)));
  const double clean = std::abs(value) < step / 1000 ? 0.0 : value;
  return fmt::format("{:.{}f}", clean, digits);
}

}  // namespace

std::string xml(const std::string& text) {
  std::string out;
  for (const char c : text) {
    switch (c) {
      case '&':
        out += "&amp;";
        break;
      case '<':
        out += "&lt;";
        break;
      case '>':
        out += "&gt;";
        break;
      case '"':
        out += "&quot;";
        break;
      default:
        out += static_cast<unsigned char>(c) < 0x20 && c != '\n' ? ' ' : c;
    }
  }
  return out;
}

Sheet::Sheet(double width, double height, std::string title)
    : width_(width), height_(height), title_(std::move(title)) {}

void Sheet::line(Point from, Point to, const Pen& pen) {
  body_ += fmt::format("<line x1=\"{:.1f}\" y1=\"{:.1f}\" x2=\"{:.1f}\" y2=\"{:.1f}\" {}/>\n", from.x, from.y,
                       to.x, to.y, stroke(pen));
}

void Sheet::path(const std::vector<Point>& points, const Pen& pen) {
  body_ += fmt::format("<polyline points=\"{}\" fill=\"none\" stroke-linejoin=\"round\" {}/>\n",
                       listed(points), stroke(pen));
}

void Sheet::moving_path(const std::vector<std::vector<Point>>& stills, double duration_s, const Pen& pen,
                        const char* fill) {
  if (stills.empty()) return;
  std::string values;
  for (const auto& still : stills) values += (values.empty() ? "" : ";") + listed(still);
  body_ += fmt::format(
      "<polyline points=\"{}\" fill=\"{}\" stroke-linejoin=\"round\" stroke-linecap=\"round\" {}>"
      "<animate attributeName=\"points\" dur=\"{:g}s\" repeatCount=\"indefinite\" "
      "values=\"{}\"/></polyline>\n",
      listed(stills.front()), fill, stroke(pen), duration_s, values);
}

void Sheet::box(Point corner, double width, double height, const char* fill, const Pen& pen) {
  body_ +=
      fmt::format("<rect x=\"{:.1f}\" y=\"{:.1f}\" width=\"{:.1f}\" height=\"{:.1f}\" fill=\"{}\" {}/>\n",
                  corner.x, corner.y, width, height, fill, stroke(pen));
}

void Sheet::mark(Mark mark, Point at, double size) {
  const double s = size;
  const auto shape = [&](const std::string& path, const char* fill, double pen) {
    body_ += fmt::format("<path d=\"{}\" fill=\"{}\" stroke=\"{}\" stroke-width=\"{:g}\"/>\n", path, fill,
                         kInk, pen);
  };
  const std::string circle = fmt::format("M{:.1f} {:.1f}a{:g} {:g} 0 1 0 {:g} 0a{:g} {:g} 0 1 0 {:g} 0z",
                                         at.x - s, at.y, s, s, 2 * s, s, s, -2 * s);
  const std::string square = fmt::format("M{:.1f} {:.1f}h{:g}v{:g}h{:g}z", at.x - s * 0.9, at.y - s * 0.9,
                                         1.8 * s, 1.8 * s, -1.8 * s);
  switch (mark) {
    case Mark::ring:
      shape(circle, "#ffffff", 1.4);
      break;
    case Mark::disc:
      shape(circle, "#8a8a8a", 0.6);
      break;
    case Mark::square:
      shape(square, "#ffffff", 1.4);
      break;
    case Mark::block:
      shape(square, kInk, 1.2);
      break;
    case Mark::cross:
      shape(fmt::format("M{:.1f} {:.1f}l{:g} {:g}m0 {:g}l{:g} {:g}", at.x - s, at.y - s, 2 * s, 2 * s, -2 * s,
                        -2 * s, 2 * s),
            "none", 2.4);
      break;
    case Mark::triangle:
      shape(fmt::format("M{:.1f} {:.1f}l{:g} {:g}h{:g}z", at.x, at.y - 1.2 * s, 1.2 * s, 2.1 * s, -2.4 * s),
            "#ffffff", 1.4);
      break;
    case Mark::diamond:
      shape(fmt::format("M{:.1f} {:.1f}l{:g} {:g}l{:g} {:g}l{:g} {:g}z", at.x, at.y - 1.3 * s, 1.3 * s,
                        1.3 * s, -1.3 * s, 1.3 * s, -1.3 * s, -1.3 * s),
            "#ffffff", 1.2);
      break;
  }
}

void Sheet::text(Point at, const std::string& words, Align align, double size, bool bold) {
  // Bold words may stand among marks: a white rim keeps them legible.
  body_ += fmt::format(
      "<text x=\"{:.1f}\" y=\"{:.1f}\" text-anchor=\"{}\" font-size=\"{:g}\"{}>{}</text>\n", at.x, at.y,
      anchor(align), size,
      bold ? " font-weight=\"600\" paint-order=\"stroke\" stroke=\"#fff\" stroke-width=\"4\"" : "",
      xml(words));
}

void Sheet::text_up(Point at, const std::string& words, double size) {
  body_ += fmt::format(
      "<text transform=\"translate({:.1f} {:.1f}) rotate(-90)\" text-anchor=\"middle\" "
      "font-size=\"{:g}\">{}</text>\n",
      at.x, at.y, size, xml(words));
}

std::string Sheet::svg() const {
  return fmt::format(
      "<svg viewBox=\"0 0 {:g} {:g}\" role=\"img\" fill=\"{}\">\n<title>{}</title>\n{}</svg>\n", width_,
      height_, kInk, xml(title_), body_);
}

std::string Sheet::file() const {
  return fmt::format(
      "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{0:g}\" height=\"{1:g}\" viewBox=\"0 0 {0:g} "
      "{1:g}\" "
      "role=\"img\" fill=\"{2}\" font-family=\"Liberation Sans, Arial, sans-serif\">\n<title>{3}</title>\n"
      "<rect width=\"100%\" height=\"100%\" fill=\"#ffffff\"/>\n{4}</svg>\n",
      width_, height_, kInk, xml(title_), body_);
}

void Range::hold(double value) {
  if (!std::isfinite(value)) return;
  low = std::min(low, value);
  high = std::max(high, value);
}

Range Range::padded(double share) const {
  const double room = high > low ? (high - low) * share : std::max(std::abs(high) * share, 1e-6);
  return {low - room, high + room};
}

double tick_step(Range range, int most) {
  const double wanted = (range.high - range.low) / most;
  const double power = std::pow(10.0, std::floor(std::log10(wanted)));
  for (const double factor : {1.0, 2.0, 5.0}) {
    if (factor * power >= wanted * (1 - 1e-9)) return factor * power;
  }
  return 10 * power;
}

Plot::Plot(Sheet& sheet, Point corner, double width, double height, Range x, Range y)
    : sheet_(sheet), corner_(corner), width_(width), height_(height), x_(x), y_(y) {
  if (!(x_.high > x_.low)) x_ = x_.padded(0.5);
  if (!(y_.high > y_.low)) y_ = y_.padded(0.5);
}

double Plot::x(double value) const { return corner_.x + width_ * (value - x_.low) / (x_.high - x_.low); }

double Plot::y(double value) const {
  const double clipped = std::isfinite(value) ? std::clamp(value, y_.low, y_.high) : y_.low;
  return corner_.y + height_ * (1 - (clipped - y_.low) / (y_.high - y_.low));
}

void Plot::axes(const std::string& x_name, const std::string& y_name, bool whole_x) {
  const double y_step = tick_step(y_, std::max(2, static_cast<int>(height_ / 32)));
  for (const double v : ticks_in(y_, y_step)) {
    sheet_.line({corner_.x, y(v)}, {corner_.x + width_, y(v)}, kGrid);
    sheet_.text({corner_.x - 6, y(v) + 4}, tick_text(v, y_step), Align::right, 11);
  }
  x_axis(x_name, whole_x);
  sheet_.line({corner_.x, corner_.y}, {corner_.x, corner_.y + height_}, kAxis);
  if (!y_name.empty()) sheet_.text_up({corner_.x - 42, corner_.y + height_ / 2}, y_name);
}

void Plot::x_axis(const std::string& name, bool whole) {
  double step = tick_step(x_, std::max(2, static_cast<int>(width_ / 70)));
  if (whole) step = std::max(1.0, step);
  const double bottom = corner_.y + height_;
  for (const double v : ticks_in(x_, step)) {
    sheet_.line({x(v), bottom}, {x(v), bottom + 4}, kAxis);
    sheet_.text({x(v), bottom + 17}, tick_text(v, step), Align::middle, 11);
  }
  sheet_.line({corner_.x, bottom}, {corner_.x + width_, bottom}, kAxis);
  if (!name.empty()) sheet_.text({corner_.x + width_ / 2, bottom + 34}, name, Align::middle);
}

void Plot::curve(const std::vector<Point>& data, const Pen& pen) {
  std::vector<Point> points;
  for (const Point& p : data) {
    if (std::isfinite(p.x) && std::isfinite(p.y)) points.push_back(at(p.x, p.y));
  }
  sheet_.path(points, pen);
}

}  // namespace pastern::tools
