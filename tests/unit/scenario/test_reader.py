"""The scenario reader: one message for every problem, with key, line, what was given, what is allowed.

The messages are what an engineer works with; a test that only saw the exception would let them rot.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from pathlib import Path

import pytest

from crowdsim.errors import EXIT_INPUT, InputError, Problem
from crowdsim.scenario.reader import parse_scenario, read_scenario

PACE = "pace = { mean = 1.87, sd = 0.186, min = 1.3, max = 2.6 }"
LOAD = "load = { harmonics = [0.4, 0.1, 0.1] }"
ARRIVAL = "{ per_hour = 900 }"
SHAPE = "{ half_waves = 1 }"


def problems(text: str) -> tuple[Problem, ...]:
    with pytest.raises(InputError) as caught:
        parse_scenario(text, "weir.toml")
    return caught.value.problems


# (old text, new text, key, line, part of what is wrong, part of what is allowed); lines counted in conftest.CLEAN
SINGLE = [
    ("length = 48.0", "", "deck.length", 4, "missing", "along the walking line [m]"),
    ("length = 48.0", 'length = "48 s"', "deck.length", 5, "'48 s' is of the wrong kind", "a number in m"),
    ("length = 48.0", "length = -1", "deck.length", 5, "-1 given", "above 0"),
    ("length = 48.0", "length = 5001", "deck.length", 5, "5001 given", "at most 5000"),
    ("length = 48.0", "length = true", "deck.length", 5, "True given", "a number in m"),
    ("length = 48.0", "length = [48]", "deck.length", 5, "[48] given", "a number in m"),
    ("length = 48.0", "length = nan", "deck.length", 5, "nan given", "a number in m"),
    ("title = \"Weir Lane footbridge\"", "title = 5", "scenario.title", 2, "5 given", "string"),
    ('name = "V1"', 'name = ""', "mode[0].name", 9, "'' given", "at least 1 character"),
    ("frequency = 1.92", 'frequency = "12 rad/s"', "mode[0].frequency", 10, "has an angle in it", "Hz or per minute"),
    ("frequency = 1.92", "frequency = 101", "mode[0].frequency", 10, "101 given", "at most 100"),
    ("damping = 0.005", "damping = 0.5", "mode[0].damping", 11, "0.5 of critical", "0.5 %"),
    ("damping = 0.005", "damping = 0", "mode[0].damping", 11, "0 given", "above 0"),
    ("38500.0", '"420 kN"', "mode[0].modal_mass", 12, "'420 kN' is a force", "kg or t"),
    ("38500.0", '"38.5 ton"', "mode[0].modal_mass", 12, "ton is ambiguous", "write t for 1000 kg"),
    ("vertical = " + SHAPE, "", "mode[0]", 8, "no ordinates", "vertical"),
    (SHAPE, "{ half_waves = 0 }", "mode[0].vertical.half_waves", 13, "0 given", "at least 1"),
    (SHAPE, "{ half_waves = 1.5 }", "mode[0].vertical.half_waves", 13, "1.5 given", "integer"),
    (SHAPE, "{ half_waves = 1, amplitude = 0 }", "mode[0].vertical", 13, "amplitude is 0", "other than 0"),
    (SHAPE, "{ half_waves = 1, s = [0, 48], value = [0, 1] }", "mode[0].vertical", 13, "beside", "one of the two"),
    (SHAPE, "{ }", "mode[0].vertical", 13, "neither half_waves nor a table", "half_waves = 1"),
    (SHAPE, "{ s = [0, 24], value = [0, 1] }", "mode[0].vertical.s", 13, "reaches from 0 to 24 m", "48 m"),
    (SHAPE, "{ s = [1, 48], value = [0, 1] }", "mode[0].vertical.s", 13, "reaches from 1 to 48 m", "48 m"),
    (SHAPE, "{ s = [0, 9, 48], value = [0, 1] }", "mode[0].vertical", 13, "s has 3 numbers, value 2", "as many"),
    (SHAPE, "{ s = [0, 48, 24], value = [0, 1, 0] }", "mode[0].vertical", 13, "does not grow", "above the one before"),
    (SHAPE, "{ s = [0, 48], value = [0, 0] }", "mode[0].vertical", 13, "every value is 0", "other than 0"),
    (SHAPE, "{ s = [0], value = [1] }", "mode[0].vertical", 13, "1 point", "at least 2"),
    (SHAPE, '{ half_waves = 1, interpolation = "cubic" }', "mode[0].vertical.interpolation", 13, "'cubic'", "monotone"),
    (ARRIVAL, "{ per_hour = 900, density = 0.5 }", "stream[0].arrival", 17, "per_hour and density", "exactly one"),
    (ARRIVAL, "{ }", "stream[0].arrival", 17, "nothing given", "exactly one"),
    (ARRIVAL, "{ constant = 0 }", "stream[0].arrival.constant", 17, "0 given", "at least 1"),
    (ARRIVAL, "{ constant = 2.5 }", "stream[0].arrival.constant", 17, "2.5 given", "integer"),
    (ARRIVAL, "{ times = [] }", "stream[0].arrival.times", 17, "[] given", "at least 1"),
    (ARRIVAL, "{ times = [1, -2] }", "stream[0].arrival.times[1]", 17, "-2 given", "at least 0"),
    (ARRIVAL, '{ times = [1, "2 kg"] }', "stream[0].arrival.times[1]", 17, "'2 kg' is of the wrong kind", "15 min"),
    (ARRIVAL, "{ density = 7 }", "stream[0].arrival.density", 17, "7 given", "at most 6"),
    ("sd = 0.186", "sd = -1", "stream[0].pace.sd", 18, "-1 given", "above 0"),
    ("sd = 0.186, ", "", "stream[0].pace", 18, "sd missing", "mean and sd"),
    ("mean = 1.87, ", "", "stream[0].pace", 18, "mean missing", "mean and sd"),
    ("min = 1.3, max = 2.6", "min = 2.6, max = 1.3", "stream[0].pace", 18, "min 2.6 is not below max 1.3", "redrawn"),
    ("min = 1.3, max = 2.6", "min = 4, max = 5", "stream[0].pace", 18, "[4, 5] holds 0 %", "redrawn"),
    (PACE, "pace = 9", "stream[0].pace", 18, "9 given", "at most 6"),
    (PACE, 'pace = "1.9 kg"', "stream[0].pace", 18, "'1.9 kg' is of the wrong kind", "a number in Hz"),
    (PACE, 'pace = { distribution = "uniform", mean = 2, min = 1, max = 3 }', "stream[0].pace", 18,
     "uniform", "min, max"),
    (PACE, 'pace = { mean_at = "V1", mean = 2, sd = 0.1 }', "stream[0].pace", 18, "mean and mean_at", "one of them"),
    (PACE, 'pace = { mean_at = "V1", harmonic = 4 }', "stream[0].pace.mean_at", 18, "0.48 Hz", "0.8 to 5 Hz"),
    (PACE, 'pace = { mean_at = "V1", sd = 0.1, min = 3, max = 4 }', "stream[0].pace.mean_at", 18,
     "1.92 Hz: [3, 4]", "min"),
    (LOAD, 'load = { set = "setra-2006", scatter = true }', "stream[0].load", 19,
     "setra-2006 gives no scatter", "another"),
    (LOAD, 'load = { set = "kerr-1998", contact_ratio = 0.5 }', "stream[0].load", 19,
     "belongs to half-sine", "another set"),
    (LOAD, "load = { harmonics = [0.4], phases = [0, 1] }", "stream[0].load", 19,
     "2 phases for 1 harmonics", "one phase"),
    (LOAD, "load = { harmonics = [0, 0] }", "stream[0].load", 19, "every harmonic is 0", "above 0"),
    (LOAD, "load = { harmonics = [] }", "stream[0].load.harmonics", 19, "[] given", "at least 1"),
    (LOAD, "load = { harmonics = [-1] }", "stream[0].load.harmonics[0]", 19, "-1 given", "at least 0"),
    (LOAD, "load = { harmonics = [1, 1, 1, 1, 1, 1, 1, 1, 1] }", "stream[0].load.harmonics", 19, "given", "at most 8"),
    (LOAD, 'load = { harmonics = [1], set = "kerr-1998" }', "stream[0].load", 19,
     "harmonics and set", "one of the two"),
    (LOAD, 'gait = "running"', "stream[0].gait", 19, "'running' given", "walking, jogging"),
    (LOAD, "step_length = 0.7\nspeed = 1.3", "stream[0].speed", 20, "step_length and speed given", "one of the two"),
    (LOAD, "offset = 2.0", "stream[0].offset", 19, "2 m", "-1.6 to 1.6 m"),
    (LOAD, "offset = { mean = 3.0, sd = 0.1 }", "stream[0].offset", 19, "of the probability", "-1.6 to 1.6"),
    (LOAD, 'weight = "1 ton"', "stream[0].weight", 19, "ton is ambiguous", "write t for 1000 kg"),
    (LOAD, "forward_share = 1.5", "stream[0].forward_share", 19, "1.5 given", "at most 1"),
    ("", '[[stream]]\nname = "commuters"\narrival = { constant = 3 }\n', "stream[1].name", 26,
     "there already", "differ"),
    ("", '[[case]]\nname = "a"\nstreams = ["commuters", "commuters"]\n', "case[0].streams", 27, "twice", "once"),
    ("", '[[case]]\nname = "a"\ntarget = "CL4"\n', "case[0].target", 27, "'CL4' is no class", "CL1, CL2, CL3"),
    ("", '[[case]]\nname = "a"\ntarget = "CL2"\nlimit = 0.5\n', "case[0].limit", 28,
     "target and limit", "one of the two"),
    ("", '[[case]]\nname = "a"\n[[case]]\nname = "a"\n', "case[1].name", 28, "'a' is there already", "differ"),
    ("", '[[point]]\nname = "p"\ns = 49\n', "point[0].s", 27, "49 m", "0 to 48 m"),
    ("", '[[point]]\nname = "p"\ns = 4\ne = 1.7\n', "point[0].e", 28, "1.7 m", "-1.6 to 1.6 m"),
    ("seed = 7", "time_step = 0.0066", "run.time_step", 24, "0.0066 s", "1/152 s"),
    ("seed = 7", "time_step = 0.2", "run.time_step", 24, "0.2 given", "at most 0.1"),
    ("seed = 7", "seed = -7", "run.seed", 24, "-7 given", "at least 0"),
    ("duration = 900.0", "duration = 0.5", "run.duration", 22, "0.5 given", "at least 1"),
    ("realisations = 200", "realisations = 0", "run.realisations", 23, "0 given", "at least 1"),
    ("", '[comfort]\nwindow = "4 kg"\n', "comfort.window", 26, "'4 kg' is of the wrong kind", "15 min"),
]  # fmt: skip


@pytest.mark.parametrize(("old", "new", "key", "line", "what", "allowed"), SINGLE)
def test_one_problem_is_named_by_key_line_fault_and_remedy(
    changed: Callable[..., str], old: str, new: str, key: str, line: int, what: str, allowed: str
) -> None:
    (problem,) = problems(changed((old, new)))
    assert problem.key == key
    assert problem.line == line
    assert what in problem.what
    assert allowed in problem.allowed
    assert "\n" not in problem.text()


# (old text, new text, key, the name that was meant)
MISSPELT = [
    ("length = 48.0", "length = 48.0\nwidht = 3.2", "deck.widht", "width"),
    ("sd = 0.186", "sd = 0.186, maxx = 3", "stream[0].pace.maxx", "max"),
    (ARRIVAL, "{ per_hours = 900 }", "stream[0].arrival.per_hours", "per_hour"),
    ("seed = 7", "sede = 7", "run.sede", "seed"),
    ("pace = {", 'pace = { distribution = "normall", ', "stream[0].pace.distribution", "normal"),
    (PACE, 'pace = { mean_at = "V2" }', "stream[0].pace.mean_at", "V1"),
    (LOAD, 'load = "iso-10137"', "stream[0].load", "iso-10137-2007"),
    (LOAD, 'population = "zivanovic"', "stream[0].population", "zivanovic-2007"),
    ("", '[[case]]\nname = "a"\nstreams = ["comuters"]\n', "case[0].streams[0]", "commuters"),
    ("[run]", "[runn]", "runn", "run"),
]


@pytest.mark.parametrize(("old", "new", "key", "meant"), MISSPELT)
def test_a_misspelt_name_gets_the_nearest_one_and_the_list(
    changed: Callable[..., str], old: str, new: str, key: str, meant: str
) -> None:
    (problem,) = problems(changed((old, new)))
    assert problem.key == key
    assert problem.line is not None
    assert f"did you mean {meant}?" in problem.allowed
    assert f"{meant}," in problem.allowed or problem.allowed.endswith(meant)


def test_a_name_far_from_all_gets_the_list_without_a_guess(changed: Callable[..., str]) -> None:
    (problem,) = problems(changed(("seed = 7", "colour = 7")))
    assert "did you mean" not in problem.allowed
    assert "duration, realisations, seed" in problem.allowed


def test_a_set_for_the_other_gait_is_recognised(changed: Callable[..., str]) -> None:
    (problem,) = problems(changed((LOAD, 'load = "bachmann-1995"')))
    assert "it is a set for jogging" in problem.what


def test_all_problems_come_at_once_with_the_file_and_their_number(changed: Callable[..., str]) -> None:
    text = changed(("length = 48.0", "length = -1"), ("damping = 0.005", "dumping = 0.005"), ("seed = 7", "seed = -7"))
    with pytest.raises(InputError) as caught:
        parse_scenario(text, "weir.toml")
    assert {p.key for p in caught.value.problems} == {"deck.length", "mode[0].damping", "mode[0].dumping", "run.seed"}
    first, *rest = str(caught.value).splitlines()
    assert first == "weir.toml: 4 problems"
    assert len(rest) == 4
    assert "  line 5: deck.length: -1 given (above 0)" in rest
    assert caught.value.exit_status == EXIT_INPUT


@pytest.mark.parametrize(
    ("old", "new", "line", "column"),
    [("seed = 7", "seed = ", 24, 8), ("title = \"", "title = ", 2, 9), ("seed = 7", "duration = 1", 24, 13)],
)  # fmt: skip
def test_a_syntax_error_has_line_and_column(
    changed: Callable[..., str], old: str, new: str, line: int, column: int
) -> None:
    (problem,) = problems(changed((old, new)))
    assert problem.what.startswith("not TOML: ")
    assert f"at line {line}, column {column}" in problem.what


def test_tables_nested_beyond_reason_are_a_problem_too() -> None:
    (problem,) = problems("a = " + "[" * 5000)
    assert "nested" in problem.what


def test_an_empty_file_lacks_the_three_tables_that_are_needed() -> None:
    assert {(p.key, p.what) for p in problems("")} == {("deck", "missing"), ("mode", "missing"), ("stream", "missing")}


def written(folder: Path, data: bytes) -> Path:
    path = folder / "weir.toml"
    path.write_bytes(data)
    return path


def test_a_file_gives_the_same_as_its_text(tmp_path: Path, clean: str) -> None:
    read = read_scenario(written(tmp_path, clean.encode()))
    assert read.file == parse_scenario(clean).file
    assert read.text == clean
    assert read.source == str(tmp_path / "weir.toml")
    assert read.title == "Weir Lane footbridge"


def test_byte_order_mark_and_windows_line_ends_change_nothing(tmp_path: Path, clean: str) -> None:
    path = written(tmp_path, b"\xef\xbb\xbf" + clean.replace("\n", "\r\n").encode())
    assert read_scenario(path).file == parse_scenario(clean).file
    path = written(tmp_path, b"\xef\xbb\xbf" + clean.replace("48.0", "-48.0").replace("\n", "\r\n").encode())
    with pytest.raises(InputError) as caught:
        read_scenario(path)
    assert caught.value.problems[0].line == 5


def test_what_is_not_utf8_is_said_with_the_line(tmp_path: Path, clean: str) -> None:
    path = written(tmp_path, clean.encode().replace(b"commuters", b"w\xe4hlende"))
    with pytest.raises(InputError) as caught:
        read_scenario(path)
    (problem,) = caught.value.problems
    assert "not UTF-8" in problem.what
    assert problem.line == 16
    assert caught.value.source == str(path)


def test_a_missing_file_and_a_folder_are_named(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="no such file") as caught:
        read_scenario(tmp_path / "none.toml")
    assert caught.value.source == str(tmp_path / "none.toml")
    with pytest.raises(InputError, match="is a folder"):
        read_scenario(tmp_path)
    with pytest.raises(InputError, match="cannot be read"):
        read_scenario(written(tmp_path, b"") / "below")


def test_a_file_of_absurd_size_is_not_read(tmp_path: Path) -> None:
    path = tmp_path / "huge.toml"
    with path.open("wb") as file:
        file.truncate(30_000_000)
    with pytest.raises(InputError, match="30 MB"):
        read_scenario(path)


def test_units_in_tables_and_plain_values_are_understood(changed: Callable[..., str]) -> None:
    text = changed(
        ("length = 48.0", 'length = "4800 cm"'),
        ("damping = 0.005", 'damping = "0.5 %"'),
        ("38500.0", '"38.5 t"'),
        (ARRIVAL, '{ per_hour = "15 per minute" }'),
        (PACE, 'pace = { mean = "120 per minute", sd = 0.1 }'),
        (LOAD, 'weight = { mean = "75 kg", sd = "10 kg" }\nphase = "90 deg"\noffset = "50 cm"\nforward_share = "50 %"'),
        ("duration = 900.0", 'duration = "15 min"'),
    )
    file = parse_scenario(text).file
    stream = file.stream[0]
    assert (file.deck.length, file.mode[0].damping, file.mode[0].modal_mass) == (48.0, 0.005, 38500.0)
    assert stream.arrival.per_hour == 900.0
    assert stream.pace is not None
    assert stream.pace.mean == 2.0
    assert stream.weight is not None
    assert (stream.weight.mean, stream.weight.sd) == pytest.approx((735.75, 98.1), rel=1e-15)
    assert stream.offset is not None
    assert (stream.offset.distribution, stream.offset.mean) == ("fixed", 0.5)
    assert stream.forward_share == 0.5
    assert file.run.duration == 900.0


@pytest.mark.parametrize("phases", ["[nan]", "[inf]", '["1.5"]', "[true]", '["2 kg"]'])
def test_phases_are_angles_and_nothing_else(changed: Callable[..., str], phases: str) -> None:
    (problem,) = problems(changed((LOAD, f"load = {{ harmonics = [0.4], phases = {phases} }}")))
    assert (problem.key, problem.line) == ("stream[0].load.phases[0]", 19)


def test_phases_take_units(changed: Callable[..., str]) -> None:
    load = parse_scenario(changed((LOAD, 'load = { harmonics = [0.4], phases = ["90 deg"] }'))).file.stream[0].load
    assert load is not None
    assert load.phases == [pytest.approx(0.5 * math.pi, rel=1e-15)]


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("realisations = 200", "realisations = true"),
        ("realisations = 200", 'realisations = "200"'),
        (SHAPE, '{ half_waves = "1" }'),
        (ARRIVAL, '{ constant = "40" }'),
    ],
)
def test_a_count_is_a_whole_number_and_no_text_or_switch(changed: Callable[..., str], old: str, new: str) -> None:
    (problem,) = problems(changed((old, new)))
    assert "given" in problem.what
    assert "integer" in problem.allowed


@pytest.mark.parametrize(
    ("changes", "key"),
    [
        ([(PACE, "pace = { mean = 0.001, sd = 0.1 }")], "stream[0].pace"),
        ([(LOAD, "weight = { mean = 5, sd = 1 }")], "stream[0].weight"),
        ([(LOAD, "offset = { mean = 2.0, sd = 0.1, min = -1, max = 3 }")], "stream[0].offset"),
        ([(LOAD, "offset = { mean = 1.55, sd = 0.5, min = 1.5999 }")], "stream[0].offset"),
    ],
)
def test_a_distribution_outside_what_people_do_is_a_problem_of_its_key(
    changed: Callable[..., str], changes: list[tuple[str, str]], key: str
) -> None:
    (problem,) = problems(changed(*changes))
    assert problem.key == key
    assert "of the probability" in problem.what


def test_a_weight_written_as_mass_is_noted_once(changed: Callable[..., str]) -> None:
    read = parse_scenario(changed((LOAD, 'weight = "75 kg"')))
    assert read.notes == ("weight '75 kg' taken as 735.8 N (times 9.81 m/s2)",)


def test_a_scenario_cannot_be_changed_after_reading(clean: str) -> None:
    read = parse_scenario(clean)
    with pytest.raises(Exception, match="frozen"):
        read.file.deck.length = 3.0  # type: ignore[misc]
