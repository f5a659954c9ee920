"""The command ``cant``: parses what was typed, calls the service, shows one result.

Its promise to scripts: exit status 0 and the outputs written, or exit status 2, nothing written and one line
on standard error. Commands of other packages (the web service) join through the entry point group
``cant.commands``, so that this package never imports them.
"""

from __future__ import annotations

import gc
import io
import os
import sys
from collections.abc import Iterable, Iterator, Sequence
from contextlib import contextmanager
from importlib.metadata import entry_points
from pathlib import Path
from typing import Any, NoReturn

import click

from cant import service
from cant.errors import CantError, FileError, InputError, Place
from cant.model.limits import LimitSet
from cant.model.reading import Reading
from cant.model.settings import METHODS, Settings
from cant.progress import progress_line
from cant.version import __version__
from cant.writing import terminal
from cant.writing.outputs import check_places, write_together

EXIT_REFUSED = 2
_file = click.Path(path_type=Path)


@click.group(no_args_is_help=False, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="cant")
def cant() -> None:
    """Set the cant of railway curves for mixed traffic: plan, reasons, limits, and a workbook to check.

    A planning aid: the railway's own standard and a competent, licensed engineer's approval decide.
    """


@cant.command()
@click.argument("curves", type=_file)
@click.option("--traffic", type=_file, help="Traffic table (xlsx, csv); replaces the sheet 'Traffic'.")
@click.option("--limits", "limits_given", help="Name of a limit set (see 'cant limits'), or a limits table.")
@click.option("--settings", type=_file, help="Settings table; replaces the sheet 'Settings'.")
@click.option("--reading", "answers", type=_file, help="Answers to what 'cant read' asks (JSON or TOML).")
@click.option("--method", type=click.Choice(METHODS), help="Method that gives each curve its target cant.")
@click.option("--out", type=_file, help="Annotated workbook to write.")
@click.option("--json", "json_file", type=_file, help="JSON of the plan to write (metric always).")
def plan(
    curves: Path,
    traffic: Path | None,
    limits_given: str | None,
    settings: Path | None,
    answers: Path | None,
    method: str | None,
    out: Path | None,
    json_file: Path | None,
) -> None:
    """Plan the curves of a workbook or csv file.

    Writes the annotated workbook and the JSON of the plan: where neither --out nor --json is given, both,
    named after CURVES, into the current folder.
    """
    if out is None and json_file is None:
        suffix = ".xlsm" if curves.suffix.lower() == ".xlsm" else ".xlsx"
        out, json_file = Path(f"{curves.stem}-plan{suffix}"), Path(f"{curves.stem}-plan.json")
    if out is not None and out.suffix.lower() not in (".xlsx", ".xlsm"):
        message = "the annotated workbook is an Excel workbook: give a name that ends in .xlsx"
        raise FileError(message, Place(str(out)))
    given_files = [curves, traffic, settings, answers, _limits_path(limits_given)]
    check_places([p for p in (out, json_file) if p], [p for p in given_files if p])
    data = _content(curves)
    with progress_line() as progress, _no_search_for_cycles():
        progress(0.0, "reading")
        reading = _read(data, curves, traffic, limits_given, settings, answers)
        used = _with_method(reading, method)
        planned = service.make_plan(reading, settings=used, progress=progress)
        progress(0.0, "writing")
        notes = _write(planned, (data, str(curves)), out, json_file)
    click.echo(terminal.summary(planned, [str(path) for path in (out, json_file) if path], notes))
    left_out = terminal.not_assessed_line(planned)
    if left_out:
        click.echo(left_out, err=True)


@contextmanager
def _no_search_for_cycles() -> Iterator[None]:
    """Leave Python's search for cycles of objects out for a while.

    The millions of small objects that records are made of hold no cycles; looking for some takes a twelfth of
    the whole time.
    """
    searched = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if searched:
            gc.enable()


