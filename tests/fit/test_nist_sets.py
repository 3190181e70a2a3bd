"""NIST StRD, linear regression: certified values, and the exact solution of the columns as stored.

Source of data and certified values: NIST/ITL Statistical Reference Datasets (StRD), Linear Regression,
Statistical Engineering Division, National Institute of Standards and Technology; US-government data.
"""

from __future__ import annotations

import math
from fractions import Fraction

import mpmath
import numpy as np
import pytest

from beforehand.fit.fitting import fit_of
from beforehand.fit.moments import ArraySource, moments_of, named
from beforehand.fit.tableau import tableau_of


def numbers(text: str) -> list[float]:
    """The figures of a table that is written as text."""
    return [float(part) for part in text.split()]


SETS = {
    "Norris": {
        "intercept": True,
        "terms": [("x", 1)],
        "y": numbers("""
            0.1 338.8 118.1 888.0 9.2 228.1 668.5 998.5 449.1 778.9 559.2 0.3 0.1 778.1 668.8 339.3
            448.9 10.8 557.7 228.3 998.0 888.8 119.6 0.3 0.6 557.6 339.3 888.0 998.5 778.9 10.2 117.6
            228.9 668.4 449.2 0.2
        """),
        "x": numbers("""
            0.2 337.4 118.2 884.6 10.1 226.5 666.3 996.3 448.6 777.0 558.2 0.4 0.6 775.5 666.9 338.0
            447.5 11.6 556.0 228.1 995.8 887.6 120.2 0.3 0.3 556.8 339.1 887.2 999.0 779.0 11.1 118.3
            229.2 669.1 448.9 0.5
        """),
        "coefficients": [-0.262323073774029, 1.00211681802045],
        "errors": [0.232818234301152, 0.000429796848199937],
        "residual_sd": 0.884796396144373,
        "r_squared": 0.999993745883712,
        "f": 5436385.54079785,
    },
    "Pontius": {
        "intercept": True,
        "terms": [("x", 1), ("x", 2)],
        "y": numbers("""
            0.11019 0.21956 0.32949 0.43899 0.54803 0.65694 0.76562 0.87487 0.98292 1.09146 1.20001
            1.30822 1.41599 1.52399 1.63194 1.73947 1.84646 1.95392 2.06128 2.16844 0.11052 0.22018
            0.32939 0.43886 0.54798 0.65739 0.76596 0.87474 0.983 1.0915 1.20004 1.30818 1.41613 1.52408
            1.63159 1.73965 1.84696 1.95445 2.06177 2.16829
        """),
        "x": numbers("""
            150000 300000 450000 600000 750000 900000 1050000 1200000 1350000 1500000 1650000 1800000
            1950000 2100000 2250000 2400000 2550000 2700000 2850000 3000000 150000 300000 450000 600000
            750000 900000 1050000 1200000 1350000 1500000 1650000 1800000 1950000 2100000 2250000
            2400000 2550000 2700000 2850000 3000000
        """),
        "coefficients": [0.000673565789473684, 7.32059160401003e-07, -3.16081871345029e-15],
        "errors": [0.000107938612033077, 1.57817399981659e-10, 4.86652849992036e-17],
        "residual_sd": 0.000205177424076185,
        "r_squared": 0.999999900178537,
        "f": 185330865.995752,
    },
    "NoInt1": {
        "intercept": False,
        "terms": [("x", 1)],
        "y": [130, 131, 132, 133, 134, 135, 136, 137, 138, 139, 140],
        "x": [60, 61, 62, 63, 64, 65, 66, 67, 68, 69, 70],
        "coefficients": [2.07438016528926],
        "errors": [0.0165289256198347],
        "residual_sd": 3.56753034006338,
        "r_squared": 0.999365492298663,
        "f": 15750.25,
    },
    "NoInt2": {
        "intercept": False,
        "terms": [("x", 1)],
        "y": [3, 4, 4],
        "x": [4, 5, 6],
        "coefficients": [0.727272727272727],
        "errors": [0.0420827318078432],
        "residual_sd": 0.369274472937998,
        "r_squared": 0.993348115299335,
        "f": 298.6666666666667,
    },
    "Filip": {
        "intercept": True,
        "terms": [
            ("x", 1),
            ("x", 2),
            ("x", 3),
            ("x", 4),
            ("x", 5),
            ("x", 6),
            ("x", 7),
            ("x", 8),
            ("x", 9),
            ("x", 10),
        ],
        "y": numbers("""
            0.8116 0.9072 0.9052 0.9039 0.8053 0.8377 0.8667 0.8809 0.7975 0.8162 0.8515 0.8766 0.8885
            0.8859 0.8959 0.8913 0.8959 0.8971 0.9021 0.909 0.9139 0.9199 0.8692 0.8872 0.89 0.891
            0.8977 0.9035 0.9078 0.7675 0.7705 0.7713 0.7736 0.7775 0.7841 0.7971 0.8329 0.8641 0.8804
            0.7668 0.7633 0.7678 0.7697 0.77 0.7749 0.7796 0.7897 0.8131 0.8498 0.8741 0.8061 0.846
            0.8751 0.8856 0.8919 0.8934 0.894 0.8957 0.9047 0.9129 0.9209 0.9219 0.7739 0.7681 0.7665
            0.7703 0.7702 0.7761 0.7809 0.7961 0.8253 0.8602 0.8809 0.8301 0.8664 0.8834 0.8898 0.8964
            0.8963 0.9074 0.9119 0.9228
        """),
        "x": numbers("""
            -6.860120914 -4.324130045 -4.358625055 -4.358426747 -6.955852379 -6.661145254 -6.355462942
            -6.118102026 -7.115148017 -6.815308569 -6.519993057 -6.204119983 -5.853871964 -6.109523091
            -5.79832982 -5.482672118 -5.171791386 -4.851705903 -4.517126416 -4.143573228 -3.709075441
            -3.499489089 -6.300769497 -5.953504836 -5.642065153 -5.031376979 -4.680685696 -4.329846955
            -3.928486195 -8.56735134 -8.363211311 -8.107682739 -7.823908741 -7.522878745 -7.218819279
            -6.920818754 -6.628932138 -6.323946875 -5.991399828 -8.781464495 -8.663140179 -8.473531488
            -8.247337057 -7.971428747 -7.676129393 -7.352812702 -7.072065318 -6.774174009 -6.478861916
            -6.159517513 -6.835647144 -6.53165267 -6.224098421 -5.910094889 -5.598599459 -5.290645224
            -4.974284616 -4.64454848 -4.290560426 -3.885055584 -3.408378962 -3.13200249 -8.726767166
            -8.66695597 -8.511026475 -8.165388579 -7.886056648 -7.588043762 -7.283412422 -6.995678626
            -6.691862621 -6.392544977 -6.067374056 -6.684029655 -6.378719832 -6.065855188 -5.752272167
            -5.132414673 -4.811352704 -4.098269308 -3.66174277 -3.2644011
        """),
        "coefficients": numbers("""
            -1467.4896142298 -2772.17959193342 -2316.37108160893 -1127.97394098372 -354.478233703349
            -75.1242017393757 -10.8753180355343 -1.06221498588947 -0.0670191154593408
            -0.00246781078275479 -4.02962525080404e-05
        """),
        "errors": numbers("""
            298.084530995537 559.77986547495 466.477572127796 227.204274477751 71.6478660875927
            15.28971787474 2.23691159816033 0.221624321934227 0.0142363763154724 0.000535617408889821
            8.96632837373868e-06
        """),
        "residual_sd": 0.00334801051324544,
        "r_squared": 0.99672741618562,
        "f": 2162.43954511489,
    },
    "Longley": {
        "intercept": True,
        "terms": [("x1", 1), ("x2", 1), ("x3", 1), ("x4", 1), ("x5", 1), ("x6", 1)],
        "y": numbers("""
            60323 61122 60171 61187 63221 63639 64989 63761 66019 67857 68169 66513 68655 69564 69331
            70551
        """),
        "x1": numbers("""
            83.0 88.5 88.2 89.5 96.2 98.1 99.0 100.0 101.2 104.6 108.4 110.8 112.6 114.2 115.7 116.9
        """),
        "x2": numbers("""
            234289 259426 258054 284599 328975 346999 365385 363112 397469 419180 442769 444546 482704
            502601 518173 554894
        """),
        "x3": numbers("""
            2356 2325 3682 3351 2099 1932 1870 3578 2904 2822 2936 4681 3813 3931 4806 4007
        """),
        "x4": numbers("""
            1590 1456 1616 1650 3099 3594 3547 3350 3048 2857 2798 2637 2552 2514 2572 2827
        """),
        "x5": numbers("""
            107608 108632 109773 110929 112075 113270 115094 116219 117388 118734 120445 121950 123366
            125368 127852 130081
        """),
        "x6": numbers("""
            1947 1948 1949 1950 1951 1952 1953 1954 1955 1956 1957 1958 1959 1960 1961 1962
        """),
        "coefficients": numbers("""
            -3482258.63459582 15.0618722713733 -0.035819179292591 -2.02022980381683 -1.03322686717359
            -0.0511041056535807 1829.15146461355
        """),
        "errors": numbers("""
            890420.383607373 84.9149257747669 0.0334910077722432 0.488399681651699 0.214274163161675
            0.22607320006937 455.478499142212
        """),
        "residual_sd": 304.854073561965,
        "r_squared": 0.995479004577296,
        "f": 330.285339234588,
    },
}

