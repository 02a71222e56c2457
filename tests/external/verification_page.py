"""The page docs/verification.md from the checks, their sources and what we got."""

from math import ceil, log10

HEAD = """\
# Verification

Written by the test run (`uv run pytest`); do not edit.

Each number below was asked from a worksheet function, with tables as they are typed on a sheet. "Expected"
has the digits of the source. "Agreement" is an upper bound of the relative difference, as a power of ten;
`exact` is no difference at all. Where a source says "from memory", constants or printed answers were
remembered, not looked up, and the value was computed from them by an independent method.
"""


def agreement(got: float, expected: float) -> str:
    """The relative difference, rounded up to a power of ten; the last digits depend on the machine."""
    if got == expected:
        return "exact"
    error = abs(got - expected) / abs(expected) if expected else abs(got)
    return f"1e{max(ceil(log10(error)), -13)}"


def page(checks, sources, got) -> str:
    """The whole page; cases in the order of the checks."""
    lines = [HEAD]
    for case in dict.fromkeys(c.case for c in checks):
        lines += [f"## {case}: {sources[case]['title']}", "", f"Source: {sources[case]['source']}", "",
                  "| quantity | function | expected | got | agreement |", "|---|---|---|---|---|"]  # fmt: skip
        for c in checks:
            if c.case == case:
                ours, expected = got[c.case, c.what], float(c.expected)
                lines.append(
                    f"| {c.what} | `{c.ask.function}` | {c.expected} | {ours:.9g} | {agreement(ours, expected)} |"
                )
        lines.append("")
    return "\n".join(lines)
