// Paper and ink: what the program draws with. Wraps Cairo; lines and letters carry a white casing, so that they read
// on light and dark ground and in print.
#pragma once

#include <memory>
#include <opencv2/core.hpp>
#include <span>
#include <string>
#include <string_view>

namespace focusfall {

struct SheetPoint {
  double x = 0, y = 0;
};

struct SheetBox {
  double x = 0, y = 0, width = 0, height = 0;
};

struct Stroke {
  double width_px = 1.6;
  double dash_px = 0;          // 0: a whole line
  double gap_px = 0;
  double casing_px = 1.4;      // white on each side
  double grey = 0;             // 0 black .. 1 white
};

struct Lettering {
  double size_px = 15;
  bool bold = false;
  bool casing = false;
  double grey = 0;
};

// Pixels that become a PNG, or lines that become an SVG.
enum class SheetForm { pixels, lines };

class Sheet {
 public:
  Sheet(int width_px, int height_px, SheetForm form = SheetForm::pixels);
  ~Sheet();
  Sheet(const Sheet&) = delete;
  Sheet& operator=(const Sheet&) = delete;

  // A grey picture, lightened: 0 as it is .. 1 white.
  void picture(const cv::Mat& grey, SheetPoint at, double lightened);
  void line(std::span<const SheetPoint> points, const Stroke& stroke);
  void box(const SheetBox& box, const Stroke& stroke);
  void fill(const SheetBox& box, double grey);
  // Diagonal hatching wherever the mask is set, and a line around it.
  void hatch(const cv::Mat& mask, SheetPoint at);
  // Two-headed arrow around a centre.
  void arrow(SheetPoint centre, SheetPoint half, const Stroke& stroke);

  // Valid UTF-8 only. `at` is the start of the base line.
  void text(std::string_view words, SheetPoint at, const Lettering& lettering);
  double text_width_px(std::string_view words, const Lettering& lettering) const;
  // In lines no wider than `width_px`; returns the base line below the last.
  double paragraph(std::string_view words, const SheetBox& room, const Lettering& lettering);

  // What is drawn from here on stays inside the box, until unclip().
  void clip(const SheetBox& box);
  void unclip();

  // A disc of this diameter, filled or as a ring.
  void dot(SheetPoint centre, double diameter_px, bool filled, double grey);
  // Words that run upwards; `at` is the start of their base line.
  void upright_text(std::string_view words, SheetPoint at, const Lettering& lettering);

  // The sheet as a PNG file that carries the text chunk "Software: <mark>".
  std::string png(std::string_view mark) const;

  // The sheet as an SVG file that carries the comment "<mark>"; nothing can be drawn any more. Lines only.
  std::string svg(std::string_view mark);

 private:
  struct Cairo;
  std::unique_ptr<Cairo> cairo_;
};

// Whether these are the first bytes of a PNG that Sheet::png() wrote with `mark`.
bool is_marked_png(std::string_view first_bytes, std::string_view mark);
inline constexpr std::size_t kMarkBytes = 256;   // so many bytes are enough for is_marked_png() and is_marked_svg()

// The same for Sheet::svg().
bool is_marked_svg(std::string_view first_bytes, std::string_view mark);

}  // namespace focusfall
