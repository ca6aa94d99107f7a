"""What the tests of the built program share: a scratch folder with the demo in it, and runs with everything under control.

Each test program is called with the path of the built program, then whatever unittest takes, such as the name of one test.
"""
import ctypes
import os
import re
import shutil
import subprocess
import sys
import tempfile
import unittest

HERE = os.path.dirname(os.path.abspath(__file__))
TESTS = os.path.dirname(HERE)
PROJECT = os.path.dirname(TESTS)
NETWORKS = os.path.join(PROJECT, "networks")
DATA = os.path.join(TESTS, "data")
sys.path.insert(0, os.path.join(TESTS, "support"))
sys.dont_write_bytecode = True

# A sanitizer's report is never mistaken for one of the program's own statuses.
ENVIRONMENT = {
    "PATH": os.environ.get("PATH", "/usr/bin:/bin"),
    "LC_ALL": "C",
    "ASAN_OPTIONS": "exitcode=99:detect_leaks=1",
    "UBSAN_OPTIONS": "exitcode=99:print_stacktrace=1",
    "LSAN_OPTIONS": "exitcode=99",
}
SANITIZED = bool(os.environ.get("BALLAST_SANITIZED"))
SECONDS = 60

# A network that reads fast, for what does not hang on the demo: one cause, one effect.
SMALL = """<?xml version="1.0" encoding="UTF-8"?>
<BIF VERSION="0.3">
<NETWORK>
<NAME>small (invented)</NAME>
<VARIABLE TYPE="nature"><NAME>Cold</NAME><OUTCOME>no</OUTCOME><OUTCOME>yes</OUTCOME></VARIABLE>
<VARIABLE TYPE="nature"><NAME>Cough</NAME><OUTCOME>no</OUTCOME><OUTCOME>dry</OUTCOME><OUTCOME>wet</OUTCOME></VARIABLE>
<DEFINITION><FOR>Cold</FOR><TABLE>0.75 0.25</TABLE></DEFINITION>
<DEFINITION><FOR>Cough</FOR><GIVEN>Cold</GIVEN><TABLE>0.5 0.25 0.25 0.125 0.375 0.5</TABLE></DEFINITION>
</NETWORK>
</BIF>
"""


class Done:
    """How a run ended: a status as a shell shows it, and bytes."""

    def __init__(self, status, out, err):
        self.status, self.out, self.err = (128 - status if status < 0 else status), out, err


class ProgramTest(unittest.TestCase):
    """A test in a scratch folder of its own that holds clinic.xml, cases.csv and small.xml."""
    program = None

    def setUp(self):
        self.folder = tempfile.mkdtemp(prefix="ballast-cli-")
        os.chmod(self.folder, 0o755)
        for name in ("clinic.xml", "cases.csv"):
            shutil.copyfile(os.path.join(NETWORKS, name), self.path(name))
        self.write("small.xml", SMALL)

    def tearDown(self):
        try:
            hidden = [name for _, _, names in os.walk(self.folder) for name in names if name.startswith(".")]
            self.assertEqual(hidden, [], "a temporary file was left behind")
        finally:
            shutil.rmtree(self.folder)

    def path(self, name):
        return os.path.join(self.folder, name)

    def read(self, name):
        with open(self.path(name), "rb") as file:
            return file.read()

    def write(self, name, content):
        with open(self.path(name), "wb") as file:
            file.write(content if isinstance(content, bytes) else content.encode())
        return name

    def start(self, *words, environment=None, **how):
        """Starts the program in the scratch folder. how: more of subprocess.Popen."""
        how.setdefault("cwd", self.folder)
        for stream in ("stdout", "stderr"):
            how.setdefault(stream, subprocess.PIPE)
        how.setdefault("stdin", subprocess.DEVNULL)
        how.setdefault("bufsize", 0)
        return subprocess.Popen([self.program, *words], env=dict(ENVIRONMENT, **(environment or {})), **how)

    def ballast(self, *words, status=0, input=None, **how):
        """Runs the program, which has to end with this status (None: any)."""
        if input is not None:
            how["stdin"] = subprocess.PIPE
        process = self.start(*words, **how)
        return self.finish(process, words, status, input)

    def finish(self, process, words=(), status=0, input=None):
        try:
            out, err = process.communicate(input, timeout=SECONDS)
        except subprocess.TimeoutExpired:
            process.kill()
            process.communicate()
            self.fail("%s did not end within %d s" % (words, SECONDS))
        done = Done(process.returncode, out, err)
        if status is not None:
            self.assertEqual(done.status, status, "%s: %s" % (words, (done.err or b"").decode(errors="replace")))
        return done

    def assert_error(self, done, code, *parts):
        """The last line on standard error ends with the code and holds these parts; nothing is on standard output."""
        lines = done.err.decode().splitlines()
        self.assertTrue(lines and lines[-1].endswith("[%s]" % code), done.err)
        for part in parts:
            self.assertIn(part, lines[-1])
        self.assertEqual(done.out or b"", b"")

    def names(self):
        return sorted(os.listdir(self.folder))


def skip(reason):
    raise unittest.SkipTest(reason)


def obey_permissions():
    """For preexec_fn: root passes over permissions unless these two capabilities are taken away before the program starts."""
    drop_bound, dac_override, dac_read_search = 24, 1, 2
    if os.geteuid() == 0:
        for capability in (dac_override, dac_read_search):
            if ctypes.CDLL(None).prctl(drop_bound, capability, 0, 0, 0) != 0:
                os._exit(98)


def help_page(program, command=None):
    words = [program] + ([command] if command else []) + ["--help"]
    return subprocess.run(words, env=ENVIRONMENT, stdout=subprocess.PIPE, timeout=SECONDS, check=True).stdout.decode()


def commands(program):
    """The commands that the overview lists, with their usage."""
    return dict(re.findall(r"^  ([a-z]+) +(\S.*)$", help_page(program), re.M))


class Option:
    """An option as a command's page lists it."""

    def __init__(self, letter, name, argument, text):
        self.letter, self.name, self.argument, self.text = letter, name, argument, " ".join(text.split())
        default = re.search(r"\(default: (\S+)\)$", self.text)
        self.default = default.group(1) if default else None
        self.repeatable = "may be repeated" in self.text

    @property
    def is_number(self):
        return self.argument is not None and re.fullmatch(r"[NPTKWFR](\|[a-z|-]+)?|SIZE", self.argument) is not None

    def words(self, value):
        return ["--" + self.name] + ([value] if self.argument else [])


def options(program, command):
    found = re.findall(r"^  (?:-(\w), )?--([a-z-]+)(?: (\S.*))?\n((?:      .*\n)+)", help_page(program, command), re.M)
    return [Option(letter, name, argument or None, text) for letter, name, argument, text in found]


def main():
    """Runs the tests of the calling program and ends with the line that every test program here ends with."""
    if len(sys.argv) < 2:
        sys.exit("usage: %s PROGRAM [TEST ...]" % sys.argv[0])
    ProgramTest.program = os.path.abspath(sys.argv.pop(1))
    program = unittest.main(exit=False)
    result = program.result
    failed = len(result.failures) + len(result.errors) + len(result.unexpectedSuccesses)
    for test, reason in result.skipped:
        print("skipped %s: %s" % (test, reason))
    print("%d passed, %d failed" % (result.testsRun - failed - len(result.skipped), failed))
    sys.exit(1 if failed or not result.testsRun else 0)
