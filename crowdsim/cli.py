"""The command line. Bodies of a few lines; whatever is heavy is imported inside them."""

from __future__ import annotations

import signal
import sys
from pathlib import Path
from typing import Annotated, Literal, NoReturn

import typer

app = typer.Typer(
    name="crowdsim",
    no_args_is_help=True,
    add_completion=False,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
    context_settings={"help_option_names": ["-h", "--help"]},
    help="Will people find a footbridge too lively, and how sure is that? Random walkers and joggers, simulated.",
    epilog="A comfort assessment is no safety check of the structure: the governing code, the owner's criteria "
    "and a licensed engineer decide.",
)

ScenarioFile = Annotated[Path, typer.Argument(help="Scenario file (TOML).", metavar="SCENARIO")]
RunFile = Annotated[Path, typer.Argument(help="Results file of a run (HDF5).", metavar="RUN.h5")]
CaseName = Annotated[str | None, typer.Option("--case", help="Only the case of this name.", metavar="NAME")]
Count = Annotated[
    int | None, typer.Option("--realisations", min=1, max=10_000_000, help="Default: the scenario's.", metavar="N")
]
Seed = Annotated[int | None, typer.Option("--seed", min=0, max=2**63 - 1, help="Default: the scenario's.", metavar="S")]
Workers = Annotated[
    int | None, typer.Option("--workers", min=1, max=1024, help="Threads; changes no number.", metavar="W")
]
Fit = Annotated[
    Literal["gumbel", "gev"] | None,
    typer.Option("--fit", help="Fit this law to the window peaks as well: gumbel or gev.", metavar="LAW"),
]
Json = Annotated[bool, typer.Option("--json", help="Print the summary for programs.")]
Quiet = Annotated[bool, typer.Option("--quiet", "-q", help="Print nothing but errors.")]
Verbose = Annotated[bool, typer.Option("--verbose", "-v", help="Say more: accuracy, places, run time.")]


@app.command()
def simulate(
    scenario: ScenarioFile,
    out: Annotated[Path, typer.Option("--out", "-o", help="Results file to write (HDF5).", metavar="RUN.h5")],
    case: CaseName = None,
    realisations: Count = None,
    seed: Seed = None,
    workers: Workers = None,
    force: Annotated[bool, typer.Option("--force", help="Overwrite the results file.")] = False,
    json: Json = False,
    quiet: Quiet = False,
    verbose: Verbose = False,
) -> None:
    """Simulate every case of a scenario and write the results file."""
    from crowdsim.console.base import Console
    from crowdsim.console.progress import RunProgress
    from crowdsim.console.summary import summary
    from crowdsim.errors import InterruptedRunError, ResultsError
    from crowdsim.scenario.reader import read_scenario
    from crowdsim.study.compare import compare_file
    from crowdsim.study.simulate import plan, simulate_to

    console = Console(quiet=quiet, verbose=verbose, json=json)
    if out.resolve() == scenario.resolve():
        raise ResultsError(f"{out}: is the scenario itself; --out takes the name of a results file")
    signal.signal(signal.SIGTERM, signal.default_int_handler)  # ends like Ctrl-C: what is finished is kept
    prepared = plan(read_scenario(scenario), case=case, realisations=realisations, seed=seed)
    try:
        with RunProgress(console) as progress:
            simulate_to(prepared, out, workers=workers, progress=progress, force=force)
    except InterruptedRunError as stopped:
        if stopped.kept:
            summary(console, compare_file(stopped.kept))
        raise
    summary(console, compare_file(out))


@app.command()
def check(
    scenario: ScenarioFile,
    case: CaseName = None,
    realisations: Count = None,
    json: Json = False,
    verbose: Verbose = False,
) -> None:
    """Read a scenario, show it as understood, say what is doubtful. Changes nothing."""
    from crowdsim.console.base import Console
    from crowdsim.console.check import check as show
    from crowdsim.scenario.reader import read_scenario
    from crowdsim.study.simulate import plan, refuse_errors

    prepared = plan(read_scenario(scenario), case=case, realisations=realisations)
    show(Console(verbose=verbose, json=json), prepared)
    refuse_errors(prepared)


@app.command()
def estimate(scenario: ScenarioFile, case: CaseName = None, json: Json = False) -> None:
    """Which modes lie in reach, and what the hand formulas give. No simulation."""
    from crowdsim.console.base import Console
    from crowdsim.console.estimate import estimate as show
    from crowdsim.scenario.reader import read_scenario
    from crowdsim.study.estimate import estimate as compute

    show(Console(json=json), compute(read_scenario(scenario), case))


@app.command()
def compare(
    run: RunFile,
    percentile: Annotated[
        float, typer.Option("--percentile", min=0.01, max=0.999, help="Of the peak, as a share.", metavar="P")
    ] = 0.95,
    limit: Annotated[
        float | None,
        typer.Option("--limit", help="Judge by this limit, m/s2, in place of what was asked.", metavar="A"),
    ] = None,
    fit: Fit = None,
    json: Json = False,
) -> None:
    """Judge the cases of a run; put the hand formulas beside the simulated numbers."""
    from crowdsim.console.base import Console
    from crowdsim.console.compare import compare as show
    from crowdsim.errors import InputError, Problem
    from crowdsim.study.compare import compare_file

    if limit is not None and not 0.0 < limit < 1e3:
        raise InputError("--limit", [Problem("limit", f"{limit:g} m/s2 given", "above 0, in m/s2")])
    show(Console(json=json), compare_file(run, percentile=percentile, limit=limit, family=fit))


