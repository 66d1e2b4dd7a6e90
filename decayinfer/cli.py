"""The command line: parse, call, print."""

import functools
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from decayinfer import __version__
from decayinfer.errors import DecayinferError, InputError
from decayinfer.results.threads import one_thread
from decayinfer.terminal import print_problems, print_table, show_progress, stderr, stdout

# Everything heavy is imported inside the commands, so that --help and error messages come at once.
if TYPE_CHECKING:
    from decayinfer.catalog import Catalog
    from decayinfer.inference.settings import FitSettings
    from decayinfer.results.run import RunSummary

__all__ = ["app", "main"]

app = typer.Typer(
    name="decayinfer",
    help="Infer magnetic-field decay in neutron stars from pulsar braking indices.",
    no_args_is_help=True,
    pretty_exceptions_enable=False,
    add_completion=False,
)

#: Problems of an input table that `fit` prints; log.txt has all.
_SHOWN = 10

#: Scenarios that the sample of `demo` was drawn from.
_DEMO_COOLING = ("bsk24-normal-iron", "bsk24-protons-iron")

_USER_ERROR, _BAD_ROWS, _INTERRUPTED = 2, 1, 130

Columns = Annotated[
    list[str] | None,
    typer.Option("--column", metavar="OURS=THEIRS", help="Name of a column in the table; repeat for more."),
]
Cooling = Annotated[
    str,
    typer.Option(
        metavar="LIST",
        help="Cooling scenarios, tables of age, mass and temperature of your own, or all; default the standard set.",
    ),
]
Jobs = Annotated[int, typer.Option(min=1, help="Objects to fit at a time.")]


def main() -> None:
    """Run the command line."""
    app()


def _guarded[**P](command: Callable[P, None]) -> Callable[P, None]:
    """Turn errors of the user's into one red line, and an interruption into a sentence."""

    @functools.wraps(command)
    def wrapper(*args: P.args, **kwargs: P.kwargs) -> None:
        try:
            command(*args, **kwargs)
        except DecayinferError as error:
            stderr().print(
                "error: " + " ".join(str(error).splitlines()),
                style="red",
                markup=False,
                highlight=False,
                soft_wrap=True,
            )
            raise typer.Exit(_USER_ERROR) from None
        except KeyboardInterrupt:
            stderr().print("stopped; the same command goes on where this one stopped", soft_wrap=True)
            raise typer.Exit(_INTERRUPTED) from None

    return wrapper


def _print_version(asked: bool) -> None:
    if asked:
        typer.echo(f"decayinfer {__version__}")
        raise typer.Exit


@app.callback()
def _options(
    version: Annotated[
        bool, typer.Option("--version", callback=_print_version, is_eager=True, help="Print the version.")
    ] = False,
) -> None:
    pass


@app.command()
@_guarded
def check(table: Annotated[str, typer.Argument(metavar="TABLE")], column: Columns = None) -> None:
    """Show what a table says: tau_c, field, index, the decay time it implies, what else is known; and every problem.

    Exit code 1 when a row had to be set aside.
    """
    from decayinfer.catalog import read_table
    from decayinfer.catalog.further import FURTHER_HEADER, further_listing
    from decayinfer.results.listing import CHECK_HEADER, check_listing

    catalog = read_table(table, columns=_mapping(column))
    if catalog.pulsars:
        print_table(CHECK_HEADER, check_listing(catalog))
    if further := further_listing(catalog):
        print_table(FURTHER_HEADER, further)
    print_problems(stdout(), catalog.problems)
    aside = catalog.rows_set_aside
    typer.echo(f"{len(catalog)} objects can be fitted, {len(aside)} rows set aside")
    if aside or not catalog.pulsars:
        raise typer.Exit(_BAD_ROWS)


@app.command()
@_guarded
def fit(
    table: Annotated[str, typer.Argument(metavar="TABLE")],
    out: Annotated[Path, typer.Option(metavar="RUN", help="Run folder; an unfinished run in it goes on.")],
    column: Columns = None,
    objects: Annotated[str, typer.Option(metavar="A,B", help="Fit these objects only.")] = "",
    channels: Annotated[str, typer.Option(metavar="LIST", help="Channels to fit; default all.")] = "",
    cooling: Cooling = "",
    draws: Annotated[int, typer.Option(help="Kept draws per chain.")] = 1000,
    tune: Annotated[int, typer.Option(help="Warm-up draws per chain.")] = 400,
    chains: Annotated[int, typer.Option(help="Chains per posterior run.")] = 2,
    seed: Annotated[int, typer.Option(help="Seed of the run.")] = 1,
    jobs: Jobs = 1,
) -> None:
    """Fit every object of a table: posterior and evidence per channel and cooling scenario.

    A run that was stopped, or killed, goes on with the same command.
    """
    with one_thread():
        from decayinfer.catalog import read_table
        from decayinfer.inference.settings import FitSettings

        settings = FitSettings(
            channels=_names(channels),
            cooling=_scenarios(cooling),
            draws=draws,
            tune=tune,
            chains=chains,
            seed=seed,
        )
        catalog = _chosen(read_table(table, columns=_mapping(column)), _names(objects))
        _fit_and_show(catalog, out, settings, jobs)


@app.command()
@_guarded
def demo(
    out: Annotated[Path, typer.Option(metavar="RUN", help="Run folder.")] = Path("decayinfer-demo"),
    jobs: Jobs = 2,
) -> None:
    """Do the whole job on the invented sample that ships with the package, and compare with its truths."""
    with one_thread():
        from importlib.resources import as_file, files

        from decayinfer.catalog import read_table
        from decayinfer.inference.settings import FitSettings

        with as_file(files("decayinfer") / "data" / "demo.ecsv") as path:
            catalog = read_table(path)
        _fit_and_show(catalog, out, FitSettings(cooling=_DEMO_COOLING), jobs)


