#include "src/output/sheet.h"

#include <cairo/cairo-svg.h>
#include <cairo/cairo.h>

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <numbers>
#include <opencv2/imgproc.hpp>
#include <stdexcept>
#include <vector>

namespace focusfall {
namespace {

constexpr const char* kFont = "DejaVu Sans";        // Debian fonts-dejavu-core
constexpr double kLineSpacing = 1.35;
constexpr std::size_t kHeaderBytes = 33;            // PNG: signature (8) and the chunk IHDR (25)

using Surface = std::unique_ptr<cairo_surface_t, decltype(&cairo_surface_destroy)>;

// A Cairo surface over the bytes of a matrix, copied: Cairo wants rows of its own length.
Surface surface_of(const cv::Mat& bytes, cairo_format_t format) {
  Surface surface(cairo_image_surface_create(format, bytes.cols, bytes.rows), &cairo_surface_destroy);
  cairo_surface_flush(surface.get());
  unsigned char* target = cairo_image_surface_get_data(surface.get());
  const int stride = cairo_image_surface_get_stride(surface.get());
  const std::size_t row_bytes = static_cast<std::size_t>(bytes.cols) * bytes.elemSize();
  for (int row = 0; row < bytes.rows; ++row) {
    std::copy_n(bytes.ptr<unsigned char>(row), row_bytes, target + static_cast<std::ptrdiff_t>(row) * stride);
  }
  cairo_surface_mark_dirty(surface.get());
  return surface;
}

cairo_status_t append(void* text, const unsigned char* data, unsigned int length) {
  static_cast<std::string*>(text)->append(reinterpret_cast<const char*>(data), length);
  return CAIRO_STATUS_SUCCESS;
}

// CRC-32 as the PNG specification (W3C, second edition, annex D) has it.
std::uint32_t png_crc(std::string_view bytes) {
  std::uint32_t crc = 0xFFFFFFFF;
  for (const char byte : bytes) {
    crc ^= static_cast<unsigned char>(byte);
    for (int bit = 0; bit < 8; ++bit) crc = (crc & 1) != 0 ? 0xEDB88320 ^ (crc >> 1) : crc >> 1;
  }
  return crc ^ 0xFFFFFFFF;
}

std::string big_endian(std::uint32_t number) {
  std::string bytes;
  for (int shift = 24; shift >= 0; shift -= 8) bytes += static_cast<char>(number >> shift & 0xFF);
  return bytes;
}

// Clause 11.3.4.3: keyword, a zero byte, the text.
std::string text_chunk(std::string_view mark) {
  std::string content("tEXtSoftware");
  content += '\0';
  content += mark;
  return big_endian(static_cast<std::uint32_t>(content.size() - 4)) + content + big_endian(png_crc(content));
}

// Black diagonal lines on a white veil, so that they show on any ground and the picture is still seen.
Surface hatching() {
  constexpr int kPeriodPx = 10, kLinePx = 2;
  constexpr std::uint8_t kVeil = 150;   // of 255, premultiplied
  cv::Mat tile(kPeriodPx, kPeriodPx, CV_8UC4);
  for (int y = 0; y < kPeriodPx; ++y) {
    for (int x = 0; x < kPeriodPx; ++x) {
      const bool on_line = (x + y) % kPeriodPx < kLinePx;
      tile.at<cv::Vec4b>(y, x) = on_line ? cv::Vec4b(0, 0, 0, 255) : cv::Vec4b(kVeil, kVeil, kVeil, kVeil);
    }
  }
  return surface_of(tile, CAIRO_FORMAT_ARGB32);
}

}  // namespace

struct Sheet::Cairo {
  std::string lines;   // of an SVG as it grows; outlives the surface
  Surface surface;
  std::unique_ptr<cairo_t, decltype(&cairo_destroy)> context;

  Cairo(int width, int height, SheetForm form)
      : surface(form == SheetForm::pixels ? cairo_image_surface_create(CAIRO_FORMAT_RGB24, width, height)
                                          : cairo_svg_surface_create_for_stream(append, &lines, width, height),
                &cairo_surface_destroy),
        context(nullptr, &cairo_destroy) {
    if (form == SheetForm::lines) cairo_svg_surface_set_document_unit(surface.get(), CAIRO_SVG_UNIT_PX);
    context.reset(cairo_create(surface.get()));
  }

  cairo_t* get() const { return context.get(); }

  void ink(double grey) const { cairo_set_source_rgb(get(), grey, grey, grey); }

