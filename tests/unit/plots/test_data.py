"""What is drawn is what the file holds: lines and bands against numpy on the results."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from matplotlib.axes import Axes
from matplotlib.lines import Line2D

from crowdsim.errors import ResultsError
from crowdsim.plots.envelope import envelope
from crowdsim.plots.exceedance import exceedance
from crowdsim.plots.history import history, running_rms
from crowdsim.plots.modes import modes
from crowdsim.plots.people import crowd_of, people
from crowdsim.plots.style import home
from crowdsim.response.extremes import fit
from crowdsim.response.windows import window_exceedance, window_percentile
from crowdsim.results.reader import Results
from crowdsim.study.again import case_again
from crowdsim.study.jobs import draw

Draw = Callable[..., Axes]


def line(ax: Axes, name: str) -> Line2D:
    found = [one for one in ax.lines if one.get_gid() == name]
    assert len(found) == 1, name
    return found[0]


def xy(ax: Axes, name: str) -> tuple[np.ndarray[Any, Any], np.ndarray[Any, Any]]:
    one = line(ax, name)
    return np.asarray(one.get_xdata()), np.asarray(one.get_ydata())


def words(ax: Axes) -> str:
    return " ".join(t.get_text() for t in ax.texts).replace("\u00a0", " ").replace("\n", " ")


# history


@pytest.mark.parametrize("name", ["weekday-commuters", "one-walker", "lantern-evening"])
def test_history_shows_the_record_its_rms_and_its_peak(drawn: Draw, read: dict[str, Results], name: str) -> None:
    case = read[name].cases[0]
    number = int(np.argmax(case.peak.max(axis=1)))
    place = int(np.argmax(case.peak[number]))
    ax = drawn(name, "history")
    kept = case.histories[number]
    observed = kept.time >= float(case.attributes["warm_up"]) - 1e-9
    shown = xy(ax, "acceleration")[1]
    whole = kept.acceleration[observed, place]
    assert (shown.max(), shown.min()) == (whole.max(), whole.min())
    # the same rule on the same samples: only the order of the sums differs
    assert xy(ax, "running RMS")[1].max() == pytest.approx(case.running_rms_max[number, place], rel=1e-12)
    (at,), (peak,) = xy(ax, "peak")
    assert (at, abs(peak)) == (case.peak_time[number, place], case.peak[number, place])
    assert f"{case.peak_time[number, place]:,.2f} s" in words(ax)


def test_running_rms_of_a_sine_and_of_a_step() -> None:
    t = np.arange(1001) / 100.0
    # over whole periods the trapezoidal rule is exact for a sine
    np.testing.assert_allclose(running_rms(np.sin(2.0 * np.pi * 3.0 * t), 100), math.sqrt(0.5), rtol=1e-12)
    step = np.array([0.0, 0.0, 0.0, 2.0, 2.0, 2.0])
    np.testing.assert_allclose(running_rms(step, 2), np.sqrt([0.0, 1.0, 3.0, 4.0]))


@pytest.mark.parametrize("name", ["weekday-commuters", "lantern-evening", "one-walker"])
def test_the_number_on_the_deck_is_that_of_the_walks(drawn: Draw, read: dict[str, Results], name: str) -> None:
    results = read[name]
    case = results.cases[0]
    number = int(np.argmax(case.peak.max(axis=1)))
    deck = home(drawn(name, "history")).axes[1]
    times, count = xy(deck, "persons")
    assert line(deck, "persons").get_drawstyle() == "steps-post"
    walks = [passages for _, passages in draw(case_again(results, case.name), number)]
    for t in np.random.default_rng(1).uniform(times[0], times[-1], 300):
        there = sum(int(np.sum((w.enter <= t) & (t < w.leave))) for w in walks)
        assert count[np.searchsorted(times, t, side="right") - 1] == there


def test_history_of_another_point_and_realisation(read: dict[str, Results]) -> None:
    case = read["market-day"].cases[0]
    ax = history(case, realisation=0, point="bench at the left rail")
    place = case.points.name.index("bench at the left rail")
    assert abs(xy(ax, "peak")[1][0]) == case.peak[0, place]
    assert len(home(ax).axes) == 2  # without the persons
    with pytest.raises(ResultsError, match="realisation 2 is not kept; kept: 0"):
        history(case, realisation=2)
    with pytest.raises(ResultsError, match="no point is called 'bank'; points of case 'market day': V1, T1"):
        history(case, point="bank")


def test_class_bounds_lie_on_both_sides_and_inside(drawn: Draw) -> None:
    ax = drawn("market-day", "history")
    low, high = ax.get_ylim()
    levels = sorted(
        float(one.get_ydata()[0]) for one in ax.lines if one.get_gid() is None and len(one.get_ydata()) == 2
    )  # type: ignore[arg-type,index]
    expected = [b for b in (0.5, 1.0, 2.5) if b < high]
    assert levels == sorted([*expected, *(-b for b in expected)])
    assert low == -high


# envelope


def test_envelope_shows_the_order_statistics(drawn: Draw, read: dict[str, Results]) -> None:
    case = read["weekday-commuters"].cases[0]
    ordered = np.sort(case.envelope["vertical"][:, 0], axis=0)
    ax = drawn("weekday-commuters", "envelope")
    s, value = xy(ax, "95 % value")
    np.testing.assert_array_equal(s, case.deck_s)
    np.testing.assert_array_equal(value, ordered[math.ceil(0.95 * 80) - 1])
    np.testing.assert_array_equal(xy(ax, "largest")[1], ordered[-1])
    np.testing.assert_array_equal(xy(ax, "median")[1], np.median(ordered, axis=0))
    (band,) = [c for c in ax.collections if c.get_gid() == "interval"]
    vertices = band.get_paths()[0].vertices
    assert isinstance(vertices, np.ndarray)
    # of 80: ranks 72 and 80 (binomial, 95 % at 95 %)
    i = int(np.argmax(value))
    heights = np.unique(vertices[vertices[:, 0] == s[i], 1])
    np.testing.assert_array_equal(heights, [ordered[71, i], ordered[79, i]])
    assert "8 min" in home(ax).texts[0].get_text().replace("\u00a0", " ")


def test_a_deck_that_twists_has_three_panels_the_left_edge_first(drawn: Draw, read: dict[str, Results]) -> None:
    case = read["market-day"].cases[0]
    panels = home(drawn("market-day", "envelope")).axes
    titles = [p.get_title(loc="left") for p in panels]
    assert titles == ["left edge, e = +2 m", "centre line", "right edge, e = \u22122 m"]
    for panel, i in zip(panels, (2, 1, 0), strict=True):
        np.testing.assert_array_equal(xy(panel, "median")[1], np.median(case.envelope["vertical"][:, i], axis=0))
        assert not [c for c in panel.collections if c.get_gid() == "interval"]  # 4 realisations: none


def test_one_realisation_is_one_line(read: dict[str, Results]) -> None:
    case = read["weekday-commuters"].cases[0]
    one = replace(case, peak=case.peak[:1], envelope={"vertical": case.envelope["vertical"][:1]})
    ax = envelope(one)
    np.testing.assert_array_equal(xy(ax, "largest")[1], one.envelope["vertical"][0, 0])
    assert "the one realisation" in words(ax)


def test_the_vertical_direction_comes_first_whatever_the_order_in_the_file(read: dict[str, Results]) -> None:
    case = read["weekday-commuters"].cases[0]
    sideways = {"lateral": 2.0 * case.envelope["vertical"], "vertical": case.envelope["vertical"]}
    ax = envelope(replace(case, envelope=sideways))
    np.testing.assert_array_equal(xy(ax, "largest")[1], case.envelope["vertical"][:, 0].max(axis=0))
    still = {"lateral": sideways["lateral"], "vertical": 0.0 * case.envelope["vertical"]}
    assert home(envelope(replace(case, envelope=still))).texts[0].get_text().startswith("Lateral")


# exceedance


def test_exceedance_is_the_share_of_windows_above(drawn: Draw, read: dict[str, Results]) -> None:
    case = read["weekday-commuters"].cases[0]
    peaks = case.deck_window_peak["vertical"]
    assert peaks.shape == (80, 2)
    ax = drawn("weekday-commuters", "exceedance")
    x, y = xy(ax, "share")
    assert line(ax, "share").get_drawstyle() == "steps-post"
    for a in np.random.default_rng(2).uniform(0.0, peaks.max(), 200):
        assert y[np.searchsorted(x, a, side="right") - 1] == pytest.approx(np.mean(peaks > a), abs=1e-12)
    assert x[-1] == peaks.max()
    ordered = np.sort(peaks, axis=None)
    value = window_percentile(peaks)
    assert xy(ax, "value")[0][0] == ordered[math.ceil(0.95 * 160) - 1] == value.value
    np.testing.assert_array_equal(xy(ax, "value interval")[0], [value.low, value.high])
    assert line(ax, "level").get_ydata()[0] == pytest.approx(0.05)  # type: ignore[index]
    (band,) = [c for c in ax.collections if c.get_gid() == "interval"]
    vertices = np.asarray(band.get_paths()[0].vertices)
    a = vertices[len(vertices) // 4, 0]
    share = window_exceedance(peaks, float(a))
    here = vertices[vertices[:, 0] == a, 1]
    assert here.max() == pytest.approx(share.high)
    assert here.min() == pytest.approx(max(share.low, 0.1 * ax.get_ylim()[0]))
    limit = window_exceedance(peaks, 1.0)
    assert line(ax, "limit").get_xdata()[0] == 1.0  # type: ignore[index]
    assert f"exceeded in {100 * limit.value:.2g} %" in words(ax)


def test_many_windows_stay_a_small_line_with_its_tail_whole(read: dict[str, Results]) -> None:
    case = read["weekday-commuters"].cases[0]
    peaks = np.random.default_rng(5).gumbel(0.5, 0.1, (20_000, 2)).clip(0.01)
    many = replace(case, deck_window_peak={"vertical": peaks})
    x, y = xy(exceedance(many), "share")
    assert x.size < 3100
    np.testing.assert_array_equal(x[-1000:], np.sort(peaks, axis=None)[-1000:])
    for a in np.linspace(0.3, 1.0, 50):
        # between two steps drawn lie 40,000/1500 = 27 peaks, 0.07 %
        shown = y[np.searchsorted(x, a, side="right") - 1]
        assert -1e-12 < shown - np.mean(peaks > a) < 7e-4  # below 0 by rounding alone


def test_a_record_shorter_than_the_window_is_taken_whole_and_said(read: dict[str, Results]) -> None:
    case = read["weekday-commuters"].cases[0]
    short = replace(
        case, deck_window_peak={"vertical": np.zeros((80, 0))}, attributes={**case.attributes, "window": 900.0}
    )
    ax = exceedance(short)
    peaks = case.envelope["vertical"].max(axis=(1, 2))
    assert xy(ax, "value")[0][0] == np.sort(peaks)[75]
    assert "in 8 min (the whole record)" in home(ax).texts[0].get_text().replace("\u00a0", " ")


@pytest.mark.parametrize("family", ["gumbel", "gev"])
def test_the_law_is_dashed_where_it_extrapolates(read: dict[str, Results], family: Any) -> None:
    case = read["weekday-commuters"].cases[0]
    law = fit(case.deck_window_peak["vertical"], family)
    ax = exceedance(case, family=family)
    x, y = xy(ax, "law")
    np.testing.assert_allclose(y, law.exceedance(x), rtol=1e-12)
    assert not any(law.extrapolates_value(float(a)) for a in x[:-1])
    beyond, _ = xy(ax, "law extrapolated")
    assert all(law.extrapolates_value(float(a)) for a in beyond[1:])
    assert line(ax, "law extrapolated").is_dashed()
    assert not line(ax, "law").is_dashed()
    assert "extrapolated" in words(ax)
    assert " p = " in words(ax)


def test_a_law_that_cannot_be_fitted_says_why(read: dict[str, Results]) -> None:
    few = read["market-day"].cases[0]
    with pytest.raises(ResultsError, match="the Gumbel law cannot be fitted: 4 "):
        exceedance(few, family="gumbel")
    with pytest.raises(ResultsError, match="no law is called 'weibull'; known: gumbel, gev"):
        exceedance(few, family="weibull")  # type: ignore[arg-type]


def test_marks_stand_where_they_belong_and_beyond_the_axis_at_its_edge(read: dict[str, Results]) -> None:
    case = read["weekday-commuters"].cases[0]
    marks = (("a formula", 0.6), ("another formula", 0.65), ("off the scale", 99.0))
    ax = exceedance(case, marks=marks)
    (above,) = ax.child_axes
    texts = [t.get_text() for t in above.texts]
    assert sorted(texts) == ["a formula: 0.600", "another formula: 0.650", "off the scale: 99.0 \u25b8"]
    high = ax.get_xlim()[1]
    dots = sorted(float(one.get_xdata()[0]) for one in above.lines if one.get_marker() == "o")  # type: ignore[index]
    assert np.array(dots) / above.get_xlim()[1] * high == pytest.approx([0.6, 0.65, high])
    # the strip lies over the panel to a pixel
    assert above.get_window_extent().x0 == pytest.approx(ax.get_window_extent().x0, abs=1.0)
    assert above.get_window_extent().x1 == pytest.approx(ax.get_window_extent().x1, abs=1.0)


def test_names_too_long_for_a_narrow_figure_go_into_a_key_below(read: dict[str, Results]) -> None:
    case = read["weekday-commuters"].cases[0]
    marks = (("a hand formula with a very long name indeed", 0.6), ("another with a long name", 0.65))
    ax = exceedance(case, marks=marks, width=80.0)
    assert sorted(t.get_text() for t in ax.child_axes[0].texts) == ["A", "B"]
    (key,) = home(ax).legends
    assert [t.get_text() for t in key.get_texts()] == [
        "A  a hand formula with a very long name indeed: 0.600", "B  another with a long name: 0.650",
    ]  # fmt: skip


# modes and people


@pytest.mark.parametrize("name", ["market-day", "joggers-among-walkers"])
def test_modes_are_those_simulated(drawn: Draw, read: dict[str, Results], name: str) -> None:
    results = read[name]
    case = case_again(results, results.cases[-1].name)
    panels = home(drawn(name, "modes")).axes
    for panel, mode in zip(panels, case.model.modes, strict=False):
        assert f"{mode.name}: {mode.frequency:.2f} Hz" in panel.get_title(loc="left")
        assert f"damping {100 * mode.damping:.3g} %, mass {mode.modal_mass / 1000:.1f} t" in panel.get_title(loc="left")
        half = 0.5 * case.model.width
        sides = {"left edge, vertical": half, "vertical": 0.0, "right edge, vertical": -half}
        lines = [one.get_gid() for one in panel.lines if one.get_gid() in sides]
        assert len(lines) == (3 if mode.twist else 1)
        for gid in lines:
            s, y = xy(panel, gid)
            np.testing.assert_array_equal(y, mode.ordinate("vertical", s, sides[gid]))
        np.testing.assert_array_equal(xy(panel, "points")[0], [p.s for p in case.points])
        np.testing.assert_allclose(
            xy(panel, "points")[1], [float(mode.ordinate("vertical", p.s, p.e)) for p in case.points]
        )


def test_people_are_those_drawn_in_the_run(drawn: Draw, read: dict[str, Results]) -> None:
    results = read["weekday-commuters"]
    case = case_again(results, "weekday morning")
    crowd = crowd_of(case, results.cases[0].realisations)
    count = crowd.realisations
    assert count == 50 or crowd.persons >= 5000
    paces, time = [], 0.0
    for k in range(count):
        for people_of, walks in draw(case, k):
            paces.append(people_of.pace[people_of.enter >= case.warm_up])
            time += float(
                np.sum(np.clip(walks.leave, case.warm_up, case.end) - np.clip(walks.enter, case.warm_up, case.end))
            )
    assert np.sort(np.concatenate(paces)) == pytest.approx(np.sort(np.concatenate(list(crowd.paces.values()))))
    assert crowd.mean == pytest.approx(time / (count * (case.end - case.warm_up)), rel=1e-9)
    assert crowd.share.sum() == pytest.approx(1.0)

    main, deck = home(drawn("weekday-commuters", "people")).axes[:2]
    for name, drawn_paces in crowd.paces.items():
        (steps,) = [p for p in main.patches if p.get_gid() == name]
        values, edges, _ = steps.get_data()  # type: ignore[attr-defined]
        assert np.sum(values * np.diff(edges)) == pytest.approx(1.0)
        np.testing.assert_allclose(values, np.histogram(drawn_paces, edges, density=True)[0])
    found = sorted(float(one.get_xdata()[0]) for one in main.lines if one.get_gid() == "mode")  # type: ignore[index]
    first, second = case.model.modes
    assert found == pytest.approx([first.frequency, second.frequency / 2.0])
    bands = sorted(
        float(np.ptp(p.get_path().vertices[:, 0]) * p.get_width()) for p in main.patches if p.get_gid() == "band"
    )  # type: ignore[attr-defined,call-overload]
    assert bands == pytest.approx(sorted([2 * first.damping * first.frequency, second.damping * second.frequency]))
    assert float(line(deck, "mean").get_xdata()[0]) == pytest.approx(crowd.mean)  # type: ignore[index]


def test_a_constant_crowd_is_always_there(read: dict[str, Results]) -> None:
    crowd = crowd_of(case_again(read["lantern-evening"], "lantern evening"), 12)
    assert crowd.mean == 60.0
    assert crowd.paces["procession"].size == 12 * 60


# in a notebook


@pytest.mark.parametrize("what", ["history", "envelope", "exceedance", "modes", "people"])
def test_a_figure_goes_into_axes_of_the_user(read: dict[str, Results], what: str) -> None:
    from matplotlib.figure import Figure

    case = read["weekday-commuters"].cases[0]
    again = case_again(read["weekday-commuters"], case.name)
    own = Figure(layout="tight").subplots()
    made = {
        "history": lambda: history(case, ax=own),
        "envelope": lambda: envelope(case, ax=own),
        "exceedance": lambda: exceedance(case, ax=own),
        "modes": lambda: modes(again, mode="V2", ax=own),
        "people": lambda: people(again, case.realisations, ax=own),
    }[what]()
    assert made is own
    fig = home(own)
    assert fig.axes == [own]
    assert fig.get_layout_engine() is not None  # not taken away
    assert own.lines
    assert own.get_xlabel()
    fig.draw_without_rendering()
