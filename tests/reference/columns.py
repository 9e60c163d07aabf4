# SPDX-License-Identifier: GPL-3.0-or-later
"""Every column of every table is defined in the README, and every id in those columns that hold one.

A small measurement plays every method that the tool knows, up and down the ladder; a new method or
column has to come with its line in the README's last part.
"""
import csv
import pathlib
import re

from kneeprint_tool import WORK, check, run, table, write_plan

# A method's step as small as it may be.
STEPS = {
    "steady": {"frequencies_hz": [997]},
    "modulation": {"tones_hz": [100, 5000]},
    "silence": {"duration_s": 2},
    "reference": {"frequencies_hz": [997]},
    "sweep": {"duration_s": 4},
}
# Columns that hold ids, with the heading of the table that defines them.
IDS = {"intermod": "product", "scalars": "figure", "traces": "trace"}
ID_COLUMN_HEADERS = tuple(IDS.values())

readme = pathlib.Path(__file__).resolve().parents[2] / "README.md"
part = readme.read_text().split("\n## The tables, column by column\n")[1].split("\n## ")[0]
columns, ids, about = {}, {}, {}
for section in part.split("\n### ")[1:]:
    name = section.split("\n")[0].split(".csv")[0]
    columns[name], ids[name] = set(), set()
    where = None
    for line in section.split("\n"):
        cells = [c.strip() for c in re.split(r"(?<!\\)\|", line)[1:-1]]
        if not cells:
            where = None
        elif where is None:
            where = columns[name] if cells[0] == "column" else ids[name]
            check(cells[0] == "column" or cells[0] in ID_COLUMN_HEADERS,
                  f"README, {name}: a table of {cells[0]}s")
        else:
            for item in re.findall(r"`([^`]+)`", cells[0]):
                check(item not in where, f"README, {name}: {item} is defined once")
                where.add(item)
                about[name, item] = cells[1:]
recurring = columns.pop("Columns that recur")

refused = run("measure", "--into", WORK / "refused", "--plan",
              write_plan(WORK / "refused.json", steps=[{"method": "none-such"}]), expect=3)
known = re.search(r"expected one of: (.*)", refused.stderr).group(1).split(", ")
check(len(known) >= 4, f"the tool knows {', '.join(known)}")
folder = WORK / "columns"
run("measure", "--into", folder, "--plan",
    write_plan(WORK / "columns.json", ladder={"from": -20, "to": -8, "step_db": 12, "unit": "dBFS"},
               descend=True, steps=[{"method": m, **STEPS.get(m, {})} for m in known]),
    "--rig", "virtual:sigmoid:bias=0.3", "--rate", 96000, "--seed", 3)

files = sorted((folder / "curves").glob("*.csv"))
check({f.stem for f in files} == set(columns), "the README has a part for each table, and no other")
for file in files:
    with open(file, newline="") as f:
        header = next(csv.reader(f))
    for column in header:
        check(column in columns[file.stem] or column in recurring,
              f"{file.name}: {column} is defined in the README")
    for column in columns[file.stem]:
        check(column in header, f"{file.name} has the README's {column}")
        check(about[file.stem, column][1] != "" or column == "k2",
              f"{file.name}: {column} comes with a definition")
used = {c for f in files for c in next(csv.reader(open(f, newline="")))}
check(recurring <= used, f"every recurring column occurs: {recurring - used or 'all'}")
for name, column in IDS.items():
    found = {r[column] for r in table(folder, name)}
    check(len(found) >= 4, f"{name}.csv has {len(found)} kinds of {column}")
    for item in sorted(found):
        check(item in ids[name], f"{name}.csv: {column} {item} is defined in the README")
# Each method of a figure is named beside it; a figure of several methods has a line for each.
scalars = [r for r in part.split("\n### scalars.csv")[1].split("\n### ")[0].split("\n") if r.startswith("|")]
lines, figure = set(), []
for row in scalars:
    cells = [c.strip() for c in re.split(r"(?<!\\)\|", row)[1:-1]]
    figure = re.findall(r"`([^`]+)`", cells[0]) or (figure if cells[0] == "" else [])
    lines |= {(f, cells[1]) for f in figure}
for r in table(folder, "scalars"):
    if (r["figure"], r["method"]) not in lines:
        check(False, f"scalars.csv: {r['figure']} of {r['method']} is defined in the README")
