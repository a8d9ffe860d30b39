"""Levels followed from bias to bias."""

import numpy as np
import pytest

from physics.curve import Curve
from physics.tracks import followed


def curve_of(bias: np.ndarray, level: np.ndarray) -> Curve:
    current = np.where(np.isfinite(level), bias[:, None] + level, np.nan)
    one = np.ones(bias.size)
    return Curve(bias, one, one, one > 0, level, level, current)


def test_levels_that_cross_keep_their_number() -> None:
    bias = np.linspace(-0.2, 0.4, 61)
    steep, shallow = 0.30 - 0.6 * bias, 0.20 - 0.1 * bias
    level = np.sort(np.stack([steep, shallow], axis=1), axis=1)
    energy, current = followed(curve_of(bias, level))
    assert energy.shape == (61, 2)
    for track in (steep, shallow):
        assert any(np.allclose(track, energy[:, k], atol=1e-12) for k in range(2))
    assert current == pytest.approx(bias[:, None] + energy)


def test_levels_that_come_and_go() -> None:
    bias = np.linspace(0.0, 0.5, 51)
    low, high = 0.10 - 0.5 * bias, 0.55 - 0.5 * bias
    level = np.stack([np.where(low > 0.0, low, np.nan), np.where(high < 0.4, high, np.nan)], axis=1)
    level = np.sort(level, axis=1)  # nan last, so that the high one moves to the first place
    energy, _ = followed(curve_of(bias, level))
    assert energy.shape[1] == 2
    assert np.nanmax(np.abs(energy[:, 0] - low)) < 1e-12
    assert np.nanmax(np.abs(energy[:, 1] - high)) < 1e-12


def test_no_levels_at_all() -> None:
    energy, current = followed(curve_of(np.linspace(0.0, 1.0, 5), np.empty((5, 0))))
    assert energy.shape == current.shape == (5, 0)
