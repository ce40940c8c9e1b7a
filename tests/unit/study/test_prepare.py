"""From a scenario to one case: persons on the deck, added mass, pace on a mode, warm-up, step, points.

Every expected number is worked out by hand here from the scenario, with fixed quantities where a
closed form is wanted and with quadrature over the truncated densities where they are random.
"""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest
from scipy import integrate, stats

from crowdsim.crowd.arrivals import ConstantNumber, GivenArrivals, PoissonArrivals
from crowdsim.scenario.reader import Scenario
from crowdsim.study.prepare import Case, prepare
from crowdsim.study.situation import cases

PACE = "pace = { mean = 1.87, sd = 0.186, min = 1.3, max = 2.6 }"
LOAD = "load = { harmonics = [0.4, 0.1, 0.1] }"
ARRIVAL = "{ per_hour = 900 }"
SHAPE = "vertical = { half_waves = 1 }"
STEADY = (PACE, "pace = 2.0\nstep_length = 0.75\nweight = 735.75")  # 1.5 m/s, 32 s on 48 m; 75 kg
MASS = ("", '[[case]]\nname = "with people"\npeople = "mass"\n')
SECOND = '[[mode]]\nname = "V2"\nfrequency = 4.0\ndamping = 0.01\nmodal_mass = 3e4\nvertical = { half_waves = 2 }\n'


@pytest.fixture
def case(scenario: Callable[..., Scenario]) -> Callable[..., Case]:
    """The first case of the clean scenario with changes."""

    def build(*changes: tuple[str, str]) -> Case:
        read = scenario(*changes)
        return prepare(read, cases(read)[0])

    return build


# ---------------------------------------------------------------- persons on the deck


def test_a_flow_puts_rate_times_crossing_time_on_the_deck(case: Callable[..., Case]) -> None:
    built = case(STEADY)
    assert built.persons == pytest.approx(900 / 3600 * 32, rel=1e-14)
    assert built.streams[0].walkers.arrivals == PoissonArrivals(0.25)


def test_a_density_sets_the_rate_that_keeps_it(case: Callable[..., Case]) -> None:
    built = case(STEADY, (ARRIVAL, "{ density = 0.5 }"))
    assert built.persons == pytest.approx(0.5 * 48 * 3.2, rel=1e-14)
    arrivals = built.streams[0].walkers.arrivals
    assert isinstance(arrivals, PoissonArrivals)
    assert arrivals.rate == pytest.approx(0.5 * 48 * 3.2 / 32, rel=1e-14)


def test_a_random_speed_enters_by_the_mean_of_its_inverse(case: Callable[..., Case]) -> None:
    built = case((LOAD, "step_length = { mean = 0.71, sd = 0.071, min = 0.4, max = 1.1 }"))

    def inverse(mean: float, sd: float, low: float, high: float) -> float:
        density = stats.truncnorm((low - mean) / sd, (high - mean) / sd, mean, sd).pdf
        return integrate.quad(lambda x: density(x) / x, low, high, epsabs=1e-13)[0]

    crossing = 48 * inverse(1.87, 0.186, 1.3, 2.6) * inverse(0.71, 0.071, 0.4, 1.1)
    # `quad` is good to 1e-13; the program's rule, in the probability, meets steep ends: 1e-9 is what it owes
    assert built.persons == pytest.approx(0.25 * crossing, rel=1e-9)


def test_a_constant_number_is_that_number(case: Callable[..., Case]) -> None:
    built = case((ARRIVAL, "{ constant = 40 }"))
    assert built.persons == 40.0
    assert built.streams[0].walkers.arrivals == ConstantNumber(40)


def test_given_times_are_sorted_and_averaged_over_the_event(case: Callable[..., Case]) -> None:
    """From the first arrival to the last departure: 3 x 32 s in 100 + 32 s."""
    built = case(STEADY, (ARRIVAL, "{ times = [100.0, 0.0, 50.0] }"))
    assert built.streams[0].walkers.arrivals == GivenArrivals((0.0, 50.0, 100.0))
    assert built.persons == pytest.approx(3 * 32 / 132, rel=1e-14)


@pytest.mark.parametrize("duration", [20.0, 120.0, 900.0, 3600.0])
@pytest.mark.parametrize(
    ("times", "persons"),
    [
        ([0.0], 1.0),  # alone from stepping on to stepping off
        ([200.0], 1.0),
        ([0.0] * 7, 7.0),  # abreast
        ([60.0, 68.0, 76.0], 3 * 32 / 48),
    ],
)
def test_the_number_in_an_event_does_not_hang_on_the_observed_time(
    case: Callable[..., Case], duration: float, times: list[float], persons: float
) -> None:
    """Nor on when it begins, nor does the mass of the people: half of 75 kg each."""
    built = case(STEADY, MASS, (ARRIVAL, f"{{ times = {times} }}"), ("duration = 900.0", f"duration = {duration}"))
    assert built.persons == pytest.approx(persons, rel=1e-14)
    assert built.added_mass["V1"] == pytest.approx(persons * 75 / 2, rel=1e-12)


