"""The exact text of a few runs. `bash tests/run.sh --golden` writes it anew (FOCUSFALL_GOLDEN=write)."""
import os
import pathlib
import unittest

from program import CommandLineTest, run

FOLDER = pathlib.Path(__file__).resolve().parent / "golden"

PLAN = ["predict", "--focal-length", "400mm", "--sensor", "36x24mm"]
SHOT = PLAN + ["--f-number", "2.8", "--focus-distance", "30m"]
STAGE = [f"sample-images/{name}.jpg" for name in ("stage-01-on", "stage-03-back", "bench-13-diffraction")]
BRIEF = STAGE + ["sample-images/regatta-10-no-evidence.jpg", "sample-images/none.jpg"]

RUNS = {
    "predict.txt": (80, SHOT + ["--at", "28m,30m,33m,inf", "--iso", "400", "--exposure-time", "1/2000"]),
    "predict-hold-depth.txt": (80, PLAN + ["--hold-depth", "28m..33m"]),
    "predict-hold-blur-at.txt": (80, PLAN + ["--hold-blur-at", "33m", "--focus-distance", "30m"]),
    "predict-hold-blur.txt": (80, SHOT + ["--hold-blur", "3px", "--subject-speed", "8m/s", "--pixel-pitch", "6um"]),
    "predict-reach-depth.txt": (80, PLAN + ["--f-number", "2.8", "--reach-depth", "1.5m"]),
    "predict-hold-brightness.txt": (80, PLAN + ["--f-number", "2.8", "--iso", "400", "--hold-brightness", "--luminance",
                                                "4000cd/m2"]),
    "predict.json": (80, SHOT + ["--format", "json", "--at", "28m,inf"]),
    "check.txt": (80, ["check", *STAGE]),
    "check-brief-80.txt": (80, ["check", "--brief", *BRIEF]),
    "check-brief-200.txt": (200, ["check", "--brief", *BRIEF]),
    "check-help.txt": (80, ["check", "--help"]),
    "predict-help.txt": (80, ["predict", "--help"]),
}


class GoldenTest(CommandLineTest):
    def test_output_is_what_it_was(self):
        for name, (columns, arguments) in RUNS.items():
            with self.subTest(name):
                text = run(*arguments, columns=columns).out
                if os.environ.get("FOCUSFALL_GOLDEN") == "write":
                    FOLDER.mkdir(exist_ok=True)
                    (FOLDER / name).write_text(text)
                self.assertEqual(text, (FOLDER / name).read_text(),
                                 "bash tests/run.sh --golden writes the files anew")


if __name__ == "__main__":
    unittest.main()
