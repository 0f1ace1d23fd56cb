"""The command `exposure` from the outside: forms of output, the JSON Schema, bad input."""
import csv
import io
import json
import unittest

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


if __name__ == "__main__":
    unittest.main()
