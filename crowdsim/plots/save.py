"""Saves a figure: moved into place whole, equal bits for equal inputs."""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any

from matplotlib.axes import Axes

from crowdsim.errors import ResultsError
from crowdsim.plots.style import home

ENDINGS = ("png", "svg", "pdf")
NARROWEST, WIDEST = 60.0, 400.0  # mm


def check_place(place: Path) -> None:
    """Raises ResultsError where no figure can be saved as `place`."""
    if place.suffix.lower().removeprefix(".") not in ENDINGS:
        raise ResultsError(f"{place}: a figure ends in .png, .svg or .pdf")
    if place.is_dir():
        raise ResultsError(f"{place}: is a folder; --out takes the name of a file")
    if not place.parent.is_dir():
        raise ResultsError(f"{place}: there is no folder {place.parent}; make it first")


def check_width(width: float, least: float = NARROWEST) -> None:
    """Raises ResultsError for a width [mm] at which the figure cannot be read."""
    if not least <= width <= WIDEST:
        raise ResultsError(f"width {width:g} mm: {least:g} to {WIDEST:g} mm are possible")


def save(ax: Axes, place: Path, title: str) -> None:
    """Saves the figure of `ax` as `place`, `title` in its metadata. Raises ResultsError; nothing half done stays."""
    ending = place.suffix.lower().removeprefix(".")
    # no date: equal inputs give equal bits
    named: dict[str, dict[str, Any]] = {
        "png": {"Title": title, "Software": "crowdsim"},
        "svg": {"Title": title, "Creator": "crowdsim", "Date": None},
        "pdf": {"Title": title, "Creator": "crowdsim", "Producer": None, "CreationDate": None},
    }
    temporary = place.with_name(f".{place.name}.{os.getpid()}.part")
    try:
        home(ax).savefig(temporary, format=ending, metadata=named[ending])
        os.replace(temporary, place)
    except OSError as error:
        where = place.parent.resolve()
        raise ResultsError(f"{place}: cannot be written in {where} ({error.strerror or 'not possible'})") from None
    finally:
        temporary.unlink(missing_ok=True)
