"""What belongs to Katz alone: refusing alpha, and the pin of an era."""

from __future__ import annotations

from datetime import date

import numpy as np
import pytest

from swaygauge.errors import AlphaTooLarge, ScoreError
from swaygauge.graph import Graph
from swaygauge.records import Pin, SpectralBounds
from swaygauge.scores import KatzOptions
from swaygauge.scores.katz import katz, pin_alpha, safe_alpha

NIGHT, NEXT = date(2031, 3, 1), date(2031, 3, 2)
OPTIONS = KatzOptions()


def test_alpha_too_large_names_the_largest_safe_value() -> None:
    clique = Graph(5, *np.nonzero(~np.eye(5, dtype=bool)))  # lambda = 4
    with pytest.raises(AlphaTooLarge, match=r"alpha = 0.25 is not proven to be below 1/lambda.*Use alpha < 0.25") as no:
        katz(clique, alpha=0.25)
    assert no.value.largest_safe == pytest.approx(0.25, rel=1e-9)
    assert katz(clique, alpha=0.999 * no.value.largest_safe).value[0] == pytest.approx(1000.0, rel=1e-6)


@pytest.mark.parametrize("alpha", [-0.1, np.nan, np.inf])
def test_senseless_alpha(alpha: float) -> None:
    with pytest.raises(ScoreError, match="alpha: expected a finite number >= 0"):
        katz(Graph(2, [0], [1]), alpha=alpha)


def test_safe_alpha() -> None:
    assert safe_alpha(SpectralBounds(3.9, 4.0, 0), 0.8) == 0.2
    with pytest.raises(ScoreError, match="every alpha is legal"):
        safe_alpha(SpectralBounds(0.0, 0.0), 0.8)
    with pytest.raises(ScoreError, match="between 0 and 1"):
        safe_alpha(SpectralBounds(3.9, 4.0, 0), 1.0)


def test_the_first_night_pins() -> None:
    assert pin_alpha(None, SpectralBounds(3.9, 4.0, 0), night=NIGHT, options=OPTIONS) == (
        Pin(0.2, 0.8, NIGHT, 3.9, 4.0),
        True,
    )


@pytest.mark.parametrize("upper", [4.0, 1.0, 4.5])
def test_the_pin_is_kept_up_to_the_limit(upper: float) -> None:
    pin = Pin(0.2, 0.8, NIGHT, 3.9, 4.0)
    assert pin_alpha(pin, SpectralBounds(upper, upper, 0), night=NEXT, options=OPTIONS) == (pin, False)


def test_beyond_the_limit_a_new_era_starts() -> None:
    pin = Pin(0.2, 0.8, NIGHT, 3.9, 4.0)
    assert pin_alpha(pin, SpectralBounds(5.0, 5.0, 0), night=NEXT, options=OPTIONS) == (
        Pin(0.8 / 5.0, 0.8, NEXT, 5.0, 5.0),
        True,
    )


def test_a_network_without_a_cycle_has_an_alpha_of_its_own() -> None:
    none = SpectralBounds(0.0, 0.0)
    pin, new = pin_alpha(None, none, night=NIGHT, options=OPTIONS)
    assert (pin, new) == (Pin(0.5, 0.0, NIGHT, 0.0, 0.0), True)
    assert pin_alpha(pin, none, night=NEXT, options=OPTIONS) == (pin, False)
    later, new = pin_alpha(pin, SpectralBounds(2.0, 2.0, 3), night=NEXT, options=OPTIONS)
    assert (later.alpha, later.night, new) == (0.4, NEXT, True)
