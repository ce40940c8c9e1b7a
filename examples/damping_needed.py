"""How does the 95 % peak of the weekday commuters fall with damping, and what would meet the target?

The same people cross a bridge of five different damping ratios: equal seeds make the comparison
sharp. Run: python examples/damping_needed.py [realisations]
"""

import sys
import tempfile
from pathlib import Path

import crowdsim
from crowdsim.results.texts import span

SCENARIO = Path(__file__).parent.parent / "scenarios" / "weekday-commuters.toml"
CASE = "weekday morning"


def main(realisations: int = 100) -> None:
    text = SCENARIO.read_text(encoding="utf-8")
    for damping in ("0.5 %", "0.65 %", "0.8 %", "1.2 %", "2 %"):
        scenario = crowdsim.parse_scenario(text.replace('damping = "0.5 %"', f'damping = "{damping}"'))
        with tempfile.TemporaryDirectory() as folder:
            run = Path(folder) / "run.h5"
            crowdsim.simulate(scenario, out=run, case=CASE, realisations=realisations)
            judged = crowdsim.summarise(run, scenario.title).cases[0].deck[0].judgement
        assert judged is not None
        if damping == "0.5 %":
            print(f"{CASE}: peak anywhere on the deck in {span(judged.window)}, limit {judged.limit:.2f} m/s2")
            print(f"({judged.limit_words})")
            print("damping of V1    95 % peak, m/s2    its 95 % interval    verdict")
        value = judged.value
        interval = "needs 72 realisations" if value.low is None else f"{value.low:.2f} to {value.high:.2f}"
        print(f"{damping:>13} {value.value:18.2f} {interval:>20}    {judged.verdict}")


if __name__ == "__main__":
    main(*(int(a) for a in sys.argv[1:2]))
