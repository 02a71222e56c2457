"""Stiff and larger published problems (section B of the list), added to CHECKS."""

import json
from pathlib import Path

from external_calls import feed, laws
from external_cases import CHECKS, check, tank, tube

__all__ = ["CHECKS"]

STIFF = 1e-6
DIGITS = json.loads((Path(__file__).parent / "stiff.json").read_text(encoding="utf-8"))

# B: stiff and larger
ROBER = laws(("A -> B", "k1*A", {"k1": 0.04}), ("2 B -> B + C", "k2*B^2", {"k2": 3e7}), ("B + C -> A + C", "k3*B*C", {"k3": 1e4}),
             k1="1/s", k2="L/(mol s)", k3="L/(mol s)")  # fmt: skip
ABC = feed("mol/L", A=1.0, B=0.0, C=0.0)
for tau, row in ((0.4, ("9.851721139e-01", "3.386395379e-05", "1.479402219e-02")),
                 (40.0, ("7.158270687e-01", "9.185534765e-06", "2.841637457e-01")),
                 (4000.0, ("1.832022578e-01", "8.942371253e-07", "8.167968480e-01")),
                 (4e5, ("4.938274521e-03", "1.984994088e-08", "9.950617056e-01")),
                 (4e7, ("5.203071844e-05", "2.081335732e-10", "9.999479691e-01")),
                 (4e9, ("5.208276611e-07", "2.083311717e-12", "9.999994792e-01"))):  # fmt: skip
    for name, expected in zip("ABC", row, strict=True):
        check("B01-between", f"{name}, tau = {tau:g} s", expected, tube(ROBER, ABC, tau, name), rel=STIFF)
for name, expected in zip("ABC", DIGITS["tubes"]["ROBER"], strict=True):
    check("B01", f"{name}, tau = 1e11 s", expected, tube(ROBER, ABC, 1e11, name), rel=STIFF)
for tau in ("1", "100", "10000", "1000000", "100000000000"):
    for name, expected in zip("ABC", DIGITS["tanks"][f"ROBER_{tau}"], strict=True):
        check(
            "B01-tank",
            f"{name}, tau = {float(tau):g} s",
            expected,
            tank(ROBER, ABC, float(tau), name),
            rel=1e-9,
        )

HIRES = tuple((equation, law) for equation, law in (
    ("0 -> y1", "0.0007"), ("y1 -> y2", "1.71*y1"), ("y2 -> y1", "0.43*y2"), ("y2 -> y4", "8.32*y2"), ("y3 -> y1", "8.32*y3"),
    ("y3 -> y4", "1.71*y3"), ("y4 -> y3", "0.43*y4"), ("y4 -> y6", "0.69*y4"), ("y5 -> y3", "0.035*y5"),
    ("y5 -> y6", "1.71*y5"), ("y6 -> y5", "0.43*y6"), ("y7 -> y5 + y8", "0.43*y7"), ("y7 -> y6 + y8", "0.69*y7"),
    ("y7 -> y8", "0.69*y7"), ("y6 + y8 -> y7", "280*y6*y8")))  # fmt: skip
HIRES_TABLE = (("Reaction", "Rate"), *HIRES)
EIGHT = feed(**{f"y{i}": {1: 1.0, 8: 0.0057}.get(i, 0.0) for i in range(1, 9)})
for i in range(8):
    check(
        "B02",
        f"y{i + 1}, tau = 321.8122",
        DIGITS["tubes"]["HIRES"][i],
        tube(HIRES_TABLE, EIGHT, 321.8122, f"y{i + 1}"),
        rel=STIFF,
    )
    check(
        "B02-tank",
        f"y{i + 1}, tau = 10",
        DIGITS["tanks"]["HIRES_10"][i],
        tank(HIRES_TABLE, EIGHT, 10.0, f"y{i + 1}"),
        rel=1e-9,
    )

