#!/usr/bin/env python3
"""Worked examples from the literature, met by the built program.

usage: test_published.py PROGRAM

Each check names its source. All published figures are recalled from memory. A tolerance is half a unit of the last printed
place, or wider where the recalled figure and the exact one differ by more, which is said there.
"""
import math
import os
import sys
import tempfile

HERE = os.path.dirname(os.path.abspath(__file__))
DATA = os.path.join(HERE, os.pardir, "data")
sys.path.insert(0, os.path.join(HERE, os.pardir, "support"))
from networks import expand, write_network, write_records  # noqa: E402
from program import Program, Trial  # noqa: E402


class Bench:
    """The program, the checks, and one-variable fits from counts alone."""

    def __init__(self, path, folder):
        self.program, self.trial, self.folder = Program(path, folder), Trial(), folder

    def path(self, name):
        return os.path.join(self.folder, name)

    def fit(self, *words):
        return self.program.json("fit", *words)

    def row(self, counts, *words, table=None):
        """The row of a one-variable network whose file carries these counts."""
        labels = ["o%d" % k for k in range(len(counts))]
        write_network(self.path("one.xml"), {"x": labels}, counts={"x": counts}, tables=table and {"x": table})
        result = self.fit("one.xml", *words)
        return dict(result["families"][0]["rows"][0], evidence=result["log_marginal_likelihood"])

    def records(self, name, outcomes, parents, records, *words):
        """A fit to records."""
        write_network(self.path(name + ".xml"), outcomes, parents)
        write_records(self.path(name + ".csv"), list(outcomes), records)
        return self.fit(name + ".xml", name + ".csv", *words)


def find(result, variable, **given):
    """The row of a family under these parents' outcomes."""
    for family in result["families"]:
        for row in family["rows"]:
            if family["variable"] == variable and row["given"] == given:
                return row
    raise KeyError((variable, given))


def ml(result, variable, outcome, **given):
    family = next(f for f in result["families"] if f["variable"] == variable)
    return find(result, variable, **given)["ml"][family["outcomes"].index(outcome)]


def cooper_herskovits(bench):
    """Cooper GF, Herskovits E (1992) Machine Learning 9:309-347, Table 1 and section 2: ten cases, uniform Dirichlets.
    The printed 2.23e-9 and 2.23e-10 carry the structures' prior as a factor; the exact numbers of the data alone are
    1/449064000 and 1/4490640000, their ratio 10."""
    scores = []
    for structure, exact in (("ch92_bs1.xml", 449064000), ("ch92_bs2.xml", 4490640000)):
        result = bench.fit(os.path.join(DATA, structure), os.path.join(DATA, "ch92.csv"), "--prior", "k2")
        scores.append(result["log_marginal_likelihood"])
        bench.trial.near("CH92 %s" % structure, scores[-1], -math.log(exact), 1e-14)
        bench.trial.equal("CH92 records", result["data"]["records"], 10)
    bench.trial.within("CH92 2.23e-9", math.exp(scores[0]) * 1e9, 2.23, 0.005)
    bench.trial.within("CH92 2.23e-10", math.exp(scores[1]) * 1e10, 2.23, 0.005)
    bench.trial.near("CH92 ratio 10", math.exp(scores[0] - scores[1]), 10, 1e-13)
    first = bench.fit(os.path.join(DATA, "ch92_bs1.xml"), os.path.join(DATA, "ch92.csv"), "--prior", "k2")
    mean = find(first, "x2", x1="present")["mean"]
    bench.trial.near("CH92 P(x2=present | x1=present) = (4 + 1)/(5 + 2)", mean[1], 5 / 7, 1e-15)


def college_plans(bench):
    """Heckerman D (1995) A tutorial on learning with Bayesian networks, MSR-TR-95-06, Figure 9, on the 10318 pupils of
    Sewell WH, Shah VP (1968) Am J Sociology 73:559-572: log p(D|S) under BDeu with an equivalent sample size of 5."""
    expand(os.path.join(DATA, "college_plans_counts.csv"), bench.path("college_plans.csv"))
    for structure, published in (("college_plans_1.xml", -45653), ("college_plans_2.xml", -45699)):
        result = bench.fit(os.path.join(DATA, structure), "college_plans.csv", "--prior", "bdeu", "--ess", 5, "--folds", 0)
        bench.trial.equal("Sewell & Shah: number of pupils", result["data"]["records"], 10318)
        bench.trial.within("Heckerman Figure 9, %s" % structure, result["log_marginal_likelihood"], published, 0.5)


