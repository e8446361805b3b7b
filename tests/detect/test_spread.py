import numpy as np
import pytest

from swaygauge.detect.spread import SpreadHistory, band_spread


def remembered(nights: list[np.ndarray], bands: list[np.ndarray], *, window: int = 14) -> SpreadHistory:
    history = SpreadHistory.empty()
    for number, (values, band) in enumerate(zip(nights, bands, strict=True)):
        history = history.after(number, band.astype(np.int32), values, window=window)
    return history


def test_without_winsorising_it_is_the_root_mean_square() -> None:
    random = np.random.default_rng(1)
    nights = [random.normal(0, 0.01, 500) for _ in range(14)]
    history = remembered(nights, [np.zeros(500)] * 14)
    assert band_spread(history, bands=1, winsor=1.0)[0] == pytest.approx(np.sqrt(np.mean(np.concatenate(nights) ** 2)))


def test_winsorised_spread_against_sorting_everything() -> None:
    random = np.random.default_rng(2)
    nights = [random.standard_t(2, 800) * 0.01 for _ in range(14)]
    band = random.integers(0, 3, 800)
    spread = band_spread(remembered(nights, [band] * 14), bands=3, winsor=0.99)
    for number in range(3):
        values = np.concatenate([night[band == number] for night in nights])
        cut = np.quantile(np.abs(values), 0.99)
        exact = np.sqrt(np.mean(np.clip(values, -cut, cut) ** 2))
        assert spread[number] == pytest.approx(exact, rel=0.02)  # the cut is known to an eighth of an octave


def test_one_wild_night_hardly_shows_and_is_forgotten_after_the_window() -> None:
    calm = [np.full(300, 0.01)] * 14
    wild = [*calm]
    wild[3] = np.concatenate((np.full(2, 50.0), np.full(298, 0.01)))
    bands = [np.zeros(300)] * 14
    assert band_spread(remembered(wild, bands), bands=1, winsor=0.99)[0] == pytest.approx(0.01)
    far = remembered([np.full(300, 50.0), *calm], [np.zeros(300)] * 15)
    assert band_spread(far, bands=1, winsor=1.0)[0] == pytest.approx(0.01)
    assert far.night.min() == 1


def test_too_few_values_or_no_movement_give_no_unit() -> None:
    few = remembered([np.full(20, 0.5)], [np.zeros(20)])
    assert band_spread(few, bands=2, winsor=0.99).tolist() == [0.0, 0.0]
    still = remembered([np.concatenate((np.zeros(995), np.full(5, 1.0)))] * 3, [np.zeros(1000)] * 3)
    assert band_spread(still, bands=1, winsor=0.99).tolist() == [0.0]
