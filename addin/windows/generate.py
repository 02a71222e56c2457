"""VBA that is made from the table of worksheet functions: the wrappers, and the texts of the wizard."""

from moletally.sheet.functions import CATEGORY, FUNCTIONS, Argument, Function

__all__ = ["LONGEST_TEXT", "functions_module", "table_module"]

LONGEST_TEXT = 255  # characters Excel takes as a description
RESERVED = {"function", "to", "next", "date", "end", "type", "in", "is", "like", "mod", "on", "set", "stop"}
MADE = "' Made from the table of worksheet functions by addin/windows/build.py: do not edit."


def functions_module() -> str:
    """The wrappers: one worksheet function each."""
    parts = ['Attribute VB_Name = "MoleFunctions"', MADE, "Option Explicit", ""]
    for function in FUNCTIONS.values():
        parts += [*_wrapper(function), ""]
    return "\n".join(parts)


def _wrapper(function: Function) -> list[str]:
    names = [_variable(a) for a in function.arguments]
    rest = names.pop() if function.arguments[-1].repeats else ""
    declared = [f"ByVal {names[0]} As Variant"]
    declared += [f"{'' if rest else 'Optional '}ByVal {n} As Variant" for n in names[1:]]
    count = str(len(names) - 1)
    body = [f"    MoleCalls.Place sent, {i}, {n}" for i, n in enumerate(names)]
    if rest:
        declared.append(f"ParamArray {rest}() As Variant")
        count = f"UBound({rest}) + {len(names)}"
        body += [
            f"    For i = 0 To UBound({rest})",
            f"        MoleCalls.Place sent, i + {len(names)}, {rest}(i)",
            "    Next i",
        ]
    return [
        f"Public Function {function.name}({', '.join(declared)}) As Variant",
        f"    Dim sent() As Variant{', i As Long' if rest else ''}",
        f"    ReDim sent(0 To {count})",
        *body,
        f'    {function.name} = MoleCalls.Answered("{function.name}", sent)',
        "End Function",
    ]


def _variable(argument: Argument) -> str:
    """The argument's name, which the wizard shows; VBA's own words get a mark."""
    return argument.name + "_" if argument.name.lower() in RESERVED else argument.name


def table_module() -> str:
    """The texts: names, summaries, arguments, results."""
    table = FUNCTIONS.values()
    parts = [
        'Attribute VB_Name = "MoleTable"',
        MADE,
        "Option Explicit",
        "Option Private Module",
        "",
        f"Public Const CATEGORY As String = {_text(CATEGORY)}",
        "",
        "Public Function Names() As Variant",
        f"    Names = Array({', '.join(_text(f.name) for f in table)})",
        "End Function",
        "",
        *_choice("Signature", {f.name: _text(_typed(f.signature)) for f in table}),
        *_choice("Summary", {f.name: _text(f.summary) for f in table}),
        *_choice("Result", {f.name: _text(f.result) for f in table}),
        *_choice("ArgumentNames", {f.name: _array([a.name for a in f.arguments]) for f in table}),
        *_choice("ArgumentHelp", {f.name: _array([a.help for a in f.arguments]) for f in table}),
    ]
    return "\n".join(parts)


def _choice(name: str, values: dict[str, str]) -> list[str]:
    lines = [
        f"Public Function {name}(ByVal functionName As String) As Variant",
        "    Select Case functionName",
    ]
    for key, value in values.items():
        lines += [f"        Case {_text(key)}", f"            {name} = {value}"]
    return [*lines, "    End Select", "End Function", ""]


def _array(texts: list[str]) -> str:
    return "Array( _\n                " + ", _\n                ".join(_text(t) for t in texts) + ")"


def _text(text: str) -> str:
    """A text constant; a text that Excel would refuse stops the build."""
    if len(text) > LONGEST_TEXT:
        raise SystemExit(f"longer than the {LONGEST_TEXT} characters that Excel takes: {text}")
    return '"' + text.replace('"', '""') + '"'


def _typed(signature: str) -> str:
    return signature.replace("…", ", ...")
