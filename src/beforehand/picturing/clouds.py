"""Counted points on axes: as points where they are few, as weights on a grid where they are many."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING

from beforehand.lock.pictures import Cloud, Point
from beforehand.picturing.sheet import BLUE, VERMILION, dots, stroke

if TYPE_CHECKING:
    from matplotlib.axes import Axes

# Dots have at most so many sizes, so that they are few paths.
SIZES = 8

# Up to so many points in the fullest cell, a dot is about a point; beyond, about a share.
FEW = 4

# The largest dot, in points.
LARGEST = 5.0


def centres(cloud: Cloud) -> tuple[tuple[float, float, int], ...]:
    """Middle of every cell that is not empty, with its points."""
    wide = (cloud.x_high - cloud.x_low) / cloud.columns
    tall = (cloud.y_high - cloud.y_low) / cloud.rows
    return tuple(
        (cloud.x_low + (column + 0.5) * wide, cloud.y_low + (row + 0.5) * tall, count)
        for column, row, count in cloud.cells
    )


def draw_cloud(axes: Axes, cloud: Cloud, *, across: float, colour: str = BLUE) -> None:
    """Put a cloud on axes that are ``across`` inches wide, and set their limits to hold it."""
    seen = centres(cloud)
    if not seen:
        return
    most = max(count for *_, count in seen)
    pitch = 72.0 * across / cloud.columns
    by_size: dict[float, list[tuple[float, float]]] = {}
    for x, y, count in seen:
        if most <= FEW:
            size = min(2.8, 1.1 * pitch) * math.sqrt(count)
        else:
            # Where a few points already fill a cell most, a single one must still be seen.
            least = 1.5 if most <= 10 * FEW else 0.45
            size = max(least, min(1.35 * pitch, LARGEST) * math.ceil(SIZES * math.sqrt(count / most)) / SIZES)
        by_size.setdefault(round(size, 3), []).append((x, y))
    room_x, room_y = 0.03 * (cloud.x_high - cloud.x_low), 0.04 * (cloud.y_high - cloud.y_low)
    axes.set(
        xlim=(cloud.x_low - room_x, cloud.x_high + room_x), ylim=(cloud.y_low - room_y, cloud.y_high + room_y)
    )
    for size in sorted(by_size):
        dots(
            axes, by_size[size], across=cloud.x_high - cloud.x_low, diameter=size, colour=colour, name="cloud"
        )


def draw_line(
    axes: Axes, points: Sequence[Point], *, colour: str = VERMILION, width: float = 1.6, name: str = "means"
) -> None:
    """Means of groups, joined."""
    stroke(axes, [x for x, _ in points], [y for _, y in points], colour=colour, width=width, name=name)
