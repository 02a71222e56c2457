"""Checks against the outside: closed forms, published endpoints, worked numbers of the literature.

The source of each case stands in sources.json. Digits are as the source gives them; the accepted error
is that of the method asked (tanks 1e-10, tubes 1e-8, stiff tubes 1e-6) or half a unit of the last digit
given, whichever is larger.
"""

from external_calls import Call, Check, feed, laws, vessel

TANK, TUBE = 1e-10, 1e-8
CHECKS: list[Check] = []


def check(case, what, expected, ask, rel=None):
    rel = rel or {"MOLE_CSTR": TANK, "MOLE_PFR": TUBE, "MOLE_RATES": TANK}[ask.function]
    digits = expected.lower().partition("e")[0].replace("-", "").replace(".", "").lstrip("0")
    # as many trailing zeros as a closed form has, an integer or short decimal is exact
    shown = 0.5 * 10.0 ** -(len(digits) - 1) if len(digits) >= 9 else 0.0
    CHECKS.append(Check(case, what, expected, max(rel, shown), ask))


def tank(reactions, fed, reactor, want, chain=1, constants=None):
    return Call("MOLE_CSTR", reactions, fed, reactor, want, constants, chain)


def tube(reactions, fed, reactor, want, constants=None):
    return Call("MOLE_PFR", reactions, fed, reactor, want, constants)


def power(order, k, unit):
    return laws(("A -> B", f"k*A^{order}" if order >= 0 else f"k*A^({order})", {"k": k}), k=unit)


AB = feed("mol/L", A=2.0, B=0.0)

# A01: zero order
ZERO = laws(("A -> B", "k", {"k": 0.1}), k="mol/(L min)")
for tau, c, x in ((12.0, "0.8", "0.6"), (20.0, "0", "1"), (25.0, "0", "1")):
    for name, kind in (("CSTR", tank), ("PFR", tube)):
        check("A01", f"CA, {name}, tau = {tau:g} min", c, kind(ZERO, AB, tau, "A"))
        check("A01", f"conversion, {name}, tau = {tau:g} min", x, kind(ZERO, AB, tau, "conversion(A)"))

# A02: half order
HALF = power(0.5, 0.1, "(mol/L)^0.5/min")
check("A02", "CA, PFR, tau = 12 min", "0.662943725152", tube(HALF, AB, 12.0, "A"))
check("A02", "CA, CSTR, tau = 12 min", "0.876525020512", tank(HALF, AB, 12.0, "A"))
check("A02", "CA, PFR, tau = 30 min (exhausted)", "0", tube(HALF, AB, 30.0, "A"))
check("A02", "CA, CSTR, tau = 30 min", "0.315341561574", tank(HALF, AB, 30.0, "A"))

# A03, A04: first and second order, n tanks
FIRST = power(1, 0.1, "1/min")
SECOND = power(2, 0.1, "L/(mol min)")
check("A03", "CA, CSTR", "0.909090909091", tank(FIRST, AB, 12.0, "A"))
check("A03", "CA, PFR", "0.602388423824", tube(FIRST, AB, 12.0, "A"))
check("A04", "CA, CSTR", "0.939901716342", tank(SECOND, AB, 12.0, "A"))
check("A04", "CA, PFR", "0.588235294118", tube(SECOND, AB, 12.0, "A"))
SERIES = {
    "A03": (FIRST, {2: "0.78125", 3: "0.728862973761", 5: "0.682215480298", 10: "0.643946473181",
                    100: "0.606706636161", 1000: "0.602821952753"}),
    "A04": (SECOND, {2: "0.794684768087", 3: "0.734577475794", 5: "0.680850791551", 10: "0.636611142365",
                     100: "0.59328991235", 1000: "0.588743165063"}),
}  # fmt: skip
for case, (reactions, expected) in SERIES.items():
    for n, c in expected.items():
        check(case, f"CA after {n} equal CSTRs", c, tank(reactions, AB, 12.0 / n, "A", chain=n))
