"""Variance inflation, condition indices and variance shares: published figures, numpy, exact determinants."""

from __future__ import annotations

import itertools
import math
from fractions import Fraction

import numpy as np
import pytest
from statsmodels.stats.outliers_influence import variance_inflation_factor
from threadpoolctl import threadpool_limits

from beforehand.fit.conditioning import condition, inflation_of, inflation_without
from beforehand.fit.moments import ArraySource, moments_of, named
from beforehand.fit.sweeping import RankDeficient

# fmt: off
# Longley (1967), JASA 62:819-841; data of NIST StRD (US-government data).
LONGLEY = {
    "x1": [
        83.0, 88.5, 88.2, 89.5, 96.2, 98.1, 99.0, 100.0, 101.2, 104.6, 108.4, 110.8, 112.6, 114.2, 115.7,
        116.9,
    ],
    "x2": [
        234289, 259426, 258054, 284599, 328975, 346999, 365385, 363112, 397469, 419180, 442769, 444546,
        482704, 502601, 518173, 554894,
    ],
    "x3": [2356, 2325, 3682, 3351, 2099, 1932, 1870, 3578, 2904, 2822, 2936, 4681, 3813, 3931, 4806, 4007],
    "x4": [1590, 1456, 1616, 1650, 3099, 3594, 3547, 3350, 3048, 2857, 2798, 2637, 2552, 2514, 2572, 2827],
    "x5": [
        107608, 108632, 109773, 110929, 112075, 113270, 115094, 116219, 117388, 118734, 120445, 121950,
        123366, 125368, 127852, 130081,
    ],
    "x6": [1947, 1948, 1949, 1950, 1951, 1952, 1953, 1954, 1955, 1956, 1957, 1958, 1959, 1960, 1961, 1962],
}
# Hald (1952): heat of hardening cement.
HALD = {
    "x1": [7, 1, 11, 11, 7, 11, 3, 1, 2, 21, 1, 11, 10],
    "x2": [26, 29, 56, 31, 52, 55, 71, 31, 54, 47, 40, 66, 68],
    "x3": [6, 15, 8, 8, 6, 9, 17, 22, 18, 4, 23, 9, 8],
    "x4": [60, 52, 20, 47, 33, 22, 6, 44, 22, 26, 34, 12, 12],
}
# Brownlee (1965): stack loss.
STACK_LOSS = {
    "x1": [80, 80, 75, 62, 62, 62, 62, 62, 58, 58, 58, 58, 58, 58, 50, 50, 50, 50, 50, 56, 70],
    "x2": [27, 27, 25, 24, 22, 23, 24, 24, 23, 18, 18, 17, 18, 19, 18, 18, 19, 19, 20, 20, 20],
    "x3": [89, 88, 90, 87, 87, 87, 93, 93, 87, 80, 89, 88, 82, 93, 89, 86, 72, 79, 80, 82, 91],
}
# fmt: on


def held(columns):
    """Keys and moments of plain arrays, by name."""
    arrays = {named(name): np.asarray(values, float) for name, values in columns.items()}
    return list(arrays), moments_of(ArraySource(arrays), list(arrays))


def each_alone(columns):
    """Every column a predictor of its own."""
    return {name: (named(name),) for name in columns}


def determinant(matrix):
    """Determinant of a matrix of fractions, by elimination."""
    rows, product = [list(row) for row in matrix], Fraction(1)
    for k in range(len(rows)):
        product *= rows[k][k]
        for i in range(k + 1, len(rows)):
            share = rows[i][k] / rows[k][k]
            rows[i] = [a - share * b for a, b in zip(rows[i], rows[k], strict=True)]
    return product


def generalized(columns, block, others, *, intercept=True):
    """The generalized VIF of a block by its definition, det R11 det R22 / det R, in fractions."""
    exact = {}
    for name in (*block, *others):
        values = [Fraction(float(v)) for v in columns[name]]
        mean = sum(values) / len(values) if intercept else 0
        exact[name] = [v - mean for v in values]

    def cross(names):
        return [[sum(a * b for a, b in zip(exact[p], exact[q], strict=True)) for q in names] for p in names]

    # Scaling to correlations cancels between numerator and denominator.
    return determinant(cross(block)) * determinant(cross(others)) / determinant(cross((*block, *others)))


