#!/usr/bin/env python3
"""The same bytes whatever the environment is: locale, variables, threads, compiler, terminal, and how the input arrives.

usage: test_environment.py PROGRAM [TEST ...]

BALLAST_GCC and BALLAST_CLANG may name programs built by the two compilers, to be compared.
"""
import os
import pty
import re
import select
import shutil
import subprocess
import threading

from bench import ENVIRONMENT, ProgramTest, SECONDS, main, skip
from run_cases import same

FIT = ["fit", "clinic.xml", "cases.csv"]


class Environment(ProgramTest):
    def outputs(self, environment=None, words=(), program=None, **how):
        """Everything that the program can write, by name."""
        runs = {
            "page": [*FIT, *words],
            "network": [*FIT, "-o", "-", *words],
            "json": [*FIT, "--json", "-", "--level", "0.9", *words],
            "expert": [*FIT, "--prior", "expert", "--json", "-", *words],
            "check": ["check", "clinic.xml", "cases.csv"],
            "check json": ["check", "clinic.xml", "cases.csv", "--json", "-"],
            "draw": ["draw", "clinic.xml", "--records", "30", "-o", "-"],
            "explain": ["explain", "unknown-label"],
        }
        if program:
            how["executable"] = program
        done = {name: self.ballast(*words, environment=environment, **how) for name, words in runs.items()}
        return {name: (one.out, one.err) for name, one in done.items()}

    def assert_same(self, wanted, got, told):
        for name in wanted:
            self.assertEqual(wanted[name], got[name], "%s: %s" % (told, name))

    def test_locales(self):
        if not shutil.which("localedef"):
            skip("localedef is not installed")
        folder = self.path("locales")
        os.mkdir(folder)
        subprocess.run(["localedef", "-i", "de_DE", "-f", "UTF-8", os.path.join(folder, "de_DE.UTF-8")], check=True,
                       capture_output=True, timeout=SECONDS)
        german = {"LOCPATH": folder, "LC_ALL": "de_DE.UTF-8"}
        said = subprocess.run(["/usr/bin/printf", "%.1f", "1,5"], env=dict(ENVIRONMENT, **german), capture_output=True,
                              timeout=SECONDS)
        self.assertEqual(said.stdout, b"1,5", "the locale with a decimal comma does not work, so nothing would be tested")
        wanted = self.outputs()
        for environment in (german, {"LC_ALL": "", "LC_NUMERIC": "de_DE.UTF-8", "LOCPATH": folder}, {"LC_ALL": "C.UTF-8"},
                            {"LC_ALL": "xx_YY"}, {"LC_ALL": "", "LANG": "tr_TR.UTF-8"}):
            self.assert_same(wanted, self.outputs(environment), environment)

    def test_variables(self):
        wanted = self.outputs()
        for environment in ({"GSL_RNG_TYPE": "junk", "GSL_RNG_SEED": "7"}, {"OMP_NUM_THREADS": "junk", "TZ": "Pacific/Chatham"},
                            {"XML_CATALOG_FILES": "file:///nowhere", "XML_DEBUG_CATALOG": "1", "SGML_CATALOG_FILES": "/dev/zero"},
                            {"MALLOC_PERTURB_": "165"}, {"MALLOC_PERTURB_": "90", "MALLOC_ARENA_MAX": "1"},
                            {"TMPDIR": "/nowhere", "HOME": "/nowhere", "PATH": "/nowhere"}, {"SOURCE_DATE_EPOCH": "1"},
                            {"POSIXLY_CORRECT": "1", "BALLAST": "junk", "BALLAST_OPTIONS": "--help"}):
            self.assert_same(wanted, self.outputs(environment), environment)

    def test_no_environment_at_all(self):
        done = subprocess.run([self.program, *FIT, "-o", "-"], env={}, cwd=self.folder, capture_output=True, timeout=SECONDS)
        self.assertEqual((done.returncode, done.stdout), (0, self.outputs()["network"][0]))

    def test_processor_without_fused_arithmetic(self):
        """libm's last bits may differ then: fitted tables may not, other numbers only to 1e-12."""
        wanted = self.outputs()
        got = self.outputs({"GLIBC_TUNABLES": "glibc.cpu.hwcaps=-FMA,-FMA4,-AVX2,-AVX512F"})
        for name in wanted:
            if "json" in name or name == "expert":
                self.assertTrue(same(wanted[name][0], got[name][0]), name)
            else:
                self.assertEqual(wanted[name], got[name], name)

    def test_threads(self):
        self.ballast("draw", "clinic.xml", "--records", "20000", "-o", "cases.csv")
        wanted = self.outputs(words=["--threads", "1"])
        for threads in ("2", "3", "4", "8"):
            self.assert_same(wanted, self.outputs(words=["--threads", threads]), threads)

    def test_runs_repeat(self):
        self.assert_same(self.outputs(), self.outputs(), "again")

    def test_compilers(self):
        programs = [os.environ.get(name) for name in ("BALLAST_GCC", "BALLAST_CLANG")]
        if not all(programs):
            skip("BALLAST_GCC and BALLAST_CLANG do not name two programs")
        gcc, clang = (self.outputs(program=program) for program in programs)
        for name in gcc:
            self.assertTrue(same(gcc[name][0], clang[name][0]), name)
            if "json" not in name and name != "expert":
                self.assertEqual(gcc[name], clang[name], name)

    def test_clock(self):
        if not shutil.which("faketime"):
            skip("faketime is not installed")
        wanted = self.outputs()["network"]
        for date in ("1970-01-02", "2100-01-01"):
            done = subprocess.run(["faketime", date, self.program, *FIT, "-o", "-"], env=ENVIRONMENT, cwd=self.folder,
                                  capture_output=True, timeout=SECONDS)
            self.assertEqual((done.stdout, done.stderr), wanted)