TWICE = laws(("2 A -> B", "k*A^2", {"k": 0.1}), k="L/(mol min)")
check("A04", "CA, PFR, 2 A -> B at r = k A^2", "0.344827586207", tube(TWICE, AB, 12.0, "A"))
check("A04", "CA, CSTR, 2 A -> B at r = k A^2", "0.728008543927", tank(TWICE, AB, 12.0, "A"))

# A05: A + B -> P
ABP = laws(("A + B -> P", "", {"k": 0.1}), k="L/(mol min)")
FED = feed("mol/L", A=2.0, B=3.0, P=0.0)
check("A05", "X, PFR", "0.874377395027", tube(ABP, FED, 12.0, "conversion(A)"))
check("A05", "CA, PFR", "0.251245209946", tube(ABP, FED, 12.0, "A"))
check("A05", "CB, PFR", "1.25124520995", tube(ABP, FED, 12.0, "B"))
check("A05", "X, CSTR", "0.6666666666666667", tank(ABP, FED, 12.0, "conversion(A)"))

# A06: any order
ORDERS = {0.25: ("1.32043460051", "1.35290495777"), 0.75: ("1.16629508656", "1.27856949246"),
          1.5: ("0.98593653354", "1.20567646943"), 2.5: ("0.86014455159", "1.14967223621"),
          3: ("0.830454798537", "1.13129104494"), -1: ("1.67332005307", None)}  # fmt: skip
for n, (in_tube, in_tank) in ORDERS.items():
    reactions = power(n, 0.05, f"(mol/L)^{1 - n:g}/min")
    check("A06", f"CA, PFR, order {n:g}", in_tube, tube(reactions, AB, 12.0, "A"))
    if in_tank:
        check("A06", f"CA, CSTR, order {n:g}", in_tank, tank(reactions, AB, 12.0, "A"))


# A07: A -> B -> C
def steps(k1, k2):
    return laws(("A -> B", "k*A", {"k": k1}), ("B -> C", "k*B", {"k": k2}), k="1/h")


ONE = feed("mol/L", A=1.0, B=0.0, C=0.0)
S = steps(0.5, 0.2)
check("A07", "CB/CA0, PFR, tau = 4 h", "0.523322801468", tube(S, ONE, 4.0, "B"))
check("A07", "CC/CA0, PFR, tau = 4 h", "0.341341915296", tube(S, ONE, 4.0, "C"))
check("A07", "CB/CA0, CSTR, tau = 4 h", "0.37037037037", tank(S, ONE, 4.0, "B"))
check("A07", "CB/CA0, 3 CSTRs, total tau = 4 h", "0.460090392185", tank(S, ONE, 4.0 / 3, "B", chain=3))
check("A07", "CB/CA0 at the best tau, PFR", "0.542883523319", tube(S, ONE, 3.05430243958, "B"))
check("A07", "CB/CA0 at the best tau, CSTR", "0.375247044257", tank(S, ONE, 3.16227766017, "B"))
for n, (tau, c) in {2: (3.1257574515, "0.442208285726"), 3: (3.10768174317, "0.470883664948"),
                    5: (3.08974142126, "0.496996813171"), 10: (3.07355706633, "0.518811860134")}.items():  # fmt: skip
    check("A07", f"CB/CA0 at the best tau, {n} CSTRs", c, tank(S, ONE, tau / n, "B", chain=n))
check("A07", "CB/CA0, PFR, k1 = k2, tau = 2 h", "0.367879441171", tube(steps(0.5, 0.5), ONE, 2.0, "B"))
check("A07", "CB/CA0, CSTR, k1 = k2, tau = 2 h", "0.25", tank(steps(0.5, 0.5), ONE, 2.0, "B"))

# A08: parallel, first and second order; units of k in columns of their own
PARALLEL = (
    ("Reaction", "Rate", "k", "k unit"),
    ("A -> R", "k*A", 0.3, "1/min"),
    ("A -> S", "k*A^2", 0.2, "L/(mol min)"),
)
ARS = feed("mol/L", A=2.0, R=0.0, S=0.0)
for what, c in (
    ("A", "0.219203517868"),
    ("[R]", "1.06635278389"),
    ("S", "0.714443698241"),
    ("[R]/(in(A) - A)", "0.598806654545"),
):
    check("A08", f"{what}, PFR", c, tube(PARALLEL, ARS, 5.0, what))
