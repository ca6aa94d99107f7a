#!/usr/bin/env python3
"""Runs the commands that README.md shows and compares what comes out with what it prints. usage: test_readme.py PROGRAM [--update]

An indented block whose first line begins with "$ " is a story: every such line is a command, run by the shell in one scratch
folder for the whole page, with the program as `ballast` and the project's networks/ at hand; the lines up to the next command
are its output and messages. A line of three dots stands for lines left out.
"""
import os
import re
import shutil
import subprocess
import sys
import tempfile
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]


def blocks(lines):
    """(first, last) of every indented block that begins with a command."""
    i = 0
    while i < len(lines):
        if lines[i].startswith("    $ "):
            first = i
            while i < len(lines) and (lines[i].startswith("    ") or (not lines[i] and i + 1 < len(lines) and lines[i + 1].startswith("    "))):
                i += 1
            yield first, i
        i += 1


def run(command, folder, program):
    environment = dict(os.environ, PATH=f"{folder / 'bin'}{os.pathsep}{os.environ['PATH']}", LC_ALL="C.UTF-8")
    done = subprocess.run(command, shell=True, cwd=folder, env=environment, stdout=subprocess.PIPE, stderr=subprocess.STDOUT, text=True, timeout=60,
                          stdin=subprocess.DEVNULL)
    return done.stdout.splitlines()


def agree(shown, got):
    """Whether the shown lines match, three dots standing for any number of lines."""
    pattern = "".join("(?:[^\n]*\n)*" if line.strip() == "..." else re.escape(line) + "\n" for line in shown)
    return re.fullmatch(pattern, "".join(line + "\n" for line in got)) is not None


def main(program, update):
    page = ROOT / "README.md"
    lines = page.read_text(encoding="utf-8").split("\n")
    passed = failed = 0
    out, done = [], 0
    with tempfile.TemporaryDirectory() as scratch:
        folder = Path(scratch)
        (folder / "bin").mkdir()
        (folder / "bin" / "ballast").symlink_to(Path(program).resolve())
        shutil.copytree(ROOT / "networks", folder / "networks")
        for first, last in blocks(lines):
            out += lines[done:first]
            i = first
            while i < last:
                end = i + 1
                while end < last and not lines[end].startswith("    $ "):
                    end += 1
                command = lines[i][6:]
                shown = [line[4:] for line in lines[i + 1:end]]
                while shown and not shown[-1]:
                    shown.pop()
                got = run(command, folder, program)
                if agree(shown, got):
                    passed += 1
                else:
                    failed += 1
                    print(f"FAILED README.md:{i + 1}: {command}")
                    if not update:
                        print("\n".join(["  shown:"] + [f"    {line}" for line in shown] + ["  came out:"] + [f"    {line}" for line in got]))
                out.append(lines[i])
                out += [f"    {line}".rstrip() for line in (got if update and not agree(shown, got) else shown)]
                i = end
            done = last
        out += lines[done:]
    if update:
        page.write_text("\n".join(out), encoding="utf-8")
    print(f"{passed} passed, {failed} failed")
    return 1 if failed or not passed else 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1], "--update" in sys.argv[2:]))
