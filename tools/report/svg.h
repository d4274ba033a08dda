// Pictures as inline SVG, drawn by ourselves: lines, marks told apart by shape, axes. Coordinates in user
// units, y down.
#pragma once

#include <string>
#include <utility>
#include <vector>

namespace pastern::tools {

/// Text for XML: & < > " and control characters made harmless.
[[nodiscard]] std::string xml(const std::string& text);

struct Point {
  double x{0};
  double y{0};
};

struct Pen {
  const char* colour{"#1a1a1a"};
  double width{1.5};
  const char* dash{""};  ///< SVG's stroke-dasharray
};

/// Told apart by shape and fill, never by colour alone.
enum class Mark { ring, disc, square, block, cross, triangle, diamond };

enum class Align { left, middle, right };

class Sheet {
 public:
  /// `title` is read aloud by screen readers.
  Sheet(double width, double height, std::string title);
  void line(Point from, Point to, const Pen& pen);
  void path(const std::vector<Point>& points, const Pen& pen);
  /// A path that moves: its points at equal times of `duration_s`, over and over; all of the same number.
  void moving_path(const std::vector<std::vector<Point>>& stills, double duration_s, const Pen& pen,
                   const char* fill = "none");
  void box(Point corner, double width, double height, const char* fill, const Pen& pen);
  void mark(Mark mark, Point at, double size = 4.5);
  void text(Point at, const std::string& words, Align align = Align::left, double size = 12,
            bool bold = false);
  /// Written upwards.
  void text_up(Point at, const std::string& words, double size = 12);
  [[nodiscard]] std::string svg() const;
  /// The same as a file of its own: namespace, size, white paper, fonts.
  [[nodiscard]] std::string file() const;

 private:
  double width_;
  double height_;
  std::string title_;
  std::string body_;
};

struct Range {
  double low{0};
  double high{1};
  /// Grown to hold `value`; what is not finite is left out.
  void hold(double value);
  [[nodiscard]] Range padded(double share) const;
};

/// A plot's area on a sheet: maps data to the sheet and draws axes with round numbers.
class Plot {
 public:
  Plot(Sheet& sheet, Point corner, double width, double height, Range x, Range y);
  /// Ticks, numbers and names. `whole_x`: only whole numbers along x.
  void axes(const std::string& x_name, const std::string& y_name, bool whole_x = false);
  void x_axis(const std::string& name, bool whole = false);
  [[nodiscard]] double x(double value) const;
  [[nodiscard]] double y(double value) const;  ///< clipped to the plot's area
  [[nodiscard]] Point at(double x_value, double y_value) const { return {x(x_value), y(y_value)}; }
  [[nodiscard]] Point corner() const { return corner_; }
  [[nodiscard]] double width() const { return width_; }
  [[nodiscard]] double height() const { return height_; }
  [[nodiscard]] Range y_range() const { return y_; }
  [[nodiscard]] Sheet& sheet() { return sheet_; }
  void curve(const std::vector<Point>& data, const Pen& pen);

 private:
  Sheet& sheet_;
  Point corner_;
  double width_;
  double height_;
  Range x_;
  Range y_;
};

/// 1, 2 or 5 times a power of ten, so that `range` has at most `most` ticks.
[[nodiscard]] double tick_step(Range range, int most);

}  // namespace pastern::tools
