// XMP: regions that other programs marked, and values that stand in for Exif.
#include "metadata/standard_xmp.h"

#include <gtest/gtest.h>

#include <cmath>

#include "tests/metadata/exif_file.h"

namespace focusfall {
namespace {

// A packet around properties of one description.
std::string packet(const std::string& attributes, const std::string& properties = "") {
  return "<?xpacket begin=\"\xEF\xBB\xBF\" id=\"W5M0MpCehiHzreSzNTczkc9d\"?>"
         "<x:xmpmeta xmlns:x=\"adobe:ns:meta/\"><rdf:RDF xmlns:rdf=\"http://www.w3.org/1999/02/22-rdf-syntax-ns#\">"
         "<rdf:Description rdf:about=\"\" xmlns:aux=\"http://ns.adobe.com/exif/1.0/aux/\""
         " xmlns:exif=\"http://ns.adobe.com/exif/1.0/\" xmlns:exifEX=\"http://cipa.jp/exif/1.0/\""
         " xmlns:mwg-rs=\"http://www.metadataworkinggroup.com/schemas/regions/\""
         " xmlns:stArea=\"http://ns.adobe.com/xmp/sType/Area#\" "
         "xmlns:stDim=\"http://ns.adobe.com/xap/1.0/sType/Dimensions#\""
         " xmlns:Iptc4xmpExt=\"http://iptc.org/std/Iptc4xmpExt/2008-02-29/\" "
         "xmlns:xmp=\"http://ns.adobe.com/xap/1.0/\" " +
         attributes + ">" + properties + "</rdf:Description></rdf:RDF></x:xmpmeta><?xpacket end=\"w\"?>";
}

struct Region {
  const char* type;
  const char* area;  // attributes
};

// Regions in the form of the Metadata Working Group, applied to a picture of 6000 x 4000 px unless said otherwise.
std::string mwg_packet(const std::vector<Region>& regions, const std::string& width = "6000",
                       const std::string& height = "4000") {
  std::string list;
  for (const Region& region : regions) {
    list += std::string("<rdf:li><rdf:Description mwg-rs:Type=\"") + region.type + "\"><mwg-rs:Area " + region.area +
            " stArea:unit=\"normalized\"/></rdf:Description></rdf:li>";
  }
  return packet("", "<mwg-rs:Regions rdf:parseType=\"Resource\"><mwg-rs:AppliedToDimensions stDim:w=\"" + width +
                        "\" stDim:h=\"" + height + "\" stDim:unit=\"pixel\"/><mwg-rs:RegionList><rdf:Bag>" + list +
                        "</rdf:Bag></mwg-rs:RegionList></mwg-rs:Regions>");
}

CaptureReading read_with(const std::string& xmp) {
  ExifFile file;
  file.xmp = xmp;
  return file.read();
}

TEST(StandardXmp, RegionsAreGivenByTheirCentre) {
  const auto reading =
      read_with(mwg_packet({{"Focus", "stArea:x=\"0.5\" stArea:y=\"0.25\" stArea:w=\"0.2\" stArea:h=\"0.1\""}}));
  ASSERT_EQ(reading.capture.focus_areas.size(), 1U);
  const FocusArea& area = reading.capture.focus_areas.front();
  EXPECT_EQ(area.kind, FocusAreaKind::focus_region);
  EXPECT_EQ(area.source, Source::xmp);
  EXPECT_DOUBLE_EQ(area.box.x, 0.4);
  EXPECT_DOUBLE_EQ(area.box.y, 0.2);
  EXPECT_DOUBLE_EQ(area.box.width, 0.2);
  EXPECT_DOUBLE_EQ(area.box.height, 0.1);
}

TEST(StandardXmp, FocusComesBeforeFaceAndBothAfterTheCamerasOwnArea) {
  ExifFile file;
  file.set("Exif.Image.Make", "FUJIFILM")
      .set("Exif.Photo.PixelXDimension", "6000")
      .set("Exif.Photo.PixelYDimension", "4000");
  file.set("Exif.Fujifilm.0x1023", Exiv2::unsignedShort, "1500 3000").set("Exif.Photo.SubjectArea", "600 400");
  file.xmp = mwg_packet({{"Face", "stArea:x=\"0.3\" stArea:y=\"0.3\" stArea:w=\"0.1\" stArea:h=\"0.1\""},
                         {"Pet", "stArea:x=\"0.5\" stArea:y=\"0.3\" stArea:w=\"0.1\" stArea:h=\"0.1\""},
                         {"Focus", "stArea:x=\"0.7\" stArea:y=\"0.3\" stArea:w=\"0.1\" stArea:h=\"0.1\""}});
  std::vector<FocusAreaKind> kinds;
  for (const FocusArea& area : file.read().capture.focus_areas) kinds.push_back(area.kind);
  EXPECT_EQ(kinds, (std::vector{FocusAreaKind::focus_area, FocusAreaKind::focus_region, FocusAreaKind::face_region,
                                FocusAreaKind::subject_area}));
}

TEST(StandardXmp, RegionsOfATurnedPictureOrOutsideTheFrameAreNotUsed) {
  const Region face{"Face", "stArea:x=\"0.3\" stArea:y=\"0.3\" stArea:w=\"0.1\" stArea:h=\"0.1\""};
  EXPECT_EQ(read_with(mwg_packet({face}, "3000", "2000")).capture.focus_areas.size(), 1U);  // reduced since
  const auto turned = read_with(mwg_packet({face}, "4000", "6000"));
  EXPECT_TRUE(turned.capture.focus_areas.empty());
  EXPECT_TRUE(has_remark(turned, kValueAbsurd));
  EXPECT_TRUE(read_with(mwg_packet({{"Face", "stArea:x=\"7\" stArea:y=\"0.3\" stArea:w=\"0.1\" stArea:h=\"0.1\""}}))
                  .capture.focus_areas.empty());
}

TEST(StandardXmp, IptcRegionsOfPeopleAreFaces) {
  const auto region = [](const char* type) {
    return packet("", std::string("<Iptc4xmpExt:ImageRegion><rdf:Bag><rdf:li rdf:parseType=\"Resource\">"
                                  "<Iptc4xmpExt:RegionBoundary rdf:parseType=\"Resource\">"
                                  "<Iptc4xmpExt:rbShape>rectangle</Iptc4xmpExt:rbShape>"
                                  "<Iptc4xmpExt:rbUnit>relative</Iptc4xmpExt:rbUnit>"
                                  "<Iptc4xmpExt:rbX>0.1</Iptc4xmpExt:rbX><Iptc4xmpExt:rbY>0.2</Iptc4xmpExt:rbY>"
                                  "<Iptc4xmpExt:rbW>0.3</Iptc4xmpExt:rbW><Iptc4xmpExt:rbH>0.4</Iptc4xmpExt:rbH>"
                                  "</Iptc4xmpExt:RegionBoundary><Iptc4xmpExt:rCtype><rdf:Bag>"
                                  "<rdf:li rdf:parseType=\"Resource\"><xmp:Identifier><rdf:Bag><rdf:li>"
                                  "http://cv.iptc.org/newscodes/imageregiontype/") +
                          type +
                          "</rdf:li></rdf:Bag></xmp:Identifier></rdf:li></rdf:Bag></Iptc4xmpExt:rCtype>"
                          "</rdf:li></rdf:Bag></Iptc4xmpExt:ImageRegion>");
  };
  const auto areas = read_with(region("human")).capture.focus_areas;
  ASSERT_EQ(areas.size(), 1U);
  EXPECT_EQ(areas.front().kind, FocusAreaKind::face_region);
  EXPECT_DOUBLE_EQ(areas.front().box.x, 0.1);
  EXPECT_DOUBLE_EQ(areas.front().box.height, 0.4);
  EXPECT_TRUE(read_with(region("text")).capture.focus_areas.empty());
}

TEST(StandardXmp, ValuesFillWhatExifLeavesOpen) {
  ExifFile file;
  file.set("Exif.Photo.FNumber", "28/10");
  file.xmp = packet(
      "aux:Lens=\"400mm f/2.8\" aux:SerialNumber=\"B1\" aux:LensSerialNumber=\"L1\" exif:FNumber=\"40/10\""
      " exif:ExposureTime=\"1/500\" exif:FocalLength=\"400/1\" exif:DateTimeOriginal=\"2026-06-20T14:03:07.25+02:00\"",
      "<exif:ISOSpeedRatings><rdf:Seq><rdf:li>640</rdf:li></rdf:Seq></exif:ISOSpeedRatings>");
  const Capture capture = file.read().capture;
  EXPECT_DOUBLE_EQ(capture.f_number.value().value, 2.8);
  EXPECT_EQ(capture.f_number.value().source, Source::exif);
  EXPECT_DOUBLE_EQ(capture.exposure_time_s.value().value, 0.002);
  EXPECT_DOUBLE_EQ(capture.focal_length_mm.value().value, 400);
  EXPECT_EQ(capture.focal_length_mm.value().source, Source::xmp);
  EXPECT_DOUBLE_EQ(capture.iso_speed.value().value, 640);
  EXPECT_EQ(capture.lens.value().value, "400mm f/2.8");
  EXPECT_EQ(capture.lens_serial.value().value, "L1");
  EXPECT_EQ(capture.body_serial.value().value, "B1");
  EXPECT_EQ(capture.taken_at.value().value, "2026-06-20T14:03:07.25+02:00");
}

TEST(StandardXmp, TheApproximateDistanceComesLastAndAllBitsSetAreInfinity) {
  const auto distance = read_with(packet("aux:ApproximateFocusDistance=\"562/100\"")).capture.focus_distance;
  ASSERT_TRUE(distance);
  EXPECT_DOUBLE_EQ(distance->value.value_m, 5.62);
  EXPECT_EQ(distance->source, Source::xmp);
  const auto infinite = read_with(packet("aux:ApproximateFocusDistance=\"4294967295/1\"")).capture.focus_distance;
  ASSERT_TRUE(infinite);
  EXPECT_TRUE(std::isinf(infinite->value.value_m));
  ExifFile file;
  file.set("Exif.Photo.SubjectDistance", "6/1");
  file.xmp = packet("aux:ApproximateFocusDistance=\"562/100\"");
  EXPECT_DOUBLE_EQ(file.read().capture.focus_distance.value().value.value_m, 6);
}

TEST(StandardXmp, ACropByARawDeveloperMakesPitchAndFocusAreaUnknown) {
  // The shape is kept and the recorded size written anew: nothing else shows it.
  const auto reading = [](const char* has_crop) {
    ExifFile file;
    file.set("Exif.Photo.FocalLength", "50/1").set("Exif.Photo.FocalLengthIn35mmFilm", "50");
    file.set("Exif.Photo.PixelXDimension", "3000").set("Exif.Photo.PixelYDimension", "2000");
    file.set("Exif.Photo.SubjectArea", "600 400");
    file.xmp = packet(std::string("xmlns:crs=\"http://ns.adobe.com/camera-raw-settings/1.0/\" crs:HasCrop=\"") +
                      has_crop + "\"");
    file.decoded = {3000, 2000};
    return file.read();
  };
  EXPECT_TRUE(reading("False").capture.pixel_pitch_um);
  EXPECT_EQ(reading("False").capture.focus_areas.size(), 1U);
  EXPECT_FALSE(reading("True").capture.pixel_pitch_um);
  EXPECT_TRUE(has_remark(reading("True"), kPitchUnknown));
  EXPECT_TRUE(reading("True").capture.focus_areas.empty());
}

TEST(StandardXmp, NumbersAreFractionsOrDecimalsAndNothingElse) {
  EXPECT_EQ(number_in_text("28/10"), 2.8);
  EXPECT_EQ(number_in_text("-0.5"), -0.5);
  EXPECT_EQ(number_in_text("+1e2"), 100);
  for (const char* text : {"", "1/0", "0/0", "inf", "nan", "1,5", "2.8 ", "f/2.8", "1/2/3", "0x10"}) {
    EXPECT_FALSE(number_in_text(text)) << text;
  }
}

TEST(StandardXmp, ABrokenPacketLeavesTheExifValues) {
  ExifFile file;
  file.set("Exif.Photo.FNumber", "28/10");
  file.xmp = packet("aux:Lens=\"x\"").substr(0, 500);
  EXPECT_DOUBLE_EQ(file.read().capture.f_number.value().value, 2.8);
}

}  // namespace
}  // namespace focusfall
