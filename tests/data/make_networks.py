#!/usr/bin/env python3
"""Writes the demo networks of networks/: an invented walk-in clinic and an invented hospital ward.

Everything here is made up: no number comes from patients, from a study or from an expert. usage: make_networks.py FOLDER
The clinic's records are drawn by the program itself: ballast draw clinic-truth.xml --records 250 --seed 13 -o cases.csv
"""
import random
import sys
from itertools import product
from pathlib import Path
from xml.sax.saxutils import escape

DTD = """<!DOCTYPE BIF [
  <!ELEMENT BIF (NETWORK)*>
  <!ATTLIST BIF VERSION CDATA #REQUIRED>
  <!ELEMENT NETWORK (NAME, (PROPERTY | VARIABLE | DEFINITION)*)>
  <!ELEMENT NAME (#PCDATA)>
  <!ELEMENT VARIABLE (NAME, (OUTCOME | PROPERTY)*)>
  <!ATTLIST VARIABLE TYPE (nature | decision | utility) "nature">
  <!ELEMENT OUTCOME (#PCDATA)>
  <!ELEMENT DEFINITION (FOR | GIVEN | TABLE | PROPERTY)*>
  <!ELEMENT FOR (#PCDATA)>
  <!ELEMENT GIVEN (#PCDATA)>
  <!ELEMENT TABLE (#PCDATA)>
  <!ELEMENT PROPERTY (#PCDATA)>
]>
"""


def write(path, title, outcomes, parents, table=None, row_ess=None, note="Invented: no number here comes from patients.",
          properties=None):
    lines = ['<?xml version="1.0" encoding="UTF-8"?>', DTD + '<BIF VERSION="0.3">', "<NETWORK>", f"  <NAME>{escape(title)}</NAME>",
             f"  <PROPERTY>note = {escape(note)}</PROPERTY>"]
    for name, labels in outcomes.items():
        lines += ['  <VARIABLE TYPE="nature">', f"    <NAME>{name}</NAME>"]
        lines += [f"    <OUTCOME>{escape(label)}</OUTCOME>" for label in labels]
        lines += [f"    <PROPERTY>{text}</PROPERTY>" for text in (properties or {}).get(name, [])] + ["  </VARIABLE>"]
    for name in outcomes:
        lines += ["  <DEFINITION>", f"    <FOR>{name}</FOR>"]
        lines += [f"    <GIVEN>{parent}</GIVEN>" for parent in parents.get(name, [])]
        if table:
            rows = ["      " + " ".join(f"{p:g}" for p in row) for row in table(name)]
            lines += ["    <TABLE>"] + rows + ["    </TABLE>"]
        if row_ess and name in row_ess:
            lines += [f"    <PROPERTY>ballast.row-ess = {row_ess[name]}</PROPERTY>"]
        lines += ["  </DEFINITION>"]
    path.write_text("\n".join(lines + ["</NETWORK>", "</BIF>", ""]), encoding="utf-8")


CLINIC = {
    "Season": ["winter", "summer"],
    "Age": ["child", "adult", "elder"],
    "Smoker": ["no", "yes"],
    "Infection": ["none", "viral", "bacterial"],
    "Asthma": ["no", "yes"],
    "Fever": ["none", "mild", "high"],
    "Cough": ["none", "dry", "wet"],
    "SoreThroat": ["no", "yes"],
    "Wheeze": ["no", "yes"],
    "QuickTest": ["negative", "positive"],
    "ChestFilm": ["clear", "shadow"],
    "ComesBack": ["no", "yes"],
}
CLINIC_PARENTS = {
    "Smoker": ["Age"],
    "Infection": ["Season", "Age"],
    "Asthma": ["Age"],
    "Fever": ["Infection", "Age"],
    "Cough": ["Infection", "Smoker"],
    "SoreThroat": ["Infection"],
    "Wheeze": ["Asthma", "Infection", "Smoker"],
    "QuickTest": ["Infection"],
    "ChestFilm": ["Infection"],
    "ComesBack": ["Fever", "ChestFilm"],
}
# Rival A lets every finding hang on the infection alone; rival B adds arcs that the experts argued about.
RIVAL_A = {name: ["Infection"] for name in CLINIC if name not in ("Season", "Age", "Infection")} | {"Infection": ["Season"]}
RIVAL_B = CLINIC_PARENTS | {"Fever": ["Infection", "Age", "Season"], "ComesBack": ["Fever", "ChestFilm", "Age"],
                            "SoreThroat": ["Infection", "Smoker"]}

