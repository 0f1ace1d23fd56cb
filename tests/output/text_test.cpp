// Text for terminals and spreadsheets: what must never get through, and how numbers read.
#include <gmock/gmock.h>

#include "src/output/csv.h"
#include "src/output/frame_text.h"
#include "src/output/progress.h"
#include "src/output/quantity_text.h"
#include "src/output/visible_text.h"
#include "tests/output/sample_record.h"

namespace focusfall {
namespace {

TEST(VisibleText, EscapesWhatActsOnATerminal) {
  EXPECT_EQ(visible_text("a\x1b[31mb"), "a\\x1b[31mb");
  EXPECT_EQ(visible_text("a\nb\tc\rd"), "a\\nb\\tc\\rd");
  EXPECT_EQ(visible_text(std::string("\x7f\0", 2)), "\\x7f\\x00");
  EXPECT_EQ(visible_text("\xC2\x9B"), "\\u{9b}");              // the one-character CSI
  EXPECT_EQ(visible_text("\xE2\x80\xAE" "gpj"), "\\u{202e}gpj");   // right-to-left override
}

TEST(VisibleText, ShowsBytesThatAreNoUtf8AndKeepsWhatIs) {
  EXPECT_EQ(visible_text("\xff\xc0\xaf"), "\\xff\\xc0\\xaf");
  EXPECT_EQ(visible_text("See \xC3\xA4\xE6\xB9\x96"), "See \xC3\xA4\xE6\xB9\x96");
}

TEST(CsvCell, CannotBecomeAFormula) {
  for (const char* text : {"=1+1", "+1", "-1", "@SUM(A1)", "\tx", "\rx"}) {
    const std::string cell = csv_text_cell(text);
    EXPECT_TRUE(cell.starts_with('\'') || cell.starts_with("\"'")) << text;
  }
  EXPECT_EQ(csv_text_cell("boat-27.jpg"), "boat-27.jpg");
}

TEST(CsvCell, QuotesCommasQuotesAndLines) {
  EXPECT_EQ(csv_text_cell("a,b"), "\"a,b\"");
  EXPECT_EQ(csv_text_cell("a\"b"), "\"a\"\"b\"");
  EXPECT_EQ(csv_text_cell("a\nb"), "\"a\nb\"");
}

TEST(FrameText, KeepsWithinTheTerminal) {
  for (const int columns : {60, 80, 120, 200}) {
    const std::string text = frame_text(sample_record(), {.columns = columns, .path_columns = 30});
    std::size_t start = 0;
    for (std::size_t end = text.find('\n'); end != std::string::npos; start = end + 1, end = text.find('\n', start)) {
      EXPECT_LE(text_columns(text.substr(start, end - start)), columns) << text.substr(start, end - start);
    }
  }
}

TEST(FrameText, HidesControlBytesOfCaptureData) {
  FrameRecord record = sample_record();
  record.capture->camera->value = "Evil\x1b]0;title\x07";
  record.verdict->summary = "a\x1b[2Jb";
  for (const std::string& text : {frame_text(record, {}), brief_text(record, {})}) {
    EXPECT_EQ(text.find('\x1b'), std::string::npos);
    EXPECT_EQ(text.find('\x07'), std::string::npos);
  }
}

TEST(Quantities, ReadAsAPersonWritesThem) {
  EXPECT_EQ(time_text(1.0 / 2000), "1/2000 s");
  EXPECT_EQ(time_text(0.5), "0.5 s");
  EXPECT_EQ(time_text(30), "30 s");
  EXPECT_EQ(f_number_text(2.8), "f/2.8");
  EXPECT_EQ(f_number_text(11), "f/11");
  EXPECT_EQ(f_number_text(2), "f/2");
  EXPECT_EQ(distance_range_text(29.41, 30.61), "29.4 to 30.6 m");
  EXPECT_EQ(percent_text(0.0004), "less than 0.1 %");
  EXPECT_EQ(percent_text(0.47), "47 %");
}

TEST(ProgressText, GivesARateAndTheTimeLeft) {
  EXPECT_EQ(progress_text(12, 60, 4, 80), "12 of 60 frames   3.0 frames/s   about 16 s left");
  EXPECT_EQ(progress_text(0, 60, 0, 80), "0 of 60 frames");
  EXPECT_EQ(progress_text(12, 60, 4, 10).size(), 10u);
}

}  // namespace
}  // namespace focusfall
