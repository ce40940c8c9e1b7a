"""Which modes lie in reach: published ranges, the scenario's own people, and the masses on the deck."""

from __future__ import annotations

import math
from collections.abc import Sequence

import pytest

from crowdsim.scenario.reader import parse_scenario
from crowdsim.study.screening import FULL, Screened, screen
from crowdsim.study.situation import cases, situation

NOBODY = "pace = 0.6\nspeed = 1.5\nweight = 700\nload = { harmonics = [0.4] }\n"  # reaches 0.6 Hz alone


def mode(frequency: float, mass: float = 1e12, direction: str = "vertical", name: str = "M") -> str:
    """So heavy that no crowd moves its frequency, unless a mass is given."""
    return (
        f'[[mode]]\nname = "{name}"\nfrequency = {frequency!r}\ndamping = 0.005\nmodal_mass = {mass}\n'
        f"{direction} = {{ half_waves = 1 }}\n"
    )


def stream(walk: str = NOBODY, name: str = "town", arrival: str = "{ per_hour = 720 }") -> str:
    return f'[[stream]]\nname = "{name}"\narrival = {arrival}\n{walk}'


def rows(modes: str, streams: str = "", more: str = "") -> list[Screened]:
    text = "[deck]\nlength = 36.0\nwidth = 2.5\n" + modes + (streams or stream()) + more
    scenario = parse_scenario(text)
    return list(screen([situation(scenario, table) for table in cases(scenario)]))


def said(found: Sequence[Screened]) -> dict[tuple[str, int], tuple[str, str]]:
    """(gait, harmonic) that a range of EUR 23984 or Setra or a stream names: first words of both."""
    named = [r for r in found if r.gait]
    assert all(r.simulate for r in named)
    return {(r.gait, r.harmonic): (r.eur.split(",")[0], r.setra.split(",")[0]) for r in named}


# ---------------------------------------------------------------- published ranges, each side of every edge

W1, W2, J1 = ("walking", 1), ("walking", 2), ("jogging", 1)
CRITICAL, SECOND, JOG = "critical range", "extended range", "joggers"
VERTICAL = [
    (0.99, {}),
    (1.0, {W1: ("", "range 2")}),
    (1.249, {W1: ("", "range 2")}),
    (1.25, {W1: (CRITICAL, "range 2")}),
    (1.699, {W1: (CRITICAL, "range 2")}),
    (1.7, {W1: (CRITICAL, "range 1")}),
    (1.899, {W1: (CRITICAL, "range 1")}),
    (1.9, {W1: (CRITICAL, "range 1"), J1: (JOG, "")}),
    (2.0, {W1: (CRITICAL, "range 1"), J1: (JOG, "runners")}),
    (2.1, {W1: (CRITICAL, "range 1"), J1: (JOG, "runners")}),
    (2.101, {W1: (CRITICAL, "range 2"), J1: (JOG, "runners")}),
    (2.299, {W1: (CRITICAL, "range 2"), J1: (JOG, "runners")}),
    (2.3, {W1: (CRITICAL, "range 2"), W2: (SECOND, ""), J1: (JOG, "runners")}),
    (2.301, {W1: ("", "range 2"), W2: (SECOND, ""), J1: (JOG, "runners")}),
    (2.5, {W1: ("", "range 2"), W2: (SECOND, ""), J1: (JOG, "runners")}),
    (2.6, {W1: ("", "range 2"), W2: (SECOND, "range 3"), J1: (JOG, "runners")}),
    (2.601, {W2: (SECOND, "range 3"), J1: (JOG, "runners")}),
    (3.5, {W2: (SECOND, "range 3"), J1: (JOG, "runners")}),
    (3.501, {W2: (SECOND, "range 3")}),
    (4.6, {W2: (SECOND, "range 3")}),
    (4.601, {W2: ("", "range 3")}),
    (5.0, {W2: ("", "range 3")}),
    (5.001, {}),
]
LATERAL = [
    (0.299, {}),
    (0.3, {W1: ("", "range 2")}),
    (0.5, {W1: (CRITICAL, "range 1")}),
    (1.1, {W1: (CRITICAL, "range 1")}),
    (1.101, {W1: (CRITICAL, "range 2")}),
    (1.2, {W1: (CRITICAL, "range 2")}),
    (1.201, {W1: ("", "range 2")}),
    (1.3, {W1: ("", "range 2"), W2: ("", "range 3")}),
    (1.301, {W2: ("", "range 3")}),
    (2.5, {W2: ("", "range 3")}),
    (2.501, {}),
]


