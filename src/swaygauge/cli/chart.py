"""A node's path through the places, drawn in characters: place 1 at the top, log axis, missing nights left open."""

from __future__ import annotations

import math
from collections.abc import Sequence

HEIGHT = 9


def _row_of(place: int, top: float, bottom: float, height: int) -> int:
    if bottom <= top:
        return 0
    return round((math.log2(place) - top) / (bottom - top) * (height - 1))


def draw_path(places: Sequence[int | None], height: int = HEIGHT) -> list[str]:
    """Lines of text for one place per night, oldest first; None is a night without a place.

    The left margin names the place of each labelled line. Steps of more than one line between two nights are joined by
    a thin stroke, so a jump reads as one movement.
    """
    known = [place for place in places if place is not None]
    if not known:
        return []
    top, bottom = math.log2(min(known)), math.log2(max(known))
    if top == bottom:
        height = 1
    grid = [[" "] * len(places) for _ in range(height)]
    last: int | None = None
    for column, place in enumerate(places):
        if place is None:
            last = None
            continue
        row = _row_of(place, top, bottom, height)
        if last is not None and abs(row - last) > 1:
            for between in range(min(row, last) + 1, max(row, last)):
                grid[between][column] = "│"
        grid[row][column] = "•"
        last = row
    labels = {
        row: str(round(2 ** (top + (bottom - top) * row / max(height - 1, 1)))) for row in {0, height // 2, height - 1}
    }
    margin = max(len(label) for label in labels.values())
    return [f"{labels.get(row, ''):>{margin}} ┤{''.join(cells)}" for row, cells in enumerate(grid)]