TRUTH = {
    "Season": [[0.6, 0.4]],
    "Age": [[0.25, 0.5, 0.25]],
    "Smoker": [[0.99, 0.01], [0.7, 0.3], [0.8, 0.2]],
    "Infection": [[0.25, 0.6, 0.15], [0.35, 0.5, 0.15], [0.35, 0.4, 0.25],
                  [0.5, 0.4, 0.1], [0.6, 0.3, 0.1], [0.6, 0.24, 0.16]],
    "Asthma": [[0.9, 0.1], [0.93, 0.07], [0.88, 0.12]],
    "Fever": [[0.9, 0.08, 0.02], [0.93, 0.06, 0.01], [0.95, 0.04, 0.01],
              [0.25, 0.45, 0.3], [0.4, 0.42, 0.18], [0.55, 0.35, 0.1],
              [0.1, 0.3, 0.6], [0.15, 0.35, 0.5], [0.3, 0.4, 0.3]],
    "Cough": [[0.85, 0.1, 0.05], [0.5, 0.25, 0.25], [0.25, 0.55, 0.2], [0.12, 0.43, 0.45], [0.3, 0.2, 0.5], [0.15, 0.15, 0.7]],
    "SoreThroat": [[0.92, 0.08], [0.4, 0.6], [0.3, 0.7]],
    "Wheeze": [[0.97, 0.03], [0.9, 0.1], [0.88, 0.12], [0.75, 0.25], [0.85, 0.15], [0.7, 0.3],
               [0.55, 0.45], [0.4, 0.6], [0.3, 0.7], [0.2, 0.8], [0.35, 0.65], [0.2, 0.8]],
    "QuickTest": [[0.97, 0.03], [0.94, 0.06], [0.2, 0.8]],
    "ChestFilm": [[0.97, 0.03], [0.95, 0.05], [0.7, 0.3]],
    "ComesBack": [[0.95, 0.05], [0.7, 0.3], [0.88, 0.12], [0.55, 0.45], [0.72, 0.28], [0.35, 0.65]],
}
# The expert is sensible, rounds, and is wrong here and there.
EXPERT = TRUTH | {
    "Season": [[0.5, 0.5]],
    "Age": [[0.3, 0.5, 0.2]],
    "Smoker": [[0.98, 0.02], [0.75, 0.25], [0.75, 0.25]],
    "Infection": [[0.3, 0.6, 0.1], [0.4, 0.5, 0.1], [0.4, 0.4, 0.2], [0.5, 0.4, 0.1], [0.6, 0.3, 0.1], [0.6, 0.3, 0.1]],
    "Fever": [[0.9, 0.09, 0.01], [0.9, 0.09, 0.01], [0.95, 0.04, 0.01],
              [0.2, 0.5, 0.3], [0.3, 0.5, 0.2], [0.5, 0.4, 0.1], [0.1, 0.2, 0.7], [0.1, 0.3, 0.6], [0.2, 0.3, 0.5]],
    "SoreThroat": [[0.9, 0.1], [0.5, 0.5], [0.2, 0.8]],
    "Wheeze": [[0.98, 0.02], [0.9, 0.1], [0.9, 0.1], [0.8, 0.2], [0.9, 0.1], [0.8, 0.2],
               [0.5, 0.5], [0.4, 0.6], [0.3, 0.7], [0.2, 0.8], [0.3, 0.7], [0.2, 0.8]],
    "QuickTest": [[0.98, 0.02], [0.95, 0.05], [0.1, 0.9]],
    "ChestFilm": [[0.98, 0.02], [0.98, 0.02], [0.6, 0.4]],
    "ComesBack": [[0.95, 0.05], [0.6, 0.4], [0.9, 0.1], [0.5, 0.5], [0.8, 0.2], [0.4, 0.6]],
}
ROW_ESS = {name: 20 for name in CLINIC} | {"Wheeze": 8, "ChestFilm": 12, "ComesBack": 6}