def succession(bench):
    """Laplace PS (1814) Essai philosophique sur les probabilites: after n sunrises the odds of another are n + 1 to 1."""
    for words in (["--prior", "k2"], ["--prior", "bdeu", "--ess", 2]):
        row = bench.row([1826213, 0], *words)
        bench.trial.near("Laplace's sunrises", row["mean"][0] / row["mean"][1], 1826214, 1e-13)
        for successes, failures in ((0, 0), (1, 0), (3, 2)):
            row = bench.row([successes, failures], *words)
            bench.trial.near("Laplace's rule %d, %d" % (successes, failures), row["mean"][0],
                             (successes + 1) / (successes + failures + 2), 1e-15)


# Prior mean, prior size, posterior median, 2.5 % and 97.5 % points.
TABLE_2_1 = [(0.5, 2, 0.446, 0.415, 0.477), (0.485, 2, 0.446, 0.415, 0.477), (0.485, 5, 0.446, 0.415, 0.477),
             (0.485, 10, 0.446, 0.415, 0.477), (0.485, 20, 0.447, 0.416, 0.478), (0.485, 100, 0.450, 0.420, 0.479),
             (0.485, 200, 0.453, 0.424, 0.481)]


def placenta_praevia(bench):
    """Gelman A, Carlin JB, Stern HS, Dunson DB, Vehtari A, Rubin DB (2013) Bayesian Data Analysis, 3rd ed., section 2.4
    and Table 2.1: 437 girls in 980 births."""
    row = bench.row([437, 543], "--prior", "k2")
    bench.trial.within("BDA 2.4 mean", row["mean"][0], 0.446, 0.0005)
    bench.trial.within("BDA 2.4 low", row["low"][0], 0.415, 0.0005)
    bench.trial.within("BDA 2.4 high", row["high"][0], 0.477, 0.0005)
    for mean, size, median, low, high in TABLE_2_1:
        words = ["--prior", "expert", "--row-ess", size]
        name = "BDA Table 2.1, mean %g, size %g: " % (mean, size)
        row = bench.row([437, 543], *words, table=[[mean, 1 - mean]])
        bench.trial.within(name + "2.5 %", row["low"][0], low, 0.0005)
        bench.trial.within(name + "97.5 %", row["high"][0], high, 0.0005)
        # An interval of level 1e-9 closes on the median.
        row = bench.row([437, 543], *words, "--level", 1e-9, table=[[mean, 1 - mean]])
        bench.trial.within(name + "median from below", row["low"][0], median, 0.0005)
        bench.trial.within(name + "median from above", row["high"][0], median, 0.0005)


# n, x, lower and upper limit; where two figures stand the last is the tolerance: one unit of the third place, since the
# recalled figure is that far from the exact one.
JEFFREYS_LIMITS = [(7, 2, .065, .648), (7, 3, .139, .766, .001), (8, 2, .056, .592), (8, 3, .119, .705), (8, 4, .199, .801),
                   (9, 2, .049, .544), (9, 3, .104, .652), (9, 4, .173, .746), (10, 2, .044, .503), (10, 3, .093, .606),
                   (10, 4, .153, .696), (11, 2, .040, .467), (11, 3, .084, .565, .001), (11, 4, .137, .652),
                   (12, 2, .036, .436), (12, 3, .076, .529), (12, 4, .124, .612, .001)]
NO_SUCCESS_LIMITS = [(7, .410), (8, .369), (9, .336), (10, .308), (11, .285), (12, .265)]


