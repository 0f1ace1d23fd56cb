"""The command `exposure` from the outside: forms of output, the JSON Schema, bad input."""
import csv
import io
import json
import os
import subprocess
import unittest
import xml.etree.ElementTree

import jsonschema

from program import DONE, FRAMES_MISSING, SAMPLES, TOP, WRONG_USE, CommandLineTest, run
from schema_test import strict

SCHEMA_JSON = json.loads((TOP / "src/output/schema/exposure.schema.json").read_text())
VALIDATOR = jsonschema.Draft202012Validator(strict(SCHEMA_JSON))


class ExposureTest(CommandLineTest):
    def exposure(self, *arguments):
        return run("exposure", "--level", "aim-only", *arguments)

    def assert_valid(self, record):
        part = SCHEMA_JSON["oneOf"][0 if record["kind"] == "frame" else 1]
        for error in jsonschema.Draft202012Validator(strict(part)).iter_errors(record):
            self.fail(f"{record.get('path')}: {list(error.path)}: {error.message}")
        self.assertEqual(list(record), [key for key in part["properties"] if key in record])

    def test_schema_is_itself_a_schema(self):
        jsonschema.Draft202012Validator.check_schema(SCHEMA_JSON)

    def test_every_sample_is_a_line_and_in_one_set(self):
        result = self.exposure("--format", "json", str(SAMPLES))
        self.assertEqual(result.code, DONE, result.err)
        frames = [r for r in result.records if r["kind"] == "frame"]
        sets = [r for r in result.records if r["kind"] == "set"]
        self.assertEqual(len(frames), len(list(SAMPLES.glob("*.jpg"))))
        for record in result.records:
            self.assert_valid(record)
        paths = sorted(path for one in sets for path in one["frames"])
        self.assertEqual(paths, sorted(frame["path"] for frame in frames))
        for frame in frames:
            self.assertIn(frame["path"], sets[frame["set"] - 1]["frames"])

    def test_csv_has_the_columns_of_its_header(self):
        result = self.exposure("--format", "csv", str(SAMPLES / "stage-01-on.jpg"), str(SAMPLES / "stage-02-front.jpg"))
        rows = list(csv.reader(io.StringIO(result.out)))
        self.assertEqual(len(rows), 3)
        self.assertEqual({len(row) for row in rows}, {len(rows[0])})
        self.assertEqual(rows[0][0], "path")

    def test_text_names_every_frame_and_why_a_set_is_not_tested(self):
        result = self.exposure(str(SAMPLES / "stage-01-on.jpg"))
        self.assertIn("stage-01-on.jpg", result.out)
        self.assertIn("not testable", result.out)

    def test_what_cannot_be_done_keeps_its_line(self):
        text = self.write("words.jpg", b"words")
        result = self.exposure("--format", "json", str(text), str(SAMPLES / "stage-01-on.jpg"))
        self.assertEqual(result.code, FRAMES_MISSING)
        self.lines_about(result, text)
        first = result.records[0]
        self.assertIsNone(first["set"])
        self.assertTrue(first["issues"])
        self.assert_valid(first)

    def test_a_clip_limit_outside_its_range_is_wrong_use(self):
        self.assertEqual(self.exposure("--clip-limit", "2", str(SAMPLES)).code, WRONG_USE)


class ShootTest(CommandLineTest):
    """A rendered shoot of forty frames, from files to words."""

    def shoot(self, *options):
        folder = self.folder / "shoot"
        subprocess.run([os.environ["SHOOT_MAKER"], str(folder), *options], check=True)
        return str(folder)

    def exposure(self, *arguments):
        return run("exposure", "--level", "aim-only", *arguments)

    def test_a_wrong_mark_is_named_in_words_data_and_plot(self):
        shoot = self.shoot("--wrong", "5.6", "-0.3333", "--light", "drift")
        plot = self.folder / "plot.svg"
        result = self.exposure("--plot", str(plot), shoot)
        self.assertEqual(result.code, DONE, result.err)
        self.assertIn("Diaphragm, f/5.6:", result.out)
        self.assertIn("drifted", result.out)
        root = xml.etree.ElementTree.parse(plot).getroot()
        self.assertTrue(root.tag.endswith("svg"))

        records = self.exposure("--format", "json", shoot).records
        whole = [r for r in records if r["kind"] == "set"]
        self.assertEqual(len(whole), 1)
        self.assertEqual([m["f_number"] for m in whole[0]["diaphragm"] if m["blamed"]], [5.6])
        blamed = next(m for m in whole[0]["diaphragm"] if m["blamed"])
        self.assertAlmostEqual(blamed["effective_f_number"], 5.6 * 2 ** (1 / 6), delta=0.2)
        self.assertAlmostEqual(whole[0]["slope"], 1, delta=0.02)
        self.assertTrue(whole[0]["light_changes"])
        for frame in records:
            if frame["kind"] == "frame":
                self.assertEqual(frame["exposure"], "under" if frame["f_number"] == 5.6 else "as predicted")
                self.assertEqual(frame["cause"], "diaphragm" if frame["f_number"] == 5.6 else None)

    def test_output_does_not_depend_on_the_number_of_workers_or_the_order_given(self):
        shoot = self.shoot("--frames", "10")
        one = self.exposure("--format", "json", "--workers", "1", shoot).out
        self.assertEqual(one, self.exposure("--format", "json", "--workers", "3", shoot).out)
        files = sorted(str(path) for path in (self.folder / "shoot").iterdir())
        backwards = self.exposure("--format", "json", *reversed(files)).records
        by_path = {r["path"]: r for r in backwards if r["kind"] == "frame"}
        for record in (json.loads(line) for line in one.splitlines()):
            if record["kind"] == "frame":
                self.assertEqual(record["error_ev"], by_path[record["path"]]["error_ev"])

    def test_automatic_exposure_is_not_tested(self):
        result = self.exposure("--format", "json", self.shoot("--frames", "8", "--automatic"))
        whole = result.records[-1]
        self.assertFalse(whole["testable"])
        self.assertIn("automatically", whole["reason"])
        self.assertTrue(all(r["exposure"] == "unknown" for r in result.records if r["kind"] == "frame"))

    def test_a_plot_never_replaces_what_is_not_one(self):
        shoot = self.shoot("--frames", "4")
        other = self.write("mine.svg", b"<svg/>")
        result = self.exposure("--plot", str(other), shoot)
        self.assertEqual(result.code, WRONG_USE)
        self.assertEqual(other.read_bytes(), b"<svg/>")
        frame = next((self.folder / "shoot").iterdir())
        before = frame.read_bytes()
        self.assertEqual(self.exposure("--plot", str(frame), shoot).code, WRONG_USE)
        self.assertEqual(frame.read_bytes(), before)
        plot = self.folder / "plot.svg"
        self.assertEqual(self.exposure("--plot", str(plot), shoot).code, DONE)
        self.assertEqual(self.exposure("--plot", str(plot), shoot).code, DONE)   # its own it replaces


if __name__ == "__main__":
    unittest.main()
