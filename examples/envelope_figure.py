"""Draws the envelope along the deck and the worst history of the market day.

Run: python examples/envelope_figure.py [figure.png] [realisations]
"""

import sys
from pathlib import Path

import matplotlib

matplotlib.use("Agg")
import matplotlib.pyplot as plt
import numpy as np

import crowdsim
from crowdsim.response.statistics import percentile
from crowdsim.results.texts import span

SCENARIO = Path(__file__).parent.parent / "scenarios" / "market-day.toml"


def main(figure: str = "market-day.png", realisations: int = 60) -> None:
    scenario = crowdsim.read_scenario(SCENARIO)
    case = crowdsim.simulate(scenario, realisations=realisations).case("market day")
    fig, (along, history) = plt.subplots(2, 1, figsize=(7.0, 7.0), layout="constrained")
    for e, style, label in zip(case.deck_e, ("--", "-", ":"), ("right edge", "centre line", "left edge"), strict=True):
        peaks = case.envelope["vertical"][:, list(case.deck_e).index(e), :]
        along.plot(case.deck_s, np.quantile(peaks, 0.95, axis=0), style, color="0.1", label=f"95 %, {label}")
    middle = case.envelope["vertical"][:, 1, :]
    along.plot(case.deck_s, np.median(middle, axis=0), color="tab:blue", lw=2.5, label="median, centre line")
    along.set(xlabel="place along the deck s, m", ylabel="peak acceleration, m/s2", ylim=(0, None))
    along.set_title(
        f"{scenario.title}\n{case.realisations} realisations of {span(case.attributes['duration'])}", fontsize=10
    )
    along.legend(frameon=False)

    number = max(case.histories, key=lambda k: case.peak[k].max())
    record = case.histories[number]
    at = int(np.argmax(case.peak[number]))
    when = case.peak_time[number, at]
    near = np.abs(record.time - when) < 30.0
    history.plot(record.time[near], record.acceleration[near, at], color="0.1", lw=0.6)
    history.set(xlabel="time, s", ylabel="acceleration, m/s2")
    history.set_title(f"realisation {number}, point {case.points.name[at]}, 30 s either side of the peak", fontsize=10)
    fig.savefig(figure, dpi=150)
    value = percentile(case.peak[:, at])
    sure = "no interval" if value.low is None else f"95 % confidence interval {value.low:.2f} to {value.high:.2f}"
    print(
        f"{figure}: 95 % value of the peak in the observed {span(case.attributes['duration'])} at "
        f"{case.points.name[at]}: {value.value:.2f} m/s2 ({sure})"
    )


if __name__ == "__main__":
    arguments = sys.argv[1:3]
    main(*arguments[:1], *(int(a) for a in arguments[1:]))