def _write(
    planned: service.PlannedLine, source: service.NamedFile, out: Path | None, json_file: Path | None
) -> list[str]:
    """Write workbook and JSON, both of the same records in one pass, and give the notes on the workbook."""
    if out is None:
        write_together({json_file: planned.json_chunks()} if json_file else {})
        return []
    notes: list[str] = []

    def finished() -> Iterator[bytes | memoryview]:
        made = workbook.finish()
        notes.extend(made.notes)
        if made.suffix == ".xlsm" and out.suffix.lower() != ".xlsm":
            notes.append(f"{out} holds macros: spreadsheet programs open it only as .xlsm; rename it")
        yield from made.pieces

    with service.PlanWorkbook(planned, *source) as workbook:
        if json_file is None:
            for record in planned.records():
                workbook.add(record)
            write_together({out: finished()})
        else:
            write_together({json_file: planned.json_chunks(workbook.add), out: finished()})
    return notes


@cant.command()
@click.argument("curves", type=_file)
@click.option("--traffic", type=_file, help="Traffic table; its classes are sought among the speed columns.")
@click.option("--limits", "limits_given", help="Limit set or table; its situation words are known then.")
@click.option("--settings", type=_file, help="Settings table; replaces the sheet 'Settings'.")
@click.option(
    "--reading", "answers", type=_file, help="Answers and corrections already given (JSON or TOML)."
)
@click.option("--json", "json_file", type=_file, help="JSON of the reading to write.")
def read(
    curves: Path,
    traffic: Path | None,
    limits_given: str | None,
    settings: Path | None,
    answers: Path | None,
    json_file: Path | None,
) -> None:
    """Show how a file is understood: each column with its unit, every doubt, every row refused."""
    given_files = [curves, traffic, settings, answers, _limits_path(limits_given)]
    check_places([json_file] if json_file else [], [p for p in given_files if p])
    reading = _read(_content(curves), curves, traffic, limits_given, settings, answers)
    if json_file is not None:
        write_together({json_file: service.reading_json(reading)})
    click.echo(service.reading_text(reading))
    if json_file is not None:
        click.echo(f"Written: {json_file}")
    if reading.rejected:
        click.echo(terminal.rejected_line(reading), err=True)


@cant.command()
@click.option("--host", default="127.0.0.1", show_default=True, help="Address to listen at.")
@click.option("--port", default=8000, show_default=True, type=click.IntRange(0, 65535), help="Port.")
def serve(host: str, port: int) -> None:
    """Start the web service on this machine."""
    _of_the_service("serve")(host=host, port=port)


@cant.command()
@click.argument("file", type=_file)
@click.option("--replace", is_flag=True, help="Replace FILE where it is there already.")
def backup(file: Path, replace: bool) -> None:
    """Write a copy of the web service's database to FILE, while it runs or not.

    The database is the one that CANT_DATA or CANT_DATABASE names, as for 'cant serve'.
    """
    click.echo(_of_the_service("backup")(file, replace=replace))


def _of_the_service(name: str) -> Any:
    """Give a function of the web service, which joins through its entry point."""
    found = entry_points(group="cant.commands", name=name)
    if not found:
        message = "the web service is not installed: install the whole package again"
        raise FileError(message)
    return next(iter(found)).load()


class _GroupOfTheService(click.Group):
    """A group of commands that the web service brings; it is not loaded before one of them is asked for."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Give the names of its commands."""
        return list(_of_the_service(self.name or "").list_commands(ctx))

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """Give one of its commands."""
        found: click.Command | None = _of_the_service(self.name or "").get_command(ctx, cmd_name)
        return found


cant.add_command(
    _GroupOfTheService(
        "accounts",
        help="Make, list and change the accounts of the web service, where people sign in.",
        no_args_is_help=False,
    )
)


