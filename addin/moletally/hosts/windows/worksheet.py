"""The module that xlwings' COM server imports: a user-defined function for each line of the function table.

Made from the table at import; nothing here names a worksheet function.
"""

import inspect
import os
import sys
from collections.abc import Callable
from typing import Any

import xlwings as xw
from xlwings.conversion import Accessor, Pipeline

import moletally
from moletally.hosts.windows.values import argument, exact, has_currency, marked, variants
from moletally.sheet.cells import OMITTED, Argument
from moletally.sheet.engine import engine_in_use
from moletally.sheet.functions import FUNCTIONS, Function, call
from moletally.sheet.outcome import Outcome

__all__ = ["about"]


class Cells(Accessor):  # type: ignore[misc]  # xlwings has no types
    """An argument of ours from a Range, or from the values that the add-in read; and an outcome back."""

    @classmethod
    def reader(cls, _options: object) -> Pipeline:
        """Pipeline that leaves an `Argument`."""
        return Pipeline().append_stage(_read)

    @classmethod
    def writer(cls, _options: object) -> Pipeline:
        """Pipeline that leaves a rectangle of plain values."""
        return Pipeline().append_stage(_write)


def _read(context: Any) -> None:
    cells = context.range
    if cells is None:
        context.value = argument(context.value, is_range=False)
        return
    if cells.api.Areas.Count > 1:
        context.value = SEVERAL_AREAS
        return
    value = cells.raw_value
    if has_currency(value):
        value = exact(value, cells.api.Value2)
    context.value = argument(value, is_range=True)


def _write(context: Any) -> None:
    outcome: Outcome | str = context.value
    context.value = [[outcome]] if isinstance(outcome, str) else variants(outcome)


SEVERAL_AREAS = object()


def _worksheet_function(function: Function) -> Callable[..., Outcome | str]:
    """The function as xlwings serves it."""

    def answer(*arguments: Argument) -> Outcome | str:
        for declared, given in zip(function.arguments, arguments, strict=False):
            if given is SEVERAL_AREAS:
                reason = f"{function.name}, {declared.name}: this is several ranges; give one range"
                return marked("#VALUE!", reason)
        return call(function.name, arguments)

    kinds = inspect.Parameter
    answer.__name__ = function.name
    answer.__doc__ = function.summary
    parameters = [
        kinds(a.name, kinds.VAR_POSITIONAL if a.repeats else kinds.POSITIONAL_OR_KEYWORD)
        for a in function.arguments
    ]
    answer.__signature__ = inspect.Signature(parameters)  # type: ignore[attr-defined]
    served: Any = answer
    for a in function.arguments:
        served = xw.arg(a.name, Cells, doc=a.help)(served)
    for declared in served.__xlfunc__["args"]:  # what xlwings hands in for an argument left out
        declared["optional"] = OMITTED
    served = xw.ret(Cells)(served)
    return xw.func(category=function.category)(served)  # type: ignore[no-any-return]  # last: the others reset it


@xw.func  # type: ignore[untyped-decorator]
def about() -> list[list[str]]:
    """What runs behind the cells: rows of name and value."""
    import numpy

    return [
        ["moletally", moletally.__version__],
        ["Python", f"{sys.version.split()[0]} ({sys.executable})"],
        ["kernel", f"{engine_in_use()}, numpy {numpy.__version__}"],
        ["xlwings", str(xw.__version__)],
        ["process", str(os.getpid())],
    ]


for _function in FUNCTIONS.values():
    globals()[_function.name] = _worksheet_function(_function)
