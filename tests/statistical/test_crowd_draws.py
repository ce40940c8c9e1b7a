"""Who walks: arrivals, numbers on the deck, directions, phases and the independence of every draw.

Counts follow Poisson's law, quantities the truncated distributions of scipy, numbers on the deck Little's law
(rate x E[L/v]). Every statistical test states the probability with which it would fail by chance; the seeds are fixed.
`P_LOW` is the common false-alarm probability of one assertion.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy import stats
from scipy.integrate import quad

import crowdsim
from crowdsim.crowd.arrivals import ConstantNumber, PoissonArrivals, PoissonTimes
from crowdsim.crowd.distributions import Distribution, fixed, normal
from crowdsim.crowd.people import QUANTITIES, People, PeopleSource, Walkers, draw_people, generator
from crowdsim.study.executor import Halt, default_workers, rows
from crowdsim.study.jobs import draw
from crowdsim.study.simulate import plan

Floats = NDArray[np.float64]
P_LOW = 1e-4
Z_LOW = float(stats.norm.isf(P_LOW / 2.0))  # 3.89 standard errors
LENGTH, WIDTH, END = 50.0, 3.0, 400.0

WALKERS = Walkers(
    name="commuters",
    arrivals=PoissonArrivals(0.2),
    pace=normal(1.87, 0.186, 1.3, 2.6),
    step_length=normal(0.71, 0.071, 0.4, 1.1),
    speed=None,
    weight=normal(750.0, 120.0, 300.0, 1500.0),
    offset=Distribution("uniform", minimum=-1.2, maximum=1.2),
    phase=None,
    forward_share=0.3,
)


def people(walkers: Walkers = WALKERS, number: int = 0, end: float = END, seed: int = 5) -> People:
    """The persons of one realisation."""
    return draw_people(walkers, LENGTH, end, seed, number)


def within_poisson(counts: Floats, mean: float) -> None:
    """Mean and index of dispersion of independent counts against Poisson's law, false alarm 1e-4 each."""
    count = counts.size
    assert counts.mean() == pytest.approx(mean, abs=Z_LOW * math.sqrt(mean / count))
    dispersion = (count - 1) * counts.var(ddof=1) / counts.mean()  # chi square with count - 1 degrees of freedom
    low, high = stats.chi2.ppf([P_LOW / 2.0, 1.0 - P_LOW / 2.0], count - 1)
    assert low < dispersion < high


def test_arrivals_are_a_poisson_stream() -> None:
    """Counts in 60 s, their variance, and the gaps: false alarm 3e-4 in all."""
    drawn = [PoissonTimes(0.2, generator(1, k, "a", "arrival")).take(60.0) for k in range(4000)]
    within_poisson(np.array([times.size for times in drawn], dtype=float), 12.0)
    assert all(np.all(np.diff(times) > 0.0) for times in drawn)
    assert min(t.min() for t in drawn if t.size) >= 0.0
    assert max(t.max() for t in drawn if t.size) < 60.0
    # of a record of random length the gaps cut off at its end are missing: those of one long record instead
    gaps = np.diff(PoissonTimes(0.2, generator(1, 0, "b", "arrival")).take(100_000.0), prepend=0.0)
    assert stats.kstest(gaps, stats.expon(scale=5.0).cdf).pvalue > P_LOW


TRUNCATED = [
    (normal(1.87, 0.186, 1.3, 2.6), stats.truncnorm(-0.57 / 0.186, 0.73 / 0.186, loc=1.87, scale=0.186)),
    (normal(2.0, 0.5, 1.9, 2.1), stats.truncnorm(-0.2, 0.2, loc=2.0, scale=0.5)),
    (normal(1.0, 0.4, 1.6, 3.0), stats.truncnorm(1.5, 5.0, loc=1.0, scale=0.4)),
    (Distribution("uniform", minimum=0.5, maximum=0.9), stats.uniform(0.5, 0.4)),
]


