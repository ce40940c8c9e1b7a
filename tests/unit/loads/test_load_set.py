"""How a person's load is drawn from a set: prefix-stable, negative factors redrawn, pace held in its range."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from crowdsim.loads import sets
from crowdsim.loads.load_set import LoadSet, given

PACE = np.random.default_rng(1).uniform(1.4, 2.4, 500)
ALL = [(gait, name) for gait in ("walking", "jogging") for name in sets.names(gait)]


def chosen(gait: str, name: str) -> LoadSet:
    return sets.load_set(gait, name, contact_ratio=0.6 if name == "half-sine" else None)


@pytest.mark.parametrize(("gait", "name"), ALL)
def test_every_set_gives_factors_and_phases_of_its_harmonics(gait: str, name: str) -> None:
    load = chosen(gait, name)
    factors, phases = load.draw(
        PACE + (0.8 if gait == "jogging" else 0.0), np.random.default_rng(2), np.random.default_rng(1000)
    )
    assert load.gait == gait
    assert load.source
    assert factors.shape == phases.shape == (500, load.harmonics)
    assert np.all(np.isfinite(phases))
    assert np.all(factors >= 0.0)
    assert np.all(factors[:, 0] > 0.0)


@pytest.mark.parametrize(("gait", "name"), ALL)
@pytest.mark.parametrize("count", [0, 1, 37, 499])
def test_a_person_draws_the_same_whoever_else_there_is(gait: str, name: str, count: int) -> None:
    load = chosen(gait, name)
    if load.spread is not None:
        load = load.scattered(True)
    all_factors, all_phases = load.draw(PACE, np.random.default_rng(3), np.random.default_rng(1000))
    factors, phases = load.draw(PACE[:count], np.random.default_rng(3), np.random.default_rng(1000))
    np.testing.assert_array_equal(factors, all_factors[:count])
    np.testing.assert_array_equal(phases, all_phases[:count])


def test_draws_in_pieces_are_those_of_the_whole() -> None:
    load = sets.load_set("walking", "zivanovic-2007")
    random, other = np.random.default_rng(4), np.random.default_rng(1000)
    pieces = [load.draw(PACE[a:b], random, other) for a, b in ((0, 100), (100, 100), (100, 500))]
    whole = load.draw(PACE, np.random.default_rng(4), np.random.default_rng(1000))
    np.testing.assert_array_equal(np.concatenate([p[0] for p in pieces]), whole[0])
    np.testing.assert_array_equal(np.concatenate([p[1] for p in pieces]), whole[1])


def test_scattered_factors_are_normal_above_nought() -> None:
    load = sets.load_set("walking", "zivanovic-2007")
    pace = np.full(20_000, 2.0)
    factors, _ = load.draw(pace, np.random.default_rng(5), np.random.default_rng(1000))
    mean, spread = load.mean(pace[:1])[0], load.spread(pace[:1])[0]  # type: ignore[misc]
    assert np.all(factors > 0.0)
    for k in range(5):
        truncated = stats.truncnorm(-mean[k] / spread[k], np.inf, mean[k], spread[k])
        # a person has four tries: all four below 0 has a chance of 3e-7 at two standard deviations, nothing in 20,000
        assert stats.kstest(factors[:, k], truncated.cdf).pvalue > 1e-4  # false alarm 5e-4 over the five, fixed seed


def test_a_set_without_scatter_gives_its_means() -> None:
    load = sets.load_set("walking", "zivanovic-2007", scatter=False)
    factors, _ = load.draw(PACE, np.random.default_rng(6), np.random.default_rng(1000))
    np.testing.assert_array_equal(factors, load.factors(PACE))


def test_phases_that_a_set_gives_are_the_same_for_all() -> None:
    load = sets.load_set("walking", "setra-2006")
    _, phases = load.draw(PACE, np.random.default_rng(7), np.random.default_rng(1000))
    np.testing.assert_array_equal(phases, np.tile([0.0, -0.5 * np.pi, -0.5 * np.pi], (500, 1)))


def test_phases_that_a_set_does_not_give_are_uniform_and_independent() -> None:
    load = sets.load_set("walking", "young-2001-mean")
    assert load.phases is None
    _, phases = load.draw(np.full(20_000, 2.0), np.random.default_rng(8), np.random.default_rng(1000))
    for k in range(4):
        assert stats.kstest(phases[:, k], stats.uniform(0.0, 2 * np.pi).cdf).pvalue > 1e-4
    correlation = np.corrcoef(phases.T) - np.eye(4)
    assert np.abs(correlation).max() < 4.5 / np.sqrt(20_000)  # four and a half standard errors, six pairs: 4e-5


def test_a_pace_outside_the_range_is_held_at_its_limit() -> None:
    load = sets.load_set("walking", "bachmann-ammann-1987")
    low, high = load.pace_range
    np.testing.assert_array_equal(load.factors(np.array([0.5, 9.0])), load.factors(np.array([low, high])))
    drawn, _ = load.draw(np.array([0.5, 9.0]), np.random.default_rng(9), np.random.default_rng(1000))
    np.testing.assert_array_equal(drawn, load.factors(np.array([low, high])))


def test_load_factors_written_out_hold_at_every_pace() -> None:
    load = given((0.4, 0.1), None, "walking")
    factors, phases = load.draw(np.array([0.1, 5.0]), np.random.default_rng(10), np.random.default_rng(1000))
    np.testing.assert_array_equal(factors, [[0.4, 0.1]] * 2)
    np.testing.assert_array_equal(phases, np.zeros((2, 2)))
    _, phases = given((0.4, 0.1), (0.3, -0.2), "walking").draw(
        np.array([2.0]), np.random.default_rng(10), np.random.default_rng(1000)
    )
    np.testing.assert_array_equal(phases, [[0.3, -0.2]])


@pytest.mark.parametrize(
    ("options", "message"),
    [
        ({"gait": "walking", "name": "setra-2006", "scatter": True}, "setra-2006 gives no scatter"),
        ({"gait": "walking", "name": "kerr-1998", "contact_ratio": 0.5}, "contact_ratio belongs to half-sine"),
        ({"gait": "jogging", "name": "half-sine"}, "half-sine needs contact_ratio"),
        ({"gait": "jogging", "name": "half-sine", "contact_ratio": 0.2}, "0.3 to 1, not 0.2"),
    ],
)
def test_an_option_that_a_set_does_not_have_is_refused(options: dict[str, object], message: str) -> None:
    with pytest.raises(ValueError, match=message):
        sets.load_set(**options)  # type: ignore[arg-type]


def test_an_unknown_set_and_one_of_the_other_gait_are_no_sets() -> None:
    with pytest.raises(KeyError):
        sets.load_set("walking", "bachmann-1995")
    with pytest.raises(KeyError):
        sets.load_set("jogging", "young")


def test_the_default_sets_are_there() -> None:
    for gait, name in sets.DEFAULT_LOAD.items():
        assert name in sets.names(gait)