# ---------------------------------------------------------------- people = "mass", pace on a mode


def test_without_people_the_modes_are_those_of_the_scenario(case: Callable[..., Case]) -> None:
    built = case(STEADY, (ARRIVAL, "{ constant = 40 }"))
    assert built.people == "none"
    assert built.added_mass == {"V1": 0.0}
    assert (built.model.modes[0].frequency, built.model.modes[0].modal_mass) == (1.92, 38500.0)


def test_people_add_half_their_mass_to_a_half_wave(case: Callable[..., Case]) -> None:
    built = case(STEADY, MASS, (ARRIVAL, "{ constant = 40 }"))
    # M + sum of m phi^2 = 38500 + 40 x 75 x (mean of sin^2 = 1/2) = 40000 kg
    assert built.added_mass["V1"] == pytest.approx(1500.0, rel=1e-12)  # Simpson is exact for sin^2 over half waves
    assert built.model.modes[0].modal_mass == pytest.approx(40000.0, rel=1e-12)
    assert built.model.modes[0].frequency == pytest.approx(1.92 * math.sqrt(38500 / 40000), rel=1e-12)
    assert built.model.modes[0].damping == 0.005
    assert built.bare.modes[0].frequency == 1.92


def test_the_offset_counts_where_a_mode_twists(case: Callable[..., Case]) -> None:
    built = case(
        STEADY, MASS, (ARRIVAL, "{ constant = 40 }"), (SHAPE, SHAPE + "\ntwist = { half_waves = 1, amplitude = 0.5 }"),
        (LOAD, LOAD + '\noffset = { distribution = "uniform", min = -0.4, max = 1.2 }'),
    )  # fmt: skip
    # phi = (1 + 0.5 e) sin: E (1 + 0.5 e)^2 = 1 + E e + E e^2 / 4, E e = 0.4, E e^2 = 0.16 + 1.6^2/12
    factor = 1 + 0.4 + 0.25 * (0.16 + 1.6**2 / 12)
    assert built.added_mass["V1"] == pytest.approx(40 * 75 * 0.5 * factor, rel=1e-12)


def test_a_lateral_ordinate_carries_the_people_too(case: Callable[..., Case]) -> None:
    built = case(STEADY, MASS, (ARRIVAL, "{ constant = 40 }"), (SHAPE, SHAPE + "\nlateral = { half_waves = 1 }"))
    assert built.added_mass["V1"] == pytest.approx(40 * 75 * (0.5 + 0.5), rel=1e-12)


@pytest.mark.parametrize(("harmonic", "frequency"), [(1, 1.92), (2, 3.6)])
def test_a_pace_follows_the_mode(case: Callable[..., Case], harmonic: int, frequency: float) -> None:
    pace = f'pace = {{ mean_at = "V1", harmonic = {harmonic}, sd = 0.1 }}'
    built = case((PACE, pace), ("1.92", str(frequency)))
    assert built.streams[0].walkers.pace.mean == frequency / harmonic


def test_a_pace_follows_the_mode_as_lowered_by_the_people(case: Callable[..., Case]) -> None:
    pace = 'pace = { mean_at = "V1" }\nstep_length = 0.75\nweight = 735.75'
    built = case((PACE, pace), MASS, (ARRIVAL, "{ constant = 40 }"))
    assert built.streams[0].walkers.pace.mean == pytest.approx(1.92 * math.sqrt(38500 / 40000), rel=1e-12)


def test_flow_mass_and_pace_are_solved_together(case: Callable[..., Case]) -> None:
    pace = 'pace = { mean_at = "V1" }\nstep_length = 0.75\nweight = 735.75'
    built = case((PACE, pace), MASS, (ARRIVAL, '{ per_hour = "2 per second" }'))
    # slower people are more, heavier and slower still: f = f0 sqrt(M / (M + 75/2 x 2 L / (0.75 f)))
    f = 1.92
    for _ in range(200):
        f = 1.92 * math.sqrt(38500 / (38500 + 37.5 * 2.0 * 48 / (0.75 * f)))
    assert built.model.modes[0].frequency == pytest.approx(f, rel=1e-11)  # the program iterates to 1e-12
    assert built.streams[0].walkers.pace.mean == pytest.approx(f, rel=1e-11)
    assert built.persons == pytest.approx(2.0 * 48 / (0.75 * f), rel=1e-11)


# ---------------------------------------------------------------- warm-up, step, recorder