@pytest.mark.parametrize(("frequency", "expected"), VERTICAL)
def test_vertical_ranges(frequency: float, expected: dict[tuple[str, int], tuple[str, str]]) -> None:
    """EUR 23984 (2009) and Setra (2006), from memory; the worst range that an edge touches."""
    assert said(rows(mode(frequency))) == expected


@pytest.mark.parametrize(("frequency", "expected"), LATERAL)
def test_lateral_ranges(frequency: float, expected: dict[tuple[str, int], tuple[str, str]]) -> None:
    assert said(rows(mode(frequency, direction="lateral"))) == expected


def test_longitudinal_modes_have_the_vertical_ranges_of_walking() -> None:
    for frequency, expected in VERTICAL:
        walking = {key: value for key, value in expected.items() if key[0] == "walking"}
        assert said(rows(mode(frequency, direction="longitudinal"))) == walking


@pytest.mark.parametrize(
    ("frequency", "direction", "needed"),
    [
        (1.9, "vertical", True), (3.3, "vertical", True), (4.9, "vertical", True), (0.7, "vertical", True),
        (5.1, "vertical", False), (0.9, "lateral", True), (1.8, "lateral", True), (2.6, "lateral", False),
        (2.2, "longitudinal", True), (2.6, "longitudinal", False),
    ],
)  # fmt: skip
def test_what_en_1990_wants_verified(frequency: float, direction: str, needed: bool) -> None:
    """Below 5 Hz (vertical), 2.5 Hz (horizontal), whatever harmonic reaches it: said of the mode at least once."""
    found = rows(mode(frequency, direction=direction))
    assert any("verification needed" in r.en for r in found) == needed
    assert any(r.simulate for r in found) == (needed or bool(said(found)))


@pytest.mark.parametrize(
    ("frequency", "direction", "words"),
    [(0.7, "vertical", "below 5 Hz"), (0.2, "lateral", "below 2.5 Hz"), (0.9, "longitudinal", "below 2.5 Hz")],
)
def test_a_mode_that_en_1990_alone_asks_for_needs_a_look(frequency: float, direction: str, words: str) -> None:
    """Outside the ranges of EUR 23984 and Setra, reached by nobody: "no" would be against EN 1990."""
    (row,) = rows(mode(frequency, direction=direction))
    assert (row.gait, row.harmonic, row.eur, row.setra, row.streams) == ("", 0, "", "", ())
    assert row.simulate
    assert row.why.startswith(f"EN 1990: verification needed {words}")
    assert "lies outside the ranges of EUR 23984 and Setra, and no stream reaches it" in row.why
    assert row.why.endswith(f"{direction} forces are not simulated in this version") == (direction != "vertical")


@pytest.mark.parametrize(("frequency", "direction"), [(5.001, "vertical"), (2.501, "lateral"), (5.001, "longitudinal")])
def test_a_mode_in_nobodys_reach_needs_none(frequency: float, direction: str) -> None:
    """5 Hz is Setra's longitudinal end, too, for the second harmonic."""
    (row,) = rows(mode(frequency, direction=direction))
    assert not row.simulate
    assert "EN 1990" not in row.why
    assert (row.eur, row.setra, row.en, row.streams) == ("", "", "", ())


def test_a_mode_in_no_range() -> None:
    (row,) = rows(mode(7.0))
    assert (row.mode, row.direction, row.gait, row.harmonic) == ("M", "vertical", "", 0)
    assert (row.eur, row.setra, row.en, row.streams, row.simulate) == ("", "", "", (), False)
    assert "7.000 Hz lies outside the ranges of EUR 23984 and Setra" in row.why
    (slow,) = rows(mode(0.7))
    assert slow.simulate
    assert "below 5 Hz" in slow.en


def test_a_range_is_given_with_its_numbers() -> None:
    (row, _) = rows(mode(1.9))
    assert row.eur == "critical range, 1.25 to 2.3 Hz"
    assert row.setra == "range 1, maximum risk, 1.7 to 2.1 Hz"
    assert row.why == "EUR 23984: critical range, 1.25 to 2.3 Hz; Setra: range 1, maximum risk, 1.7 to 2.1 Hz"