# Digits that the certified values share with columns whose powers were rounded to doubles first
# (Filip's do not determine more, whatever the method).
CERTIFIED_DIGITS = {"Norris": 13, "Pontius": 13, "NoInt1": 14, "NoInt2": 14, "Filip": 7, "Longley": 13}


def columns_of(name):
    """Keys and values of a set's design columns, powers rounded to doubles, and the outcome."""
    facts = SETS[name]
    design = {}
    for column, power in facts["terms"]:
        x = np.array(facts[column], dtype=float)
        design[named(f"{column} to the {power}")] = x**power if power > 1 else x
    return design, np.array(facts["y"], dtype=float)


def fitted(design, outcome, *, intercept):
    """Our fit of these columns."""
    target = named("y")
    moments = moments_of(ArraySource({**design, target: outcome}), [*design, target])
    tableau = tableau_of(moments, target, tuple(design), intercept=intercept)
    return fit_of(tableau, {str(place): (key,) for place, key in enumerate(design)})


def solved(design, outcome, *, intercept):
    """Coefficients, standard errors and residual sum of squares of the stored doubles, to 80 digits."""
    with mpmath.workdps(80):
        rows = [
            ([mpmath.mpf(1)] if intercept else []) + [mpmath.mpf(float(v)) for v in row]
            for row in zip(*design.values(), strict=True)
        ]
        x, y = mpmath.matrix(rows), mpmath.matrix([mpmath.mpf(float(v)) for v in outcome])
        gram = x.T * x
        inverse = gram**-1
        b = inverse * (x.T * y)
        rest = y - x * b
        rss = (rest.T * rest)[0]
        s2 = rss / (len(outcome) - x.cols)
        return (
            [float(v) for v in b],
            [float(mpmath.sqrt(s2 * inverse[k, k])) for k in range(x.cols)],
            float(rss),
        )


