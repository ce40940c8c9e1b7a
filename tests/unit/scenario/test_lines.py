"""Where a key stands in the file: the line that an error message points to."""

from __future__ import annotations

from crowdsim.scenario.lines import key_lines, key_text, line_of

TEXT = """\
[deck]
length = 48.0

[[mode]]
name = "V1"
[mode.vertical]
half_waves = 1

[[mode]]
name = "V2"   # the second
[mode.vertical]
half_waves = 2

[run]
"seed" = 7
extra.deep = 1
"""


def test_tables_keys_and_arrays_of_tables() -> None:
    lines = key_lines(TEXT)
    assert lines["deck",] == 1
    assert lines["deck", "length"] == 2
    assert lines["mode", 0] == 4
    assert lines["mode", 0, "vertical", "half_waves"] == 7
    assert lines["mode", 1] == 9
    assert lines["mode", 1, "name"] == 10
    assert lines["mode", 1, "vertical", "half_waves"] == 12
    assert lines["run", "seed"] == 15
    assert lines["run", "extra", "deep"] == 16


def test_a_key_that_is_not_written_points_to_the_table_around_it() -> None:
    lines = key_lines(TEXT)
    assert line_of(lines, ("mode", 1, "damping")) == 9
    assert line_of(lines, ("mode", 0, "vertical", "s", 3)) == 6
    assert line_of(lines, ("stream", 0)) is None


def test_windows_line_ends_count_once() -> None:
    assert key_lines(TEXT.replace("\n", "\r\n")) == key_lines(TEXT)


def test_the_path_as_a_person_writes_it() -> None:
    assert key_text(("stream", 0, "pace", "sd")) == "stream[0].pace.sd"
    assert key_text(("stream", 0, "arrival", "times", 2)) == "stream[0].arrival.times[2]"
    assert key_text(()) == ""