def jeffreys_intervals(bench):
    """Brown LD, Cai TT, DasGupta A (2001) Statistical Science 16:101-133, Table 5. Its entries for no success are a
    modification, 1 - 0.025^(1/n), the 97.5 % point of Beta(1, n): that of a uniform prior and one trial fewer."""
    for n, x, low, high, *wider in JEFFREYS_LIMITS:
        row = bench.row([x, n - x], "--prior", "jeffreys")
        tolerance = wider[0] if wider else 0.0005
        bench.trial.within("Brown, Cai & DasGupta, %d of %d, lower" % (x, n), row["low"][0], low, tolerance)
        bench.trial.within("Brown, Cai & DasGupta, %d of %d, upper" % (x, n), row["high"][0], high, tolerance)
        bench.trial.near("the complement's limits mirror", row["low"][1], 1 - row["high"][0], 1e-9)
    for n, high in NO_SUCCESS_LIMITS:
        row = bench.row([0, n - 1], "--prior", "k2")
        bench.trial.within("Brown, Cai & DasGupta, 0 of %d, upper" % n, row["high"][0], high, 0.0005)
        bench.trial.near("the same, closed form", row["high"][0], 1 - 0.025 ** (1 / n), 1e-10)


def vegetarians(bench):
    """Agresti A (2002) Categorical Data Analysis, 2nd ed., section 1.4.3: none of 25 students was a vegetarian. The
    Clopper-Pearson limit is the 97.5 % point of Beta(1, 25): a uniform prior and 24 students."""
    row = bench.row([0, 25], "--prior", "k2")
    bench.trial.within("Agresti, 0 of 25, lower", row["low"][0], 0.001, 0.0005)
    bench.trial.within("Agresti, 0 of 25, upper", row["high"][0], 0.132, 0.0005)
    bench.trial.within("Agresti, Clopper-Pearson", bench.row([0, 24], "--prior", "k2")["high"][0], 0.137, 0.0005)


DEATH_PENALTY = {("white", "white"): (53, 414), ("white", "black"): (11, 37), ("black", "white"): (0, 16),
                 ("black", "black"): (4, 139)}


def death_penalty(bench):
    """Agresti A (2002) Categorical Data Analysis, 2nd ed., Table 2.6 (Radelet ML, Pierce GL 1991 Florida Law Review 43:1-34):
    674 defendants."""
    outcomes = {"Victim": ["white", "black"], "Defendant": ["white", "black"], "Death": ["yes", "no"]}
    records = [(victim, defendant, death) for (victim, defendant), counts in DEATH_PENALTY.items()
               for death, count in zip(("yes", "no"), counts) for _ in range(count)]
    result = bench.records("radelet", outcomes, {"Death": ["Victim", "Defendant"]}, records, "--folds", 0)
    bench.trial.equal("Agresti Table 2.6: defendants", result["data"]["records"], 674)
    for victim, defendant, share in (("white", "white", 0.113), ("white", "black", 0.229), ("black", "white", 0.0),
                                     ("black", "black", 0.028)):
        bench.trial.within("Agresti Table 2.6, victim %s, defendant %s" % (victim, defendant),
                           ml(result, "Death", "yes", Victim=victim, Defendant=defendant), share, 0.0005)
    result = bench.records("radelet", outcomes, {"Death": ["Defendant"]}, records, "--folds", 0)
    for defendant, share in (("white", 0.110), ("black", 0.079)):
        bench.trial.within("Agresti Table 2.6, defendant %s" % defendant, ml(result, "Death", "yes", Defendant=defendant),
                           share, 0.0005)


ADMITTED = {"A": (0.62, 0.82), "B": (0.63, 0.68), "C": (0.37, 0.34), "D": (0.33, 0.35), "E": (0.28, 0.24), "F": (0.06, 0.07)}