for what, c in (("A", "0.637458608818"), ("[R]", "0.956187913227"), ("[R]/(in(A) - A)", "0.701767975208")):
    check("A08", f"{what}, CSTR", c, tank(PARALLEL, ARS, 5.0, what))

# A09, A10: reversible
AR = (("Reaction", "k [1/min]", "Keq"), ("A <-> R", 0.4, 4.0))
FED = feed("mol/L", A=2.0, R=0.3)
check("A09", "CA, PFR", "0.803620446629", tube(AR, FED, 3.0, "A"))
check("A09", "CR, PFR", "1.49637955337", tube(AR, FED, 3.0, "[R]"))
check("A09", "CA, CSTR", "1.076", tank(AR, FED, 3.0, "A"))
check("A09", "CA, PFR, tau = 1000 min (equilibrium)", "0.46", tube(AR, FED, 1000.0, "A"))
check("A09", "X, CSTR, tau = 1e15 min (equilibrium)", "0.77", tank(AR, FED, 1e15, "conversion(A)"))
ESTER = (("Reaction", "k", "k unit", "Keq"), ("A + B <-> C + D", 0.5, "L/(mol h)", 4.0))
FED = feed("mol/L", A=1.0, B=1.5, C=0.1, D=0.2)
check("A10", "extent, PFR", "0.711037577178", tube(ESTER, FED, 4.0, "in(A) - A"))
check("A10", "extent, CSTR", "0.563673432026", tank(ESTER, FED, 4.0, "in(A) - A"))
check("A10", "extent at equilibrium, PFR, tau = 1e6 h", "0.740136528314", tube(ESTER, FED, 1e6, "in(A) - A"))

# A14: saturation kinetics, constants in a table of their own
MM = (("Reaction", "Rate"), ("S -> P", "Vmax*S/(Km + S)"))
MMC = (("Name", "Value", "Unit"), ("Vmax", 0.5, "mol/(L min)"), ("Km", 0.8, "mol/L"))
SP = feed("mol/L", S=2.0, P=0.0)
check("A14", "S, PFR, tau = 4 min", "0.766869085383", tube(MM, SP, 4.0, "S", MMC))
check("A14", "S, CSTR, tau = 4 min", "0.926649916142", tank(MM, SP, 4.0, "S", constants=MMC))
check("A14", "X at the tau for 95 %, PFR", "0.95", tube(MM, SP, 8.59317163769, "conversion(S)", MMC))
check("A14", "X at the tau for 95 %, CSTR", "0.95", tank(MM, SP, 34.2, "conversion(S)", constants=MMC))

# A18: limits of the recycle tube
KT = power(1, 2.5, "1/min")
check("A18", "C/C0, R = 0, first order", "0.0820849986239", tube(KT, AB, 1.0, "A/in(A)"))
check("A18", "C/C0, R -> infinity, first order", "0.285714285714", tank(KT, AB, 1.0, "A/in(A)"))
AUTO = laws(("A + B -> 2 B", "k*A*B", {"k": 1.0}), k="L/(mol min)")
check("A18", "X, autocatalytic tank at k CA0 tau = 100, started with product", "0.99",
      tank(AUTO, feed("mol/L", start={"A": 0.5, "B": 0.5}, A=1.0, B=0.0), 100.0, "conversion(A)"))  # fmt: skip

# A29: van 't Hoff at a given temperature
EQ = (("Reaction", "k [1/s]", "Keq", "dH [kJ/mol]", "Keq T ref [K]"), ("A <-> R", 1.0, 300.0, -75.3, 298.0))
check("A29", "Xe at 338 K", "0.891602778943",
      tank(EQ, feed("mol/L", A=1.0, R=0.0), vessel(Residence_time=(1e15, "s"), Temperature=(338.0, "K")), "conversion(A)"))  # fmt: skip

