"""Runs a command with faults around it and judges what it leaves: the base of sweep.py and environment.py."""
import argparse
import concurrent.futures
import os
import pathlib
import shutil
import subprocess
import sys
import tempfile

OLD = b"what stood here before\n"

# An invented network and an invented table, for these tests alone.
NETWORK = """<?xml version="1.0"?>
<BIF VERSION="0.3">
<NETWORK>
<NAME>demo</NAME>
<VARIABLE TYPE="nature"><NAME>fever</NAME><OUTCOME>no</OUTCOME><OUTCOME>yes</OUTCOME></VARIABLE>
<VARIABLE TYPE="nature"><NAME>cough</NAME><OUTCOME>none</OUTCOME><OUTCOME>some</OUTCOME><OUTCOME>much</OUTCOME></VARIABLE>
<DEFINITION><FOR>fever</FOR><TABLE>0.75 0.25</TABLE></DEFINITION>
<DEFINITION><FOR>cough</FOR><GIVEN>fever</GIVEN><TABLE>0.5 0.25 0.25 0.125 0.375 0.5</TABLE></DEFINITION>
</NETWORK>
</BIF>
"""
TABLE = "fever,cough\n" + "".join(
    f"{'yes' if i % 3 == 0 else 'no'},{('none', 'some', 'much', 'some')[i * 7 % 4]}\n" for i in range(24))


class Command:
    """A command line to be tried. In its words {network}, {table} and {bytes} are inputs, {out} and {json} outputs."""

    def __init__(self, name, words, outputs, large=False):
        self.name, self.words, self.outputs, self.large = name, words, outputs, large


def commands(options):
    """The table of commands. A new one needs only a line here."""
    probe = os.path.join(options.shims, "fault_probe")
    ballast = options.ballast
    table = [
        Command("probe", [probe, "{bytes}", "{out}", "3"], ["out"]),
        Command("probe to standard output", [probe, "{bytes}", "-", "3"], []),
        Command("probe, much", [probe, "{bytes}", "{out}", "400"], ["out"], large=True),
    ]
    if ballast:
        table += [
            Command("check", [ballast, "check", "{network}", "{table}", "--json", "{json}"], ["json"]),
            Command("fit", [ballast, "fit", "{network}", "{table}", "-o", "{out}", "--json", "{json}", "--threads", "2"],
                    ["out", "json"]),
            Command("check to standard output", [ballast, "check", "{network}", "{table}", "--json", "-"], []),
            Command("draw to standard output", [ballast, "draw", "{network}", "--records", "20", "-o", "-"], []),
            Command("draw", [ballast, "draw", "{network}", "--records", "200", "-o", "{out}"], ["out"]),
            Command("draw, much", [ballast, "draw", "{network}", "--records", "30000", "-o", "{out}"], ["out"], large=True),
        ]
    return table


class Result:
    """What a run left behind."""

    def __init__(self, status, stdout, stderr, files):
        self.status, self.stdout, self.stderr, self.files = status, stdout, stderr, files


