"""How does the 95 % peak of the weekday commuters fall with damping?

The same people cross a bridge of five different damping ratios: equal seeds make the comparison
sharp. Run: python examples/damping_needed.py [realisations]
"""

import sys
from pathlib import Path

import crowdsim
from crowdsim.response.statistics import percentile

SCENARIO = Path(__file__).parent.parent / "scenarios" / "weekday-commuters.toml"
LIMIT = 1.0  # m/s2, upper end of the medium class of EUR 23984 (from memory)


def main(realisations: int = 100) -> None:
    text = SCENARIO.read_text(encoding="utf-8")
    print("damping of V1    95 % peak    its 95 % interval    m/s2, vertical, 15 min, at mid-span")
    for damping in ("0.5 %", "0.8 %", "1.2 %", "2 %", "3 %"):
        scenario = crowdsim.parse_scenario(text.replace('damping = "0.5 %"', f'damping = "{damping}"'))
        results = crowdsim.simulate(scenario, case="weekday morning", realisations=realisations)
        case = results.cases[0]
        at = case.points.name.index("V1")
        peak = percentile(case.peak[:, at])
        if peak.low is None or peak.high is None:
            interval, verdict = "needs 72 realisations", "undecided"
        else:
            interval = f"{peak.low:.2f} to {peak.high:.2f}"
            verdict = "met" if peak.high <= LIMIT else "not met" if peak.low > LIMIT else "undecided"
        print(f"{damping:>13} {peak.value:12.2f} {interval:>20}    {verdict}")


if __name__ == "__main__":
    main(*(int(a) for a in sys.argv[1:2]))