def test_sideways_forces_are_said_to_be_missing() -> None:
    (row,) = rows(mode(0.9, direction="lateral"))
    assert row.why.endswith("lateral forces are not simulated in this version")
    assert row.streams == ()


# ---------------------------------------------------------------- the scenario's own people

TOWN = """
pace = { distribution = "uniform", min = 1.6, max = 2.4 }
speed = 1.5
weight = 700
load = { harmonics = [0.4, 0.1] }
"""


@pytest.mark.parametrize(
    ("frequency", "harmonics"),
    [
        # 0.1 % of the paces are below 1.6008 and above 2.3992 Hz; 2 % of damping more on either side
        (1.55, []), (1.58, [1]), (2.0, [1]), (2.44, [1]), (2.46, []), (3.1, []), (3.2, [2]), (4.0, [2]), (4.88, [2]),
        (4.92, []), (6.0, []),
    ],
)  # fmt: skip
def test_streams_that_reach_a_mode(frequency: float, harmonics: list[int]) -> None:
    found = rows(mode(frequency), stream(TOWN))
    assert [r.harmonic for r in found if r.gait == "walking" and "town" in r.streams] == harmonics
    for row in found:
        assert ("within the pace of 'town'" in row.why) == ("town" in row.streams)


def test_streams_alone_make_a_row() -> None:
    """A slow procession below every published range."""
    slow = "pace = 0.8\nspeed = 0.6\nweight = 700\nload = { harmonics = [0.4] }\n"
    (row,) = rows(mode(0.8), stream(slow, "procession"))
    assert (row.gait, row.harmonic, row.eur, row.setra, row.streams) == ("walking", 1, "", "", ("procession",))
    assert row.simulate
    assert row.why == "within the pace of 'procession'"


def test_a_harmonic_without_force_reaches_nothing() -> None:
    only_second = TOWN.replace("[0.4, 0.1]", "[0.0, 0.1]")
    assert not [r for r in rows(mode(2.0), stream(only_second)) if r.streams]
    assert [r.harmonic for r in rows(mode(4.0), stream(only_second)) if r.streams] == [2]


def test_joggers_and_walkers_stand_in_rows_of_their_own() -> None:
    paces = "pace = { mean = 2.6, sd = 0.15, min = 2.0, max = 3.2 }"
    run = f'gait = "jogging"\n{paces}\nspeed = 2.7\nload = {{ harmonics = [1.3] }}\n'
    found = rows(mode(2.4), stream(TOWN) + stream(run, "run", "{ per_hour = 30 }"))
    # 2.4 Hz is in the extended range of EUR 23984, but at twice no pace of the town
    assert {(r.gait, r.harmonic): r.streams for r in found} == {W1: ("town",), W2: (), J1: ("run",)}


RUN = """
gait = "jogging"
pace = { mean = 2.8, sd = 0.1, min = 2.4, max = 3.2 }
speed = 2.7
load = { harmonics = [1.3, 0.4, 0.1] }
"""


@pytest.mark.parametrize(
    ("frequency", "named"),
    [
        (2.8, {W2: (), J1: ("run",)}),  # the second harmonic of slow walkers, by EUR 23984 and Setra
        (5.6, {("jogging", 2): ("run",)}),  # above every range: twice 2.8 Hz
        (8.4, {("jogging", 3): ("run",)}),
        (11.2, {}),  # four times: the load has three harmonics
    ],
)
def test_every_harmonic_of_a_load_is_looked_at(frequency: float, named: dict[tuple[str, int], tuple[str, ...]]) -> None:
    found = rows(mode(frequency), stream(RUN, "run"))
    assert {(r.gait, r.harmonic): r.streams for r in found if r.gait} == named
    assert any(r.simulate for r in found) == bool(named)
    for row in found:
        assert ("within the pace of 'run'" in row.why) == bool(row.streams)


def test_a_third_harmonic_of_walking_has_a_row() -> None:
    """3 x 1.6 to 2.4 Hz: 5.7 Hz is beyond every range; joggers who reach nothing are not named."""
    third = TOWN.replace("[0.4, 0.1]", "[0.4, 0.1, 0.1]")
    (row,) = rows(mode(5.7), stream(third) + stream(RUN.replace("2.8, sd", "2.6, sd").replace("3.2", "2.7"), "run"))
    assert (row.gait, row.harmonic, row.streams, row.simulate) == ("walking", 3, ("town",), True)
    assert row.why == "within the pace of 'town'"