@pytest.mark.parametrize(("distribution", "reference"), TRUNCATED)
def test_moments_and_draws_of_truncated_distributions(distribution: Distribution, reference) -> None:  # type: ignore[no-untyped-def]
    """Quadrature against scipy's to 1e-8 (its own integration), draws by Kolmogorov-Smirnov and mean: 2e-4."""
    for power in (1.0, 2.0, -1.0):
        expected = reference.expect(lambda x, power=power: x**power)
        assert distribution.expectation(power) == pytest.approx(expected, rel=1e-8)
    drawn = distribution.draw(np.random.default_rng(8), 20_000)
    assert drawn.min() >= distribution.minimum
    assert drawn.max() <= distribution.maximum
    assert stats.kstest(drawn, reference.cdf).pvalue > P_LOW
    assert drawn.mean() == pytest.approx(reference.mean(), abs=Z_LOW * reference.std() / math.sqrt(drawn.size))


def test_moments_and_draws_of_a_truncated_lognormal() -> None:
    """The same with mean and sd of the variable itself before truncation."""
    mean, sd, low, high = 740.0, 157.0, 500.0, 1100.0
    sigma = math.sqrt(math.log1p((sd / mean) ** 2))
    whole = stats.lognorm(s=sigma, scale=mean * math.exp(-0.5 * sigma**2))
    assert (whole.mean(), whole.std()) == pytest.approx((mean, sd))
    share = whole.cdf(high) - whole.cdf(low)
    distribution = Distribution("lognormal", mean, sd, low, high)
    for power in (1.0, 2.0, -1.0):
        expected = quad(lambda x, power=power: x**power * whole.pdf(x), low, high)[0] / share
        assert distribution.expectation(power) == pytest.approx(expected, rel=1e-8)
    drawn = distribution.draw(np.random.default_rng(9), 20_000)
    assert stats.kstest(drawn, lambda x: (whole.cdf(x) - whole.cdf(low)) / share).pvalue > P_LOW


def test_persons_redrawn_not_clipped() -> None:
    """Nobody stands on an end of the interval, though 13 % and 7 % of the whole distribution lie beyond."""
    drawn = normal(1.0, 0.1, 0.887, 1.15).draw(np.random.default_rng(10), 5000)
    assert np.count_nonzero((drawn == 0.887) | (drawn == 1.15)) == 0
    assert np.unique(drawn).size == drawn.size


def deck_scenario(arrival: str) -> str:
    """A scenario whose people walk as `WALKERS`, with speed from pace and step length."""
    return f"""
[deck]
length = {LENGTH}
width = {WIDTH}
[[mode]]
name = "V1"
frequency = 2.0
damping = 0.02
modal_mass = 40000.0
vertical = {{ half_waves = 1 }}
[[stream]]
name = "commuters"
arrival = {arrival}
forward_share = 0.3
pace = {{ mean = 1.87, sd = 0.186, min = 1.3, max = 2.6 }}
step_length = {{ mean = 0.71, sd = 0.071, min = 0.4, max = 1.1 }}
[run]
duration = 100.0
seed = 17
"""


INVERSE_SPEED = float(
    stats.truncnorm(-0.57 / 0.186, 0.73 / 0.186, loc=1.87, scale=0.186).expect(lambda x: 1.0 / x)
    * stats.truncnorm(-0.31 / 0.071, 0.39 / 0.071, loc=0.71, scale=0.071).expect(lambda x: 1.0 / x)
)


@pytest.mark.parametrize(
    ("arrival", "rate"),
    [("{ per_hour = 540 }", 0.15), ("{ density = 0.08 }", 0.08 * WIDTH / INVERSE_SPEED)],
)
def test_number_on_the_deck_and_crossings(arrival: str, rate: float) -> None:
    """Little's law: rate x E[L/v] on the deck at one time, Poisson; crossings rate x duration, Poisson.

    1500 realisations, one time each (95 s after the warm-up's beginning, past the slowest crossing), false alarm
    1e-4 each; 5e-4 in all with the forward share. By density the mean is density x length x width.
    """
    case = plan(crowdsim.parse_scenario(deck_scenario(arrival))).cases[0]
    expected = rate * LENGTH * INVERSE_SPEED
    assert case.persons == pytest.approx(expected, rel=1e-8)
    if "density" in arrival:
        assert case.persons == pytest.approx(0.08 * LENGTH * WIDTH, rel=1e-12)
    on_deck, forward, everybody = [], 0, 0
    moment = case.end - 5.0
    for number in range(1500):
        ((persons, walks),) = draw(case, number)
        on_deck.append(np.count_nonzero((walks.enter <= moment) & (walks.leave > moment)))
        forward += np.count_nonzero(persons.direction > 0.0)
        everybody += persons.count
    within_poisson(np.array(on_deck, dtype=float), expected)
    assert forward / everybody == pytest.approx(0.3, abs=Z_LOW * math.sqrt(0.3 * 0.7 / everybody))
    crossings = np.array([r.crossings for r in rows(case, 1500, default_workers(), Halt())], dtype=float)
    within_poisson(crossings, rate * case.duration)


