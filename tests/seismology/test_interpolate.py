"""Modes between two models: the truth lies within what is stated, crossings are refused."""

from __future__ import annotations

import numpy as np
import pytest

import oscsolve
from oscsolve import InputError, interpolate_modes

BAND = (0.5, 200.0)


def solved(index: float, **settings) -> oscsolve.ModeSet:
    star = oscsolve.polytrope(index)
    options = oscsolve.SolveOptions(eigenfunctions=False)
    return oscsolve.solve_modes(star, [0, 1, 2], BAND, unit="sigma2", options=options, **settings)


def keys_of(modes) -> list[tuple[int, int]]:
    return list(zip(modes.degree.tolist(), modes.order.tolist(), strict=True))


@pytest.mark.parametrize(("low", "high"), [(2.9, 3.1), (3.4, 3.5), (4.0, 4.02)])
def test_what_is_between_lies_within_the_stated_error(low, high):
    first, middle, second = (solved(index) for index in (low, 0.5 * (low + high), high))
    found = interpolate_modes(first, second, 0.5)
    truth = dict(zip(keys_of(middle), middle.nu.tolist(), strict=True))
    exact = np.array([truth[key] for key in keys_of(found)])
    assert found.degree.size > 20
    assert np.all(np.abs(found.nu - exact) <= found.nu_error)
    assert np.all(found.nu_error < 0.1 * found.nu)
    # Pure p modes are interpolated to a few parts in a thousand at worst.
    radial = found.degree == 0
    assert np.all(np.abs(found.nu / exact - 1.0)[radial] < 2e-3)


def test_ends_are_the_models_themselves():
    first, second = solved(3.0), solved(3.02)
    for share, modes in ((0.0, first), (1.0, second)):
        found = interpolate_modes(first, second, share)
        rows = [keys_of(modes).index(key) for key in keys_of(found)]
        assert found.nu == pytest.approx(modes.nu[rows], rel=1e-12)
        assert found.nu_dynamical == pytest.approx(modes.star.nu_dynamical)


def test_modes_that_change_character_are_refused_with_the_reason():
    found = interpolate_modes(solved(3.4), solved(3.5), 0.5)
    assert len(found.reason) == len(found.refused) > 0
    assert all(reason.startswith("avoided crossing") for reason in found.reason)
    assert not set(keys_of(found)) & {tuple(key) for key in found.refused.tolist()}


def test_wrong_arguments_are_refused():
    first = solved(3.0)
    with pytest.raises(InputError, match="share must be from 0 to 1"):
        interpolate_modes(first, first, 1.5)
    with pytest.raises(InputError, match="differ in gravity: full and cowling"):
        interpolate_modes(first, solved(3.0, gravity="cowling"), 0.5)
