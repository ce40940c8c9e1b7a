"""Gumbel or GEV laws fitted to the window peaks of a run: an option beside the distribution-free numbers."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

from crowdsim.response.extreme_likelihood import Family
from crowdsim.response.extremes import fit, goodness
from crowdsim.results.judgement import LOADED
from crowdsim.results.reader import open_file

SHARES = (0.5, 0.95, 0.99, 0.999)


@dataclass(frozen=True)
class FittedQuantile:
    """A percentile of the law [m/s2]; `extrapolated`: beyond what the sample holds."""

    share: float
    value: float
    low: float | None
    high: float | None
    extrapolated: bool


@dataclass(frozen=True)
class FittedCase:
    """The law of one case and direction; `trouble` says why there is none.

    window : that the peaks belong to [s]; text : parameters with standard errors
    p_value : of the Anderson-Darling test, by parametric bootstrap
    """

    case: str
    direction: str
    window: float
    family: str
    text: str
    upper_end: float | None
    statistic: float | None
    p_value: float | None
    correlation: float | None
    quantiles: tuple[FittedQuantile, ...]
    trouble: str


def fit_file(path: str | Path, family: Family) -> tuple[FittedCase, ...]:
    """The law of the largest peak anywhere on the deck in a comfort window, case by case. Raises ResultsError."""
    with open_file(path) as file:
        groups = [file["cases"][k] for k in sorted(file["cases"], key=int)]
        return tuple(_fit(g, d, family) for g in groups for d in LOADED if d in g["deck"])


def _fit(group: Any, direction: str, family: Family) -> FittedCase:
    name = str(group.attrs["name"])
    deck = group["deck"][direction]
    peaks = deck["window_peak"][()]
    window = float(group.attrs["window"])
    if peaks.shape[1] == 0:  # no window fits: the whole record
        window = float(group.attrs["duration"])
        peaks = deck["peak_envelope"][()].max(axis=(1, 2))[:, None]
    try:
        law = fit(peaks, family)
        test = goodness(law, peaks)
    except ValueError as error:
        return FittedCase(name, direction, window, family, "", None, None, None, None, (), str(error))
    quantiles = []
    for share in SHARES:
        low, high = law.quantile_interval(share)
        known = low == low and high == high  # nan where the law has no standard errors
        quantiles.append(
            FittedQuantile(
                share,
                law.quantile(share),
                low if known else None,
                high if known else None,
                law.extrapolates(share),
            )
        )
    return FittedCase(
        case=name, direction=direction, window=window, family=family, text=law.text(),
        upper_end=law.upper_end if law.upper_end < float("inf") else None,
        statistic=test.statistic, p_value=test.p_value, correlation=test.correlation, quantiles=tuple(quantiles),
        trouble="",
    )  # fmt: skip