@cant.command()
@click.argument("name", required=False)
def limits(name: str | None) -> None:
    """List the limit sets that come with the program, or print the one named NAME."""
    if name is None:
        click.echo(terminal.limit_sets_text())
        return
    found = service.limits_named(name)
    if found is None:
        raise InputError(_unknown_set(name))
    click.echo(terminal.limit_set_text(found))


@cant.command()
@click.argument("file", type=_file)
def template(file: Path) -> None:
    """Write an empty workbook to fill in to FILE (.xlsx)."""
    if file.suffix.lower() != ".xlsx":
        message = "the template is an .xlsx workbook: give a name that ends in .xlsx"
        raise FileError(message, Place(str(file)))
    check_places([file], [])
    write_together({file: service.template()})
    click.echo(f"Written: {file}")


def _read(
    data: bytes,
    curves: Path,
    traffic: Path | None,
    limits_given: str | None,
    settings: Path | None,
    answers: Path | None,
) -> Reading:
    """Read the curve file with everything that was named beside it."""
    return service.read_curves(
        data,
        str(curves),
        traffic=_named(traffic),
        limits=_limits(limits_given),
        settings=_named(settings),
        answers=service.answers_from(_content(answers), str(answers)) if answers else None,
    )


def _content(path: Path) -> bytes:
    """Read a file, or say in one line why not."""
    try:
        return path.read_bytes()
    except FileNotFoundError:
        message = "there is no such file"
    except IsADirectoryError:
        message = "is a folder: name a file"
    except OSError as error:
        message = f"cannot be read: {error.strerror or error}"
    raise FileError(message, Place(str(path)))


def _named(path: Path | None) -> service.NamedFile | None:
    return (_content(path), str(path)) if path else None


def _limits_path(given: str | None) -> Path | None:
    """Give the file that --limits names, or None where it names a set or nothing."""
    return Path(given) if given and service.limits_named(given) is None else None


def _limits(given: str | None) -> LimitSet | service.NamedFile | None:
    """Find what --limits names: a set that comes with the program, else a file."""
    if given is None:
        return None
    known = service.limits_named(given)
    if known is not None:
        return known
    if not Path(given).exists():
        raise InputError(_unknown_set(given))
    return _named(Path(given))


def _unknown_set(name: str) -> str:
    return f"'{name}' is neither a limit set nor a file: the sets are {', '.join(service.limit_set_names())}"


def _with_method(reading: Reading, method: str | None) -> Settings | None:
    """Put the method that was typed into the settings of the file."""
    if method is None:
        return None
    return (reading.settings or Settings()).model_copy(update={"method": method})


def _fail(message: str) -> NoReturn:
    """End with status 2 and one line on standard error."""
    click.echo(f"cant: {' '.join(message.split())}", err=True)
    sys.exit(EXIT_REFUSED)


def main(arguments: Sequence[str] | None = None) -> None:
    """Run the command; the console script's entry.

    Parameters
    ----------
    arguments : sequence of str, optional
        What was typed after the command's name; the process's own arguments when left out.
    """
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors="replace")
    try:
        code = cant.main(args=_list(arguments), prog_name="cant", standalone_mode=False)
    except CantError as error:
        _fail(str(error))
    except click.UsageError as error:
        path = error.ctx.command_path if error.ctx else "cant"
        _fail(f"{error.format_message()} (see '{path} --help')")
    except click.ClickException as error:
        _fail(error.format_message())
    except (click.Abort, KeyboardInterrupt):
        _fail("stopped; nothing was written")
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        sys.exit(0)
    except MemoryError:
        _fail("the machine has too little memory for this file; nothing was written")
    except Exception as error:
        if os.environ.get("CANT_TRACEBACK"):
            raise
        _fail(
            f"an error of the program itself ({type(error).__name__}: {error}); nothing was written. "
            "Set CANT_TRACEBACK=1 to see where, and report it"
        )
    sys.exit(code if isinstance(code, int) else 0)


def _list(arguments: Iterable[str] | None) -> list[str] | None:
    return None if arguments is None else list(arguments)
