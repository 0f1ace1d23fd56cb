"""The command lens from the outside: its finding on the bench series, its forms of output, bad input."""
import csv
import io
import json
import math
import time
import unittest
import xml.etree.ElementTree

import jsonschema

from program import DONE, FRAMES_MISSING, SAMPLES, TOP, WRONG_USE, CommandLineTest, run

SCHEMA_JSON = json.loads((TOP / "src/output/schema/lens.schema.json").read_text())
VALIDATOR = jsonschema.Draft202012Validator(SCHEMA_JSON)
BENCH = sorted(SAMPLES.glob("bench-??.jpg"))


def bench_truth_um(paths):
    """Mean of the true values: what a perfect reading of these frames gives."""
    rows = csv.DictReader(io.StringIO((SAMPLES / "truth.csv").read_text()))
    truth = {str(SAMPLES / row["file"]): float(row["defocus_um"]) for row in rows}
    return sum(truth[path] for path in paths) / len(paths)


class LensTest(CommandLineTest):
    @classmethod
    def setUpClass(cls):
        """Every frame of the series, and of these the records whose aim was found to lie on the gravel."""
        lines = run("check", "--format", "json", *map(str, BENCH)).out.splitlines(keepends=True)
        cls.bench = "".join(lines)
        cls.stored = "".join(line for line in lines
                             if (json.loads(line)["measurement"]["plane"] or {}).get("at_contact_px") is not None)
        cls.count = len(cls.stored.splitlines())

    def lens(self, text, *options):
        return run("lens", "--format", "json", str(self.write("records.jsonl", text.encode())), *options)

    def records(self):
        return [json.loads(line) for line in self.stored.splitlines()]

    @staticmethod
    def lines(records):
        return "".join(json.dumps(record) + "\n" for record in records)

    def assert_valid(self, result):
        for record in result.records:
            for error in VALIDATOR.iter_errors(record):
                self.fail(f"{list(error.path)}: {error.message}")

    def test_schema_is_a_schema_and_refuses_other_findings(self):
        jsonschema.Draft202012Validator.check_schema(SCHEMA_JSON)
        broken = self.lens(self.stored).records[-1]
        self.assertTrue(VALIDATOR.is_valid(broken))
        broken["groups"][0]["finding"] = "broken"
        self.assertFalse(VALIDATOR.is_valid(broken))

    def test_finds_the_back_focus_of_the_bench_series(self):
        result = self.lens(self.bench)
        self.assertEqual(result.code, DONE, result.err)
        self.assert_valid(result)
        self.assertEqual([line["kind"] for line in result.records], ["frame"] * 12 + ["set"])
        found = result.records[-1]
        (group,) = found["groups"]
        self.assertEqual((found["finding"], group["used"], group["frames"]), ("back focus", self.count, 12))
        self.assertGreaterEqual(self.count, 10)   # at most two frames may be refused as uncertain
        truth_um = bench_truth_um([line["path"] for line in result.records[:-1] if line["left_out"] is None])
        self.assertLess(group["bias_um_low"], truth_um)
        self.assertGreater(group["bias_um_high"], truth_um)

    def test_photographs_and_their_records_say_the_same(self):
        direct = run("lens", "--format", "json", *map(str, BENCH)).records[-1]["groups"][0]
        stored = self.lens(self.stored).records[-1]["groups"][0]
        self.assertEqual(direct["finding"], stored["finding"])
        self.assertAlmostEqual(direct["bias_um"], stored["bias_um"], delta=0.01)   # records hold five digits

    def test_text_and_csv(self):
        path = str(self.write("records.jsonl", self.stored.encode()))
        text = run("lens", path)
        self.assertIn("Back focus: focus falls", text.out.replace("\n             ", " "))
        self.assertIn("Lens or body cannot be told from these frames", text.out)
        rows = list(csv.DictReader(io.StringIO(run("lens", "--format", "csv", path).out)))
        self.assertEqual([row["finding"] for row in rows], ["back focus"])

    def test_help_carries_the_cautions(self):
        text = " ".join(run("lens", "--help").out.split())
        self.assertIn("Never point a long lens at or near the sun", text)
        self.assertIn("evidence, not a repair order", text)

    def test_too_few_frames_are_no_error(self):
        result = self.lens(self.lines(self.records()[:4]))
        self.assertEqual(result.code, DONE)
        self.assertEqual(result.records[-1]["finding"], "not enough evidence")
        self.assertIn("4 usable frames", result.records[-1]["summary"])

    def test_a_copied_file_is_no_repeat(self):
        result = self.lens(self.lines(self.records()[:1] * 8))
        self.assertEqual(result.code, DONE)
        self.assertEqual(result.records[-1]["left_out"], {"copy": 7})
        self.assertIn("a copied file is not a repeat", result.err)
        self.assertEqual(result.records[-1]["finding"], "not enough evidence")

    def test_several_lenses_are_reported_each(self):
        records = self.records()
        for record in records[6:]:
            record["capture"]["lens_serial"] = "LL-0852"
        result = self.lens(self.lines(records))
        self.assert_valid(result)
        self.assertEqual(len(result.records[-1]["groups"]), 2)

    def test_frames_are_left_out_for_a_reason_and_never_for_what_they_say(self):
        records = self.records()
        records[0]["measurement"]["plane"] = None
        records[1]["capture"]["focus_mode"] = "manual"
        records[2]["verdict"]["causes"] = ["camera shake"]
        records[3]["verdict"].update(focus="on", defocus_um=0.1, defocus_um_low=-9, defocus_um_high=9)
        found = self.lens(self.lines(records)).records[-1]
        self.assertEqual(found["left_out"], {"manual focus": 1, "motion": 1, "no plane": 1})
        self.assertEqual(found["used"], self.count - 3)

    def test_asks_for_what_no_file_records(self):
        records = self.records()
        for record in records:
            record["capture"]["f_number"] = None
        result = self.lens(self.lines(records))
        self.assertEqual(result.code, WRONG_USE)
        self.assertIn("--f-number", result.err)

    def test_a_bad_line_is_said_and_the_others_count(self):
        result = self.lens(self.stored + "{nonsense\n" + '{"schema": "focusfall.other/1"}\n')
        self.assertEqual(result.code, FRAMES_MISSING)
        self.assertIn(f"records.jsonl, line {self.count + 1}:", result.err)
        self.assertIn(f"records.jsonl, line {self.count + 2}:", result.err)
        self.assertEqual(result.records[-1]["used"], self.count)

    def test_the_slope_tells_the_diaphragm(self):
        """The gravel lies 60 degrees away from square-on: the camera looks down at 30. Its fine texture reads too flat;
        a quarter of a stop is what these frames are good for, against f/1.8 in truth."""
        (group,) = self.lens(self.stored, "--tilt", "60deg").records[-1]["groups"]
        self.assertLess(abs(group["diaphragm"]["stops_wider"]), 0.25)
        self.assertIn("marked is f/1.8", group["diaphragm"]["text"])
        (group,) = self.lens(self.stored, "--camera-height", "9m").records[-1]["groups"]
        self.assertIsNone(group["diaphragm"]["f_number"])   # higher above ground than the ground is far

    def series(self, best):
        """Fifteen positions 150 um apart, blurred as the thin lens says: 33.3 um pixels at f/1.8574."""
        records = [json.loads(json.dumps(self.records()[0])) for _ in range(15)]
        for number, record in enumerate(records):
            disc = (number - best) * 150 / (33.333 * 1.8574)
            square = disc * disc + 0.5
            record["measurement"]["aim"]["measured_px2"] = {"value": square, "low": square - 0.5, "high": square + 0.5}
        return self.lines(records)

    def test_finds_the_best_of_a_focus_series(self):
        result = self.lens(self.series(6.4), "--focus-step", "150um")
        self.assert_valid(result)
        found = result.records[-1]["focus_series"]
        self.assertAlmostEqual(found["best_position_um"], 6.4 * 150, delta=10)
        self.assertAlmostEqual(found["slope_px_per_um"], 1 / (33.333 * 1.8574), delta=1e-4)
        self.assertIn("nearest to frame 7", found["text"])
        outside = self.lens(self.series(20), "--focus-step", "150um").records[-1]["focus_series"]
        self.assertIn("lies outside the series", outside["text"])

    def test_plots_every_frame_and_spares_other_files(self):
        plot = self.folder / "plot.svg"
        for _ in range(2):   # an older plot is replaced
            self.assertEqual(self.lens(self.stored, "--plot", str(plot)).code, DONE)
        drawn = xml.etree.ElementTree.parse(plot).getroot()
        self.assertTrue(drawn.tag.endswith("svg"))
        fewer = self.folder / "fewer.svg"
        self.lens(self.lines(self.records()[:6]), "--plot", str(fewer))
        self.assertGreater(plot.stat().st_size, fewer.stat().st_size)
        other = self.write("other.svg", b"<svg/>")
        result = self.lens(self.stored, "--plot", str(other))
        self.assertEqual(result.code, FRAMES_MISSING)
        self.assertEqual(other.read_bytes(), b"<svg/>")
        self.lines_about(result, other)

    def test_a_leaning_surface_is_a_tilted_field(self):
        """The gravel taken for a wall: 22.65 px of disc a frame height, 1264 um to half a diagonal, straight down the
        frame. Fine gravel reads up to a quarter too flat."""
        result = run("lens", "--format", "json", "--flat", str(BENCH[0]))
        self.assert_valid(result)
        flat = result.records[-1]["flat"]
        self.assertAlmostEqual(flat["axis_deg"], 90, delta=5)
        self.assertGreater(flat["tilt_um"], 0.75 * 1264)
        self.assertLess(flat["tilt_um"], 1.05 * 1264)
        self.assertFalse(flat["signed"])
        self.assertIn("lens, body and wall together", flat["text"])

    def walls(self, folder, x_tilt_px):
        """Five frames of a wall with a tilt along the long side, focus moved on by 2 px of disc from frame to frame."""
        records = [json.loads(json.dumps(self.records()[0])) for _ in range(5)]
        half_diagonal_px = math.hypot(1080, 720) / 2
        for number, record in enumerate(records):
            record["path"] = f"{folder}/{number}.jpg"
            discs = [abs(2 * (number - 2) + x_tilt_px * (60 + 120 * column - 540) / half_diagonal_px)
                     for row in range(6) for column in range(9)]
            record["measurement"]["tiles"] = {"rows": 6, "columns": 9, "blur_disc_px": discs, "edges": [30] * 54,
                                              "clipped": [0] * 54, "tile_px": 120}
        return records

    def test_a_series_gives_the_field_its_sign_and_a_second_one_its_owner(self):
        um_per_px = 33.333 * 1.8574
        one = self.lines(self.walls("upright", 5))
        flat = self.lens(one, "--flat", "--focus-travel", "near-to-far").records[-1]["flat"]
        self.assertTrue(flat["signed"])
        self.assertAlmostEqual(flat["tilt_um"], 5 * um_per_px, delta=0.1 * um_per_px)
        self.assertIn("further behind to the right", flat["text"])
        flat = self.lens(one, "--flat", "--focus-travel", "far-to-near").records[-1]["flat"]
        self.assertIn("further behind to the left", flat["text"])
        both = one + self.lines(self.walls("turned", -1))   # 2 px of lens and body, 3 px of the wall
        result = self.lens(both, "--flat", "--focus-travel", "near-to-far", "--upside-down", "turned")
        self.assert_valid(result)
        self.assertAlmostEqual(result.records[-1]["flat"]["camera_tilt_um"], 2 * um_per_px, delta=0.2 * um_per_px)

    def test_nonsense_on_the_bench_is_said(self):
        for option, value in (("--tilt", "0deg"), ("--tilt", "90"), ("--tilt", "steep"), ("--camera-height", "-1m"),
                              ("--focus-step", "0um")):
            result = self.lens(self.stored, option, value)
            self.assertEqual(result.code, WRONG_USE)
            self.assertIn(option, result.err)

    def test_tells_the_sides_of_approach_apart(self):
        """Half of the frames, as if from the far side, get 60 um more: half a limit."""
        records = self.records()
        for number, record in enumerate(records):
            record["path"] = f"{'far' if number % 2 else 'near'}/{number}.jpg"
            for key in ("defocus_um", "defocus_um_low", "defocus_um_high"):
                record["verdict"][key] += 60 * (number % 2)
        found = self.lens(self.lines(records), "--approach", "near=near", "--approach", "far=far").records[-1]
        (trend,) = [one for one in found["trends"] if one["kind"] == "approach"]
        self.assertEqual(trend["acquisitions"], self.count)
        self.assertLess(trend["slope_um_low"], 60)
        self.assertGreater(trend["slope_um_high"], 60)

    def test_bad_options(self):
        for option, value in (("--approach", "left"), ("--series", "odd"), ("--near-side", "middle")):
            self.assertEqual(self.lens(self.stored, option, value).code, WRONG_USE)
        self.assertEqual(self.lens(self.stored, "--near-side", "top").code, WRONG_USE)   # records hold it already

    def test_a_thousand_records_take_less_than_a_second(self):
        bench, records = self.records(), []
        for number in range(1000):
            record = json.loads(json.dumps(bench[number % self.count]))
            record["measurement"]["plane"]["at_contact_px"] += 1e-4 * number   # no two frames measure the same
            record["capture"]["taken_at"] = f"2026-06-16T{10 + number // 360}:{number // 6 % 60:02}:{number % 6}0"
            records.append(record)
        path = str(self.write("records.jsonl", self.lines(records).encode()))
        start = time.perf_counter()
        result = run("lens", "--format", "json", path)
        elapsed_s = time.perf_counter() - start
        self.assertEqual(result.records[-1]["used"], 1000)
        print(f"1,000 records: {elapsed_s:.2f} s")
        self.assertLess(elapsed_s, 1)


if __name__ == "__main__":
    unittest.main()