DEGREES = {2: ["no", "yes"], 3: ["low", "normal", "high"], 4: ["none", "mild", "moderate", "severe"]}
# name, number of outcomes, parents: causes first, then states of the body, then what is observed and done.
WARD = [
    ("AgeBand", 4, []), ("Frailty", 3, ["AgeBand"]), ("Smoking", 2, []), ("Diabetes", 2, ["AgeBand"]),
    ("HeartDisease", 2, ["AgeBand", "Smoking"]), ("LungDisease", 2, ["Smoking"]), ("KidneyDisease", 2, ["Diabetes"]),
    ("RecentSurgery", 2, []), ("Catheter", 2, ["RecentSurgery", "Frailty"]), ("Infection", 4, ["Catheter", "Diabetes"]),
    ("FluidLoss", 3, ["RecentSurgery"]), ("FluidOverload", 2, ["HeartDisease", "KidneyDisease"]),
    ("Inflammation", 3, ["Infection"]), ("OxygenUptake", 3, ["LungDisease", "FluidOverload"]),
    ("HeartOutput", 3, ["HeartDisease", "FluidLoss"]), ("VesselTone", 3, ["Inflammation"]),
    ("Pressure", 3, ["HeartOutput", "VesselTone"]), ("Pulse", 3, ["HeartOutput", "Inflammation"]),
    ("Temperature", 3, ["Inflammation"]), ("BreathingRate", 3, ["OxygenUptake", "Inflammation"]),
    ("Saturation", 3, ["OxygenUptake"]), ("UrineFlow", 3, ["Pressure", "KidneyDisease"]), ("Creatinine", 3, ["KidneyDisease"]),
    ("WhiteCells", 3, ["Infection"]), ("Lactate", 3, ["Pressure"]), ("Glucose", 3, ["Diabetes"]),
    ("Confusion", 2, ["Frailty", "Saturation"]), ("Pain", 4, ["RecentSurgery"]), ("Sedation", 3, ["Pain"]),
    ("ChestSounds", 3, ["FluidOverload", "LungDisease"]), ("FilmShadow", 2, ["Infection", "FluidOverload"]),
    ("Culture", 2, ["Infection"]), ("Antibiotic", 2, ["Culture", "Temperature"]), ("OxygenGiven", 3, ["Saturation"]),
    ("Alarm", 2, ["Pulse", "Saturation"]), ("StayLength", 4, ["Infection", "Frailty"]),
]


# A table as a clinic's software exports it: codes, a measured temperature, one line for several equal cases.
TRIAGE = {"Season": ["winter", "summer"], "Temperature": ["normal", "raised", "high"], "Cough": ["no", "yes"],
          "SentHome": ["no", "yes"]}
TRIAGE_PARENTS = {"Temperature": ["Season"], "Cough": ["Season"], "SentHome": ["Temperature", "Cough"]}
TRIAGE_PROPERTIES = {"Temperature": ["ballast.column = temp_c", "ballast.cuts = 37.5 38.5"]}
TRIAGE_CODES = """variable,outcome,code
Season,winter,W
Season,summer,S
Cough,no,0
Cough,yes,1
SentHome,no,N
SentHome,yes,Y
"""
TRIAGE_CASES = """Season,temp_c,Cough,SentHome,n,ward
W,36.8,0,Y,14,A
W,37.9,1,Y,9,A
W,38.9,1,N,6,A
W,39.4,1,N,2,B
W,37.2,1,Y,11,B
W,38.6,0,N,3,B
S,36.6,0,Y,21,A
S,37.4,1,Y,5,A
S,37.5,0,Y,4,B
S,38.2,1,N,2,B
S,39.0,0,N,1,B
"""


def ward_table(rng, name, labels, parents):
    outcomes = {n: k for n, k, _ in WARD}
    rows = []
    for configuration in product(*[range(outcomes[p]) for p in parents]):
        level = sum(c / (outcomes[p] - 1) for c, p in zip(configuration, parents)) / max(1, len(parents))
        weights = [rng.gammavariate(1.2 + 6 * max(0.0, 1 - abs(k / (labels - 1) - level) * 1.6), 1) for k in range(labels)]
        cuts = [round(1000 * w / sum(weights)) for w in weights]
        cuts[cuts.index(max(cuts))] += 1000 - sum(cuts)
        rows.append([c / 1000 for c in cuts])
    return rows


def main(folder):
    folder.mkdir(parents=True, exist_ok=True)
    write(folder / "clinic.xml", "Walk-in clinic (invented)", CLINIC, CLINIC_PARENTS, EXPERT.get, ROW_ESS,
          "Invented: an expert's structure and tables, each row worth the cases in ballast.row-ess.")
    write(folder / "clinic-truth.xml", "Walk-in clinic, the truth behind cases.csv (invented)", CLINIC, CLINIC_PARENTS, TRUTH.get)
    write(folder / "clinic-rival-a.xml", "Walk-in clinic, rival A: infection alone (invented)", CLINIC, RIVAL_A)
    write(folder / "clinic-rival-b.xml", "Walk-in clinic, rival B: three more arcs (invented)", CLINIC, RIVAL_B)
    write(folder / "triage.xml", "Triage desk (invented)", TRIAGE, TRIAGE_PARENTS, properties=TRIAGE_PROPERTIES)
    (folder / "triage-codes.csv").write_text(TRIAGE_CODES, encoding="utf-8")
    (folder / "triage-cases.csv").write_text(TRIAGE_CASES, encoding="utf-8")
    rng = random.Random(20)
    tables = {name: ward_table(rng, name, labels, parents) for name, labels, parents in WARD}
    write(folder / "ward.xml", "Hospital ward (invented)", {name: DEGREES[k] for name, k, _ in WARD},
          {name: parents for name, _, parents in WARD}, tables.get)


if __name__ == "__main__":
    main(Path(sys.argv[1]))
