"""The terminal chart of a node's path through the places."""

from __future__ import annotations

from swaygauge.cli.chart import draw_path


def test_place_one_is_on_top_and_the_axis_is_logarithmic() -> None:
    lines = draw_path([1, 4, 16], height=5)
    assert [line.strip().split(" ")[0] for line in (lines[0], lines[2], lines[4])] == ["1", "4", "16"]
    assert [next(row for row, line in enumerate(lines) if line[-3 + column] == "•") for column in range(3)] == [0, 2, 4]


def test_a_missing_night_is_an_open_column() -> None:
    lines = draw_path([8, None, 8])
    assert lines == ["8 ┤• •"]


def test_a_jump_is_joined_but_not_across_a_gap() -> None:
    assert any("│" in line for line in draw_path([1, 512]))
    assert not any("│" in line for line in draw_path([1, None, 512]))


def test_no_place_at_all_draws_nothing() -> None:
    assert draw_path([None, None]) == []
