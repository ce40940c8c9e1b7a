"""The table of cases for a client: every case of a scenario, judged, as Markdown and CSV.

Run: python examples/client_table.py [scenario.toml] [table.csv] [realisations]
"""

import csv
import sys
import tempfile
from pathlib import Path

import crowdsim
from crowdsim.results.texts import percent, span

SCENARIO = Path(__file__).parent.parent / "scenarios" / "weekday-commuters.toml"
COLUMNS = ("case", "persons on the deck", "window", "95 % peak, m/s2", "its 95 % interval", "class",
           "chance of each class", "limit, m/s2", "verdict")  # fmt: skip


def row(case: crowdsim.CaseSummary) -> list[str]:
    """One case as a client reads it."""
    judged = next(deck.judgement for deck in case.deck if deck.judgement is not None)
    value = judged.value
    interval = "none" if value.low is None or value.high is None else f"{value.low:.2f} to {value.high:.2f}"
    chances = ", ".join(f"{name} {percent(share.value)}" for name, share in judged.chances)
    limit = "-" if judged.limit is None else f"{judged.limit:.2f}"
    return [case.name, f"{case.persons_on_deck:.1f}", span(judged.window), f"{value.value:.2f}", interval,
            judged.class_name or "-", chances or "-", limit, judged.verdict or "-"]  # fmt: skip


def main(scenario: str = str(SCENARIO), table: str = "cases.csv", realisations: int = 200) -> None:
    read = crowdsim.read_scenario(scenario)
    with tempfile.TemporaryDirectory() as folder:
        run = Path(folder) / "run.h5"
        crowdsim.simulate(read, out=run, realisations=realisations)
        summary = crowdsim.summarise(run, read.title)
    rows = [row(case) for case in summary.cases]
    print(f"{summary.title}\n")
    for line in (COLUMNS, ["---"] * len(COLUMNS), *rows):
        print(f"| {' | '.join(line)} |")
    print()
    for case in summary.cases:
        print(*(deck.judgement.sentence for deck in case.deck if deck.judgement is not None), sep="\n")
    print("\nComfort only, vertical only; no safety check of the structure.")
    with open(table, "w", newline="", encoding="utf-8") as file:
        csv.writer(file).writerows([COLUMNS, *rows])


if __name__ == "__main__":
    arguments = sys.argv[1:4]
    try:
        main(*arguments[:2], *(int(a) for a in arguments[2:]))
    except (crowdsim.CrowdsimError, OSError) as error:
        sys.exit(str(error))