def admissions(bench):
    """Bickel PJ, Hammel EA, O'Connell JW (1975) Science 187:398-404; rates of the six largest departments as in Freedman D,
    Pisani R, Purves R, Statistics, chapter 2."""
    expand(os.path.join(DATA, "ucbadmissions_counts.csv"), bench.path("ucbadmissions.csv"))
    result = bench.fit(os.path.join(DATA, "ucbadmissions.xml"), "ucbadmissions.csv", "--folds", 0)
    for department, shares in ADMITTED.items():
        for gender, share in zip(("Male", "Female"), shares):
            bench.trial.within("Freedman, Pisani & Purves, %s %s" % (gender, department),
                               ml(result, "Admit", "Admitted", Gender=gender, Dept=department), share, 0.005)
    outcomes = {"Gender": ["Male", "Female"], "Dept": list("ABCDEF"), "Admit": ["Admitted", "Rejected"]}
    write_network(bench.path("rates.xml"), outcomes, {"Admit": ["Gender"]})
    result = bench.fit("rates.xml", "ucbadmissions.csv", "--folds", 0)
    for gender, share in (("Male", 0.445), ("Female", 0.304)):
        bench.trial.within("Bickel et al., all %s" % gender, ml(result, "Admit", "Admitted", Gender=gender), share, 0.0005)
    write_network(bench.path("apart.xml"), outcomes, {"Admit": ["Gender", "Dept"]})
    result = bench.fit("apart.xml", "ucbadmissions.csv", "--folds", 0)
    for gender, share in (("Male", 0.39), ("Female", 0.43)):
        mean = sum(ml(result, "Dept", d) * ml(result, "Admit", "Admitted", Gender=gender, Dept=d) for d in "ABCDEF")
        bench.trial.within("Freedman, Pisani & Purves, weighted average, %s" % gender, mean, share, 0.005)


SAVED = [("1st", "Male", "Adult", 32.57), ("1st", "Female", "Adult", 97.22), ("2nd", "Male", "Adult", 8.33),
         ("2nd", "Female", "Adult", 86.02), ("3rd", "Male", "Adult", 16.23), ("3rd", "Female", "Adult", 46.06),
         ("3rd", "Male", "Child", 27.08), ("3rd", "Female", "Child", 45.16)]


def titanic(bench):
    """British Wreck Commissioner's Inquiry (1912) Report on the loss of the Titanic, numbers saved, in the form of Dawson RJM
    (1995) J Statistics Education 3(3)."""
    expand(os.path.join(DATA, "titanic_counts.csv"), bench.path("titanic.csv"))
    result = bench.fit(os.path.join(DATA, "titanic.xml"), "titanic.csv", "--folds", 0)
    for passage, sex, age, percent in SAVED:
        bench.trial.within("Titanic, saved, %s %s %s" % (passage, sex, age),
                           100 * ml(result, "Survived", "Yes", Class=passage, Sex=sex, Age=age), percent, 0.005)
    for sex in ("Male", "Female"):
        row = find(result, "Survived", Class="Crew", Sex=sex, Age="Child")
        bench.trial.equal("Titanic: no child in the crew", (row["total"], row["basis"], row["ml"]), (0, "prior", None))
    outcomes = {"Class": ["1st", "2nd", "3rd", "Crew"], "Survived": ["No", "Yes"]}
    write_network(bench.path("saved.xml"), outcomes, {"Survived": ["Class"]})
    result = bench.fit("saved.xml", "titanic.csv", "--folds", 0)
    for passage, percent in (("1st", 62.46), ("2nd", 41.40), ("3rd", 25.21), ("Crew", 23.95)):
        bench.trial.within("Titanic, saved, %s" % passage, 100 * ml(result, "Survived", "Yes", Class=passage), percent,
                           0.005)
    write_network(bench.path("saved.xml"), outcomes)
    result = bench.fit("saved.xml", "titanic.csv", "--folds", 0)
    bench.trial.within("Titanic, saved, all", 100 * ml(result, "Survived", "Yes"), 32.30, 0.005)


def low_birth_weight(bench):
    """Hosmer DW, Lemeshow S (1989) Applied Logistic Regression: 59 low birth weights of 189, odds ratio of smoking 2.02."""
    write_network(bench.path("smoke.xml"), {"smoke": ["no", "yes"], "low": ["no", "yes"]}, {"low": ["smoke"]})
    result = bench.fit("smoke.xml", os.path.join(DATA, "birthwt.csv"), "--folds", 0)
    counts = [find(result, "low", smoke=smoke)["counts"] for smoke in ("no", "yes")]
    bench.trial.equal("Hosmer & Lemeshow: low of all", (counts[0][1] + counts[1][1], result["data"]["records"]), (59, 189))
    ratio = 1.0
    for smoke, sign in (("yes", 1), ("no", -1)):
        ratio *= (ml(result, "low", "yes", smoke=smoke) / ml(result, "low", "no", smoke=smoke)) ** sign
    bench.trial.within("Hosmer & Lemeshow: odds ratio of smoking", ratio, 2.02, 0.005)


