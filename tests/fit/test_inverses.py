"""Inverses and triangles of cross-products, against numpy."""

from __future__ import annotations

import numpy as np
import pytest

from beforehand.fit.inverses import triangle_of, unit_inverse, unit_inverses_without
from beforehand.fit.moments import ArraySource, moments_of, named
from beforehand.fit.sweeping import RankDeficient


def held(columns):
    """Moments of plain arrays, by name."""
    arrays = {named(name): np.asarray(values, float) for name, values in columns.items()}
    return moments_of(ArraySource(arrays), list(arrays))


def table(seed, n=40, k=4):
    """A random table with columns of unlike size."""
    rng = np.random.default_rng(seed)
    values = (
        rng.normal(size=(n, k)) @ (np.eye(k) + 0.3 * rng.normal(size=(k, k))) + rng.normal(size=k)
    ) * 10.0 ** rng.integers(-4, 5, size=k)
    columns = {f"x{j}": values[:, j] for j in range(k)}
    columns["y"] = (values / values.std(axis=0)) @ rng.normal(size=k) + rng.normal(size=n) + 3
    return columns


@pytest.mark.parametrize("centred", [True, False])
def test_unit_inverse(centred):
    """The inverse of the cross-products with a unit diagonal (numpy)."""
    columns = table(24, k=4)
    keys = [named(f"x{j}") for j in range(4)]
    x = np.column_stack([columns[f"x{j}"] for j in range(4)])
    x = x - x.mean(axis=0) * centred
    x = x / np.linalg.norm(x, axis=0)
    found = unit_inverse(held(columns), keys, centred=centred)
    np.testing.assert_allclose(found, np.linalg.inv(x.T @ x), rtol=1e-10, atol=1e-12)
    assert (found == found.T).all()


@pytest.mark.parametrize("intercept", [True, False])
def test_triangle(intercept):
    """R of the columns scaled to unit length, the intercept first, with a positive diagonal (numpy's QR)."""
    columns = table(25, k=4)
    x = np.column_stack([columns[f"x{j}"] for j in range(4)])
    x = np.column_stack([np.ones(40), x]) if intercept else x
    r = np.linalg.qr(x / np.linalg.norm(x, axis=0), mode="r")
    r = r * np.sign(np.diag(r))[:, None]
    found = triangle_of(held(columns), [named(f"x{j}") for j in range(4)], intercept=intercept)
    np.testing.assert_allclose(found, r, rtol=1e-10, atol=1e-13)


def test_dependent_columns_have_no_inverse():
    """The fault names the place of the column."""
    x = np.arange(6.0)
    moments = held({"x": x, "z": 3 * x - 1, "twice": 2 * x})
    with pytest.raises(RankDeficient) as caught:
        unit_inverse(moments, [named("x"), named("z")], centred=True)
    assert str(caught.value) == "column 2 is an exact combination of the others"
    with pytest.raises(RankDeficient) as caught:
        triangle_of(moments, [named("x"), named("twice")], intercept=False)
    assert str(caught.value) == "column 2 is an exact combination of the others"


@pytest.mark.parametrize("centred", [True, False])
def test_inverses_after_groups_have_left(centred):
    """Each part of the inverse is that of the model without the group (numpy), whatever its width."""
    columns = table(26, k=6)
    keys = [named(f"x{j}") for j in range(6)]
    own, others = keys[:2], [keys[2:3], keys[3:6]]
    found = unit_inverses_without(held(columns), own, others, centred=centred)
    for group, part in zip(others, found, strict=True):
        stay = [key for key in keys if key not in group]
        expected = unit_inverse(held(columns), stay, centred=centred)[:2, :2]
        np.testing.assert_allclose(part, expected, rtol=1e-15)
    assert unit_inverses_without(held(columns), own, [], centred=centred) == ()
