#!/usr/bin/env python3
"""Every option of every command, as its help page lists it, with values that are none, missing, twice or cut short.

usage: test_options.py PROGRAM [TEST ...]

The inputs that are named do not exist, so that a value that was let through shows as a file that cannot be opened.
"""
import re

from bench import ProgramTest, commands, main, options

NO_NUMBERS = ["10x", "", " ", "1e400", "-1", "nan", "inf", "-inf", " 5", "5 ", "5\n", "1,5", "1_000", "0x10", "1e", ".", "--5",
              "18446744073709551616", "\u0665", "1\x1b[2J"]
ARGUMENTS = {"check": ["missing.xml"], "fit": ["missing.xml"], "explain": [],
             "draw": ["missing.xml", "--records", "3", "-o", "-"],
             "tally": ["missing.xml", "missing.csv", "-o", "-"]}


class Options(ProgramTest):
    def each(self, wanted=lambda option: True):
        for command in commands(self.program):
            for option in options(self.program, command):
                if option.name != "help" and wanted(option):
                    yield command, option

    def refused(self, command, option, *words):
        """The option stands first, so that nothing else is wrong before it."""
        done = self.ballast(command, *words, *ARGUMENTS[command], status=2)
        self.assertNotIn(b"\x1b", done.err)
        return done

    def test_what_is_no_number(self):
        tried = 0
        for command, option in self.each(lambda option: option.is_number):
            for value in NO_NUMBERS:
                tried += 1
                done = self.refused(command, option, "--" + option.name, value)
                self.assert_error(done, "bad-value", "--%s; give " % option.name)
            joined = self.refused(command, option, "--%s=%s" % (option.name, NO_NUMBERS[-1]))
            self.assertEqual(joined.err, done.err)
        self.assertGreater(tried, 200)

    def ranges(self):
        """Each numeric option with the range that its refusal names: lowest, highest, and whether these belong to it."""
        for command, option in self.each(lambda option: option.is_number):
            told = self.refused(command, option, "--" + option.name, "10x").err.decode()
            found = re.search(r"; give (?:a whole number|a number|bytes, such as 512M or 4G,) (from|above) (\S+) (and below|to below|up to) ([^\s,]+)", told)
            self.assertTrue(found, told)
            yield command, option, found.group(2), found.group(1) == "from", found.group(4), found.group(3) == "up to"

    def test_ends_of_ranges(self):
        for command, option, low, has_low, high, has_high in self.ranges():
            tries = [(low, has_low), (high, has_high)]
            if has_high and "." not in high and "e" not in high:
                tries += [(str(int(high) + 1), False), (str(int(high) - 1), True)]
            for value, accepted in tries:
                value = "%d" % float(value) if "e+" in value else value
                words = [command, "--" + option.name, value, *(word for word in ARGUMENTS[command])]
                if option.name in words[3:] or "--" + option.name in words[3:]:
                    words = words[:3] + ["missing.xml", "-o", "-"]
                done = self.ballast(*words, status=None)
                self.assertEqual(b"[bad-value]" not in done.err, accepted, "%s: %s" % (words, done.err))

    def test_option_without_value(self):
        for command, option in self.each(lambda option: option.argument):
            done = self.ballast(command, "missing.xml", "--" + option.name, status=2)
            self.assert_error(done, "no-value", "--%s %s" % (option.name, option.argument))

    def test_flag_with_value(self):
        for command, option in self.each(lambda option: not option.argument):
            done = self.refused(command, option, "--%s=yes" % option.name)
            self.assert_error(done, "bad-value", "--" + option.name)

    def test_option_twice(self):
        values = {"prior": "k2", "estimate": "ml", "missing": "drop", "table-order": "for-slowest", "level": "0.5",
                  "prior-floor": "0.5", "holdout": "0.5"}
        for command, option in self.each():
            words = option.words(values.get(option.name, "1")) * 2
            arguments = [word for word in ARGUMENTS[command] if word.startswith("missing.")]
            done = self.ballast(command, *words, *arguments, status=None)
            if option.repeatable:
                self.assertNotIn(b"[option-twice]", done.err)
            else:
                self.assert_error(done, "option-twice", "--" + option.name)
                self.assertEqual(done.status, 2)

    def test_abbreviated_and_misspelt(self):
        for command, option in self.each(lambda option: len(option.name) > 3):
            swapped = option.name[:-2] + option.name[-1] + option.name[-2]
            for wrong in {option.name[:-1], option.name + "s", swapped, option.name.upper()} - {option.name}:
                done = self.refused(command, option, "--" + wrong)
                self.assert_error(done, "unknown-option", "no option --%s;" % wrong, "did you mean --")

    def test_words_that_are_none(self):
        for command, option in self.each(lambda option: option.argument and not option.is_number):
            if option.argument in ("FILE", "TEXT", "CHARACTER", "COLUMN", "VARIABLE", "TABLE"):
                continue
            for value in ("", "x", (option.default or "") + "s", " " + (option.default or ""), (option.default or "").upper()):
                done = self.refused(command, option, "--" + option.name, value)
                self.assert_error(done, "bad-value", "--%s; give " % option.name)

    def test_commands_one_edit_away(self):
        for command in commands(self.program):
            for wrong in (command[:-1], command + "s", command[1] + command[0] + command[2:], command.upper()):
                done = self.ballast(wrong, "missing.xml", status=2)
                self.assert_error(done, "unknown-command", 'no command "%s"; did you mean %s ' % (wrong, command))

    def test_threads(self):
        for value in ("0", "1000000"):
            done = self.ballast("fit", "missing.xml", "--threads", value, status=2)
            self.assert_error(done, "bad-value", "a whole number from 1 up to 1024")
        for value in ("1", "1024"):
            self.ballast("fit", "clinic.xml", "cases.csv", "--threads", value)

    def test_seeds(self):
        drawn = set()
        for seed in ("0", "1", "2", "9223372036854775808", "18446744073709551614", "18446744073709551615"):
            drawn.add(self.ballast("draw", "clinic.xml", "--records", "40", "-o", "-", "--seed", seed).out)
            self.ballast("fit", "clinic.xml", "cases.csv", "--seed", seed)
        self.assertEqual(len(drawn), 6)

    def test_a_longer_draw_begins_with_the_shorter_one(self):
        short, long = (self.ballast("draw", "clinic.xml", "--records", n, "-o", "-").out for n in ("100", "9000"))
        self.assertTrue(long.startswith(short))
        self.assertEqual(long.count(b"\n"), 9001)

    def test_a_delimiter_is_looked_at_first(self):
        for value in ("", "ab", "\n", '"', "\x01", "\u00e9", "\\n"):
            for command in ("fit", "check"):
                self.assert_error(self.ballast(command, "missing.xml", "--delimiter", value, status=2), "bad-value", "delimiter")

    def test_very_long_words(self):
        word = "x" * 100000
        fit = ["fit", "clinic.xml", "cases.csv"]
        for words in ([word], ["fit", "--" + word], ["fit", word], ["fit", "missing.xml", "--ess", word], ["explain", word],
                      [*fit, "-o", word], [*fit, "--missing-label", word]):
            done = self.ballast(*words, status=None)
            self.assertIn(done.status, (0, 2, 3))
            self.assertLess(len(done.err), 4096)

    def test_very_many_words(self):
        done = self.ballast("fit", *["a"] * 20000, status=2)
        self.assert_error(done, "wrong-arguments")
        self.ballast("fit", "clinic.xml", "cases.csv", *["--missing-label", "-9"] * 5000)


if __name__ == "__main__":
    main()