PLAY_TENNIS = """sunny hot high weak no/sunny hot high strong no/overcast hot high weak yes/rain mild high weak yes/
rain cool normal weak yes/rain cool normal strong no/overcast cool normal strong yes/sunny mild high weak no/
sunny cool normal weak yes/rain mild normal weak yes/sunny mild normal strong yes/overcast mild high strong yes/
overcast hot normal weak yes/rain mild high strong no"""


def play_tennis(bench):
    """Mitchell TM (1997) Machine Learning, section 6.9.1, on Quinlan JR (1986) Machine Learning 1:81-106, Table 1: raw
    frequencies of a class and its four attributes, on (sunny, cool, high, strong)."""
    outcomes = {"Outlook": ["sunny", "overcast", "rain"], "Temperature": ["hot", "mild", "cool"], "Humidity": ["high", "normal"],
                "Wind": ["weak", "strong"], "Play": ["yes", "no"]}
    parents = {name: ["Play"] for name in outcomes if name != "Play"}
    records = [line.split() for line in PLAY_TENNIS.split("/")]
    result = bench.records("tennis", outcomes, parents, records, "--folds", 0)
    score = {}
    for play, published in (("yes", 0.0053), ("no", 0.0206)):
        score[play] = ml(result, "Play", play)
        for name, value in (("Outlook", "sunny"), ("Temperature", "cool"), ("Humidity", "high"), ("Wind", "strong")):
            score[play] *= ml(result, name, value, Play=play)
        bench.trial.within("Mitchell 6.9.1, %s" % play, score[play], published, 0.00005)
    bench.trial.within("Mitchell 6.9.1, normalised", score["no"] / (score["yes"] + score["no"]), 0.795, 0.0005)


def nursery_rhyme(bench):
    """Murphy KP (2012) Machine Learning: A Probabilistic Perspective, section 3.4.4.1: 17 words of 10 kinds, one
    pseudo-count each; the predictive probabilities are 3, 5, 5, 1, 2, 2, 1, 2, 1, 5 twenty-sevenths."""
    row = bench.row([2, 4, 4, 0, 1, 1, 0, 1, 0, 4], "--prior", "k2")
    for k, twenty_sevenths in enumerate([3, 5, 5, 1, 2, 2, 1, 2, 1, 5]):
        bench.trial.near("Murphy 3.4.4.1, word %d" % k, row["mean"][k], twenty_sevenths / 27, 1e-15)


ESTIMATOR = {(1, 0): 1 / 2, (2, 0): 3 / 8, (1, 1): 1 / 8, (3, 0): 5 / 16, (2, 1): 1 / 16, (4, 0): 35 / 128, (3, 1): 5 / 128,
             (2, 2): 3 / 128, (5, 0): 63 / 256, (4, 1): 7 / 256, (3, 2): 3 / 256}


def sequence_estimator(bench):
    """Krichevsky RE, Trofimov VK (1981) IEEE Trans IT 27:199-207; table of Willems FMJ, Shtarkov YM, Tjalkens TJ (1995) IEEE Trans
    IT 41:653-664: the probability of a sequence with a zeros and b ones under Jeffreys' prior."""
    for (a, b), exact in ESTIMATOR.items():
        bench.trial.near("Krichevsky & Trofimov %d, %d" % (a, b), bench.row([a, b], "--prior", "jeffreys")["evidence"],
                         math.log(exact), 1e-13)


# Counts (a, b), the published ratio, the tolerance.
BENT_COIN = [(5, 1, 222.2, 0.05), (3, 3, 2.67, 0.005), (2, 4, 0.71, 0.005),
             # The book prints .356, the exact ratio is .3555: six tenths of its last unit away.
             (1, 5, 0.356, 0.0006), (0, 6, 0.427, 0.0005), (10, 10, 96.5, 0.05), (3, 17, 0.2, 0.05), (0, 20, 1.83, 0.005)]