def table(seed, n=30, k=3, levels=4):
    """A random table with correlated numbers and a category, and its blocks."""
    rng = np.random.default_rng(seed)
    values = rng.normal(size=(n, k)) @ (np.eye(k) + 0.6 * rng.normal(size=(k, k))) + rng.normal(size=k)
    values = values * 10.0 ** rng.integers(-5, 6, size=k)
    columns = {f"x{j}": values[:, j] for j in range(k)}
    codes = rng.permutation(np.arange(n) % levels)
    for level in range(1, levels):
        columns[f"g{level}"] = (codes == level).astype(float)
    blocks = {f"x{j}": (named(f"x{j}"),) for j in range(k)}
    blocks["g"] = tuple(named(f"g{level}") for level in range(1, levels))
    return columns, blocks


# Variance inflation -------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("columns", "expected"),
    [
        (HALD, [38.496211490636, 254.42316585093, 46.868386333574, 282.51286478857]),
        (
            LONGLEY,
            [
                135.53243828,
                1788.5134827182,
                33.61889059605,
                3.5889301934455,
                399.15102231264,
                758.98059740689,
            ],
        ),
        (STACK_LOSS, [2.906484, 2.572632, 1.333587]),
    ],
)
def test_published_inflation(columns, expected):
    """VIF of the cement, Longley and stack-loss data, recomputed (the first two with 30 digits)."""
    found = inflation_of(held(columns)[1], each_alone(columns), intercept=True)
    assert list(found) == list(columns)
    np.testing.assert_allclose(list(found.values()), expected, rtol=5e-7 if len(expected) == 3 else 1e-12)


@pytest.mark.parametrize("seed", range(8))
def test_inflation_of_numbers_and_of_a_category(seed):
    """VIF as statsmodels gives it; that of a category by determinants (Fox & Monette 1992), to the 1/df."""
    columns, blocks = table(seed)
    found = inflation_of(held(columns)[1], blocks, intercept=True)
    x = np.column_stack([values / np.abs(values).max() for values in columns.values()])
    x = np.column_stack([np.ones(len(x)), x])
    for place, name in enumerate(["x0", "x1", "x2"], start=1):
        assert math.isclose(found[name], variance_inflation_factor(x, place), rel_tol=1e-9)
    expected = generalized(columns, ["g1", "g2", "g3"], ["x0", "x1", "x2"])
    assert math.isclose(found["g"], float(expected) ** (1 / 3), rel_tol=1e-13)


def test_without_an_intercept_inflation_is_about_zero():
    """Uncentred determinants, in fractions."""
    columns, blocks = table(9)
    found = inflation_of(held(columns)[1], blocks, intercept=False)
    for name, block in {"x0": ["x0"], "g": ["g1", "g2", "g3"]}.items():
        others = [other for other in columns if other not in block]
        expected = float(generalized(columns, block, others, intercept=False)) ** (1 / len(block))
        assert math.isclose(found[name], expected, rel_tol=1e-13)


def test_orthogonal_columns_are_not_inflated():
    """A 2 by 2 by 2 design has VIF 1 everywhere, and one predictor alone has it too."""
    rows = list(itertools.product([-1.0, 1.0], repeat=3))
    columns = {name: [row[j] for row in rows] for j, name in enumerate("abc")}
    assert inflation_of(held(columns)[1], each_alone(columns), intercept=True) == {
        "a": 1.0,
        "b": 1.0,
        "c": 1.0,
    }
    assert inflation_of(held(HALD)[1], {"x1": (named("x1"),)}, intercept=True) == {"x1": 1.0}


def test_units_and_column_order_do_not_matter():
    """Columns times powers of two, or in another order: the same inflation."""
    columns, blocks = table(10)
    expected = inflation_of(held(columns)[1], blocks, intercept=True)
    scaled = {name: np.ldexp(values, 40 * j - 100) for j, (name, values) in enumerate(columns.items())}
    assert inflation_of(held(scaled)[1], blocks, intercept=True) == pytest.approx(expected, rel=1e-14)
    turned = inflation_of(held(columns)[1], dict(reversed(blocks.items())), intercept=True)
    assert turned == pytest.approx(expected, rel=1e-13)