class HowInputArrives(ProgramTest):
    """The name of an input is in the output, so what is compared has the same name."""

    def results(self, *words, **how):
        words = ["fit", *words, "--ess", "4", "--folds", "5"]
        return [self.ballast(*words, "-o", "-", **how).out, self.ballast(*words, "--json", "-", **how).out]

    def from_file(self, words, name="cases.csv"):
        results = []
        for output in ("-o", "--json"):
            with open(self.path(name), "rb") as file:
                results.append(self.ballast("fit", *words, "--ess", "4", "--folds", "5", output, "-", stdin=file).out)
        return results

    def test_pipe(self):
        table, network = self.read("cases.csv"), self.read("clinic.xml")
        self.assertEqual(self.results("clinic.xml", "-", input=table), self.from_file(["clinic.xml", "-"]))
        self.assertEqual(self.results("-", "cases.csv", input=network), self.from_file(["-", "cases.csv"], "clinic.xml"))

    def test_byte_by_byte(self):
        wanted = self.from_file(["clinic.xml", "-"])[0]
        process = self.start("fit", "clinic.xml", "-", "--ess", "4", "--folds", "5", "-o", "-", stdin=subprocess.PIPE)
        for byte in self.read("cases.csv"):
            process.stdin.write(bytes([byte]))
        self.assertEqual(self.finish(process).out, wanted)
        process = self.start("fit", "-", "cases.csv", "--ess", "4", "--folds", "5", "-o", "-", stdin=subprocess.PIPE)
        for byte in self.read("clinic.xml"):
            process.stdin.write(bytes([byte]))
        self.assertEqual(self.finish(process).out, self.from_file(["-", "cases.csv"], "clinic.xml")[0])

    def feed(self, name, *pieces):
        """Writes to a FIFO with a pause between the pieces; whoever closes it early gets noticed."""
        failed = []

        def write():
            with open(self.path(name), "wb", buffering=0) as fifo:
                for piece in pieces:
                    try:
                        fifo.write(piece)
                    except BrokenPipeError:
                        failed.append("the reader went away")
                    select.select([], [], [], 0.05)

        thread = threading.Thread(target=write)
        thread.start()
        return thread, failed

    def test_fifo(self):
        os.mkdir(self.path("fifo"))
        for name in ("clinic.xml", "cases.csv"):
            os.mkfifo(self.path("fifo/" + name))
        wanted = self.results("clinic.xml", "cases.csv")
        for i, option in enumerate(("-o", "--json")):
            feeds = []
            for name in ("clinic.xml", "cases.csv"):
                content = self.read(name)
                feeds.append(self.feed("fifo/" + name, content[:100], content[100:2000], content[2000:]))
            got = self.ballast("fit", "fifo/clinic.xml", "fifo/cases.csv", "--ess", "4", "--folds", "5", option, "-").out
            for thread, failed in feeds:
                thread.join(SECONDS)
                self.assertEqual(failed, [])
            self.assertEqual(got, wanted[i])

    def test_process_substitution(self):
        """bash hands over a descriptor under a name such as /dev/fd/63."""
        script = '"$0" fit <(cat clinic.xml) <(cat cases.csv) --ess 4 --folds 5 -o out.xml --quiet'
        done = subprocess.run(["bash", "-c", script, self.program], cwd=self.folder, env=ENVIRONMENT, capture_output=True,
                              timeout=SECONDS)
        self.assertEqual(done.returncode, 0, done.stderr)
        hide = lambda content: re.sub(rb"ballast\.inputs = [^<]*", b"", content)
        self.assertEqual(hide(self.read("out.xml")), hide(self.results("clinic.xml", "cases.csv")[0]))

    def test_table_that_is_not_kept_and_cannot_be_read_again(self):
        words = ["fit", "clinic.xml", "-", "--memory", "0", "--folds", "5", "-o", "-", "--ess", "4"]
        done = self.ballast(*words, input=self.read("cases.csv"), status=3)
        self.assert_error(done, "cannot-reread", "standard input")
        with open(self.path("cases.csv"), "rb") as file:
            self.assertEqual(self.ballast(*words, stdin=file).out, self.from_file(["clinic.xml", "-"])[0])

    def test_memory_changes_nothing(self):
        wanted = self.results("clinic.xml", "cases.csv")
        for memory in ("0", "1", "1000", "3K", "1M", "1G"):
            self.assertEqual(self.results("clinic.xml", "cases.csv", "--memory", memory), wanted)

    def test_standard_input_from_its_middle(self):
        """What stood before in the file was read by somebody else."""
        table = self.read("cases.csv")
        self.write("two.csv", b"a line for somebody else\n" + table)
        with open(self.path("two.csv"), "rb", buffering=0) as file:
            file.seek(25)
            got = self.ballast("fit", "clinic.xml", "-", "--ess", "4", "--folds", "5", "-o", "-", "--memory", "0", stdin=file).out
        self.assertEqual(got, self.from_file(["clinic.xml", "-"])[0])


