"""Odd but plausible input: refused with a reason, or taken as meant; never a traceback."""

from __future__ import annotations

import json
import math

import h5py
import numpy as np
import pytest

from crowdsim.errors import InputError, ResultsError
from crowdsim.results.reader import open_results
from crowdsim.scenario.reader import parse_scenario
from crowdsim.scenario.schema import json_schema
from crowdsim.scenario.units import UnitError, parse
from crowdsim.study.simulate import plan, simulate

PACE = "pace = { mean = 1.87, sd = 0.186, min = 1.3, max = 2.6 }"
LOAD = "load = { harmonics = [0.4, 0.1, 0.1] }"


def test_a_record_shorter_than_the_comfort_window_is_simulated(scenario):
    asked = (("duration = 900.0", "duration = 120.0"), ("", "[comfort]\nwindow = 240\n"))
    (case,) = simulate(scenario(*asked), realisations=2).cases
    assert case.window_peak.shape == (2, 0, 1)
    assert np.all(case.peak > 0)


@pytest.mark.parametrize("text", ["2 rps", "2 krpm", "2 mrad/s", "2 °/s", "2 revolutions_per_second"])
def test_every_angular_unit_is_refused_as_a_frequency(text):
    with pytest.raises(UnitError):
        parse("frequency", text)


@pytest.mark.parametrize(
    ("kind", "text"), [("fraction", "0.5 rad"), ("fraction", "1 deg"), ("angle", "50 %"), ("rotation", "5 percent")]
)
def test_an_angle_is_no_fraction(kind, text):
    with pytest.raises(UnitError):
        parse(kind, text)


@pytest.mark.parametrize(
    "change",
    [
        (PACE, "pace = { mean = 0.001, sd = 0.1 }"),
        (LOAD, "weight = { mean = 5, sd = 1 }"),
        (LOAD, "offset = { mean = 2.0, sd = 0.1, min = -1, max = 3 }"),
        (LOAD, "offset = { mean = 1.55, sd = 0.5, min = 1.5999 }"),
    ],
)
def test_a_distribution_outside_what_is_walked_is_an_input_error(changed, change):
    with pytest.raises(InputError):
        plan(parse_scenario(changed(change)))


def test_a_walker_faster_than_anybody_is_an_input_error(changed):
    text = changed((PACE, "pace = 6\nstep_length = 2.9"), ("length = 48.0", "length = 500.0"))
    with pytest.raises(InputError):
        simulate(parse_scenario(text), realisations=1)


def test_a_fast_tail_of_walkers_is_no_traceback(changed):
    text = changed(
        (PACE, "pace = { mean = 3, sd = 0.5 }\nstep_length = { mean = 2.0, sd = 0.7 }"),
        ("length = 48.0", "length = 500.0"),
    )
    simulate(parse_scenario(text), realisations=3)


@pytest.mark.parametrize("phases", ["[nan]", "[inf]", '["1.5"]', "[true]"])
def test_phases_are_numbers(changed, phases):
    with pytest.raises(InputError):
        parse_scenario(changed((LOAD, f"load = {{ harmonics = [0.4], phases = {phases} }}")))


def test_phases_take_units(changed):
    file = parse_scenario(changed((LOAD, 'load = { harmonics = [0.4], phases = ["90 deg"] }'))).file
    assert file.stream[0].load.phases[0] == pytest.approx(math.pi / 2)


@pytest.mark.parametrize("new", ['[[modes]]\nname = "x"\n', '[[option]]\nname = "x"\n'])
def test_an_unknown_array_of_tables_has_its_line(changed, new):
    with pytest.raises(InputError) as caught:
        parse_scenario(changed(("", new)))
    assert caught.value.problems[0].line == 25


def test_a_text_over_several_lines_is_no_table(changed):
    text = changed(
        (
            'title = "Weir Lane footbridge"\n\n[deck]\nlength = 48.0',
            'title = "W"\nnote = """\n[deck]\nlength = 3\n"""\n[deck]\nlength = -1',
        )
    )
    with pytest.raises(InputError) as caught:
        parse_scenario(text)
    assert caught.value.problems[0].line == 8


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("realisations = 200", "realisations = true"),
        ("realisations = 200", 'realisations = "200"'),
        ("seed = 7", 'matched = "no"'),
        ("{ half_waves = 1 }", '{ half_waves = "1" }'),
    ],
)
def test_counts_and_switches_are_strict(changed, old, new):
    with pytest.raises(InputError):
        parse_scenario(changed((old, new)))


def test_schema_has_no_null_at_all():
    assert "null" not in json.dumps(json_schema())


def test_a_foreign_file_with_our_mark_is_refused(tmp_path):
    with h5py.File(tmp_path / "x.h5", "w") as f:
        f.attrs["format"] = "crowdsim results"
    with pytest.raises(ResultsError):
        open_results(tmp_path / "x.h5")
    with h5py.File(tmp_path / "x.h5", "a") as f:
        f.attrs["format_version"] = 1
    with pytest.raises(ResultsError):
        open_results(tmp_path / "x.h5")
