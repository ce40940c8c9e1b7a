"""Plausibility of a whole scenario before anything runs: numbers, rule, remedy.

A finding that is an error stops the run; a warning is shown and stored with the results.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from crowdsim.bridge.modal import ModalModel, Mode
from crowdsim.bridge.ordinates import Table
from crowdsim.crowd.arrivals import GivenArrivals
from crowdsim.crowd.populations import GRAVITY
from crowdsim.dynamics.step import HARMONIC_ANGLE
from crowdsim.response.statistics import LEAST_FOR_INTERVAL
from crowdsim.scenario.reader import Scenario
from crowdsim.study.prepare import Case
from crowdsim.study.situation import DEFAULT_WINDOW, EDGE, SLOWEST_SHARE, resonates

WEIGHT_LIKELY = (300.0, 1500.0)  # N, mean of a stream, common practice
PACKED = 6.0  # persons/m2: nobody can stand closer
USELESS_ERROR = 0.1
MASS_PER_AREA = (15.0, 1500.0)  # kg/m2 of modal mass at a unit ordinate, common practice
DAMPING_LIKELY = 0.03
DAMPING_LEAST = 0.0005
END_SHARE = 0.02
EXCURSION = 0.02
OUTSIDE_SHARE = 0.01
CROWDED = 0.3  # persons/m2, from where people slow each other down, common practice
EFFECT_OF_PEOPLE = 0.2  # persons/m2, this program's choice


@dataclass(frozen=True)
class Finding:
    """One remark: error or warning, the key it is about, what, and what to do."""

    level: str
    key: str
    text: str

    def line(self) -> str:
        """For a person."""
        return f"{self.key}: {self.text}"


def findings(scenario: Scenario, cases: list[Case], realisations: int) -> list[Finding]:
    """Everything worth saying about the scenario before it runs, each once."""
    found: list[Finding] = []
    for mode in cases[0].bare.modes:
        found += _mode(cases[0].bare, mode)
    for case in cases:
        found += _case(scenario, case)
    if realisations < LEAST_FOR_INTERVAL:
        found.append(
            Finding(
                "warning",
                "run.realisations",
                f"{realisations} realisations: the 95 % value has a distribution-free interval from "
                f"{LEAST_FOR_INTERVAL} on; raise the number for an interval",
            )
        )
    return list(dict.fromkeys(found))


def _mode(model: ModalModel, mode: Mode) -> list[Finding]:
    found: list[Finding] = []
    key = f"mode {mode.name}"

    def warn(text: str) -> None:
        found.append(Finding("warning", key, text))

    if mode.damping > DAMPING_LIKELY:
        warn(
            f"damping {100 * mode.damping:.3g} % of critical; footbridges without dampers have 0.2 to 2 %, and "
            f'above {100 * DAMPING_LIKELY:g} % a percentage may stand for a fraction: 0.5 % is 0.005 or "0.5 %"'
        )
    if mode.damping < DAMPING_LEAST:
        warn(
            f"damping {100 * mode.damping:.3g} % of critical; footbridges have 0.2 to 2 %, and lower values make the "
            "warm-up very long: mend the number"
        )
    top = max((abs(model.largest(mode, d)[2]) for d in mode.directions), default=0.0)
    if top > 0.0:
        per_area = mode.modal_mass / top**2 / (model.length * model.width)
        low, high = MASS_PER_AREA
        if not low <= per_area <= high:
            hint = "t or kN taken for kg?" if per_area < low else "N or g taken for kg?"
            warn(
                f"modal mass {mode.modal_mass:.4g} kg over the largest ordinate squared is {per_area:.3g} kg per m2 of "
                f"deck; {low:g} to {high:g} is usual ({hint})"
            )
        if not 0.5 <= top <= 2.0:
            warn(
                f"largest ordinate {top:.3g}: the modal mass must belong to these ordinates as they stand; nothing is "
                "rescaled (for unit ordinates the largest is 1)"
            )
    for direction in ("vertical", "lateral", "longitudinal", "twist"):
        shape = getattr(mode, direction)
        if shape is None:
            continue
        ends = np.abs(shape(np.array([0.0, model.length])))
        largest = float(np.abs(shape(model.fine)).max())
        if largest > 0.0 and float(ends.max()) > END_SHARE * largest:
            warn(
                f"{direction} ordinate {float(ends.max()):.3g} at an end of the deck, not nought: a person's force "
                "begins there with a step; right for a free or sprung end, otherwise mend the table"
            )
        if isinstance(shape, Table) and shape.used == "spline" and shape.excursion() > EXCURSION:
            warn(
                f"the spline through the {direction} table leaves the range of its values by "
                f'{100 * shape.excursion():.3g} % of the largest; give more points, or interpolation = "monotone"'
            )
    sideways = [d for d in ("lateral", "longitudinal") if getattr(mode, d) is not None]
    if sideways:
        warn(
            f"moves the deck in the {' and '.join(sideways)} direction, and this version has vertical forces alone: "
            "what it gives in that direction is far too small (nought without a vertical or twist ordinate) and says "
            "nothing of the bridge"
        )
    return found


def _case(scenario: Scenario, case: Case) -> list[Finding]:
    found: list[Finding] = []
    run = scenario.file.run

    def warn(key: str, text: str) -> None:
        found.append(Finding("warning", key, text))

    angle = case.choice.mode_angle
    if not math.isfinite(case.choice.peak_error + case.choice.history_error):
        found.append(
            Finding(
                "error",
                "run.time_step",
                f"{case.choice.time_step:.4g} s: omega dt = {angle:.3g} at the highest mode makes {run.integration} "
                "unstable; leave time_step out, or make it smaller",
            )
        )
        return found
    if run.time_step is not None and case.choice.expected_error > USELESS_ERROR:
        found.append(
            Finding(
                "error",
                "run.time_step",
                f"{case.choice.time_step:.4g} s: expected error of a peak {100 * case.choice.expected_error:.3g} %; "
                "leave time_step out, or make it smaller",
            )
        )
        return found
    if run.time_step is None and case.choice.expected_error > 2e-3:
        warn(
            "run.matched",
            f"{run.integration} as in textbooks at 1/{case.choice.per_second} s: expected error of a peak "
            f"{100 * case.choice.expected_error:.3g} %; with matched = true (the default) about 0.02 %",
        )
    if run.time_step is not None and (angle > HARMONIC_ANGLE or case.choice.expected_error > 2e-3):
        warn(
            "run.time_step",
            f"{case.choice.time_step:.4g} s: omega dt = {angle:.2g} at the highest mode, expected error "
            f"{100 * case.choice.expected_error:.3g} %; leave time_step out for about 0.02 %",
        )
    if not any(m.driven for m in case.model.modes):
        found.append(
            Finding(
                "error",
                "mode",
                "no mode has a vertical or twist ordinate: no force would drive any. Forces are vertical in this "
                "version; lateral and longitudinal comfort cannot be judged with it. Give a mode that moves the "
                "deck vertically",
            )
        )
        return found
    if not resonates(case.driven, case.streams):
        warn(
            f"case {case.name}",
            "no harmonic of any stream reaches the frequency of any mode; the response is quasi-static. Check "
            f"frequencies ({', '.join(f'{m.frequency:.3g}' for m in case.driven)} Hz) and pace",
        )
    for stream in case.streams:
        key = f"stream {stream.walkers.name}"
        if stream.outside > OUTSIDE_SHARE:
            low, high = stream.load.pace_range
            warn(
                key,
                f"{100 * stream.outside:.3g} % of the persons have a pace outside {low:g} to {high:g} Hz, where "
                f"{stream.load.name} holds; their factors are held at the limit",
            )
        mean = stream.mean_mass * GRAVITY
        if not WEIGHT_LIKELY[0] <= mean <= WEIGHT_LIKELY[1]:
            hint = 'kg taken for N? write "75 kg"' if mean < WEIGHT_LIKELY[0] else "grams, or N twice times 9.81?"
            warn(
                key,
                f"mean weight {mean:.4g} N; {WEIGHT_LIKELY[0]:g} to {WEIGHT_LIKELY[1]:g} N is usual ({hint})",
            )
        arrivals = stream.walkers.arrivals
        if isinstance(arrivals, GivenArrivals):
            gone = sum(t + case.bare.length * stream.inverse_speed < case.warm_up for t in arrivals.times)
            if gone:
                warn(
                    key,
                    f"{gone} of {len(arrivals.times)} given arrivals step off before the observed time begins at "
                    f"{case.warm_up:.4g} s; their times count from time 0, so add the warm-up to them",
                )
            slowest = case.bare.length / stream.walkers.speed_quantile(SLOWEST_SHARE)
            last = arrivals.times[-1] + slowest
            if last > case.end + 1e-9:
                warn(
                    "run.duration",
                    f"ends at {case.end:.4g} s; the last of {key} may walk until {last:.4g} s; a duration of "
                    f"{math.ceil(last - case.warm_up)} s sees everybody off",
                )
    if case.bare.twists and case.bare.width <= 2.0 * EDGE:
        warn(
            "deck.width",
            f"{case.bare.width:g} m: no room for the usual walking lines {EDGE:g} m from the edges, so everybody walks "
            "on the centre line and drives no twist; give `offset`",
        )
    given = all(isinstance(s.walkers.arrivals, GivenArrivals) for s in case.streams)
    if not given and case.warm_up < case.warm_up_needed - 0.01:
        warn(
            "run.warm_up",
            f"{case.warm_up:.4g} s is shorter than the slowest crossing plus three time constants "
            f"({case.warm_up_needed:.4g} s): the deck is not yet in its usual state; leave warm_up out",
        )
    density = case.persons / (case.bare.length * case.bare.width)
    if density > PACKED:
        found.append(
            Finding(
                "error",
                f"case {case.name}",
                f"{case.persons:.4g} persons on {case.bare.length * case.bare.width:.4g} m2, {density:.3g} per m2; "
                f"more than {PACKED:g} cannot stand there: lower the arrival rate or the number",
            )
        )
    if density > CROWDED:
        warn(
            f"case {case.name}",
            f"{density:.2g} persons/m2 on average: above about {CROWDED:g} people slow each other down, which is left "
            "out here; give the pace and speed of the crowd you mean",
        )
    if density > EFFECT_OF_PEOPLE and case.people == "none":
        warn(
            f"case {case.name}",
            f'{density:.2g} persons/m2 and people = "none": their mass (and the damping that walking bodies add) is '
            'left out; people = "mass" adds the mass',
        )
    if case.recorder.segments == 0:
        warn(
            "comfort.window",
            f"{case.window:g} s is longer than the observed {case.duration:g} s: no whole window fits, so a target can "
            "be found not met but never met; make duration at least as long",
        )
    if case.event and case.window < case.duration - 1e-9:
        many = case.recorder.segments > 1
        what = f"into {case.recorder.segments} windows that are not alike" if many else "and judges only its beginning"
        warn(
            "comfort.window",
            f"{case.window:g} s cuts a record of given arrivals {what}: windows in which nobody walks count in every "
            "probability, and what is left over in none; leave window out to judge the whole event",
        )
    if scenario.file.comfort.window is None and case.window < DEFAULT_WINDOW - 1e-9 and not case.event:
        warn(
            "run.duration",
            f"{case.duration:g} s is shorter than the usual comfort window of {DEFAULT_WINDOW:g} s: classes and "
            f"verdicts speak of the whole record of {case.window:g} s; a longer window has higher peaks",
        )
    return found