@pytest.mark.parametrize("share", [0.0, 0.37, 1.0])
def test_constant_number_stays_on_the_deck(share: float) -> None:
    """Exactly n at any time, round(share n) of them forward, places uniform at time 0 and later (false alarm 2e-4)."""
    text = deck_scenario("{ constant = 27 }").replace("forward_share = 0.3", f"forward_share = {share}")
    case = plan(crowdsim.parse_scenario(text)).cases[0]
    begin: list[float] = []
    later: list[float] = []
    moment = 97.3
    for number in range(60):
        ((persons, walks),) = draw(case, number)
        for time in (0.0, 11.7, moment, case.end - 1e-6):
            assert np.count_nonzero((walks.enter <= time) & (walks.leave > time)) == 27
        assert np.count_nonzero(persons.direction > 0.0) == round(share * 27)
        begin += persons.place.tolist()
        there = (walks.enter <= moment) & (walks.leave > moment)
        later += (walks.place + walks.velocity * (moment - walks.enter))[there].tolist()
    for places in (begin, later):
        assert min(places) >= -1e-9
        assert max(places) <= LENGTH + 1e-9
        assert stats.kstest(np.array(places) / LENGTH, "uniform").pvalue > P_LOW


def test_constant_number_keeps_the_person_and_the_phase() -> None:
    """Whoever re-enters does so at once at the other end, same way, force and pace, and the phase runs on."""
    case = plan(crowdsim.parse_scenario(deck_scenario("{ constant = 6 }"))).cases[0]
    ((persons, walks),) = draw(case, 0)
    who = np.searchsorted(np.sort(persons.pace), walks.pace)
    for person in range(persons.count):
        own = np.flatnonzero(who == person)
        order = own[np.argsort(walks.enter[own])]
        assert order.size > 1
        np.testing.assert_allclose(walks.enter[order][1:], walks.leave[order][:-1], rtol=1e-12)
        assert np.unique(walks.velocity[order]).size == 1
        assert np.unique(walks.cosine[order], axis=0).shape[0] == 1
        start = 0.0 if walks.velocity[order[0]] > 0.0 else LENGTH
        assert np.all(walks.place[order][1:] == start)
        run_on = walks.turns[order] - walks.pace[order] * walks.enter[order]
        np.testing.assert_allclose(run_on, run_on[0], atol=1e-9)  # turns, after some 200 of them


def walkers_with_load(load: str, number: int = 0, duration: float = 2000.0) -> tuple[People, Floats, Floats]:
    """Persons who arrive 540 an hour, and of each harmonic its factor and phase, read from the force of the walks."""
    text = deck_scenario("{ per_hour = 540 }").replace("forward_share", f"load = {load}\nforward_share")
    case = plan(crowdsim.parse_scenario(text.replace("duration = 100.0", f"duration = {duration}"))).cases[0]
    ((persons, walks),) = draw(case, number)
    factor = np.hypot(walks.sine, walks.cosine) / persons.weight[:, None]
    return persons, factor, np.arctan2(walks.sine, walks.cosine) % (2.0 * np.pi)


