"""The command line. Numerics are imported only inside the commands that need them."""

import json
import logging
import os
import shlex
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import click

from midradius.study.cli_answer import BAD_INPUT, DONE, INTERRUPTED, NOT_MET
from midradius.study.cli_answer import answered as _answered
from midradius.study.cli_answer import printable as _printable
from midradius.study.cli_calibrate import calibrate
from midradius.study.cli_diagram import diagram
from midradius.study.cli_endquench import endquench
from midradius.study.cli_lever import lever
from midradius.study.cli_media import media
from midradius.study.cli_mesh import mesh
from midradius.study.cli_probe import probe
from midradius.study.cli_sources import described, sources, used_lines
from midradius.study.cli_steels import steels
from midradius.study.cli_tank import tank

_EPILOG = """\b
Exit codes:
  0  done
  1  done, but a requirement of the case fails (too close to call is 0), or a
     tank is not acceptable or not judged in full
  2  bad input: nothing was written
  3  the solver gave up: nothing was written
130  interrupted: nothing was written
"""

_RUN_EPILOG = """\b
Examples:
  midradius run shaft.toml --out shaft
  midradius run shaft.toml --out shaft --json > shaft.json
  midradius run shaft.toml --out shaft --quiet

\b
The folder holds:
  fields.pvd, fields/*.vtu  temperatures over time, for any VTK viewer
  final.vtu                 phases, hardness and cooling times at the end
  histories.csv             temperature over time at the named positions
  profile.csv               everything from surface to core
  positions.csv             the answer at the named positions
  needs.csv                 what the case asks for, and whether it is met
  record.h5                 all of it, with inputs, versions and sources
  *.png                     cooling curves, profile, section; of a solid and with
                            pictures = "scenes" the part itself, cooling.gif as well
With [output] format = "vtkhdf" all fields are in fields.vtkhdf, written as they come.
"""


class _ReaderGone(Exception):
    """Whoever read stdout has left."""


class _Commands(click.Group):
    """The commands, with their ends told apart before click turns them into exit code 1."""

    def invoke(self, ctx: click.Context) -> object:
        try:
            return super().invoke(ctx)
        except BrokenPipeError as gone:
            raise _ReaderGone from gone
        except SystemExit as leaving:
            if isinstance(leaving.__context__, BrokenPipeError):  # so ends rich
                raise _ReaderGone from leaving
            raise
        except KeyboardInterrupt:
            click.echo("Interrupted.", err=True)
            sys.exit(INTERRUPTED)


@click.group(
    cls=_Commands,
    context_settings={"help_option_names": ["-h", "--help"]},
    epilog=_EPILOG,
    no_args_is_help=True,
)
@click.version_option(package_name="midradius", prog_name="midradius")
def cli() -> None:
    """Through-section cooling of steel parts: what hardness is reached at depth.

    A case file says steel, section and route; midradius computes the cooling,
    the microstructure and the hardness at every depth.

    \b
    Start with:
      midradius new shaft.toml
      midradius run shaft.toml --out shaft
    """


cli.add_command(calibrate)
cli.add_command(diagram)
cli.add_command(endquench)
cli.add_command(lever)
cli.add_command(media)
cli.add_command(mesh)
cli.add_command(probe)
cli.add_command(sources)
cli.add_command(steels)
cli.add_command(tank)


@cli.command(epilog=_RUN_EPILOG)
@click.argument("case", type=click.Path(path_type=Path))
@click.option(
    "--out",
    "folder",
    type=click.Path(path_type=Path),
    help="Result folder; an earlier midradius result there is replaced. Default: the case's name.",
)
@click.option("--json", "as_json", is_flag=True, help="Print one JSON document, nothing else.")
@click.option("--quiet", is_flag=True, help="Print nothing but errors.")
@click.option("--sources", "with_sources", is_flag=True, help="Print the works it rests on.")
def run(case: Path, folder: Path | None, as_json: bool, quiet: bool, with_sources: bool) -> None:
    """Solve CASE and write a result folder."""
    from midradius.study.casefile import read_any

    with _answered():
        asked = read_any(case)
        from midradius.study import job

        target = folder if folder is not None else _folder_of(case)
        # It would tell of its font cache on stderr, where only errors belong.
        logging.getLogger("matplotlib").setLevel(logging.ERROR)
        with _progress(asked.title, hidden=quiet or as_json) as tell:
            result = job.run(asked, target, tell=tell)
    if with_sources:
        from midradius.study.sources import used
    if as_json:
        from midradius.study.summary import document

        content = document(result)
        if with_sources:
            content["sources"] = described(used(result.sources))
        # Escapes instead of letters beyond ASCII: whole whatever encoding stdout has.
        click.echo(json.dumps(content, indent=1, allow_nan=False))
    elif not quiet:
        from rich.console import Console

        from midradius.study.summary import terminal

        console = Console(highlight=False)
        terminal(result, console)
        for line in ["\nSources", *used_lines(used(result.sources))] if with_sources else []:
            click.echo(line)
        console.print(f"\nWritten to {_printable(target)}", markup=False)
    from midradius.study.needs import any_fails

    if any_fails(result.verdicts):
        sys.exit(NOT_MET)