# A30, A31: two vessels in series; X1 at the best split, and the order of tank and tube
X1 = power(1, 1.0, "1/s")
check("A30", "C/C0 of two equal CSTRs at the total k tau for 95 %", "0.05",
      tank(X1, feed("mol/L", A=1.0, B=0.0), 6.94427191 / 2, "A", chain=2), rel=1e-9)  # fmt: skip
check("A30", "X of one CSTR, second order, at k CA0 tau = 380", "0.95",
      tank(power(2, 1.0, "L/(mol s)"), feed("mol/L", A=1.0, B=0.0), 380.0, "conversion(A)"))  # fmt: skip
check("A30", "X of a PFR, second order, at k CA0 tau = 19", "0.95",
      tube(power(2, 1.0, "L/(mol s)"), feed("mol/L", A=1.0, B=0.0), 19.0, "conversion(A)"))  # fmt: skip
SECOND_S = power(2, 3.0, "L/(mol s)")
check("A31", "PFR after a CSTR at its outlet, C/C0", "0.188580484696",
      tube(SECOND_S, feed("mol/L", A=0.43425854591066488, B=0.0), 1.0, "A"))  # fmt: skip
check("A31", "CSTR after a PFR at its outlet, C/C0", "0.16666666666666667",
      tank(SECOND_S, feed("mol/L", A=0.25, B=0.0), 1.0, "A"))  # fmt: skip


# A35, F06: Arrhenius through the rate of a first-order law, k = r/C
def arrhenius(k, energy, reference, at, unit="kJ/mol", kelvin="K"):
    table = (("Reaction", "k [1/s]", f"E [{unit}]", f"T ref [{kelvin}]"), ("A -> B", k, energy, reference))
    return Call("MOLE_CSTR", table, feed("mol/L", A=1.0, B=0.0),
                vessel(Residence_time=(1.0, "s"), Temperature=(at, kelvin)), "(in(A) - A)/A")  # fmt: skip


check(
    "A35",
    "k(310 K) by E/R in K",
    "0.0229487329359",
    arrhenius(0.01, 7725.30197968, 300.0, 310.0, "K"),
    rel=1e-9,
)
check("A35", "k(320 K) by E in kJ/mol", "0.05", arrhenius(0.01, 64.231734524, 300.0, 320.0), rel=1e-9)
PRE = (("Reaction", "k0 [1/s]", "E [kJ/mol]"), ("A -> B", 2.718281828459045**21.145836413, 64.231734524))
check("A35", "k(300 K) by k0", "0.01", Call("MOLE_CSTR", PRE, feed("mol/L", A=1.0, B=0.0),
      vessel(Residence_time=(1.0, "s"), Temperature=(300.0, "K")), "(in(A) - A)/A"), rel=2e-9)  # fmt: skip
check("F06", "k ratio 310/300 K, E = 50 kJ/mol", "1.90908785421", arrhenius(1.0, 50.0, 300.0, 310.0))
check(
    "F06",
    "k ratio 37/27 degC, E = 50 kJ/mol",
    "1.90787458133",
    arrhenius(1.0, 50.0, 27.0, 37.0, kelvin="degC"),
)
check("F06", "k ratio, E = 11950.286 cal/mol", "1.90908785421",
      arrhenius(1.0, 50.0 / 4.184, 300.0, 310.0, "kcal/mol"))  # fmt: skip
check("F06", "E for doubling, 300 to 310 K", "2", arrhenius(1.0, 53.5972607913, 300.0, 310.0), rel=1e-10)

