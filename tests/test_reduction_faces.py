"""Faces: what two readings say of the angle and of the instrument, and horizon closures."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from adjust.angles import FULL_TURN, wrapped
from adjust.reductions import faces
from adjust.reductions.circle import number_groups
from adjust.reductions.faces import LEFT, RIGHT
from adjust.reductions.horizon import horizon_closures
from adjust.units import ARCSEC, parse_dms

ANGLES = st.floats(0, FULL_TURN, exclude_max=True)
SMALL = st.floats(-60 * ARCSEC, 60 * ARCSEC)
READING = 1e-12
"""Radians: rounding of readings of a few radians."""


def dms(text):
    return np.radians(parse_dms(text))


def means(left, right, kind="horizontal"):
    face = np.array([LEFT] * len(left) + [RIGHT] * len(right))
    as_left = faces.horizontal_as_left if kind == "horizontal" else faces.zenith_as_left
    readings = as_left(np.array([*left, *right]), face)
    return faces.mean_of_faces(readings, face, np.zeros(len(face), dtype=np.int64), 1)


def test_horizontal_pair():
    """Rule of ISO 17123-3: mean (x_I + x_II ± 180°)/2; the figures are made up."""
    pair = means([dms("45-12-20")], [dms("225-12-30")])
    assert pair.value[0] == pytest.approx(dms("45-12-25"), rel=0, abs=READING)
    assert pair.error[0] == pytest.approx(-5 * ARCSEC, rel=0, abs=READING)
    assert pair.variance[0] == 1.0


def test_zenith_pair():
    """Rule of ISO 17123-3: index (x_I + x_II − 360°)/2; the figures are made up."""
    pair = means([dms("88-30-14")], [dms("271-29-58")], "zenith")
    assert pair.value[0] == pytest.approx(dms("88-30-08"), rel=0, abs=READING)
    assert pair.error[0] == pytest.approx(6 * ARCSEC, rel=0, abs=READING)


@given(ANGLES, SMALL)
def test_both_faces_are_free_of_the_error_and_give_it(direction, error):
    pair = means([(direction + error) % FULL_TURN], [(direction + np.pi - error) % FULL_TURN])
    assert abs(wrapped(pair.value - direction)[0]) < READING
    assert abs(pair.error[0] - error) < READING


@given(st.floats(0.2, 2.9), SMALL)
def test_zenith_angles_are_free_of_the_index_error(zenith, index):
    pair = means([zenith + index], [FULL_TURN - (zenith - index)], "zenith")
    assert abs(pair.value[0] - zenith) < READING
    assert abs(pair.error[0] - index) < READING


@given(ANGLES, st.floats(0.3, 2.8), SMALL, st.booleans())
def test_one_face_and_a_known_collimation_give_the_direction(direction, zenith, collimation, on_right):
    effect = faces.effect_of_collimation(np.array([collimation]), np.array([zenith]))
    reading = direction + np.pi - effect[0] if on_right else direction + effect[0]
    single = means([], [reading]) if on_right else means([reading], [])
    assert np.isnan(single.error[0])
    assert single.variance[0] == 2.0
    assert abs(wrapped(faces.corrected_single_faces(single, effect) - direction)[0]) < READING
    known = faces.collimation_of(effect, np.array([zenith]))
    assert abs(known[0] - collimation) < READING


def test_pairs_are_not_corrected_and_unknown_errors_correct_nothing():
    pair, single = means([1.0], [1.0 + np.pi]), means([1.0], [])
    assert faces.corrected_single_faces(pair, np.array([1e-3]))[0] == pair.value[0]
    assert faces.corrected_single_faces(single, np.array([np.nan]))[0] == 1.0


def test_variance_of_uneven_numbers_of_readings():
    """Three on one face, one on the other: (1/3 + 1)/2 of the variance of a pair, by simulation to 2 %."""
    generator = np.random.default_rng(71)
    rounds = 40_000
    readings = 1.0 + generator.normal(0, np.sqrt(2) * ARCSEC, (rounds, 4))  # a pair then has 1″
    face = np.tile([LEFT, LEFT, LEFT, RIGHT], rounds)
    result = faces.mean_of_faces(readings.ravel(), face, np.repeat(np.arange(rounds), 4), rounds)
    np.testing.assert_allclose(result.variance, 2 / 3, rtol=0, atol=1e-12)
    assert np.var(result.value) / ARCSEC**2 == pytest.approx(2 / 3, rel=0.02)


def test_closed_horizon():
    """Two half-rounds of three targets; the first comes back 4″ off, the second does not come back."""
    target = np.array([7, 8, 9, 7, 9, 8, 7])
    half = np.array([0, 0, 0, 0, 1, 1, 1])
    reading = np.array([359.999, 80.0, 200.0, 359.999 + 4 / 3600 - 360, 20.0, 260.0, 180.0]) * np.pi / 180
    closures = horizon_closures(reading, target, half, 2)
    assert closures.first.tolist() == [0]
    assert closures.last.tolist() == [3]
    np.testing.assert_allclose(closures.misclosure, 4 * ARCSEC, rtol=0, atol=READING)


def test_groups_are_numbered_as_they_are_met():
    group, count = number_groups(np.array([5, 5, 2, 5, 9]), np.array([1, 1, 0, 2, 0]))
    assert group.tolist() == [0, 0, 1, 2, 3]
    assert count == 4