@cli.command()
@click.argument("case", type=click.Path(path_type=Path))
def check(case: Path) -> None:
    """Read CASE, name all its faults, and solve nothing.

    Of a mesh section it lists the surface zones, which stages name in faces.
    """
    from midradius.study.casefile import read_any

    with _answered():
        asked = read_any(case)
        from midradius.study import job

        job.look(asked)
        lines = _seen(asked)
    click.echo(f"{_printable(case)}: sound ({asked.title})")
    for line in lines:
        click.echo(_printable(line))


def _seen(case: Any) -> tuple[str, ...]:
    """What a mesh section was found to be."""
    mesh = getattr(getattr(case, "section", None), "mesh", None)
    if mesh is None:
        return ()
    from midradius.study.casemesh import mesh_of
    from midradius.study.meshtext import described_mesh

    return described_mesh(mesh_of(mesh))


@cli.command(short_help="Write a commented starter case.")
@click.argument("file", type=click.Path(path_type=Path), required=False)
@click.option(
    "--form",
    type=click.Choice(["slab", "round", "tube", "ball", "bar", "ring"]),
    default="round",
    show_default=True,
    help="Form of the section.",
)
@click.option(
    "--temperatures",
    "given",
    is_flag=True,
    help="No section: temperatures of a file, measured or computed elsewhere.",
)
def new(file: Path | None, form: str, given: bool) -> None:
    """Write a commented starter case to FILE, or to the screen without one."""
    from midradius.study.starter import text, text_with_temperatures

    content = text_with_temperatures() if given else text(form)
    if file is None:
        click.echo(content, nl=False)
        return
    with _answered():
        _write_new(file, content)
    shown, target = (shlex.quote(_printable(path)) for path in (file, _folder_of(file)))
    first = "name your file of temperatures in it, then " if given else ""
    click.echo(f"Wrote {shown}. Next: {first}midradius run {shown} --out {target}", err=True)


def _write_new(file: Path, content: str) -> None:
    from midradius.thermo.errors import InputFault

    try:
        with file.open("x", encoding="utf-8") as stream:
            stream.write(content)
    except FileExistsError:
        raise InputFault(
            "file", str(file), "a new name", "It exists already and was not touched."
        ) from None
    except OSError as fault:
        raise InputFault(
            "file", str(file), "a place that can be written", f"{fault.strerror}."
        ) from fault


@cli.command()
def schema() -> None:
    """Print the JSON Schema of the case file, for editors."""
    from midradius.study.schema import document

    click.echo(json.dumps(document(), indent=2))


def _folder_of(case: Path) -> Path:
    """Where the result of a case goes unless it is said: here, under the case's name."""
    return Path(case.stem if case.suffix else f"{case.name}-result")


@contextmanager
def _progress(title: str, *, hidden: bool) -> Iterator[Callable[[float, float], None] | None]:
    """A bar on stderr with the simulated time, only where a person watches."""
    if hidden or not sys.stderr.isatty():
        yield None
        return
    from rich.console import Console
    from rich.progress import BarColumn, Progress, TextColumn

    from midradius.study.summary import duration

    columns: list[Any] = [
        TextColumn("cooling", markup=False),
        BarColumn(),
        TextColumn("{task.fields[now]} of about {task.fields[end]}", markup=False),
    ]
    with Progress(*columns, console=Console(stderr=True), transient=True) as bar:
        task = bar.add_task(title, total=1.0, now="0 s", end="?")

        def tell(now: float, end: float) -> None:
            bar.update(task, completed=min(now / end, 1.0), now=duration(now), end=duration(end))

        yield tell


def main() -> None:
    """The console entry: Ctrl-C anywhere ends quietly, a closed pipe too."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):  # a title may not fit an old terminal's letters
            stream.reconfigure(errors="backslashreplace")
    try:
        cli(prog_name="midradius", standalone_mode=False)
        if sys.stdout is not None:
            sys.stdout.flush()
    except click.exceptions.Abort:
        click.echo("Interrupted.", err=True)
        sys.exit(INTERRUPTED)
    except click.ClickException as fault:
        fault.show()
        sys.exit(fault.exit_code)
    except (_ReaderGone, BrokenPipeError):
        _silence_stdout()
        sys.exit(DONE)
    except OSError as fault:
        _silence_stdout()
        click.echo(f"The answer could not be printed: {fault.strerror}.", err=True)
        sys.exit(BAD_INPUT)


def _silence_stdout() -> None:
    """Let what is still buffered go nowhere, so that leaving says nothing about it."""
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
