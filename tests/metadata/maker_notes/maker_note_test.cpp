// The tables of all makers.
#include "metadata/maker_notes/maker_note.h"

#include <gtest/gtest.h>

#include "tests/metadata/exif_file.h"

namespace focusfall {
namespace {

TEST(MakerNote, EveryKeyOfEveryTableIsOneThatExiv2Knows) {
  // A misspelt key would never be found, and nobody would notice. Numbers ("0x2027") are keys in every group.
  int keys = 0;
  for (const auto& makers : {apple_notes(), canon_notes(), casio_notes(), fujifilm_notes(), minolta_notes(),
                             nikon_notes(), olympus_notes(), panasonic_notes(), pentax_notes(), samsung_notes(),
                             sony_notes()}) {
    for (const Maker& maker : makers) {
      for (const NoteRow& row : maker.rows) {
        EXPECT_NO_THROW(Exiv2::ExifKey{row.key}) << row.key;
        EXPECT_NE(row.take, nullptr) << row.key;
        ++keys;
      }
    }
  }
  EXPECT_GT(keys, 60);
}

TEST(MakerNote, TheNoteOfAnotherMakerIsNotRead) {
  ExifFile file;
  file.set("Exif.Image.Make", "Panasonic").set("Exif.Image.Model", "DMC-G9");
  file.set("Exif.Panasonic.FocusMode", Exiv2::unsignedShort, "6");
  EXPECT_TRUE(file.read().capture.focus_mode);
  file.set("Exif.Image.Make", "Somebody else");
  EXPECT_FALSE(file.read().capture.focus_mode);
}

}  // namespace
}  // namespace focusfall
