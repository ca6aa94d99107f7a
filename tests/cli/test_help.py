#!/usr/bin/env python3
"""The help pages say what the program does: no option more, none less, and the defaults are the ones shown.

usage: test_help.py PROGRAM [TEST ...]
"""
import os

from bench import ProgramTest, commands, help_page, main, options

# What makes a whole run of each command, and what an option needs beside it.
RUNS = {
    "check": ["check", "clinic.xml", "cases.csv", "--json", "out.json"],
    "fit": ["fit", "clinic.xml", "cases.csv", "-o", "out.xml", "--json", "out.json"],
    "draw": ["draw", "clinic.xml", "--records", "50", "-o", "out.csv"],
    "tally": ["tally", "clinic.xml", "cases.csv", "-o", "out.xml", "--json", "out.json"],
    "explain": ["explain", "unknown-label"],
}
GOES_WITH = {"scale": ["--prior", "k2"], "prior-floor": ["--prior", "expert"], "row-ess": ["--prior", "expert"]}
# Defaults that are told in words, by values that mean the same.
IN_WORDS = {"delimiter": ",", "threads": str(os.cpu_count()), "memory": "1G"}


class Help(ProgramTest):
    def pages(self):
        return {name: help_page(self.program, name) for name in commands(self.program)}

    def test_every_command_has_a_page(self):
        self.assertEqual(sorted(commands(self.program)), sorted(RUNS), "a new command needs a line in RUNS")
        for name, usage in commands(self.program).items():
            page = help_page(self.program, name)
            self.assertTrue(page.startswith("usage: ballast %s %s\n" % (name, usage)), page)
            for other in (["help", name], ["--help", name], [name, "-h"]):
                self.assertEqual(self.ballast(*other).out.decode(), page)

    def test_help_wins_over_missing_arguments_only(self):
        self.ballast("fit", "--help", "--no-such-option", status=2)
        self.ballast("fit", "a", "b", "c", "d", "--help")

    def test_no_line_is_too_long(self):
        texts = dict(self.pages(), overview=help_page(self.program), explain_all=self.ballast("explain").out.decode())
        for name, page in texts.items():
            for line in page.splitlines():
                self.assertLessEqual(len(line), 80, "%s: %s" % (name, line))
            self.assertTrue(page.endswith("\n") and not page.endswith("\n\n"), name)
            self.assertNotIn("\t", page)

    def test_listed_options_are_accepted_and_no_others(self):
        every = {option.name: option for name in commands(self.program) for option in options(self.program, name)}
        for name in commands(self.program):
            listed = {option.name for option in options(self.program, name)}
            self.assertIn("help", listed)
            for option in every.values():
                done = self.ballast(name, *option.words("x"), "missing.xml", status=None)
                refused = b"[unknown-option]" in done.err
                self.assertEqual(refused, option.name not in listed, "%s --%s: %s" % (name, option.name, done.err))
                self.assertEqual(done.status == 0, option.name == "help" and option.name in listed)

    def test_letters_are_the_options_they_stand_for(self):
        for name in commands(self.program):
            for option in options(self.program, name):
                if not option.letter:
                    continue
                long = self.ballast(name, *option.words("x"), *option.words("x"), status=None)
                again = ["-" + option.letter] + (["x"] if option.argument else [])
                short = self.ballast(name, *option.words("x"), *again, status=None)
                self.assertEqual(long.err, short.err)
                self.assertIn(b"[option-twice]", short.err)

    def outputs(self, words):
        done = self.ballast(*words)
        found = {name: self.read(name) for name in ("out.xml", "out.json", "out.csv") if os.path.exists(self.path(name))}
        for name in found:
            os.remove(self.path(name))
        return done.out, done.err, found

    def test_defaults_are_the_ones_shown(self):
        tried = 0
        for name, words in RUNS.items():
            for option in options(self.program, name):
                value = option.default or IN_WORDS.get(option.name)
                if value is None or option.name == "carry":  # that takes an earlier fit: test_carried.py
                    continue
                tried += 1
                beside = words + GOES_WITH.get(option.name, [])
                given = self.outputs(beside + option.words(value))
                self.assertEqual(self.outputs(beside), given, "%s --%s" % (name, option.name))
        self.assertGreater(tried, 15)

    def test_another_value_than_the_default_is_another_result(self):
        changes = {"ess": "3", "scale": "2", "prior-floor": "0.5", "level": "0.5", "estimate": "ml", "folds": "5", "prior": "k2",
                   "seed": "2"}
        reference = {name: self.outputs(RUNS["fit"] + GOES_WITH.get(name, [])) for name in changes}
        for name, value in changes.items():
            self.assertNotEqual(reference[name], self.outputs(RUNS["fit"] + GOES_WITH.get(name, []) + ["--" + name, value]), name)
        self.assertNotEqual(self.outputs(RUNS["draw"]), self.outputs(RUNS["draw"] + ["--seed", "2"]))

    def test_explain_knows_what_it_lists(self):
        listing = [line for line in self.ballast("explain").out.decode().splitlines()]
        codes = [line.split()[0] for line in listing if not line.startswith(" ")]
        self.assertEqual(codes, sorted(codes))
        self.assertEqual(len(codes), len(set(codes)))
        self.assertGreater(len(codes), 50)
        for code in codes:
            lines = self.ballast("explain", code).out.decode().splitlines()
            self.assertEqual(lines[0], code)
            for word in ("cause", "example", "mend"):
                told = [line for line in lines if line.startswith(word)]
                self.assertTrue(len(told) == 1 and len(told[0].split()) > 2, "%s of %s: %s" % (word, code, told))
            for line in lines:
                self.assertLessEqual(len(line), 80, line)


if __name__ == "__main__":
    main()