def digits(found, expected):
    """Fewest correct significant digits over a list of numbers."""
    worst = max(abs(a - e) / abs(e) for a, e in zip(found, expected, strict=True))
    return 16.0 if worst == 0 else -math.log10(worst)


@pytest.mark.parametrize("name", SETS)
def test_certified_values(name):
    """Coefficients, standard errors, residual standard deviation, R² and F as NIST certifies them."""
    facts = SETS[name]
    fit = fitted(*columns_of(name), intercept=facts["intercept"])
    wanted = CERTIFIED_DIGITS[name]
    assert digits([c.estimate for c in fit.coefficients], facts["coefficients"]) >= wanted
    assert digits([c.standard_error for c in fit.coefficients], facts["errors"]) >= wanted
    assert digits(
        [fit.residual_sd, fit.r_squared, fit.f], [facts["residual_sd"], facts["r_squared"], facts["f"]]
    ) >= min(wanted, 13)


@pytest.mark.parametrize("name", SETS)
def test_exact_solution_of_the_columns_as_stored(name):
    """At least 15 digits of every coefficient and standard error against 80-digit arithmetic."""
    design, outcome = columns_of(name)
    intercept = SETS[name]["intercept"]
    fit = fitted(design, outcome, intercept=intercept)
    b, errors, rss = solved(design, outcome, intercept=intercept)
    assert digits([c.estimate for c in fit.coefficients], b) >= 15
    assert digits([c.standard_error for c in fit.coefficients], errors) >= 15
    assert digits([fit.rss], [rss]) >= 15


