"""Runs the built program for the outside checks, and counts what held."""
import json
import math
import subprocess
import sys


class Program:
    """The built program. It runs in a folder of its own choosing, so that files are named by their base names."""

    def __init__(self, path, folder):
        self.path, self.folder = path, folder

    def run(self, *words, status=0):
        """Standard output of one run, which must end with this status."""
        done = subprocess.run([self.path, *map(str, words)], cwd=self.folder, capture_output=True, timeout=120)
        if done.returncode != status:
            raise RuntimeError("%s ended with status %d: %s" % (" ".join(map(str, words)), done.returncode,
                                                               done.stderr.decode(errors="replace")))
        return done.stdout

    def json(self, *words):
        """The JSON of one run: strict, every key once."""
        return read_json(self.run(*words, "--quiet", "--json", "-"))


def read_json(text):
    return json.loads(text, object_pairs_hook=_once, parse_constant=_refuse)


def _once(pairs):
    names = [name for name, _ in pairs]
    if len(set(names)) != len(names):
        raise ValueError("a key stands twice in %s" % names)
    return dict(pairs)


def _refuse(word):
    raise ValueError("%s is no JSON" % word)


class Trial:
    """Counts checks, prints those that fail, and gives the exit status."""

    def __init__(self):
        self.passed, self.failed = 0, 0

    def check(self, held, name, told=""):
        if held:
            self.passed += 1
        else:
            self.failed += 1
            if self.failed <= 60:
                print("FAILED %s: %s" % (name, told))
        return held

    def equal(self, name, got, wanted):
        return self.check(got == wanted, name, "got %.200r, wanted %.200r" % (got, wanted))

    def within(self, name, got, wanted, tolerance):
        """|got - wanted| <= tolerance, as published tables are checked."""
        held = isinstance(got, (int, float)) and abs(got - wanted) <= tolerance
        return self.check(held, name, "got %r, wanted %r within %g" % (got, wanted, tolerance))

    def near(self, name, got, wanted, relative, absolute=0.0):
        held = (isinstance(got, (int, float)) and not isinstance(got, bool) and math.isfinite(got) and
                abs(got - wanted) <= max(absolute, relative * abs(wanted)))
        return self.check(held, name, "got %r, wanted %r" % (got, wanted))

    def finish(self):
        """Prints the closing line and ends the process."""
        print("%d passed, %d failed" % (self.passed, self.failed))
        sys.exit(1 if self.failed or not self.passed else 0)