@pytest.mark.parametrize("share", [1e-3, 1e-6, 1e-9, 1e-12])
def test_inflation_of_near_copies(share):
    """Columns that say nearly the same: twelve digits of a VIF up to 1e24 (by fractions)."""
    rng = np.random.default_rng(11)
    a, b, c = rng.normal(size=(3, 25))
    columns = {"a": a, "b": a + share * b, "c": c}
    found = inflation_of(held(columns)[1], each_alone(columns), intercept=True)
    for name in "abc":
        expected = float(generalized(columns, [name], [other for other in "abc" if other != name]))
        assert math.isclose(found[name], expected, rel_tol=1e-12)


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("seed", range(6))
def test_inflation_after_another_has_left(seed, intercept):
    """Leaving each other predictor out is the inflation in the smaller model."""
    columns, blocks = table(seed)
    moments = held(columns)[1]
    for name in blocks:
        found = inflation_without(moments, blocks, name, intercept=intercept)
        assert list(found) == [other for other in blocks if other != name]
        for other, value in found.items():
            left = {one: keys for one, keys in blocks.items() if one != other}
            expected = inflation_of(moments, left, intercept=intercept)[name]
            assert math.isclose(value, expected, rel_tol=1e-12)


@pytest.mark.parametrize("share", [1e-3, 1e-6, 1e-9])
def test_inflation_after_a_near_copy_has_left(share):
    """Without its near copy a column is as little inflated as in the smaller model, to twelve digits."""
    rng = np.random.default_rng(12)
    a, b, c = rng.normal(size=(3, 25))
    columns = {"a": a, "b": a + share * b, "c": c + 0.5 * a}
    moments = held(columns)[1]
    found = inflation_without(moments, each_alone(columns), "a", intercept=True)
    for other in "bc":
        left = {one: keys for one, keys in each_alone(columns).items() if one != other}
        assert math.isclose(found[other], inflation_of(moments, left, intercept=True)["a"], rel_tol=1e-12)


def test_dependent_columns_have_no_inflation():
    """An exact combination is a fault with the place of its column."""
    columns = {"a": [1.0, 2, 3, 5], "b": [2.0, 4, 6, 10]}
    with pytest.raises(RankDeficient) as caught:
        inflation_of(held(columns)[1], each_alone(columns), intercept=True)
    assert str(caught.value) == "column 2 is an exact combination of the others"


def test_a_predictor_without_columns_is_not_inflated():
    """A category with one level in these rows has no column: 1, and the others are as without it."""
    blocks = {**each_alone(HALD), "g": ()}
    found = inflation_of(held(HALD)[1], blocks, intercept=True)
    assert found == {**inflation_of(held(HALD)[1], each_alone(HALD), intercept=True), "g": 1.0}
    assert inflation_without(held(HALD)[1], blocks, "x1", intercept=True)["g"] == found["x1"]


# Condition indices and variance shares ------------------------------------------------------------


def test_condition_of_longley():
    """Condition indices up to 43275 and the shares on the two largest (Belsley, Kuh & Welsch's method)."""
    keys, moments = held(LONGLEY)
    found = condition(moments, keys, intercept=True)
    expected = [1, 9.14172052, 12.25573505, 25.3366071, 230.423946, 1048.080298, 43275.04359]
    np.testing.assert_allclose(found.indices, expected, rtol=1e-8)
    np.testing.assert_allclose(
        found.shares[-1], [0.9999, 0.0383, 0.6546, 0.6893, 0.3020, 0.1597, 0.9998], atol=5.1e-5
    )
    np.testing.assert_allclose(
        found.shares[-2], [0.0001, 0.5046, 0.3284, 0.2253, 0.0000, 0.8306, 0.0002], atol=5.1e-5
    )
    assert found.keys == (None, *keys)


def test_condition_of_the_cement_data():
    """Condition indices up to 249.6 and the shares on the largest (Hald 1952), recomputed."""
    keys, moments = held(HALD)
    found = condition(moments, keys, intercept=True)
    np.testing.assert_allclose(found.indices, [1, 2.72721445, 3.77752894, 10.4620738, 249.578252], rtol=1e-8)
    np.testing.assert_allclose(found.shares[-1], [0.9999, 0.9316, 0.9969, 0.9498, 0.9973], atol=5.1e-5)