def test_the_warm_up_is_the_slowest_crossing_and_three_time_constants(case: Callable[..., Case]) -> None:
    built = case(STEADY)
    needed = 32 + 3 / (0.005 * 2 * math.pi * 1.92)
    assert built.warm_up_needed == pytest.approx(needed, rel=1e-12)
    assert 0 <= built.warm_up - needed < built.choice.time_step  # brought up to a whole step
    assert built.warm_up == built.recorder.warm * built.choice.time_step


def test_the_slowest_is_one_in_a_thousand(case: Callable[..., Case]) -> None:
    built = case((LOAD, "speed = { mean = 1.4, sd = 0.15, min = 0.8, max = 2.2 }"))
    a, b = (0.8 - 1.4) / 0.15, (2.2 - 1.4) / 0.15
    slowest = 48 / stats.truncnorm(a, b, 1.4, 0.15).ppf(0.001)
    assert built.warm_up_needed == pytest.approx(slowest + 3 / (0.005 * 2 * math.pi * 1.92), rel=1e-9)


def test_the_slowest_product_of_pace_and_step_length(case: Callable[..., Case]) -> None:
    built = case((LOAD, "step_length = { mean = 0.71, sd = 0.071, min = 0.4, max = 1.1 }"))
    slowest = 48 / (built.warm_up_needed - 3 / (0.005 * 2 * math.pi * 1.92))
    pace = stats.truncnorm((1.3 - 1.87) / 0.186, (2.6 - 1.87) / 0.186, 1.87, 0.186)
    step = stats.truncnorm((0.4 - 0.71) / 0.071, (1.1 - 0.71) / 0.071, 0.71, 0.071)
    share = integrate.quad(lambda x: pace.pdf(x) * step.cdf(slowest / x), 1.3, 2.6, epsabs=1e-12)[0]
    # the program looks the quantile up among the products of its quadrature nodes: next to 1e-3, not on it
    assert 0.0009 < share < 0.0011


def test_the_slowest_mode_sets_the_time_constant(case: Callable[..., Case]) -> None:
    slow = SECOND.replace("damping = 0.01", "damping = 0.001")
    built = case(STEADY, ("", slow))
    assert built.warm_up_needed == pytest.approx(32 + 3 / (0.001 * 2 * math.pi * 4.0), rel=1e-12)


def test_a_constant_number_needs_no_crossing_and_given_times_no_warm_up(case: Callable[..., Case]) -> None:
    assert case((ARRIVAL, "{ constant = 40 }")).warm_up_needed == pytest.approx(3 / (0.005 * 2 * math.pi * 1.92))
    built = case((ARRIVAL, "{ times = [0.0, 5.0] }"))
    assert (built.warm_up, built.recorder.warm) == (0.0, 0)


def test_a_given_warm_up_is_used(case: Callable[..., Case]) -> None:
    assert case(("seed = 7", "warm_up = 33.0")).warm_up == pytest.approx(33.0, rel=1e-14)
    assert case((ARRIVAL, "{ times = [0.0, 5.0] }"), ("seed = 7", "warm_up = 33.0")).recorder.warm > 0


def test_the_recorder_counts_warm_up_observed_time_and_windows(case: Callable[..., Case]) -> None:
    built = case(("seed = 7", "warm_up = 33.0\ntime_step = 0.01"))
    record = built.recorder
    assert (record.warm, record.total, record.window, record.segment) == (3300, 3300 + 90000 + 1, 100, 24000)
    assert record.segments == 3  # whole windows of 240 s in 900 s
    assert built.end == pytest.approx(933.0, rel=1e-14)
    assert built.duration == pytest.approx(900.0, rel=1e-14)


def test_the_step_is_a_whole_part_of_a_second_and_fine_enough(case: Callable[..., Case]) -> None:
    built = case(("", SECOND))
    n = built.choice.per_second
    fastest = built.streams[0].walkers.pace.quantile(0.999)
    assert n % 20 == 0
    assert 2 * math.pi * 4.0 / n <= 0.3
    assert 2 * math.pi * 3 * fastest / n <= 0.4
    assert built.choice.time_step == 1 / n
    assert case(("seed = 7", "time_step = 0.004")).choice.per_second == 250


# ---------------------------------------------------------------- points and stations


def test_each_mode_has_a_point_at_its_largest_ordinate(case: Callable[..., Case]) -> None:
    built = case(("", SECOND), ("", '[[point]]\nname = "tower"\ns = 40\ne = -1.5\n'))
    assert [(p.name, p.direction) for p in built.points] == [(n, "vertical") for n in ("V1", "V2", "tower")]
    assert built.points[0].s == pytest.approx(24.0, abs=1e-9)
    assert built.points[1].s in (pytest.approx(12.0, abs=1e-9), pytest.approx(36.0, abs=1e-9))
    assert (built.points[2].s, built.points[2].e) == (40.0, -1.5)
    expected = [[math.sin(n * math.pi * p.s / 48) for n in (1, 2)] for p in built.points]
    np.testing.assert_allclose(built.recorder.points, expected, atol=1e-15)