EURO = [(.37, .25, .005), (1.0, .48, .005), (2.7, .82, .005), (7.4, 1.3, .05), (20, 1.8, .05), (55, 1.9, .05), (148, 1.7, .05),
        (403, 1.3, .05), (1096, 1.1, .05)]


def evidence(bench):
    """MacKay DJC (2003) Information Theory, Inference, and Learning Algorithms, section 3.3 and Table 3.5 (bent coin: a uniform
    prior against p = 1/6), and the solution of exercise 3.15 (a coin spun 250 times, 140 heads: Beta(a, a) against 1/2)."""
    for a, b, published, tolerance in BENT_COIN:
        log_known = a * math.log(1 / 6) + b * math.log(5 / 6)
        got = math.exp(bench.row([a, b], "--prior", "k2")["evidence"] - log_known)
        bench.trial.within("MacKay Table 3.5, %d, %d" % (a, b), got, published, tolerance)
    for strength, published, tolerance in EURO:
        got = math.exp(bench.row([140, 110], "--prior", "k2", "--scale", strength)["evidence"] + 250 * math.log(2))
        bench.trial.within("MacKay exercise 3.15, alpha %g" % strength, got, published, tolerance)


STUDENT = [(1, 12.706), (2, 4.303), (5, 2.571), (10, 2.228), (30, 2.042), (100, 1.984)]
FISHER = [(1, 1, 161.448), (2, 10, 4.103), (5, 10, 3.326), (10, 10, 2.978), (3, 20, 3.098), (10, 20, 2.348)]


def beta_row(bench, a, b, level):
    """The row of a prior Beta(a, b) that met no record."""
    words = ["--prior", "expert", "--row-ess", a + b, "--level", level]
    return bench.row([0, 0], *words, table=[[a / (a + b), b / (a + b)]])


def engineering_tables(bench):
    """NIST/SEMATECH e-Handbook of Statistical Methods, 1.3.6.7.2 (t(0.975)), 1.3.6.7.3 (F(0.95)) and 7.2.4.2 (exact limits, 4
    defective of 20, 90 %): each is a quantile of a Beta distribution. The handbook's upper limit came from a goal seek and is 9e-7
    from the exact one."""
    for nu, published in STUDENT:
        quantile = beta_row(bench, nu / 2, 1 / 2, 0.9)["low"][0]
        bench.trial.within("t(0.975; %d)" % nu, math.sqrt(nu * (1 / quantile - 1)), published, 0.0005)
    for d1, d2, published in FISHER:
        row = beta_row(bench, d1 / 2, d2 / 2, 0.9)
        # 1 - x is the other outcome's lower limit, which keeps its digits where x is near 1.
        bench.trial.within("F(0.95; %d, %d)" % (d1, d2), d2 * row["high"][0] / (d1 * row["low"][1]), published, 0.0005)
    low = bench.row([3, 16], "--prior", "k2", "--level", 0.9)["low"][0]
    high = bench.row([4, 15], "--prior", "k2", "--level", 0.9)["high"][0]
    bench.trial.within("e-Handbook 7.2.4.2, lower", low, 0.071354, 5e-7)
    bench.trial.within("e-Handbook 7.2.4.2, upper", high, 0.401029, 2e-6)


EXAMPLES = [cooper_herskovits, college_plans, succession, placenta_praevia, jeffreys_intervals, vegetarians, death_penalty,
            admissions, titanic, low_birth_weight, play_tennis, nursery_rhyme, sequence_estimator, evidence, engineering_tables]


def main():
    with tempfile.TemporaryDirectory() as folder:
        bench = Bench(os.path.abspath(sys.argv[1]), folder)
        for example in EXAMPLES:
            before = bench.trial.passed
            try:
                example(bench)
            except (RuntimeError, KeyError, ValueError) as error:
                bench.trial.check(False, example.__name__, repr(error))
            print("%4d  %s" % (bench.trial.passed - before, example.__name__.replace("_", " ")))
        bench.trial.finish()


if __name__ == "__main__":
    main()