@pytest.mark.parametrize("intercept", [True, False])
@pytest.mark.parametrize("seed", range(10))
def test_condition_against_numpy(seed, intercept):
    """Singular values and right vectors of the columns scaled to unit length (numpy's svd)."""
    columns, _ = table(seed, k=1 + seed % 5, levels=2 + seed % 4)
    keys, moments = held(columns)
    x = np.column_stack(list(columns.values()))
    x = np.column_stack([np.ones(len(x)), x]) if intercept else x
    _, values, right = np.linalg.svd(x / np.linalg.norm(x, axis=0), full_matrices=False)
    found = condition(moments, keys, intercept=intercept)
    np.testing.assert_allclose(found.indices, values[0] / values, rtol=1e-10)
    parts = (right.T / values) ** 2
    np.testing.assert_allclose(
        found.shares, (parts / parts.sum(axis=1, keepdims=True)).T, rtol=1e-8, atol=1e-12
    )


def test_indices_ascend_from_one_and_shares_add_to_one():
    """The first index is 1, none is smaller than the one before; each column of shares adds to 1."""
    columns, _ = table(13, k=6)
    keys, moments = held(columns)
    found = condition(moments, keys, intercept=True)
    assert found.indices[0] == 1.0
    assert list(found.indices) == sorted(found.indices)
    np.testing.assert_allclose(found.shares.sum(axis=0), 1.0, rtol=1e-14)


@pytest.mark.parametrize("share", [1e-4, 1e-8, 1e-12])
def test_large_indices_keep_their_digits(share):
    """Two columns with cosine c: indices 1 and √((1 + c)/(1 - c)), in fractions, up to 1e12."""
    rng = np.random.default_rng(14)
    a, b = rng.normal(size=(2, 25))
    columns = {"a": a, "b": a + share * b}
    keys, moments = held(columns)
    exact = [[Fraction(float(v)) for v in columns[name]] for name in "ab"]
    aa, bb, ab = (
        sum(p * q for p, q in zip(exact[i], exact[j], strict=True)) for i, j in ((0, 0), (1, 1), (0, 1))
    )
    shift = 1 << 400
    length = Fraction(math.isqrt(int(aa * bb * shift * shift)), shift)
    expected = math.sqrt((length + ab) / (length - ab))
    assert math.isclose(condition(moments, keys, intercept=False).indices[1], expected, rel_tol=1e-10)


def test_threads_and_units_do_not_matter():
    """One thread or two, columns times powers of two: the same doubles, or nearly."""
    columns, _ = table(15, k=6)
    keys, moments = held(columns)
    expected = condition(moments, keys, intercept=True)
    for threads in (1, 2):
        with threadpool_limits(threads):
            again = condition(moments, keys, intercept=True)
        assert again.indices == expected.indices
        assert (again.shares == expected.shares).all()
    scaled = {name: np.ldexp(values, 50 - 20 * j) for j, (name, values) in enumerate(columns.items())}
    other = condition(held(scaled)[1], keys, intercept=True)
    np.testing.assert_allclose(other.indices, expected.indices, rtol=1e-13)
    np.testing.assert_allclose(other.shares, expected.shares, rtol=1e-11, atol=1e-14)


def test_one_column_alone():
    """A single column has the one index 1 and the whole share."""
    keys, moments = held({"a": [1.0, 2, 3]})
    found = condition(moments, keys, intercept=False)
    assert (found.indices, found.shares.tolist(), found.keys) == ((1.0,), [[1.0]], (keys[0],))
    assert condition(moments, [], intercept=True).indices == (1.0,)


def test_orthogonal_columns_have_index_one():
    """Nothing is rotated where columns are orthogonal already."""
    rows = list(itertools.product([-1.0, 1.0], repeat=2))
    keys, moments = held({"a": [row[0] for row in rows], "b": [row[1] for row in rows]})
    found = condition(moments, keys, intercept=True)
    assert found.indices == (1.0, 1.0, 1.0)
    assert (found.shares.sum(axis=1) == 1.0).all()