POLLU = """1>2+3 .35;2+4>1 26.6;5+2>6+1 1.23e4;7>2*5+8 8.6e-4;7>8 8.2e-4;7+6>5+8 1.5e4;9>10+8+5 1.3e-4;9+6>11 2.4e4;
11+2>10+12+1 1.65e4;11+1>13 9e3;13>11+1 .022;10+2>14+1 1.2e4;14>7+5 1.88;1+6>15 1.63e4;3>4 4.8e6;4>16 3.5e-4;4>3 .0175;
16>2*6 1e8;16>3 4.44e11;17+6>18+5 1.24e3;19>2 2.1;19>1+3 5.78;1+4>19 .0474;19+1>20 1.78e3;20>19+1 3.12"""


def side(text):
    return " + ".join(
        f"{t.split('*')[0]} y{t.split('*')[1]}" if "*" in t else f"y{t}" for t in text.split("+")
    )


rows = [item.split() for item in POLLU.replace("\n", "").split(";")]
POLLU_TABLE = (
    ("Reaction", "k"),
    *((f"{side(e.split('>')[0])} -> {side(e.split('>')[1])}", float(k)) for e, k in rows),
)
TWENTY = feed(
    **{f"y{i}": {2: 0.2, 4: 0.04, 7: 0.1, 8: 0.3, 9: 0.01, 17: 0.007}.get(i, 0.0) for i in range(1, 21)}
)
for i in range(20):
    if float(DIGITS["tubes"]["POLLU"][i]) > 1e-12 * 0.3:
        check(
            "B03",
            f"y{i + 1}, tau = 60",
            DIGITS["tubes"]["POLLU"][i],
            tube(POLLU_TABLE, TWENTY, 60.0, f"y{i + 1}"),
            rel=STIFF,
        )
    check(
        "B03-tank",
        f"y{i + 1}, tau = 60",
        DIGITS["tanks"]["POLLU_60"][i],
        tank(POLLU_TABLE, TWENTY, 60.0, f"y{i + 1}"),
        rel=1e-9,
    )

Q = 77.27
OREGO = (("Species", "Feed", "a", "b", "c", "d", "e"),
         ("y1", 1.0, Q, Q, -Q * 8.375e-6, -Q, None), ("y2", 2.0, -1 / Q, None, None, -1 / Q, 1 / Q),
         ("y3", 3.0, None, 0.161, None, None, -0.161), ("Rate", None, "y2", "y1", "y1^2", "y1*y2", "y3"))  # fmt: skip
for i in range(3):
    check(
        "B04",
        f"y{i + 1}, tau = 360",
        DIGITS["tubes"]["OREGO"][i],
        tube(OREGO, None, 360.0, f"y{i + 1}"),
        rel=STIFF,
    )

E5 = laws(("y1 -> y2 + y3", "k1*y1", {"k1": 7.89e-10}), ("y2 + y3 -> waste", "k2*y2*y3", {"k2": 1.13e9}),
          ("y1 + y3 -> y4", "k3*y1*y3", {"k3": 1.1e7}), ("y4 -> y3", "k4*y4", {"k4": 1.13e3}))  # fmt: skip
FOUR = feed(y1=1.76e-3, y2=0.0, y3=0.0, y4=0.0, waste=0.0)
for tau, row in ((1e3, ("1.6180769999e-03", "1.38223703050e-10", "8.25157350068e-12")),
                 (1e5, ("7.4813208224e-06", "2.37347815612e-12", "2.21235866896e-12")),
                 (1e7, ("4.7150333630e-10", "1.81888958608e-14", "1.81888123768e-14")),
                 (1e9, ("3.1317148329e-14", "1.48409579529e-16", "1.48409579483e-16")),
                 (1e11, (None, "1.01925825681e-20", "1.01925825681e-20")),
                 (1e13, (None, "8.86123352129e-23", "8.86123352129e-23"))):  # fmt: skip
    for name, expected in zip(("y1", "y2", "y3"), row, strict=True):
        if expected:
            check("B05", f"{name}, tau = {tau:g} s", expected, tube(E5, FOUR, tau, name), rel=STIFF)