WIGGLE = numbers("""
    759 -2048 2048 -2048 2523 -2048 2048 -2048 1838 -2048 2048 -2048 1838 -2048 2048 -2048 2523 -2048
    2048 -2048 759
""")


@pytest.mark.parametrize(("number", "size"), [(3, 1), (4, 100), (5, 10_000)])
def test_wampler_three_to_five(number, size):
    """Wampler3 to 5: all coefficients are 1, whatever the size of the deviations (formula of NIST)."""
    x = [float(v) for v in range(21)]
    design = {named(f"x{power}"): np.array([v**power for v in x]) for power in range(1, 6)}
    outcome = np.array(
        [float(sum(Fraction(v) ** j for j in range(6)) + size * w) for v, w in zip(x, WIGGLE, strict=True)]
    )
    fit = fitted(design, outcome, intercept=True)
    assert digits([c.estimate for c in fit.coefficients], [1.0] * 6) >= 14
    # Certified standard errors of Wampler3, times the size of the deviations.
    errors = numbers("""
        2152.32624678170 2363.55173469681 779.343524331583 101.475507550350 5.64566512170752
        0.112324854679312
    """)
    assert digits([c.standard_error for c in fit.coefficients], [e * size for e in errors]) >= 14
    assert digits([fit.residual_sd], [2360.14502379268 * size]) >= 14


@pytest.mark.parametrize("number", [1, 2])
def test_wampler_one_and_two_are_exact(number):
    """Wampler1 and 2 leave no residual: no t, p or F exists, and the fit says so."""
    x = [float(v) for v in range(21)]
    scale = 1 if number == 1 else 10
    design = {named(f"x{power}"): np.array([v**power for v in x]) for power in range(1, 6)}
    outcome = np.array([float(sum(Fraction(int(v), scale) ** j for j in range(6))) for v in x])
    fit = fitted(design, outcome, intercept=True)
    assert fit.exact
    assert digits([c.estimate for c in fit.coefficients], [scale**-j for j in range(6)]) >= 12
    assert all(c.standard_error == 0.0 and c.t is None and c.p is None for c in fit.coefficients)
    assert (fit.f, fit.f_p, fit.aic, fit.bic, fit.residual_sd) == (None, None, None, None, 0.0)


@pytest.mark.parametrize("seed", range(6))
def test_twelve_digits_at_a_condition_number_of_ten_billion(seed):
    """Columns scaled to unit length with condition number 1e10: 12 digits of all that is reported."""
    rng = np.random.default_rng(seed)
    n, p = 40, 6
    left, _ = np.linalg.qr(rng.normal(size=(n, p)))
    right, _ = np.linalg.qr(rng.normal(size=(p, p)))
    values = left @ np.diag(np.logspace(0, -10, p)) @ right.T
    values /= np.linalg.norm(values, axis=0)
    assert np.linalg.cond(values) > 1e9
    outcome = values @ rng.normal(size=p) + rng.normal(size=n) * 1e-3
    design = {named(f"x{k}"): values[:, k] for k in range(p)}
    for intercept in (True, False):
        fit = fitted(design, outcome, intercept=intercept)
        b, errors, _ = solved(design, outcome, intercept=intercept)
        assert digits([c.estimate for c in fit.coefficients], b) >= 12
        assert digits([c.standard_error for c in fit.coefficients], errors) >= 12
