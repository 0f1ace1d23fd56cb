"""What a run promises: order, the same bytes, lists of paths, settings, CSV, overlays, values that win."""
import csv
import io
import os
import unittest

from program import DONE, FRAMES_MISSING, SAMPLES, WRONG_USE, CommandLineTest, environment, run

SAMPLE = SAMPLES / "stage-01-on.jpg"
SOME = [str(SAMPLES / name) for name in ("stage-08-missed-aim.jpg", "bench-13-diffraction.jpg", "regatta-01-front.jpg",
                                         "stage-01-on.jpg", "regatta-15-upright.jpg", "bench-02.jpg")]


class OrderTest(CommandLineTest):
    def test_results_come_in_the_order_of_the_input(self):
        result = run("check", "--format", "json", "--workers", "2", *SOME)
        self.assertEqual([record["path"] for record in result.records], SOME)

    def test_a_folder_is_walked_in_byte_order(self):
        for name in ("b.jpg", "B.jpg", "a/z.jpg", "ä.jpg", "10.jpg", "9.jpg"):
            self.sample(under=name)
        result = run("check", "--format", "json", str(self.folder))
        found = [os.path.relpath(record["path"], self.folder) for record in result.records]
        self.assertEqual(found, sorted(found, key=lambda name: name.encode()))

    def test_the_same_input_gives_the_same_bytes_with_one_worker_and_with_two(self):
        for arguments in (["--format", "json", "--tiles"], ["--format", "csv"], []):
            outputs = {run("check", *arguments, "--workers", workers, *SOME).out_bytes for workers in ("1", "2", "2")}
            self.assertEqual(len(outputs), 1, arguments)


class ListTest(CommandLineTest):
    def paths_of(self, *arguments, stdin=b""):
        result = run("check", "--format", "json", *arguments, stdin=stdin)
        self.assertEqual(result.code, DONE, result.err)
        return [record["path"] for record in result.records]

    def test_a_list_of_lines(self):
        path = self.write("list.txt", "\n".join(SOME[:2]).encode() + b"\n\n")
        self.assertEqual(self.paths_of(f"@{path}"), SOME[:2])

    def test_a_list_from_standard_input(self):
        self.assertEqual(self.paths_of("@-", stdin=(SOME[1] + "\n" + SOME[0]).encode()), [SOME[1], SOME[0]])

    def test_a_list_with_nul_holds_names_with_line_ends(self):
        odd = self.sample(under="two\nlines.jpg")
        self.assertEqual(self.paths_of("@-", stdin=f"{odd}\0{SOME[0]}\0".encode()), [str(odd), SOME[0]])

    def test_no_quoting_in_lists(self):
        odd = self.sample(under="'a b' \"c\".jpg")
        self.assertEqual(self.paths_of("@-", stdin=f"{odd}\n".encode()), [str(odd)])

    def test_a_name_that_starts_with_the_sign_of_a_list(self):
        self.sample(under="@boat.jpg")
        result = run("check", "--format", "json", "./@boat.jpg", cwd=self.folder)
        self.assertEqual(result.records[0]["path"], "./@boat.jpg")

    def test_an_empty_list_is_done(self):
        result = run("check", "@-")
        self.assertEqual((result.code, result.out), (DONE, ""))


class SettingsTest(CommandLineTest):
    def check(self, text, *arguments):
        path = self.write("settings.toml", text.encode())
        return run("check", "--format", "json", "--settings", str(path), *arguments, str(SAMPLE))

    def assert_wrong(self, text, line, *said):
        result = self.check(text)
        self.assertEqual(result.code, WRONG_USE, result.err)
        self.assertEqual(result.out, "")
        self.assertEqual(len(result.err.splitlines()), 1, result.err)
        self.assertIn(f"settings.toml:{line}: ", result.err)
        for words in said:
            self.assertIn(words, result.err)

    def test_errors_name_the_line(self):
        self.assert_wrong("[defaults]\npixel_pitch = '4um'\ncolour = 'red'\n", 3, "colour")
        self.assert_wrong("[defaults]\n\nf_number = 0\n", 3, "f_number", "0")
        self.assert_wrong("[defaults\n", 1)
        self.assert_wrong("[[body]]\npixel_pitch = '4um'\n", 1, "serial", "model")
        self.assert_wrong("[[body]]\nserial = '1'\nf_number = 2\n", 3, "f_number")
        self.assert_wrong("[camera]\n", 1, "camera")
        self.assert_wrong("[defaults]\noverride = 1\n", 2, "override")

    def test_fill_a_gap_and_say_so(self):
        # The sample says no pupil magnification; its pitch is known.
        capture = self.check("[defaults]\nfocal_length = '200mm'\n").records[0]["capture"]
        self.assertEqual((capture["focal_length_mm"], capture["source"]["focal_length_mm"]), (135, "exif"))
        overridden = self.check("[defaults]\nfocal_length = '200mm'\noverride = true\n").records[0]["capture"]
        self.assertEqual((overridden["focal_length_mm"], overridden["source"]["focal_length_mm"]), (200, "settings"))

    def test_the_command_line_wins_over_everything(self):
        capture = self.check("[defaults]\nfocal_length = '200mm'\noverride = true\n", "--focal-length",
                             "100mm").records[0]["capture"]
        self.assertEqual((capture["focal_length_mm"], capture["source"]["focal_length_mm"]), (100, "user"))

    def test_the_default_place_is_that_of_the_xdg_specification(self):
        self.write("focusfall/settings.toml", b"[defaults]\nwrong = 1\n")
        env = environment(XDG_CONFIG_HOME=str(self.folder))
        self.assertEqual(run("check", str(SAMPLE), env=env).code, WRONG_USE)
        self.assertEqual(run("check", "--no-settings", str(SAMPLE), env=env).code, DONE)