  // Strokes the current path, the casing first.
  void stroke(const Stroke& s) const {
    cairo_set_line_join(get(), CAIRO_LINE_JOIN_ROUND);
    if (s.casing_px > 0) {
      cairo_set_dash(get(), nullptr, 0, 0);
      cairo_set_line_cap(get(), CAIRO_LINE_CAP_ROUND);
      cairo_set_source_rgba(get(), 1, 1, 1, 0.85);
      cairo_set_line_width(get(), s.width_px + 2 * s.casing_px);
      cairo_stroke_preserve(get());
    }
    const double dashes[] = {s.dash_px, s.gap_px};
    cairo_set_dash(get(), dashes, s.dash_px > 0 ? 2 : 0, 0);
    cairo_set_line_cap(get(), CAIRO_LINE_CAP_BUTT);
    ink(s.grey);
    cairo_set_line_width(get(), s.width_px);
    cairo_stroke(get());
    cairo_set_dash(get(), nullptr, 0, 0);
  }

  void font(const Lettering& l) const {
    cairo_select_font_face(get(), kFont, CAIRO_FONT_SLANT_NORMAL,
                           l.bold ? CAIRO_FONT_WEIGHT_BOLD : CAIRO_FONT_WEIGHT_NORMAL);
    cairo_set_font_size(get(), l.size_px);
  }
};

Sheet::Sheet(int width_px, int height_px, SheetForm form) : cairo_(std::make_unique<Cairo>(width_px, height_px, form)) {
  if (cairo_status(cairo_->get()) != CAIRO_STATUS_SUCCESS) {
    throw std::runtime_error(std::string("a picture cannot be drawn: ") +
                             cairo_status_to_string(cairo_status(cairo_->get())));
  }
  cairo_->ink(1);
  cairo_paint(cairo_->get());
}

Sheet::~Sheet() = default;

void Sheet::picture(const cv::Mat& grey, SheetPoint at, double lightened) {
  cv::Mat light, colour;
  grey.convertTo(light, CV_8U, 1 - lightened, 255 * lightened);
  // Sixty-four greys are all that is seen under the lines; the file is half as large for it.
  cv::bitwise_or(light, cv::Scalar(3), light);
  cv::cvtColor(light, colour, cv::COLOR_GRAY2BGRA);
  const Surface surface = surface_of(colour, CAIRO_FORMAT_RGB24);
  cairo_set_source_surface(cairo_->get(), surface.get(), at.x, at.y);
  cairo_paint(cairo_->get());
}

void Sheet::line(std::span<const SheetPoint> points, const Stroke& stroke) {
  if (points.size() < 2) return;
  cairo_new_path(cairo_->get());
  for (const SheetPoint& point : points) cairo_line_to(cairo_->get(), point.x, point.y);
  const SheetPoint &first = points.front(), &last = points.back();
  if (first.x == last.x && first.y == last.y) cairo_close_path(cairo_->get());
  cairo_->stroke(stroke);
}

void Sheet::box(const SheetBox& box, const Stroke& stroke) {
  cairo_new_path(cairo_->get());
  cairo_rectangle(cairo_->get(), box.x, box.y, box.width, box.height);
  cairo_->stroke(stroke);
}

void Sheet::dot(SheetPoint centre, double diameter_px, bool filled, double grey) {
  constexpr double kRingPx = 1.4;
  cairo_new_path(cairo_->get());
  cairo_arc(cairo_->get(), centre.x, centre.y, diameter_px / 2, 0, 2 * std::numbers::pi);
  cairo_->ink(filled ? grey : 1);
  cairo_fill_preserve(cairo_->get());
  cairo_->ink(grey);
  cairo_set_line_width(cairo_->get(), kRingPx);
  cairo_stroke(cairo_->get());
}

void Sheet::fill(const SheetBox& box, double grey) {
  cairo_new_path(cairo_->get());
  cairo_rectangle(cairo_->get(), box.x, box.y, box.width, box.height);
  cairo_->ink(grey);
  cairo_fill(cairo_->get());
}

void Sheet::hatch(const cv::Mat& mask, SheetPoint at) {
  cairo_t* context = cairo_->get();
  // The border: what a slightly larger mask has more, in black, under the hatching.
  cv::Mat larger;
  cv::dilate(mask, larger, cv::getStructuringElement(cv::MORPH_RECT, {3, 3}));
  const Surface border = surface_of(larger - mask, CAIRO_FORMAT_A8);
  cairo_->ink(0);
  cairo_mask_surface(context, border.get(), at.x, at.y);
  const Surface area = surface_of(mask, CAIRO_FORMAT_A8);
  const Surface pattern = hatching();
  cairo_set_source_surface(context, pattern.get(), 0, 0);
  cairo_pattern_set_extend(cairo_get_source(context), CAIRO_EXTEND_REPEAT);
  cairo_mask_surface(context, area.get(), at.x, at.y);
}

void Sheet::arrow(SheetPoint centre, SheetPoint half, const Stroke& stroke) {
  const double length = std::hypot(half.x, half.y);
  if (length <= 0) return;
  constexpr double kHeadPx = 9, kHeadWidth = 0.5;
  const SheetPoint along{half.x / length, half.y / length};
  cairo_t* context = cairo_->get();
  cairo_new_path(context);
  cairo_move_to(context, centre.x - half.x, centre.y - half.y);
  cairo_line_to(context, centre.x + half.x, centre.y + half.y);
  for (const double sign : {-1.0, 1.0}) {
    const SheetPoint tip{centre.x + sign * half.x, centre.y + sign * half.y};
    const SheetPoint foot{tip.x - sign * along.x * kHeadPx, tip.y - sign * along.y * kHeadPx};
    const SheetPoint across{-along.y * kHeadPx * kHeadWidth, along.x * kHeadPx * kHeadWidth};
    cairo_move_to(context, foot.x + across.x, foot.y + across.y);
    cairo_line_to(context, tip.x, tip.y);
    cairo_line_to(context, foot.x - across.x, foot.y - across.y);
  }
  cairo_->stroke(stroke);
}

void Sheet::text(std::string_view words, SheetPoint at, const Lettering& lettering) {
  cairo_t* context = cairo_->get();
  const std::string text(words);
  cairo_->font(lettering);
  cairo_new_path(context);
  cairo_move_to(context, at.x, at.y);
  if (lettering.casing) {
    cairo_text_path(context, text.c_str());
    cairo_set_source_rgba(context, 1, 1, 1, 0.9);
    cairo_set_line_width(context, lettering.size_px * 0.3);
    cairo_set_line_join(context, CAIRO_LINE_JOIN_ROUND);
    cairo_stroke(context);
    cairo_move_to(context, at.x, at.y);
  }
  cairo_->ink(lettering.grey);
  cairo_show_text(context, text.c_str());
  cairo_new_path(context);
}

void Sheet::upright_text(std::string_view words, SheetPoint at, const Lettering& lettering) {
  cairo_save(cairo_->get());
  cairo_translate(cairo_->get(), at.x, at.y);
  cairo_rotate(cairo_->get(), -std::numbers::pi / 2);
  text(words, {0, 0}, lettering);
  cairo_restore(cairo_->get());
}

double Sheet::text_width_px(std::string_view words, const Lettering& lettering) const {
  cairo_->font(lettering);
  cairo_text_extents_t extents{};
  cairo_text_extents(cairo_->get(), std::string(words).c_str(), &extents);
  return extents.x_advance;
}

double Sheet::paragraph(std::string_view words, const SheetBox& room, const Lettering& lettering) {
  std::string line;
  double y = room.y;
  const auto finish = [&] {
    if (y <= room.y + room.height) text(line, {room.x, y}, lettering);
    y += lettering.size_px * kLineSpacing;
    line.clear();
  };
  while (!words.empty()) {
    const auto blank = words.find(' ');
    const std::string word(words.substr(0, blank));
    words.remove_prefix(blank == std::string_view::npos ? words.size() : blank + 1);
    const std::string longer = line.empty() ? word : line + " " + word;
    if (!line.empty() && text_width_px(longer, lettering) > room.width) {
      finish();
      line = word;
    } else {
      line = longer;
    }
  }
  if (!line.empty()) finish();
  return y;
}

void Sheet::clip(const SheetBox& box) {
  cairo_save(cairo_->get());
  cairo_new_path(cairo_->get());
  cairo_rectangle(cairo_->get(), box.x, box.y, box.width, box.height);
  cairo_clip(cairo_->get());
}

void Sheet::unclip() { cairo_restore(cairo_->get()); }

std::string Sheet::png(std::string_view mark) const {
  std::string bytes;
  cairo_surface_flush(cairo_->surface.get());
  const cairo_status_t status = cairo_surface_write_to_png_stream(cairo_->surface.get(), append, &bytes);
  if (status != CAIRO_STATUS_SUCCESS || bytes.size() < kHeaderBytes) {
    throw std::runtime_error(std::string("a PNG cannot be made: ") + cairo_status_to_string(status));
  }
  return bytes.insert(kHeaderBytes, text_chunk(mark));
}

std::string Sheet::svg(std::string_view mark) {
  cairo_surface_finish(cairo_->surface.get());
  const cairo_status_t status = cairo_surface_status(cairo_->surface.get());
  const auto end_of_declaration = cairo_->lines.find("?>");
  if (status != CAIRO_STATUS_SUCCESS || end_of_declaration == std::string::npos) {
    throw std::runtime_error(std::string("a drawing cannot be written: ") + cairo_status_to_string(status));
  }
  std::string file = cairo_->lines;
  return file.insert(end_of_declaration + 2, "\n<!-- " + std::string(mark) + " -->");
}

bool is_marked_svg(std::string_view first_bytes, std::string_view mark) {
  return first_bytes.starts_with("<?xml") &&
         first_bytes.find("<!-- " + std::string(mark) + " -->") != std::string_view::npos;
}

bool is_marked_png(std::string_view first_bytes, std::string_view mark) {
  const std::string chunk = text_chunk(mark);
  return first_bytes.starts_with("\x89PNG\r\n\x1a\n") && first_bytes.size() >= kHeaderBytes + chunk.size() &&
         first_bytes.substr(kHeaderBytes, chunk.size()) == chunk;
}

}  // namespace focusfall
