"""Calls written as VBScript, an independent late-bound client as the add-in's VBA is one; and what it printed.

Wine's engine has neither ChrW nor AscW: what is written must be ASCII, what is printed has a ? for other letters.
"""

import json

__all__ = ["parsed", "script"]

HEAD = r"""
Option Explicit
Dim server
Set server = GetObject("new:" & WScript.Arguments(0))

Function Escaped(text)
  Dim i, code
  Escaped = ""
  For i = 1 To Len(text)
    code = Asc(Mid(text, i, 1))
    If code > 126 Or code < 0 Then
      Escaped = Escaped & "?"
    ElseIf code < 32 Or code = 34 Or code = 92 Then
      Escaped = Escaped & "\u" & Right("000" & Hex(code), 4)
    Else
      Escaped = Escaped & Chr(code)
    End If
  Next
End Function

Function Shown(value)
  Select Case VarType(value)
    Case 8: Shown = Chr(34) & Escaped(value) & Chr(34)
    Case 11
      Shown = LCase(CStr(value))
    Case 0, 1: Shown = "null"
    Case 10: Shown = "{""error"": true}"
    Case Else
      Shown = CStr(value)
  End Select
End Function

Function Rank(value)
  Dim n
  Rank = 0
  If Not IsArray(value) Then Exit Function
  Rank = 1
  On Error Resume Next
  n = UBound(value, 2)
  If Err.Number = 0 Then Rank = 2
End Function

Sub Tell(value)
  Dim i, j, line
  Select Case Rank(value)
    Case 0: WScript.Echo Shown(value)
    Case 1
      line = ""
      For j = LBound(value) To UBound(value): line = line & "," & Shown(value(j)): Next
      WScript.Echo "[" & Mid(line, 2) & "]"
    Case Else
      WScript.Echo "rows " & (UBound(value, 1) - LBound(value, 1) + 1)
      For i = LBound(value, 1) To UBound(value, 1)
        line = ""
        For j = LBound(value, 2) To UBound(value, 2): line = line & "," & Shown(value(i, j)): Next
        WScript.Echo "[" & Mid(line, 2) & "]"
      Next
  End Select
End Sub
"""


def _literal(cell) -> str:
    if cell is None:
        return "Empty"
    if isinstance(cell, bool):
        return str(cell)
    if isinstance(cell, int | float):
        return f'CDbl("{float(cell)!r}")'
    if isinstance(cell, dict):
        ((kind, value),) = cell.items()
        assert kind == "date"
        return f"#{value[:10]}#"
    assert cell.isascii(), cell
    return '"' + cell.replace('"', '""') + '"'


def script(module: str, calls) -> str:
    """The text of a script that makes the calls in turn; a call is (name, arguments).

    Its arguments: the class id of the server; where ranges are asked for, that of the program that gives them.
    """
    lines = [HEAD]
    if any("range" in a for _, arguments in calls for a in arguments if isinstance(a, dict)):
        lines.append('Dim ranges\nSet ranges = GetObject("new:" & WScript.Arguments(1))')
    given = 0
    for n, (name, arguments) in enumerate(calls):
        names = []
        for k, argument in enumerate(arguments):
            if isinstance(argument, dict) and "block" in argument:
                rows = argument["block"]
                lines.append(f"Dim t{n}_{k}({len(rows) - 1}, {len(rows[0]) - 1})")
                lines += [
                    f"t{n}_{k}({i}, {j}) = {_literal(c)}"
                    for i, row in enumerate(rows)
                    for j, c in enumerate(row)
                ]
                names.append(f"t{n}_{k}")
            elif isinstance(argument, dict) and "range" in argument:
                names.append(f"ranges.Item({given})")
                given += 1
            elif argument == {"left out": True}:
                names.append('Chr(1) & "left out"')  # as the add-in's VBA says it
            else:
                names.append(_literal(argument))
        lines.append(f'Tell server.CallUDF("{module}", "{name}", Array({", ".join(names)}))')
    return "\r\n".join("\n".join(lines).splitlines()) + "\r\n"


def parsed(printed: str) -> list:
    """The values that a script printed, in the order of its calls."""
    values, lines = [], iter(printed.splitlines())
    for line in lines:
        if line.startswith("rows "):
            values.append([json.loads(next(lines)) for _ in range(int(line[5:]))])
        elif line.strip():
            values.append(json.loads(line))
    return values
