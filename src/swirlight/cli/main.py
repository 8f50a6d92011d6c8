"""The door: one thin file per command behind it. Messages on stderr, results on stdout.

Exit codes: 0 success, 2 bad input (one clear message), 1 the work itself failed, 130 and 143
after Ctrl-C and SIGTERM, once everything is saved.
"""

import sys
from typing import Annotated

import typer

from swirlight.cli.check import check
from swirlight.cli.convert import convert
from swirlight.cli.correlate import correlate
from swirlight.cli.launch import launch, resume
from swirlight.cli.response import response
from swirlight.cli.schema import schema
from swirlight.cli.species import species
from swirlight.cli.spectrum import spectrum
from swirlight.cli.status import status
from swirlight.cli.verify import verify
from swirlight.errors import InputError, StopRequested, SwirlightError

app = typer.Typer(
    name="swirlight",
    help="Will a circularly polarised pulse set the molecules of this liquid turning, and which"
    " signal shows it?",
    no_args_is_help=True,
    add_completion=False,
    pretty_exceptions_enable=False,
    rich_markup_mode=None,
)
for command in (check, launch, resume, status, response, correlate, spectrum, species, convert,
                verify, schema):
    app.command()(command)


def _print_versions(wanted):
    if not wanted:
        return
    import platform
    from importlib.metadata import version

    names = ("swirlight", "numpy", "numba", "scipy", "h5py", "pydantic", "pint", "PyYAML", "dask")
    typer.echo("\n".join([f"{name} {version(name)}" for name in names]
                         + [f"Python {platform.python_version()} on {platform.platform()}"]))
    raise typer.Exit


@app.callback()
def _root(
    version: Annotated[
        bool,
        typer.Option("--version", callback=_print_versions, is_eager=True,
                     help="Print the versions of everything that matters."),
    ] = False,
):
    pass


def main():
    """Run the command line and exit with its code."""
    sys.exit(run(sys.argv[1:]))


def run(arguments):
    """Run one command; return its exit code. No exception of ours leaves as a traceback."""
    try:
        code = app(arguments, standalone_mode=False)
        return code if isinstance(code, int) else 0
    except typer.Exit as done:
        return done.exit_code
    except InputError as error:
        return _fail(error, 2)
    except StopRequested as stop:
        return _fail("stopped; everything is saved, and `swirlight resume` goes on",
                     128 + stop.signal)
    except SwirlightError as error:
        return _fail(error, 1)
    except OSError as error:
        where = f"{error.filename}: " if error.filename else ""
        return _fail(f"{where}{error.strerror or error}", 1)
    except (KeyboardInterrupt, typer.Abort):
        return _fail("interrupted", 130)
    except Exception as error:
        if hasattr(error, "format_message"):  # a usage error of the argument parser
            return _fail(f"{error.format_message()} (see 'swirlight --help')", 2)
        raise


def _fail(message, code):
    print(f"swirlight: {message}" if code != 2 else str(message), file=sys.stderr)
    return code