def test_phases_and_harmonic_phases_are_uniform_and_independent() -> None:
    """Kolmogorov-Smirnov on each phase, Rayleigh's test on differences: a person's next harmonic, the next person.

    For independent uniform phases count x |mean exp(i difference)|^2 is exponential with mean 1. Sets without phases
    of their own draw one for each harmonic. False alarm 1e-4 each.
    """
    found = [walkers_with_load('"young-2001-mean"', number) for number in range(20)]
    phase = np.concatenate([persons.phase for persons, _, _ in found])
    harmonic = np.concatenate([phases for _, _, phases in found])
    assert harmonic.shape == (phase.size, 4)
    assert phase.size > 5000
    columns = [phase, *harmonic.T]
    for column in columns:
        assert stats.kstest(column / (2.0 * np.pi), "uniform").pvalue > P_LOW
    differences = [a - b for i, a in enumerate(columns) for b in columns[:i]]
    differences += [column[1:] - column[:-1] for column in columns]
    for difference in differences:
        assert difference.size * abs(np.mean(np.exp(1j * difference))) ** 2 < -math.log(P_LOW)


def test_quantities_of_a_person_are_uncorrelated() -> None:
    """Rank correlation of every pair of quantities, and of a quantity from person to person: 1e-4 each."""
    p = people(end=40_000.0)
    quantities = {"pace": p.pace, "length": p.step_length, "weight": p.weight, "offset": p.offset, "phase": p.phase,
                  "gap": np.diff(p.enter, prepend=0.0)}  # fmt: skip
    names = list(quantities)
    for i, name in enumerate(names):
        for other in names[:i]:
            assert stats.spearmanr(quantities[name], quantities[other]).pvalue > P_LOW, (name, other)
        assert stats.spearmanr(quantities[name][1:], quantities[name][:-1]).pvalue > P_LOW, name


QUANTITY_FIELDS = {"arrival": "enter", "direction": "direction", "pace": "pace", "weight": "weight",
                   "offset": "offset", "phase": "phase"}  # fmt: skip
FIXED_SPEED = replace(WALKERS, step_length=None, speed=normal(1.4, 0.2, 0.8, 2.0))


@pytest.mark.parametrize(
    ("changed", "touched"),
    [
        (replace(FIXED_SPEED, pace=Distribution("uniform", minimum=1.5, maximum=2.5)), {"pace"}),
        (replace(FIXED_SPEED, speed=fixed(1.3)), {"speed"}),
        (replace(FIXED_SPEED, weight=Distribution("lognormal", 740.0, 157.0, 300.0, 1500.0)), {"weight"}),
        (replace(FIXED_SPEED, offset=normal(0.0, 0.5, -1.2, 1.2)), {"offset"}),
        (replace(FIXED_SPEED, phase=fixed(0.0)), {"phase"}),
        (replace(FIXED_SPEED, forward_share=0.8), {"direction", "place"}),
    ],
)
def test_changing_one_distribution_leaves_all_other_draws_alone(changed: Walkers, touched: set[str]) -> None:
    """Bit for bit, and the changed quantity does change."""
    before, after = people(FIXED_SPEED), people(changed)
    for name in ("enter", "place", "direction", "pace", "speed", "weight", "offset", "phase"):
        assert np.array_equal(getattr(before, name), getattr(after, name)) == (name not in touched), name


def test_step_length_is_a_draw_of_its_own() -> None:
    """With speed = pace x step length, another pace leaves the step lengths as they are (one rounding each way)."""
    slower = people(replace(WALKERS, pace=normal(1.6, 0.1, 1.3, 2.6)))
    np.testing.assert_allclose(slower.step_length, people().step_length, rtol=5e-16)


def test_the_load_draws_for_itself() -> None:
    """Scatter of the factors moves neither persons nor phases; phases written out leave all else as it is."""
    plain, factor, phase = walkers_with_load('{ set = "young-2001-mean", scatter = false }')
    spread, other_factor, other_phase = walkers_with_load('{ set = "young-2001-mean", scatter = true }')
    given, _, given_phase = walkers_with_load("{ harmonics = [0.4, 0.1], phases = [0.5, 1.5] }")
    for name in ("enter", "direction", "pace", "speed", "weight", "offset", "phase"):
        np.testing.assert_array_equal(getattr(plain, name), getattr(spread, name))
        np.testing.assert_array_equal(getattr(plain, name), getattr(given, name))
    np.testing.assert_allclose(other_phase, phase, rtol=0.0, atol=1e-12)  # by way of sine and cosine
    np.testing.assert_allclose(given_phase, np.broadcast_to([0.5, 1.5], given_phase.shape), rtol=1e-12)
    assert np.all(other_factor > 0.0)
    assert np.count_nonzero(np.isclose(other_factor, factor, rtol=1e-9)) == 0


