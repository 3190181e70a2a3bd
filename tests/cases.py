"""Published tables as facts, with their sources; and the shortest way from a table to a run."""

from __future__ import annotations

import pandas as pd

from beforehand.api import Run, plan_from_mapping, run


def numbers(text: str) -> list[float]:
    """The figures of a table that is written as text."""
    return [float(part) for part in text.split()]


# Woods, Steinour & Starke (1932), Ind. Eng. Chem. 24:1207-1214; Draper & Smith, Applied Regression
# Analysis, appendix B.
CEMENT = {
    "x1": [7, 1, 11, 11, 7, 11, 3, 1, 2, 21, 1, 11, 10],
    "x2": [26, 29, 56, 31, 52, 55, 71, 31, 54, 47, 40, 66, 68],
    "x3": [6, 15, 8, 8, 6, 9, 17, 22, 18, 4, 23, 9, 8],
    "x4": [60, 52, 20, 47, 33, 22, 6, 44, 22, 26, 34, 12, 12],
    "y": [78.5, 74.3, 104.3, 87.6, 95.9, 109.2, 102.7, 72.5, 93.1, 115.9, 83.8, 113.3, 109.4],
}

# Anscombe (1973), Graphs in Statistical Analysis, American Statistician 27:17-21, table.
ANSCOMBE_X = [10, 8, 13, 9, 11, 14, 6, 4, 12, 7, 5]
ANSCOMBE = {
    1: (ANSCOMBE_X, [8.04, 6.95, 7.58, 8.81, 8.33, 9.96, 7.24, 4.26, 10.84, 4.82, 5.68]),
    2: (ANSCOMBE_X, [9.14, 8.14, 8.74, 8.77, 9.26, 8.1, 6.13, 3.1, 9.13, 7.26, 4.74]),
    3: (ANSCOMBE_X, [7.46, 6.77, 12.74, 7.11, 7.81, 8.84, 6.08, 5.39, 8.15, 6.42, 5.73]),
    4: (
        [8, 8, 8, 8, 8, 8, 8, 19, 8, 8, 8],
        [6.58, 5.76, 7.71, 8.84, 8.47, 7.04, 5.25, 12.5, 5.56, 7.91, 6.89],
    ),
}

# Brownlee (1965), Statistical Theory and Methodology in Science and Engineering, 2nd ed., p. 454.
STACK_LOSS = {
    "y": [42, 37, 37, 28, 18, 18, 19, 20, 15, 14, 14, 13, 11, 12, 8, 7, 8, 8, 9, 15, 15],
    "x1": [80, 80, 75, 62, 62, 62, 62, 62, 58, 58, 58, 58, 58, 58, 50, 50, 50, 50, 50, 56, 70],
    "x2": [27, 27, 25, 24, 22, 23, 24, 24, 23, 18, 18, 17, 18, 19, 18, 18, 19, 19, 20, 20, 20],
    "x3": [89, 88, 90, 87, 87, 87, 93, 93, 87, 80, 89, 88, 82, 93, 89, 86, 72, 79, 80, 82, 91],
}

# Longley (1967), JASA 62:819-841.
LONGLEY = {
    "TOTEMP": numbers("""
        60323 61122 60171 61187 63221 63639 64989 63761 66019 67857 68169 66513 68655 69564 69331 70551
    """),
    "GNPDEFL": numbers("""
        83 88.5 88.2 89.5 96.2 98.1 99 100 101.2 104.6 108.4 110.8 112.6 114.2 115.7 116.9
    """),
    "GNP": numbers("""
        234289 259426 258054 284599 328975 346999 365385 363112 397469 419180 442769 444546 482704
        502601 518173 554894
    """),
    "UNEMP": [2356, 2325, 3682, 3351, 2099, 1932, 1870, 3578, 2904, 2822, 2936, 4681, 3813, 3931, 4806, 4007],
    "ARMED": [1590, 1456, 1616, 1650, 3099, 3594, 3547, 3350, 3048, 2857, 2798, 2637, 2552, 2514, 2572, 2827],
    "POP": numbers("""
        107608 108632 109773 110929 112075 113270 115094 116219 117388 118734 120445 121950 123366
        125368 127852 130081
    """),
    "YEAR": list(range(1947, 1963)),
}

# Montgomery & Peck (1982), Introduction to Linear Regression Analysis, example 3.1.
DELIVERY = {
    "cases": [7, 3, 3, 4, 6, 7, 2, 7, 30, 5, 16, 10, 4, 6, 9, 10, 6, 7, 3, 17, 10, 26, 9, 8, 4],
    "distance": numbers("""
        560 220 340 80 150 330 110 210 1460 605 688 215 255 462 448 776 200 132 36 770 140 810 450 635
        150
    """),
    "minutes": numbers("""
        16.68 11.5 12.03 14.88 13.75 18.11 8 17.83 79.24 21.5 40.33 21 13.5 19.75 24 29 15.35 19 9.5
        35.1 17.9 52.32 18.75 19.83 10.75
    """),
}


def run_on(table: dict[str, list], outcome: str, /, **blocks: object) -> Run:
    """Run a plan on a table: every other column a numeric predictor unless ``predictors`` says else."""
    frame = pd.DataFrame(table)
    plan = {
        "language": 1,
        "title": "A published table",
        "question": "Does the program rule as the source does?",
        "data": {"file": "table.csv"},
        "outcome": {"column": outcome},
        "predictors": [{"column": name} for name in table if name != outcome],
    }
    for name, block in blocks.items():
        plan[name] = {**plan[name], **block} if isinstance(block, dict) and name in plan else block
    return run(plan_from_mapping(plan), frame)


def rulings(done: Run, step: str) -> list[tuple[str, str]]:
    """Subject and ground of every ruling of a step, in order."""
    return [(ruling.subject, ruling.ground) for ruling in done.lock.rulings if ruling.step == step]


def terms(done: Run) -> dict[str, object]:
    """The final table's terms by name."""
    return {term.term: term for term in done.lock.answer.terms}
