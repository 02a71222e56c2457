"""The command line: new, recalc, audit, excel, functions.

Exit codes: 0 all fine, 1 some cell has a problem or is stale, 2 the book or the call can't be used.
"""

import gc
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

import click

from moletally import __version__
from moletally.sheet.functions import FUNCTIONS

__all__ = ["main"]

PROGRESS_AFTER = 2.0  # s


class _Failed(click.ClickException):
    """A book or call that can't be used."""

    exit_code = 2


@click.group(context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(__version__, prog_name="moletally")
def main() -> None:
    """Worksheet functions that solve the mole balances of stirred tanks (CSTR) and plug-flow tubes (PFR).

    These commands work on workbook files, without Excel.
    """


@main.command()
@click.argument("template", required=False)
@click.argument("book", required=False, type=click.Path(path_type=Path))
def new(template: str | None, book: Path | None) -> None:
    """Copy a ready design workbook: moletally new TEMPLATE BOOK.xlsx

    Without a TEMPLATE they are listed.
    """
    from moletally.hosts.headless.book import BookError
    from moletally.hosts.headless.templates import describe, new_book, templates

    if template is None:
        for name, path in templates().items():
            click.echo(f"{name:16} {describe(path)}")
        return
    if book is None:
        raise _Failed(f"name the workbook to make: moletally new {template} BOOK.xlsx")
    try:
        new_book(template, book)
    except BookError as error:
        raise _Failed(str(error)) from None
    click.echo(f"{book} is ready: change an input and run moletally recalc {book}")


@main.command()
@click.argument("book", type=click.Path(path_type=Path))
@click.option("--set", "settings", multiple=True, metavar="CELL=VALUE",
              help='Change an input for this run: "Sheet!B3=0.5", or by name "Feed=2". May be repeated.')  # fmt: skip
@click.option("--out", type=click.Path(path_type=Path), metavar="FILE",
              help="Write a copy in which only values differ.")  # fmt: skip
@click.option("--json", "as_json", is_flag=True, help="Print the answers as JSON.")
def recalc(book: Path, settings: tuple[str, ...], out: Path | None, as_json: bool) -> None:
    """Recalculate a workbook without Excel and print the answers of our functions.

    Without --out nothing is written.
    """
    from moletally.hosts.headless import report
    from moletally.hosts.headless.book import BookError, open_book
    from moletally.hosts.headless.calculate import calculate
    from moletally.hosts.headless.settings import apply_settings
    from moletally.hosts.headless.write_back import patched, save

    _collect_seldom()
    try:
        opened = open_book(book)
        inputs = apply_settings(opened, list(settings))
        calculation = calculate(opened, progress=_progress())
        if out is not None:
            save(patched(opened, calculation.results, inputs), out)
    except BookError as error:
        raise _Failed(str(error)) from None
    except OSError as error:
        raise _Failed(f"{out} can't be written: {error.strerror}") from None
    if as_json:
        answers = report.as_json(calculation, FUNCTIONS)
        click.echo(report.json_text(answers))
        click.get_current_context().exit(1 if answers["problems"] else 0)
    click.echo(report.as_text(calculation, FUNCTIONS))
    if out is not None:
        click.echo(f"written: {out}")
    click.get_current_context().exit(1 if report.troubles(calculation) else 0)


@main.command()
@click.argument("book", type=click.Path(path_type=Path))
def audit(book: Path) -> None:
    """Print all findings for every call of our functions in a workbook."""
    from moletally.hosts.headless.audit import audit_book
    from moletally.hosts.headless.book import BookError, open_book

    worst = False
    _collect_seldom()
    try:
        opened = open_book(book)
    except BookError as error:
        raise _Failed(str(error)) from None
    for call in audit_book(opened):
        click.echo(f"{call.cell}  {call.function}")
        for level, where, what in call.rows:
            worst |= level == "stop"
            click.echo(f"    {level:5}  {where}: {what}".replace("\n", "\n        "))
    click.get_current_context().exit(1 if worst else 0)


@main.group()
def excel() -> None:
    """Install the add-in for Excel on Windows, look at it, take it away."""


@excel.command()
@click.option("--with-excel", is_flag=True,
              help="Let your own Excel make the macro file instead of taking the prebuilt one.")  # fmt: skip
def install(with_excel: bool) -> None:
    """Place the add-in where Excel finds it, and pin this Python. Needs no admin rights."""
    from moletally.hosts.windows.command import installed

    with _reasons_told():
        click.echo("\n".join(installed(with_excel)))


@excel.command()
def uninstall() -> None:
    """Take the add-in away without trace."""
    from moletally.hosts.windows.command import uninstalled

    with _reasons_told():
        click.echo("\n".join(uninstalled()))


@excel.command()
def status() -> None:
    """Check each link between a cell and its answer; exit code 1 if one is broken."""
    from moletally.hosts.windows.command import status as show_status

    with _reasons_told():
        holds = show_status(click.echo)
    click.get_current_context().exit(0 if holds else 1)


@contextmanager
def _reasons_told() -> Iterator[None]:
    """What can't be installed ends the command with its reason."""
    from moletally.hosts.windows.command import InstallError

    try:
        yield
    except InstallError as error:
        raise _Failed(str(error)) from None


@main.command()
def functions() -> None:
    """Print the table of worksheet functions, and what computes them here."""
    from moletally.sheet.engine import engine_in_use

    for function in FUNCTIONS.values():
        click.echo(f"{function.signature}\n    {function.summary}")
        for argument in function.arguments:
            optional = " (optional)" if argument.optional else ""
            click.echo(f"      {argument.name:10} {argument.help}{optional}")
        click.echo(f"    Result: {function.result}\n")
    click.echo(f"Computed by the {engine_in_use()}.")


def _collect_seldom() -> None:
    """A large book is a million objects that live until the process ends: looking through them is a fifth of its time."""
    gc.set_threshold(200_000, 50, 100)


def _progress() -> Callable[[int, int], None]:
    """Tells on a terminal how far a long recalculation is; quiet while it is quick."""
    begun = shown = time.monotonic()

    def tell(done: int, of: int) -> None:
        nonlocal shown
        now = time.monotonic()
        if now - begun > PROGRESS_AFTER and now - shown > 0.5:
            shown = now
            click.echo(f"{done} of {of} calls", err=True)

    return tell