@pytest.mark.parametrize("load", ['"young-2001-mean"', '"zivanovic-2007"', '{ set = "kerr-1998", scatter = true }'])
def test_the_load_of_a_longer_run_begins_with_that_of_the_shorter(load: str) -> None:
    """Factors and phases, bit for bit."""
    short, long = (walkers_with_load(load, duration=duration)[1:] for duration in (200.0, 900.0))
    for a, b in zip(short, long, strict=True):
        assert 20 < a.shape[0] < b.shape[0]
        np.testing.assert_array_equal(a, b[: a.shape[0]])


@pytest.mark.parametrize("speed", [WALKERS.speed, normal(1.4, 0.2, 0.8, 2.0)])
def test_a_longer_duration_only_adds_persons(speed: Distribution | None) -> None:
    """Those of the shorter time come first, bit for bit, in every quantity."""
    walkers = replace(WALKERS, speed=speed, step_length=None if speed else WALKERS.step_length)
    short, long = people(walkers, end=100.0), people(walkers, end=1000.0)
    assert 0 < short.count < long.count
    assert np.all(long.enter[short.count :] >= 100.0)
    for name in ("enter", "place", "direction", "pace", "speed", "weight", "offset", "phase"):
        np.testing.assert_array_equal(getattr(short, name), getattr(long, name)[: short.count])


def test_persons_taken_piece_by_piece_are_those_taken_at_once() -> None:
    """Bit for bit, whatever the pieces."""
    whole = people(end=1000.0)
    source = PeopleSource(WALKERS, LENGTH, 5, 0)
    pieces = [source.take(until) for until in (0.5, 30.0, 30.0, 444.4, 1000.0)]
    for name in ("enter", "place", "direction", "pace", "speed", "weight", "offset", "phase"):
        np.testing.assert_array_equal(np.concatenate([getattr(p, name) for p in pieces]), getattr(whole, name))


def test_more_persons_at_all_times_only_add_to_the_others() -> None:
    """A constant number: the first ones keep all their quantities (the direction goes with the share)."""
    few = people(replace(WALKERS, arrivals=ConstantNumber(10)))
    many = people(replace(WALKERS, arrivals=ConstantNumber(30)))
    for name in ("place", "pace", "speed", "weight", "offset", "phase"):
        np.testing.assert_array_equal(getattr(few, name), getattr(many, name)[:10])


def test_realisations_streams_seeds_and_quantities_differ() -> None:
    """No two generators give the same numbers: realisations 0 to 99, three names, two seeds, every quantity."""
    first = [
        generator(seed, number, name, quantity).random()
        for seed in (1, 2)
        for number in range(100)
        for name in ("a", "b", "commuters")
        for quantity in QUANTITIES
    ]
    assert len(set(first)) == len(first)
    assert stats.kstest(first, "uniform").pvalue > P_LOW


def test_another_stream_leaves_the_first_alone() -> None:
    """Persons, walks and response of a case with one stream are the same, whatever else the file holds."""
    text = deck_scenario("{ per_hour = 540 }")
    other = """
[[stream]]
name = "runners"
gait = "jogging"
arrival = { per_hour = 100 }
[[case]]
name = "both"
[[case]]
name = "alone"
streams = ["commuters"]
"""
    alone = plan(crowdsim.parse_scenario(text)).cases[0]
    both, part = plan(crowdsim.parse_scenario(text + other)).cases
    ((persons, walks),) = draw(alone, 3)
    for case in (both, part):
        found, found_walks = draw(case, 3)[0]
        count = min(found.count, persons.count)
        assert count > 10
        for name in ("enter", "direction", "pace", "speed", "weight", "phase"):
            np.testing.assert_array_equal(getattr(found, name)[:count], getattr(persons, name)[:count])
        np.testing.assert_array_equal(found_walks.cosine[:count], walks.cosine[:count])
    peaks = [[r.response.peak[0] for r in rows(case, 3, 1, Halt())] for case in (alone, part)]
    assert peaks[0] == peaks[1]