def test_a_twist_moves_the_point_to_the_edge(case: Callable[..., Case]) -> None:
    built = case((SHAPE, SHAPE + "\ntwist = { half_waves = 1, amplitude = -0.25 }"))
    (point,) = built.points
    assert (point.s, point.e) == (pytest.approx(24.0, abs=1e-9), -1.6)
    assert built.recorder.points == pytest.approx(1 + 0.25 * 1.6)  # vertical + e x twist
    assert built.model.edges == (-1.6, 0.0, 1.6)


def test_a_mode_in_two_directions_has_two_points(case: Callable[..., Case]) -> None:
    built = case((SHAPE, SHAPE + "\nlateral = { half_waves = 2 }"))
    assert [(p.name, p.direction) for p in built.points] == [("V1 vertical", "vertical"), ("V1 lateral", "lateral")]


def test_stations_cover_the_deck_and_every_point(case: Callable[..., Case]) -> None:
    built = case(("", '[[point]]\nname = "lamp"\ns = 7.77\n'))
    assert built.deck_s.size == 97 + 1
    assert (built.deck_s[0], built.deck_s[-1]) == (0.0, 48.0)
    assert 7.77 in built.deck_s
    assert np.all(np.diff(built.deck_s) > 0)
    assert built.recorder.stations.shape == (98, 1)


# ---------------------------------------------------------------- offset


def test_people_walk_on_the_centre_line_unless_a_mode_twists(case: Callable[..., Case]) -> None:
    offset = case().streams[0].walkers.offset
    assert (offset.kind, offset.mean) == ("fixed", 0.0)
    twisting = (SHAPE, SHAPE + "\ntwist = { half_waves = 1, amplitude = 0.1 }")
    offset = case(twisting).streams[0].walkers.offset
    assert (offset.kind, offset.minimum, offset.maximum) == ("uniform", pytest.approx(-1.3), pytest.approx(1.3))
    offset = case(twisting, ("width = 3.2", "width = 0.5")).streams[0].walkers.offset
    assert (offset.kind, offset.mean) == ("fixed", 0.0)


def test_a_random_offset_stays_within_the_width(case: Callable[..., Case]) -> None:
    offset = case((LOAD, "offset = { mean = 1.0, sd = 0.5, min = -2.0, max = 5.0 }")).streams[0].walkers.offset
    assert (offset.minimum, offset.maximum) == (-1.6, 1.6)
    assert (offset.mean, offset.sd) == (1.0, 0.5)


# ---------------------------------------------------------------- cases, defaults


def test_without_a_case_all_streams_make_one(scenario: Callable[..., Scenario]) -> None:
    read = scenario(("", '[[stream]]\nname = "joggers"\ngait = "jogging"\narrival = { per_hour = 30 }\n'))
    (table,) = cases(read)
    built = prepare(read, table)
    assert built.name == "all streams"
    assert [s.walkers.name for s in built.streams] == ["commuters", "joggers"]


def test_a_case_has_the_streams_that_it_names(scenario: Callable[..., Scenario]) -> None:
    read = scenario(
        ("", '[[stream]]\nname = "joggers"\ngait = "jogging"\narrival = { per_hour = 30 }\n'),
        ("", '[[case]]\nname = "run"\nstreams = ["joggers"]\nlimit = 0.7\n[[case]]\nname = "both"\ntarget = "CL2"\n'),
    )
    run, both = (prepare(read, t) for t in cases(read))
    assert [s.walkers.name for s in run.streams] == ["joggers"]
    assert (run.limit, run.target) == (0.7, None)
    assert [s.walkers.name for s in both.streams] == ["commuters", "joggers"]
    assert (both.limit, both.target) == (None, "CL2")


def test_what_is_left_out_comes_from_a_named_source(case: Callable[..., Case]) -> None:
    (stream,) = case((PACE, ""), (LOAD, "")).streams
    said = "; ".join(stream.sources)
    assert "population zivanovic-2007 by default" in said
    assert "load: young-2001-mean by default" in said
    assert stream.walkers.pace.mean == 1.87
    (given,) = case((LOAD, LOAD + "\nweight = 700\nspeed = 1.4")).streams
    assert given.sources == ()


def test_a_seed_given_beside_the_scenario_wins(scenario: Callable[..., Scenario]) -> None:
    read = scenario()
    assert prepare(read, cases(read)[0]).seed == 7
    assert prepare(read, cases(read)[0], 11).seed == 11