# F03: the same k in other units, orders 0 to 3: outlets agree
for n in (0, 0.5, 1, 1.5, 2, 2.5, 3):
    factor = {0: "16.6666666667", 0.5: "0.527046276695", 1: "0.0166666666667", 1.5: "5.27046276695e-4",
              2: "1.66666666667e-5", 2.5: "5.27046276695e-7", 3: "1.66666666667e-8"}[n]  # fmt: skip
    american = {0: "3.74567763457", 0.5: "14.9913527767", 1: "60", 1.5: "240.138435379", 2: "961.107802438",
                2.5: "3846.6487318", 3: "15395.4701318"}[n]  # fmt: skip
    for unit, conc, expected, time in (
        ("(m^3/mol)^{}/s", "mol/m3", factor, 60.0), ("(ft^3/lbmol)^{}/h", "lbmol/ft3", american, 1 / 60)
    ):  # fmt: skip
        # the rate at C = 1 of the unit asked, from a k of 1 (L/mol)^(n-1)/min, is that k in the unit asked
        table = laws(("A -> B", f"k*A^{n:g}", {"k": 1.0}), k=f"(L/mol)^{n - 1:g}/min")
        ask = Call("MOLE_CSTR", table, feed(conc, A=1.0, B=0.0), vessel(Residence_time=(1e-13, "min")), "B")
        check("F03", f"order {n:g}: 1 (L/mol)^{n - 1:g}/min in {unit.format(f'{n - 1:g}')} (times tau)",
              repr(float(expected) * 1e-13 * time), ask)  # fmt: skip

# F05: rates per mass of catalyst
PER_MASS = laws(("A -> B", "k*A", {"k": 2e-3}), k="m^3/(kg s)")
check("F05", "k' rho_b = 1.6 1/s, tank at tau = 1 s", repr(1 / 2.6),
      tank(PER_MASS, feed("mol/L", A=1.0, B=0.0), vessel(Residence_time=(1.0, "s"), Bulk_density=(800.0, "kg/m^3")), "A"))  # fmt: skip
for what, fed, unit, expected in (
    ("ft3/lbmol in L/mol", "lbmol/ft3", "mol/L", "16.018463374"), ("25 degC in degR", None, None, "536.67")
):  # fmt: skip
    if fed:
        check(
            "F05", f"lbmol/ft3 in {unit}", expected, tank(FIRST, feed(fed, A=1.0, B=0.0), 0.0, f"A [{unit}]")
        )
    else:
        check("F05", what, expected, tank(FIRST, AB, vessel(Residence_time=(1.0, "min"), Temperature=(25.0, "degC")),
                                          "temperature [degR]"))  # fmt: skip

# C: literature examples at a given size
check("C03", "rate of disappearance of A from a tank, k chosen as in the data", "0.08",
      tank(laws(("A -> C", "k", {"k": 0.08}), k="mol/(L min)"), feed("mol/L", A=0.1, C=0.0),
           vessel(Volume=(1.0, "L"), Flow=(1.0, "L/min")), "(in(A) - A)/tau"))  # fmt: skip
RS = laws(("A + B -> R", "k*A^1.5*B^0.3", {"k": 1.0}), ("A + B -> S", "k2*A^0.5*B^1.8", {"k2": 1.0}),
          k="mol^-0.8 L^0.8 min^-1", k2="mol^-1.3 L^1.3 min^-1")  # fmt: skip
EQUAL_STREAMS = (("Species", "Feed acid [mol/L]", "Feed base [mol/L]"), ("A", 20.0, 0.0), ("B", 0.0, 20.0),
                 ("R", 0.0, 0.0), ("S", 0.0, 0.0), ("Flow [L/min]", 1.0, 1.0))  # fmt: skip
# equal amounts react, so A = B = C: tau = (10 - C)/(C^1.8 + C^2.3) for the tank at C = 1
check(
    "C04",
    "CR, mixed flow at 90 % conversion",
    "4.5",
    tank(RS, EQUAL_STREAMS, vessel(Residence_time=(4.5, "min")), "[R]"),
)
ENZYME = laws(("A -> B", "k*A/(1 + K*A)", {"k": 0.1, "K": 0.5}), k="1/min", K="L/mol")
check("C05", "X at V = 986.433 L and 25 L/min, PFR", "0.95",
      tube(ENZYME, AB, vessel(Volume=(986.433068388, "L"), Flow=(25.0, "L/min")), "conversion(A)"))  # fmt: skip
TRACER = power(1, 0.307, "1/min")
check("C07", "plug flow C/C0 at t = 15 min", "0.0100017020047", tube(TRACER, AB, 15.0, "A/in(A)"))
CHP = power(1, 4.12, "1/h")
check("C08", "X, CSTR of 36.998 m3 at 26.9 m3/h", "0.85",
      tank(CHP, AB, vessel(Volume=(36.998381877, "m3"), Flow=(26.9, "m3/h")), "conversion(A)"))  # fmt: skip
