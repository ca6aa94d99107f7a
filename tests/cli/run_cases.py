#!/usr/bin/env python3
"""Runs every folder beside this file that holds a file called args, and compares what the program does with what the folder says.

usage: run_cases.py PROGRAM [--update] [CASE ...]

args          one line of shell-quoted words; $NETWORKS and $DATA stand for the project's networks/ and tests/data/
exit          the exit status
stdout        what comes out; absent = nothing. stderr likewise
stdin         what goes in; absent = nothing
files/NAME    an output file as it has to be
anything else is an input file, or a folder of them

A case runs in a copy of its folder, and may leave no file that files/ does not name. Numbers of JSON may differ by 1e-12,
everything else is compared byte for byte. --update writes down what the program does now: read it before you keep it.
"""
import argparse
import difflib
import math
import os
import re
import shlex
import shutil
import subprocess
import sys
import tempfile

from bench import DATA, ENVIRONMENT, HERE, NETWORKS, SECONDS

OF_THE_CASE = ("args", "exit", "stdout", "stderr", "stdin", "files")
NUMBER = re.compile(rb"(?<![\w\"])-?\d+(?:\.\d+)?(?:[eE][-+]?\d+)?(?![\w\"])")


def read(path):
    with open(path, "rb") as file:
        return file.read()


def read_or(path, otherwise):
    return read(path) if os.path.exists(path) else otherwise


def files_below(folder):
    """Relative names of all files below a folder, with their bytes."""
    found = {}
    for where, _, names in os.walk(folder):
        for name in names:
            path = os.path.join(where, name)
            found[os.path.relpath(path, folder)] = read(path)
    return found


def near(a, b):
    return a == b or math.isclose(float(a), float(b), rel_tol=1e-12, abs_tol=1e-12)


def same(wanted, got):
    """Equal bytes; or JSON of equal text whose numbers are equal to 1e-12."""
    if wanted == got:
        return True
    if not (wanted.startswith(b"{") and got.startswith(b"{")) or NUMBER.split(wanted) != NUMBER.split(got):
        return False
    return all(near(a, b) for a, b in zip(NUMBER.findall(wanted), NUMBER.findall(got)))


def difference(name, wanted, got):
    lines = [text.decode(errors="backslashreplace").splitlines() for text in (wanted, got)]
    shown = list(difflib.unified_diff(*lines, "wanted " + name, "got " + name, lineterm=""))
    return "\n".join(shown[:60]) or "%s differs in how its lines end" % name


class Case:
    def __init__(self, name):
        self.name, self.folder = name, os.path.join(HERE, name)

    def path(self, name):
        return os.path.join(self.folder, name)

    def wanted(self):
        """What the folder says: a mapping of exit, stdout, stderr and files/... to bytes."""
        wanted = {name: read_or(self.path(name), b"") for name in ("stdout", "stderr")}
        wanted["exit"] = read_or(self.path("exit"), b"0\n").strip() + b"\n"
        files = files_below(self.path("files")) if os.path.isdir(self.path("files")) else {}
        wanted.update(("files/" + name, content) for name, content in files.items())
        return wanted

    def run(self, program, scratch):
        """What the program does, as wanted() puts it, and what it did to its inputs."""
        work = os.path.join(scratch, self.name)
        shutil.copytree(self.folder, work, symlinks=True, ignore=shutil.ignore_patterns(*OF_THE_CASE))
        before = files_below(work)
        places = {"$NETWORKS": "../networks", "$DATA": "../data"}
        words = shlex.split(read(self.path("args")).decode())
        for place, path in places.items():
            words = [word.replace(place, path) for word in words]
        done = subprocess.run([program, *words], cwd=work, env=ENVIRONMENT, timeout=SECONDS, capture_output=True,
                              input=read_or(self.path("stdin"), b""))
        after = files_below(work)
        got = {"stdout": done.stdout, "stderr": done.stderr, "exit": b"%d\n" % done.returncode}
        got.update(("files/" + name, content) for name, content in after.items() if name not in before)
        harmed = sorted(name for name in before if after.get(name) != before[name])
        shutil.rmtree(work)
        return got, harmed

    def complaints(self, program, scratch):
        got, harmed = self.run(program, scratch)
        wanted = self.wanted()
        told = ["%s was changed" % name for name in harmed]
        for name in sorted(set(wanted) | set(got)):
            if name not in got:
                told.append("%s was not written" % name)
            elif name not in wanted:
                told.append("%s was left behind" % name)
            elif not same(wanted[name], got[name]):
                told.append(difference(name, wanted[name], got[name]))
        return told

    def update(self, program, scratch):
        got, harmed = self.run(program, scratch)
        if harmed:
            raise SystemExit("%s changes its inputs: %s" % (self.name, harmed))
        shutil.rmtree(self.path("files"), ignore_errors=True)
        for name, content in got.items():
            path = self.path(name)
            if name in ("stdout", "stderr") and not content:
                if os.path.exists(path):
                    os.remove(path)
                continue
            os.makedirs(os.path.dirname(path), exist_ok=True)
            with open(path, "wb") as file:
                file.write(content)


def all_cases():
    return sorted(name for name in os.listdir(HERE) if os.path.exists(os.path.join(HERE, name, "args")))


def reached(cases):
    """The codes that some case's standard error shows."""
    return {code.decode() for name in cases for code in re.findall(rb" \[([a-z0-9-]+)\]$", Case(name).wanted()["stderr"], re.M)}


def check_codes(program, cases):
    """Every code of `ballast explain` has a case, but for those that without_case.txt gives a reason for."""
    listing = subprocess.run([program, "explain"], env=ENVIRONMENT, capture_output=True, timeout=SECONDS, check=True).stdout
    known = {line.split()[0] for line in listing.decode().splitlines() if line and not line[0].isspace()}
    with open(os.path.join(HERE, "without_case.txt"), encoding="utf-8") as file:
        excused = {line.split()[0] for line in file if line.strip() and not line.startswith("#")}
    shown = reached(cases)
    told = ["no case shows the code %s" % code for code in sorted(known - shown - excused)]
    told += ["%s has a case, and stands in without_case.txt" % code for code in sorted(excused & shown)]
    told += ["%s is no code, and stands in without_case.txt" % code for code in sorted(excused - known)]
    told += ["a case shows the code %s, which ballast explain does not know" % code for code in sorted(shown - known)]
    return told


def main():
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("program")
    parser.add_argument("cases", nargs="*", metavar="CASE")
    parser.add_argument("--update", action="store_true")
    options = parser.parse_intermixed_args()
    program = os.path.abspath(options.program)
    passed = failed = 0
    with tempfile.TemporaryDirectory(prefix="ballast-cases-") as scratch:
        shutil.copytree(NETWORKS, os.path.join(scratch, "networks"))
        shutil.copytree(DATA, os.path.join(scratch, "data"))
        before = files_below(scratch)
        for name in options.cases or all_cases():
            case = Case(name.rstrip("/"))
            if options.update:
                case.update(program, scratch)
            told = case.complaints(program, scratch)
            failed += bool(told)
            passed += not told
            for line in told:
                print("FAILED %s: %s" % (case.name, line))
        if files_below(scratch) != before:
            failed += 1
            print("FAILED: a case wrote outside its folder")
    if not options.cases:
        told = check_codes(program, all_cases())
        failed += len(told)
        passed += not told
        for line in told:
            print("FAILED: %s" % line)
    print("%d passed, %d failed" % (passed, failed))
    sys.exit(1 if failed or not passed else 0)


if __name__ == "__main__":
    main()
