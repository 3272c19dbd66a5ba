"""How a command ends: exit codes, and one message for what can go wrong."""

import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import click

DONE, NOT_MET, BAD_INPUT, GAVE_UP = 0, 1, 2, 3
INTERRUPTED = 130


def printable(text: Path | str) -> str:
    """A path or text that cannot steer a terminal."""
    return "".join(c if c.isprintable() else "?" for c in str(text))


@contextmanager
def answered() -> Iterator[None]:
    """Turn what can go wrong into one message and the documented exit code."""
    from midradius.thermo.errors import MidradiusError, SolverFault

    try:
        yield
    except SolverFault as fault:
        click.echo(f"{fault}", err=True)
        sys.exit(GAVE_UP)
    except MidradiusError as fault:
        click.echo(f"{fault}", err=True)
        sys.exit(BAD_INPUT)
    except KeyboardInterrupt:
        click.echo("Interrupted; nothing was written.", err=True)
        sys.exit(INTERRUPTED)