@app.command()
def plot(
    run: RunFile,
    what: Annotated[str, typer.Argument(help="history, envelope, exceedance, modes or people.", metavar="WHAT")],
    out: Annotated[Path, typer.Option("--out", "-o", help="Figure to write: png, svg or pdf.", metavar="FIGURE")],
    case: CaseName = None,
    point: Annotated[str | None, typer.Option("--point", help="Of the history.", metavar="NAME")] = None,
    fit: Fit = None,
    width: Annotated[float, typer.Option("--width", help="Of the figure, mm.", metavar="MM")] = 170.0,
) -> None:
    """Draw a figure of a run. Without --case, the first case."""
    from crowdsim.plots.draw import draw
    from crowdsim.study.compare import compare_file, marks

    hand = []
    if what == "exceedance":
        comparison = compare_file(run)
        hand = marks(comparison, case or comparison.summary.cases[0].name)
    typer.echo(draw(run, what, out, case=case, point=point, fit=fit, marks=hand, width=width))


@app.command()
def sensitivity(
    scenario: ScenarioFile,
    out: Annotated[
        Path | None, typer.Option("--out", "-o", help="Bar figure to write: png, svg or pdf.", metavar="FIGURE")
    ] = None,
    into: Annotated[
        Path | None, typer.Option("--into", help="Results file of the same scenario to keep it in.", metavar="RUN.h5")
    ] = None,
    case: CaseName = None,
    realisations: Count = None,
    seed: Seed = None,
    workers: Workers = None,
    width: Annotated[float, typer.Option("--width", help="Of the figure, mm.", metavar="MM")] = 170.0,
    json: Json = False,
    quiet: Quiet = False,
) -> None:
    """What the 95 % peak hangs on: one change at a time, with the same random numbers."""
    from crowdsim.console.base import Console
    from crowdsim.console.progress import RunProgress
    from crowdsim.console.sensitivity import sensitivity as show
    from crowdsim.errors import ResultsError
    from crowdsim.results.sensitivity import cases_for, write_sensitivity
    from crowdsim.scenario.reader import read_scenario
    from crowdsim.study.sensitivity import sensitivity as study

    console = Console(quiet=quiet, json=json)
    read = read_scenario(scenario)
    if into is not None:  # what cannot be kept is said before a minute of work
        kept = cases_for(into, read.text)
        if case is not None and case not in kept:
            raise ResultsError(f"{into}: has no case {case!r}; cases there: {', '.join(kept)}")
    if out is not None:
        from crowdsim.plots.save import check_place, check_width
        from crowdsim.plots.sensitivity import NARROWEST

        check_place(out)
        check_width(width, NARROWEST)
    with RunProgress(console) as progress:
        result = study(read, case=case, realisations=realisations, seed=seed, workers=workers, progress=progress)
    show(console, result)
    if into is not None:
        write_sensitivity(into, read.text, result)
        console.path(f"kept in {into}")
    if out is not None:
        from crowdsim.plots.sensitivity import draw_sensitivity

        console.path(f"drawn: {draw_sensitivity(result, out, width=width)}")


@app.command()
def schema() -> None:
    """Print the JSON Schema of a scenario file, for editors."""
    import json

    from crowdsim.scenario.schema import json_schema

    typer.echo(json.dumps(json_schema(), indent=2))


def _version(value: bool) -> None:
    if value:
        import crowdsim

        typer.echo(f"crowdsim {crowdsim.__version__}")
        raise typer.Exit


@app.callback()
def _options(
    version: Annotated[
        bool, typer.Option("--version", callback=_version, is_eager=True, help="Print the version.")
    ] = False,
) -> None:
    pass


def main() -> NoReturn:
    """Runs the command line; errors raised on purpose become one message and their exit status."""
    from crowdsim.errors import EXIT_OTHER, CrowdsimError

    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="replace")  # a name that the terminal cannot show ends no run
    try:
        status = app(standalone_mode=False)
        sys.exit(status if isinstance(status, int) else 0)
    except CrowdsimError as error:
        typer.echo(str(error), err=True)
        sys.exit(error.exit_status)
    except (KeyboardInterrupt, typer.Abort):
        typer.echo("stopped; nothing was written", err=True)
        sys.exit(EXIT_OTHER)
    except BrokenPipeError:
        sys.exit(EXIT_OTHER)
    except OSError as error:
        typer.echo(f"{error.filename or 'crowdsim'}: {error.strerror or error}", err=True)
        sys.exit(EXIT_OTHER)
    except Exception as error:
        if not hasattr(error, "exit_code") or not hasattr(error, "show"):
            raise
        error.show()  # the command line itself is at fault
        sys.exit(error.exit_code)
