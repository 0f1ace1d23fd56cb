"""What --format json prints, held against the JSON Schema that ships with the program."""
import json
import pathlib
import re
import unittest

import jsonschema

from program import DONE, FRAMES_MISSING, SAMPLES, SCHEMA, TOP, CommandLineTest, run


def strict(schema):
    """The schema leaves room for new keys, as readers should; here a key that it does not know is an error."""
    if isinstance(schema, dict):
        closed = {key: strict(value) for key, value in schema.items()}
        return {**closed, "additionalProperties": False} if "properties" in closed else closed
    return [strict(element) for element in schema] if isinstance(schema, list) else schema


SCHEMA_JSON = json.loads(SCHEMA.read_text())
VALIDATOR = jsonschema.Draft202012Validator(strict(SCHEMA_JSON))


class SchemaTest(CommandLineTest):
    def assert_valid(self, record):
        for error in VALIDATOR.iter_errors(record):
            self.fail(f"{record.get('path')}: {list(error.path)}: {error.message}")

    def test_is_itself_a_schema(self):
        jsonschema.Draft202012Validator.check_schema(SCHEMA_JSON)

    def test_refuses_a_record_that_breaks_it(self):
        record = run("check", "--format", "json", str(SAMPLES / "stage-01-on.jpg")).records[0]
        record["verdict"]["focus"] = "sharp"
        self.assertFalse(VALIDATOR.is_valid(record))

    def test_every_sample_satisfies_it(self):
        result = run("check", "--format", "json", "--tiles", str(SAMPLES))
        self.assertEqual(result.code, DONE, result.err)
        self.assertEqual(len(result.records), len(list(SAMPLES.glob("*.jpg"))))
        for record in result.records:
            self.assert_valid(record)
            tiles = record["measurement"]["tiles"]
            for key in ("blur_disc_px", "edges", "clipped"):
                self.assertEqual(len(tiles[key]), tiles["rows"] * tiles["columns"])

    def test_keys_stand_in_the_order_of_the_schema(self):
        record = run("check", "--format", "json", str(SAMPLES / "stage-01-on.jpg")).records[0]
        known = SCHEMA_JSON["properties"]
        self.assertEqual(list(record), [key for key in known if key in record])
        for part in ("capture", "prediction", "aim", "measurement", "verdict"):
            known_part = known[part]["properties"]
            self.assertEqual(list(record[part]), [key for key in known_part if key in record[part]], part)

    def test_a_frame_that_could_not_be_done_is_a_line_too(self):
        result = run("check", "--format", "json", str(self.folder / "none.jpg"), str(self.write("text.jpg", b"words")))
        self.assertEqual(result.code, FRAMES_MISSING)
        self.assertEqual([len(record["issues"]) for record in result.records], [1, 1])
        for record in result.records:
            self.assert_valid(record)
            self.assertIsNone(record["verdict"])

    def test_plans_satisfy_it(self):
        plan = ["predict", "--format", "json", "--focal-length", "400mm", "--f-number", "2.8"]
        for more in (["--focus-distance", "30m", "--at", "28m,inf"], ["--hold-depth", "28m..33m"], [],
                     ["--focus-distance", "inf"]):
            result = run(*plan, *more)
            self.assertEqual(result.code, DONE, result.err)
            self.assert_valid(result.records[0])

    def test_every_number_is_finite(self):
        def refuse(name):
            self.fail(f"{name} is no JSON")
        for line in run("check", "--format", "json", "--tiles", str(SAMPLES)).out.splitlines():
            json.loads(line, parse_constant=refuse)


class IssueCodesTest(unittest.TestCase):
    TABLE = re.findall(r'^    \{"([a-z-]+)", "', (TOP / "src/pipeline/issue_codes.h").read_text(), re.MULTILINE)

    def test_schema_and_table_agree(self):
        self.assertEqual(SCHEMA_JSON["$defs"]["issue_code"]["enum"], self.TABLE)

    def test_no_code_in_the_sources_is_missing(self):
        made = re.compile(r'(?:\{Stage::\w+,\s*|\.code = |(?:Decode|Read)Error\{|DecodeNote\{|k\w+ = )"([a-z]+(?:-[a-z]+)+)"')
        found = set()
        for folder in ("src/pipeline", "src/decode", "src/commands", "metadata"):
            for path in pathlib.Path(TOP / folder).rglob("*.[ch]*"):
                if path.name not in ("issue_codes.h", "options.cpp"):
                    found.update(made.findall(path.read_text()))
        self.assertIn("frame-failed", found)   # the search finds what it should
        self.assertEqual(found - set(self.TABLE), set())


if __name__ == "__main__":
    unittest.main()