def test_rows_come_in_the_order_of_the_harmonics_walkers_first() -> None:
    """Both gaits at 4.8 Hz: walkers' second (1.6 to 2.4 Hz) and third, joggers' second (2.4 Hz and up)."""
    third = TOWN.replace("[0.4, 0.1]", "[0.4, 0.1, 0.1]")
    found = rows(mode(4.8), stream(RUN.replace("2.8, sd", "2.5, sd"), "run") + stream(third))
    assert [(r.gait, r.harmonic) for r in found] == [W2, ("walking", 3), ("jogging", 2)]


def test_streams_of_all_cases_count_once() -> None:
    two = '[[case]]\nname = "a"\n[[case]]\nname = "b"\n'
    (row, _) = rows(mode(2.0), stream(TOWN), two)
    assert row.streams == ("town",)


# ---------------------------------------------------------------- masses on the deck


def test_frequencies_empty_with_people_and_full() -> None:
    """4.8 persons of 700/9.81 kg: 171.25 kg on half a wave; 70 kg/m2 on 90 m2: 3150 kg. By hand, M = 30 000 kg."""
    found = rows(mode(2.0, 30_000.0), stream(TOWN))
    assert FULL == 70.0
    for row in found:
        assert row.empty == 2.0
        assert row.people == pytest.approx(2.0 * math.sqrt(30_000 / (30_000 + 4.8 * 700 / 9.81 / 2)), rel=1e-9)
        assert row.full == pytest.approx(2.0 * math.sqrt(30_000 / 33_150), rel=1e-9)


def test_the_busiest_case_loads_the_deck() -> None:
    """Whatever `people` says, and whichever case comes first: 20 persons against 4.8."""
    streams = stream(TOWN) + stream(TOWN, "fair", "{ constant = 20 }")
    named = '[[case]]\nname = "day"\nstreams = ["town"]\n[[case]]\nname = "fair"\nstreams = ["fair"]\n'
    (row, *_) = rows(mode(2.0, 30_000.0), streams, named)
    assert row.people == pytest.approx(2.0 * math.sqrt(30_000 / (30_000 + 20 * 700 / 9.81 / 2)), rel=1e-9)


def test_a_twisting_mode_carries_people_across_its_width() -> None:
    """Full deck: e uniform over +-1.25 m, E[e^2] = 2.5^2/12; twist 0.8 sin: 6300 x 0.64 x 0.520833 x 1/2 kg."""
    twist = mode(2.0, 3000.0).replace("vertical = { half_waves = 1 }", "twist = { half_waves = 1, amplitude = 0.8 }")
    (row, *_) = rows(twist, stream(TOWN))
    added = 6300.0 * 0.64 * 2.5**2 / 12.0 / 2.0
    assert row.full == pytest.approx(2.0 * math.sqrt(3000.0 / (3000.0 + added)), rel=1e-9)
    # walking lines uniform over +-0.95 m
    people = 4.8 * 700.0 / 9.81 * 0.64 * 0.95**2 / 3.0 / 2.0
    assert row.people == pytest.approx(2.0 * math.sqrt(3000.0 / (3000.0 + people)), rel=1e-9)


def test_a_range_that_the_full_deck_falls_into_counts() -> None:
    """Empty 2.2 Hz is Setra's range 2; full, 2.2 sqrt(30/33.15) = 2.093 Hz, it is in range 1: the worst counts."""
    (walking, _) = rows(mode(2.2, 30_000.0))
    assert walking.setra.startswith("range 1")
    (heavy, _) = rows(mode(2.2))
    assert heavy.setra.startswith("range 2")


def test_every_mode_and_direction_has_a_row() -> None:
    both = mode(2.0, name="V1") + "lateral = { half_waves = 1 }\n" + mode(9.0, name="V9")
    found = rows(both)
    assert [(r.mode, r.direction) for r in found] == [
        ("V1", "vertical"), ("V1", "vertical"), ("V1", "lateral"), ("V9", "vertical"),
    ]  # fmt: skip