class Bench:
    """A scratch folder with the inputs in it; counts what passed and what failed."""

    def __init__(self, description, in_memory=False):
        """in_memory: the scratch folder may lie in memory, where a sync takes no time."""
        parser = argparse.ArgumentParser(description=description)
        parser.add_argument("--shims", required=True, help="folder of the preloaded libraries and of the probe")
        parser.add_argument("--ballast", help="the program; without it only the probe is tried")
        parser.add_argument("--only", help="only commands whose name contains this")
        parser.add_argument("--seconds", type=float, default=50, help="about how long to take")
        parser.add_argument("--full", action="store_true", help="every number of every fault, however long it takes")
        self.options = parser.parse_args()
        self.options.shims = os.path.abspath(self.options.shims)
        self.options.ballast = self.options.ballast and os.path.abspath(self.options.ballast)
        self.passed = self.failed = 0
        memory = "/dev/shm" if in_memory and os.access("/dev/shm", os.W_OK) else None
        self.scratch = pathlib.Path(tempfile.mkdtemp(prefix="ballast-faults-", dir=memory))
        self.scratch.chmod(0o755)
        self.inputs = {}
        for name, text in (("network", NETWORK), ("table", TABLE), ("bytes", "0123456789abcdef\n" * 40)):
            path = self.scratch / {"network": "network.xml", "table": "cases.csv", "bytes": "bytes"}[name]
            path.write_text(text)
            self.inputs[name] = str(path)
        self.pool = concurrent.futures.ThreadPoolExecutor(2)

    def __enter__(self):
        return self

    def __exit__(self, *_):
        self.pool.shutdown(cancel_futures=True)
        shutil.rmtree(self.scratch)

    def commands(self):
        return [c for c in commands(self.options) if not self.options.only or self.options.only in c.name]

    def words(self, command, folder):
        places = dict(self.inputs, out=f"{folder}/out", json=f"{folder}/json")
        return [word.format(**places) if "{" in word else word for word in command.words]

    def shim(self, name):
        return os.path.join(self.options.shims, name + ".so")

    def folder(self, command, old=True):
        folder = pathlib.Path(tempfile.mkdtemp(dir=self.scratch))
        if old:
            for name in command.outputs:
                (folder / name).write_bytes(OLD)
        return folder

    def run(self, command, environment=None, old=True, timeout=60, **how):
        """Runs a command in a folder of its own. how: more of subprocess.run, such as preexec_fn."""
        folder = self.folder(command, old)
        try:
            return self.run_in(folder, self.words(command, folder), environment, timeout, **how)
        finally:
            shutil.rmtree(folder)

    def run_in(self, folder, words, environment=None, timeout=60, **how):
        how.setdefault("stdout", subprocess.PIPE)
        how.setdefault("stderr", subprocess.PIPE)
        how.setdefault("stdin", subprocess.DEVNULL)
        done = subprocess.run(words, env=dict(os.environ, LC_ALL="C", **(environment or {})), timeout=timeout, **how)
        files = {p.name: p.read_bytes() for p in pathlib.Path(folder).iterdir() if p.is_file()}
        return Result(done.returncode, done.stdout, done.stderr, files)

    def baseline(self, command):
        """An undisturbed run, which everything else is held against."""
        result = self.run(command)
        if result.status != 0 or sorted(result.files) != sorted(command.outputs) or OLD in result.files.values():
            raise SystemExit(f"{command.name} fails without any fault: {result.status} {result.stderr!r} {sorted(result.files)}")
        return result

    def count(self, command, shim, environment, old=True):
        """How many allocations or calls of a kind an undisturbed run makes."""
        report = self.scratch / f"count-{os.urandom(4).hex()}"
        self.run(command, dict(environment, LD_PRELOAD=self.shim(shim), FAULT_REPORT=str(report)), old)
        number = int(report.read_text())
        report.unlink()
        return number

    def judge(self, command, result, wanted, statuses, old=True, hidden=False, untouched=False):
        """What is wrong with a result, in words; "" when nothing is. hidden: hidden files may be left; untouched: no output may be
        new."""
        if result.status not in statuses:
            return f"status {result.status}, not one of {sorted(statuses)}: {result.stderr!r}"
        if result.status == 3 and (not result.stderr.strip() or b"[" not in result.stderr):
            return f"status 3 without a message: {result.stderr!r}"
        if result.status == 0 and result.stdout != wanted.stdout:
            return "status 0, and standard output differs"
        for name in command.outputs:
            bytes_now = result.files.get(name)
            if result.status == 0 and bytes_now != wanted.files[name]:
                return f"status 0, and {name} differs: {bytes_now!r:.100}"
            before = OLD if old else None
            if untouched and bytes_now != before:
                return f"{name} was touched: {bytes_now!r:.100}"
            if bytes_now not in (wanted.files[name], before):
                return f"{name} is neither as it was nor complete: {bytes_now!r:.100}"
        others = sorted(set(result.files) - set(command.outputs))
        if others and not (hidden and all(name.startswith(".ballast-") for name in others)):
            return f"left behind: {others}"
        return ""

    def note(self, what, complaint):
        if complaint:
            self.failed += 1
            print(f"FAILED {what}: {complaint}", flush=True)
        else:
            self.passed += 1

    def skip(self, what, reason):
        print(f"skipped {what}: {reason}", flush=True)

    def end(self):
        print(f"{self.passed} passed, {self.failed} failed")
        return 1 if self.failed or not self.passed else 0


def thin(numbers, most):
    """At most so many of the numbers, the first and last among them, evenly spread."""
    numbers = list(numbers)
    if len(numbers) <= most:
        return numbers
    most = max(most, 2)
    return [numbers[i * (len(numbers) - 1) // (most - 1)] for i in range(most)]


sys.dont_write_bytecode = True