class UserValuesTest(CommandLineTest):
    def test_win_over_the_file_and_say_so(self):
        result = run("check", "--format", "json", "--f-number", "5.6", "--focus-distance", "30ft", "--pixel-pitch",
                     "4.3um", str(SAMPLE))
        capture = result.records[0]["capture"]
        self.assertEqual(capture["f_number"], 5.6)
        self.assertAlmostEqual(capture["focus_distance_m"]["value"], 30 * 0.3048, places=5)   # international foot
        for key in ("f_number", "focus_distance_m", "pixel_pitch_um"):
            self.assertEqual(capture["source"][key], "user")
        self.assertIn("f/5.6 (user)", run("check", "--f-number", "5.6", str(SAMPLE)).out)

    def test_an_aim_is_in_the_picture_as_displayed(self):
        # Orientation 8: turned 90 degrees counter-clockwise for display, so that the stored top right corner is shown
        # top left. A box at the left border, .2 wide and .4 high, from .1 below the top: x = 1 - .1 - .4, y = 0.
        record = run("check", "--format", "json", "--aim", "0,0.1,0.2,0.4", SOME[4]).records[0]
        self.assertEqual(record["aim"]["source"], "user")
        for key, value in {"x": 0.5, "y": 0, "width": 0.4, "height": 0.2}.items():
            self.assertAlmostEqual(record["aim"][key], value, places=5)

    def test_an_aim_in_pixels_is_the_same_as_in_fractions(self):
        fractions = run("check", "--format", "json", "--aim", "0.25,0.25,0.5,0.5", str(SAMPLE)).records[0]
        width, height = fractions["capture"]["width_px"], fractions["capture"]["height_px"]
        box = f"{width / 4}px,{height / 4}px,{width / 2}px,{height / 2}px"
        pixels = run("check", "--format", "json", "--aim", box, str(SAMPLE)).records[0]
        self.assertEqual(pixels, fractions)


class CsvTest(CommandLineTest):
    def test_is_a_table_with_one_row_a_frame(self):
        result = run("check", "--format", "csv", *SOME, str(self.folder / "none.jpg"))
        self.assertEqual(result.code, FRAMES_MISSING)
        rows = list(csv.DictReader(io.StringIO(result.out, newline="")))
        self.assertEqual([row["path"] for row in rows], SOME + [str(self.folder / "none.jpg")])
        self.assertEqual(len({len(row) for row in rows}), 1)
        records = run("check", "--format", "json", *SOME).records
        for row, record in zip(rows, records):
            self.assertEqual(row["verdict.focus"], record["verdict"]["focus"])
            self.assertEqual(float(row["measurement.aim.blur_disc_px"]), record["measurement"]["aim"]["blur_disc_px"])
        self.assertEqual(rows[-1]["issues"], "file-missing")

    def test_names_cannot_become_formulas(self):
        for name in ("=1+1.jpg", "+1.jpg", "-1.jpg", "@a.jpg"):
            self.sample(under=name)
        result = run("check", "--format", "csv", "./=1+1.jpg", "--", "=1+1.jpg", "+1.jpg", "-1.jpg", cwd=self.folder)
        for row in csv.reader(io.StringIO(result.out, newline="")):
            for cell in row:
                try:
                    float(cell)     # a negative number is no formula
                except ValueError:
                    self.assertNotRegex(cell, r"^[=+\-@\t\r]")


class OverlayTest(CommandLineTest):
    def test_one_picture_a_frame_named_after_it(self):
        pictures = self.folder / "pictures"
        result = run("check", "--overlay", str(pictures), *SOME[:2], str(self.folder / "none.jpg"))
        self.assertEqual(result.code, FRAMES_MISSING)
        self.assertEqual(sorted(os.listdir(pictures)), ["bench-13-diffraction.overlay.png",
                                                        "stage-08-missed-aim.overlay.png"])
        first = (pictures / "bench-13-diffraction.overlay.png").read_bytes()
        self.assertTrue(first.startswith(b"\x89PNG\r\n\x1a\n"))
        # A second run replaces what the first one wrote, by the same bytes.
        self.assertEqual(run("check", "--overlay", str(pictures), *SOME[:2]).code, DONE)
        self.assertEqual((pictures / "bench-13-diffraction.overlay.png").read_bytes(), first)

    def test_frames_of_one_name_get_pictures_of_their_own(self):
        paths = [str(self.sample(under=f"{day}/boat.jpg")) for day in ("one", "two")]
        run("check", "--overlay", str(self.folder / "pictures"), *paths)
        self.assertEqual(sorted(os.listdir(self.folder / "pictures")), ["boat-2.overlay.png", "boat.overlay.png"])

    def test_what_someone_else_wrote_is_kept(self):
        name = "stage-01-on.overlay.png"
        kept = self.write(f"pictures/{name}", b"\x89PNG\r\n\x1a\nsomeone's picture")
        result = run("check", "--overlay", str(kept.parent), str(SAMPLE))
        self.assertEqual(result.code, FRAMES_MISSING)
        self.assertIn("was not written by focusfall", self.lines_about(result, kept))
        self.assertEqual(kept.read_bytes(), b"\x89PNG\r\n\x1a\nsomeone's picture")
        self.assertEqual(os.listdir(kept.parent), [name])

    def test_the_json_holds_no_tiles_for_it(self):
        result = run("check", "--format", "json", "--overlay", str(self.folder / "pictures"), str(SAMPLE))
        self.assertNotIn("tiles", result.records[0]["measurement"])


if __name__ == "__main__":
    unittest.main()