check("C08", "X, PFR of 12.387 m3 at 26.9 m3/h", "0.85",
      tube(CHP, AB, vessel(Volume=(12.3865358236, "m3"), Flow=(26.9, "m3/h")), "conversion(A)"))  # fmt: skip
HYDROLYSIS = power(1, 0.158, "1/min")
CM3 = vessel(Volume=(1800.0, "cm^3"), Flow=(582.0, "cm^3/min"))
for n, x in ((1, "0.328254847645"), (2, "0.548758450288"), (3, "0.69688067644")):
    # conversion over the whole chain: from the outlet concentration of the last tank
    check(
        "C10",
        f"CA/CA0 after {n} tank(s)",
        repr(1 - float(x)),
        tank(HYDROLYSIS, feed("mol/L", A=1.0, B=0.0), CM3, "A", chain=n),
    )
check("C10", "X, PFR of one tank's volume", "0.386552009702", tube(HYDROLYSIS, AB, CM3, "conversion(A)"))
# C12 with R = 8.314: E/R in K, so that the rounded R of the source is kept
OPT = (("Reaction", "Rate", "k0 [1/min]", "E [K]"), ("A -> Rev", "", 2.718281828459045**17.34, 48900.0 / 8.314),
       ("Rev -> A", "", 2.718281828459045**42.04, 124200.0 / 8.314))  # fmt: skip
check("C12", "X, CSTR of 2026.344 L at the best temperature", "0.8",
      tank(OPT, feed("mol/L", A=4.0, Rev=0.0), vessel(Volume=(2026.344, "L"), Flow=(250.0, "L/min"),
                                                      Temperature=(335.21633, "K")), "conversion(A)"), rel=2e-7)  # fmt: skip
DIELS = laws(("Q + D -> P", "k*Q*D", {"k": 9.92e-6}), k="m^3/(mol s)")
QD = feed("mol/m3", Q=80.0, D=100.0, P=0.0)
check("C13", "X, PFR", "0.875", tube(DIELS, QD, 4412.64484553, "conversion(Q)"))
check("C13", "X, one CSTR", "0.875", tank(DIELS, QD, 23521.5053763, "conversion(Q)"))
check("C13", "CQ, 2 equal CSTRs", "10", tank(DIELS, QD, 9978.28599528 / 2, "Q", chain=2))
check("C13", "CQ, 3 equal CSTRs", "10", tank(DIELS, QD, 7579.93401199 / 3, "Q", chain=3))
check("C13", "X, CSTR of 2.61089 m3 at 0.111 m3/ks", "0.875",
      tank(DIELS, QD, vessel(Volume=(2.61088709677, "m3"), Flow=(1.11e-4, "m3/s")), "conversion(Q)"))  # fmt: skip
VDV = (("Species", "Feed [mol/L]", "main", "on", "side"), ("A", 10.0, -1.0, None, -1.0), ("B", 0.0, 1.0, -1.0, None),
       ("C", 0.0, None, 1.0, None), ("D", 0.0, None, None, 0.5), ("Rate", None, "k*A", "k*B", "k*A^2"),
       ("k", None, 50.0, 100.0, 10.0), ("k unit", None, "1/h", "1/h", "L/(mol h)"))  # fmt: skip
for rate, a, b in ((240 / 7, "3", "1.1170212766"), (34.3, "3.00069296741", "1.11716044952"),
                   (50.0, "3.66025403784", "1.22008467928"), (77.5, "4.49425135416", "1.26598629695"),
                   (100.0, "5", "1.25"), (150.0, "5.81138830084", "1.16227766017"),
                   (172.463768116, None, "1.1170212766")):  # fmt: skip
    for name, expected in (("A", a), ("B", b)):
        if expected:
            check("C15", f"C{name} at F/V = {rate:.6g} 1/h", expected,
                  Call("MOLE_CSTR", VDV, None, vessel(Volume=(1.0, "L"), Flow=(rate, "L/h")), name))  # fmt: skip