class Terminal(ProgramTest):
    def on_terminal(self, environment, *words):
        """What a terminal is sent on both streams."""
        master, slave = pty.openpty()
        process = self.start(*words, environment=environment, stdout=slave, stderr=slave, stdin=slave)
        os.close(slave)
        got = b""
        while True:
            try:
                piece = os.read(master, 65536)
            except OSError:
                break
            if not piece:
                break
            got += piece
        os.close(master)
        self.assertEqual(process.wait(SECONDS), 0)
        return got.replace(b"\r\n", b"\n")

    def test_no_escape_codes(self):
        wanted = self.ballast(*FIT, stderr=subprocess.STDOUT).out
        for environment in ({"TERM": "xterm-256color"}, {"TERM": "dumb"}, {"TERM": ""}, {"COLUMNS": "0"},
                            {"COLUMNS": "1", "LINES": "1"}, {"COLUMNS": "99999"}, {"COLUMNS": "junk"}, {"NO_COLOR": ""},
                            {"NO_COLOR": "1"}, {"CLICOLOR_FORCE": "1"}):
            got = self.on_terminal(environment, *FIT)
            self.assertNotIn(b"\x1b", got)
            self.assertNotIn(b"\r", got)
            self.assertEqual(sorted(got.splitlines()), sorted(wanted.splitlines()), environment)


if __name__ == "__main__":
    main()