@app.command()
@_guarded
def simulate(
    objects: Annotated[int, typer.Option(min=1, help="Number of objects.")],
    out: Annotated[
        Path, typer.Option(metavar="TABLE", help="Table to write: .ecsv, .csv, .fits, .xml or .vot.")
    ],
    seed: Annotated[int, typer.Option(help="Seed of the sample.")] = 1,
    channels: Annotated[str, typer.Option(metavar="LIST", help="Channels to draw from; default all.")] = "",
    cooling: Cooling = "",
) -> None:
    """Draw an invented sample from the priors; its truths stand in extra columns."""
    with one_thread():
        from decayinfer.inference.settings import FitSettings
        from decayinfer.inference.simulate import simulate_table
        from decayinfer.results.run import resolve_settings
        from decayinfer.results.tables import check_new_table, save_table

        check_new_table(out)  # before the work
        asked = FitSettings(channels=_names(channels), cooling=_scenarios(cooling), seed=seed)
        save_table(simulate_table(objects, seed, resolve_settings(asked)), out)
    typer.echo(f"wrote {objects} invented objects to {out}")


@app.command()
@_guarded
def cooling(
    name: Annotated[str, typer.Argument(metavar="[NAME]", show_default=False)] = "",
    as_csv: Annotated[bool, typer.Option("--csv", help="Print a CSV table; errors are fractions.")] = False,
) -> None:
    """List the cooling scenarios, or show one."""
    from decayinfer.cooling.listing import HEADER, card, listing, to_csv
    from decayinfer.cooling.registry import load_scenario, scenario_names

    scenarios = [load_scenario(each) for each in ([name] if name else scenario_names())]
    if as_csv:
        typer.echo(to_csv(scenarios))
    elif name:
        for line in card(scenarios[0]):
            stdout().print(line, markup=False, highlight=False)
    else:
        print_table(HEADER, listing(scenarios))
        typer.echo("standard: fitted when --cooling names none; --cooling all takes all but the provisional")


@app.command()
@_guarded
def compare(
    run: Annotated[Path, typer.Argument(help="A finished run folder.")],
    first: Annotated[str, typer.Argument(metavar="CHANNEL", help="Channel whose evidence is divided.")],
    second: Annotated[str, typer.Argument(metavar="CHANNEL", help="Channel whose evidence divides.")],
    objects: Annotated[str, typer.Option(metavar="LIST", help="Objects; default all.")] = "",
) -> None:
    """Bayes factors of two channels, per object and cooling scenario and averaged."""
    from decayinfer.results.compare import HEADER, listing
    from decayinfer.results.compare import compare as factors
    from decayinfer.results.read import read_run

    print_table(HEADER, listing(factors(read_run(run), first, second, objects=_names(objects))))


def _fit_and_show(catalog: "Catalog", out: Path, settings: "FitSettings", jobs: int) -> None:
    from decayinfer.results.read import read_run
    from decayinfer.results.run import run_fit

    aside = [problem for problem in catalog.problems if problem.severity == "error"]
    print_problems(stderr(), aside[:_SHOWN])
    if len(aside) > _SHOWN:
        stderr().print(f"and {len(aside) - _SHOWN} more problems; decayinfer check lists them all")
    with show_progress() as progress:
        summary = run_fit(catalog, out, settings, jobs=jobs, progress=progress)
    _show_run(read_run(summary.path), summary)


def _show_run(run: Any, summary: "RunSummary") -> None:
    from decayinfer.results.listing import HEADER, flag_legend, listing
    from decayinfer.results.truths import coverage

    print_table(HEADER, listing(run))
    for name, meaning in flag_legend(run).items():
        typer.echo(f"{name}: {meaning}")
    covered = coverage(run)
    if covered is not None:
        share = 100 * covered.inside / covered.total
        typer.echo(
            f"{covered.inside} of {covered.total} truths ({share:.0f} %) lie inside their 90 % intervals"
        )
    for remark in summary.remarks:
        stderr().print(f"note: {remark}", markup=False, highlight=False, soft_wrap=True)
    typer.echo(
        f"{summary.fitted} posterior runs made, {summary.reused} found, {summary.unreachable} unreachable, "
        f"{summary.failed} failed; {summary.seconds:.0f} s; results in {summary.path}"
    )


def _chosen(catalog: "Catalog", names: tuple[str, ...]) -> "Catalog":
    """Keep the named objects, in the order of the table."""
    from dataclasses import replace

    for name in names:
        catalog[name]  # raises for a name that is not there
    kept = tuple(pulsar for pulsar in catalog.pulsars if not names or pulsar.name in names)
    return replace(catalog, pulsars=kept, rows=())


def _names(text: str) -> tuple[str, ...]:
    return tuple(name.strip() for name in text.split(",") if name.strip())


def _scenarios(text: str) -> tuple[str, ...]:
    """Return the names in --cooling; what looks like a file becomes a scenario first."""
    return tuple(_from_file(name) if Path(name).suffix else name for name in _names(text))


def _from_file(path: str) -> str:
    from decayinfer.cooling.user_table import register_table

    scenario = register_table(path)
    said = f"{path} is the cooling scenario {scenario.name}, fitted to {scenario.fit_error['temperature']:.2%} in T_b"
    stderr().print(said, markup=False, highlight=False, soft_wrap=True)
    return scenario.name


def _mapping(pairs: list[str] | None) -> dict[str, str]:
    """Return --column options as a mapping."""
    for pair in pairs or []:
        if not all(pair.partition("=")):
            raise InputError(f"--column {pair!r} must have the form period=THEIRS")
    return dict(pair.split("=", 1) for pair in pairs or [])


if __name__ == "__main__":
    main()
