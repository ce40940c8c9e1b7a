"""Fitted laws of the window peaks, as text."""

from __future__ import annotations

from collections.abc import Sequence

from crowdsim.console.base import Console, interval_text
from crowdsim.results.fits import FittedCase
from crowdsim.results.texts import number, span

DOUBTFUL = 0.05  # p-value of the goodness of fit


def fits(console: Console, fitted: Sequence[FittedCase]) -> None:
    """Case by case: parameters, goodness of fit, percentiles; extrapolation is said."""
    console.heading("Law fitted to the peaks in a window, anywhere on the deck (the verdict does not use it)")
    for law in fitted:
        if law.trouble:
            console.line(f"{law.case}: no fit: {law.trouble}.", "  ")
            continue
        console.line(f"{law.case}, {law.direction}, {span(law.window)}: {law.text}", "  ")
        if law.upper_end is not None:
            console.line(f"The law has an upper end at {number(law.upper_end)} m/s2.", "  ")
        judged = "fits badly: do not use it" if (law.p_value or 0.0) < DOUBTFUL else "no sign against the fit"
        console.line(
            f"Anderson-Darling {number(law.statistic or 0.0)}, p-value {number(law.p_value or 0.0, 2)} by parametric "
            f"bootstrap, probability-plot correlation {number(law.correlation or 0.0, 4)}: {judged}.",
            "  ",
        )
        parts = [
            f"{100 * q.share:g} %: {number(q.value)} ({interval_text(q.low, q.high)})"
            + (" EXTRAPOLATED beyond the windows simulated" if q.extrapolated else "")
            for q in law.quantiles
        ]
        console.line(f"Percentiles, m/s2: {'; '.join(parts)}.", "  ")
