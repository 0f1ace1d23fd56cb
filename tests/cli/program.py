"""Runs the program for the tests of the command line. FOCUSFALL names it; ctest sets the variable."""
import json
import os
import pathlib
import subprocess
import tempfile
import unittest

TOP = pathlib.Path(__file__).resolve().parents[2]
PROGRAM = os.environ.get("FOCUSFALL", str(TOP / "build-tests" / "focusfall"))
SAMPLES = TOP / "sample-images"
SCHEMA = TOP / "src" / "output" / "schema" / "frame.schema.json"

DONE, FRAMES_MISSING, WRONG_USE, BROKEN_OFF, INTERRUPTED = 0, 1, 2, 3, 130


class Result:
    def __init__(self, completed):
        self.code = completed.returncode
        self.out_bytes, self.err_bytes = completed.stdout, completed.stderr
        self.out = completed.stdout.decode("utf-8", "replace")
        self.err = completed.stderr.decode("utf-8", "replace")

    @property
    def records(self):
        return [json.loads(line) for line in self.out.splitlines()]


def environment(columns=80, **more):
    """Nothing of the person who runs the tests: no settings, no width of a terminal."""
    return {"PATH": os.environ["PATH"], "HOME": "/nonexistent", "COLUMNS": str(columns), **more}


def run(*arguments, columns=80, cwd=TOP, stdin=b"", env=None, timeout=120):
    return Result(subprocess.run([PROGRAM, *arguments], cwd=cwd, input=stdin, capture_output=True, timeout=timeout,
                                 env=env or environment(columns)))


class CommandLineTest(unittest.TestCase):
    """A test with a folder of its own."""

    maxDiff = None

    def setUp(self):
        folder = tempfile.TemporaryDirectory()
        self.addCleanup(folder.cleanup)
        self.folder = pathlib.Path(folder.name)

    def write(self, name, content):
        path = self.folder / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(content)
        return path

    def sample(self, name="stage-01-on.jpg", under=None):
        return self.write(under or name, (SAMPLES / name).read_bytes())

    def lines_about(self, result, path):
        """The lines of standard error that name a path, which must be exactly one."""
        lines = [line for line in result.err.splitlines() if line.startswith(f"{path}: ")]
        self.assertEqual(len(lines), 1, result.err)
        return lines[0]