for n, ratio in ((1, 21.4975768542), (2, 3.90865033713), (3, 2.3722829037), (4, 1.87813051231), (5, 1.64150983617),
                 (10, 1.27007942994)):  # fmt: skip
    total = ratio * 4.605170185988092
    check("C17", f"C/C0 of {n} CSTRs of {ratio} times the PFR volume", "0.01",
          tank(X1, feed("mol/L", A=1.0, B=0.0), total / n, "A", chain=n))  # fmt: skip

# D: several steady states; the start decides
CUBIC = laws(("A + 2 B -> 3 B", "k*A*B^2", {"k": 1.0}), k="L^2/(mol^2 min)")
for first, b in ((0.9, "1"), (1.9, "1"), (2.1, "3"), (3.2, "3")):
    fed = feed("mol/L", start={"A": 6.0 - first, "B": first}, A=60 / 11, B=6 / 11)
    check("D01", f"CB from a start with B = {first:g}", b, tank(CUBIC, fed, 1 / 11, "B"))
check(
    "D01", "CB from a vessel full of feed", "1", tank(CUBIC, feed("mol/L", A=60 / 11, B=6 / 11), 1 / 11, "B")
)
DECAY = laws(
    ("A + 2 B -> 3 B", "k*A*B^2", {"k": 1.0}), ("B -> C", "k2*B", {"k2": 0.025}), k="L^2/(mol^2 s)", k2="1/s"
)
BC = vessel(Residence_time=(100.0, "s"))
check(
    "D03",
    "extent without autocatalyst",
    "0",
    tank(DECAY, feed("mol/L", A=1.0, B=0.0, C=0.0), BC, "1 - A/in(A)"),
)
IGNITED = feed("mol/L", start={"A": 0.2, "B": 0.3, "C": 0.5}, A=1.0, B=0.0, C=0.0)
check("D03", "extent, ignited", "0.857071421427", tank(DECAY, IGNITED, BC, "1 - A/in(A)"))
check("D03", "b, ignited", "0.244877548979", tank(DECAY, IGNITED, BC, "B"))
for kappa, b0, tau, extent in (
    (0.025, 1 / 15, 10, "0.84040229"), (0.025, 1 / 15, 30, "0.90185383"), (0.025, 1 / 15, 100, "0.87967295"),
    (0.025, 1 / 15, 1000, "0.0082297456"), (0.02, 0.15, 10, "0.88061321"), (0.02, 0.15, 100, "0.92813676"),
    (0.08, 1 / 15, 100, "0.0065799582"),
):  # fmt: skip
    table = laws(
        ("A + 2 B -> 3 B", "k*A*B^2", {"k": 1.0}),
        ("B -> C", "k2*B", {"k2": kappa}),
        k="L^2/(mol^2 s)",
        k2="1/s",
    )
    check("D03b", f"extent, b0 = {b0:g}, kappa = {kappa:g}, T = {tau:g}", extent,
          tank(table, feed("mol/L", A=1.0, B=b0, C=0.0), vessel(Residence_time=(float(tau), "s")), "1 - A/in(A)"), rel=2e-7)  # fmt: skip
LHHW = laws(("C -> P", "k*C/(1 + K*C)^2", {"k": 1.0, "K": 1.0}), k="1/s", K="L/mol")
check(
    "D04",
    "u from a vessel full of feed",
    "10.3875793279",
    tank(LHHW, feed("mol/L", C=20.0, P=0.0), 120.0, "C"),
)
check("D04", "u from a reacted start", "0.261938798622",
      tank(LHHW, feed("mol/L", start={"C": 0.5, "P": 19.5}, C=20.0, P=0.0), 120.0, "C"))  # fmt: skip
check("D12", "CB, non-trivial state", "0.75",
      tank(AUTO, feed("mol/L", start={"A": 0.9, "B": 0.1}, A=1.0, B=0.0), 4.0, "B"))  # fmt: skip
check("D12", "CB, washout at k CA0 tau = 0.5", "0", tank(AUTO, feed("mol/L", A=1.0, B=0.0), 0.5, "B"))
