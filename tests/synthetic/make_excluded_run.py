"""Makes the seventh run of the example's realization, which is left out: a copy of the sixth, later, disturbed.

    python3 tests/synthetic/make_excluded_run.py

The sixth run is moved by 8640 s, every null reading gets fresh noise from a fixed seed, and from the middle of the
weighing on the null voltage drifts as it would when the air handling restarts and the room warms. All of it is invented.
"""

import csv
import pathlib
import random

RAW = pathlib.Path(__file__).resolve().parents[2] / "example-records/campaigns/realization/raw"
SHIFT = 8640.0
random.seed(20410506)


def rewrite(source, target, change):
    with open(RAW / source, encoding="utf-8", newline="") as file:
        rows = list(csv.reader(file))
    head, body = rows[0], rows[1:]
    at = {name: index for index, name in enumerate(head)}
    for row in body:
        digits = len(row[at["t_s"]].split(".")[1]) if "." in row[at["t_s"]] else 0
        row[at["t_s"]] = f"{float(row[at['t_s']]) + SHIFT:.{digits}f}"
        change(row, at)
    with open(RAW / target, "w", encoding="utf-8", newline="") as file:
        csv.writer(file, lineterminator="\n").writerows([head, *body])


def moving(row, at):
    row[at["null_uV"]] = f"{float(row[at['null_uV']]) + random.gauss(0.0, 0.15):.4f}"


def weighing(row, at):
    start = 17.24 * 3600.0 + 2 * 86400.0
    late = max(0.0, float(row[at["t_s"]]) - start)
    sign = 1.0 if row[at["state"]] == "on" else 0.4
    row[at["null_uV"]] = f"{float(row[at['null_uV']]) + sign * 4.0e-4 * late + random.gauss(0.0, 0.01):.4f}"


rewrite("moving-6.csv", "moving-7.csv", moving)
rewrite("weighing-6.csv", "weighing-7.csv", weighing)
