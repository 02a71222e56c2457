"""Calls functions with Range objects: ranges.py CLASS_ID CALLS.json RESULTS.json

The objects are the least of Excel's Range that xlwings needs, served from this process. What makes one pass
for a Range is its type information: xlwings compares the IID of the object's type with Excel's Range. Written
on the model of measurements made before this project.
"""

import datetime as dt
import decimal
import json
import os
import sys
import tempfile

import pythoncom
import pywintypes
import win32com.client
from calls import MODULE
from win32com.client import VARIANT
from win32com.server import policy, util
from wire import decoded

TYPES = {
    "Range": "{00020846-0000-0000-C000-000000000046}",
    "_Worksheet": "{000208D8-0000-0000-C000-000000000046}",
    "_Workbook": "{000208DA-0000-0000-C000-000000000046}",
    "_Application": "{000208D5-0000-0000-C000-000000000046}",
}


def type_information():
    """Types with the IIDs of Excel's own."""
    path = os.path.join(tempfile.mkdtemp(), "types.tlb")
    library = pythoncom.CreateTypeLib2(3, path)  # 3: SYS_WIN64
    library.SetGuid(pywintypes.CreateGuid())
    library.SetVersion(1, 0)
    library.SetName("StandIn")
    library.SetLcid(0)
    for name, iid in TYPES.items():
        info = library.CreateTypeInfo(name, pythoncom.TKIND_DISPATCH)
        info.SetGuid(pywintypes.IID(iid))
        info.SetTypeFlags(0x1000)
        info.LayOut()
    library.SaveAllChanges()
    loaded = pythoncom.LoadTypeLib(path)
    return {loaded.GetDocumentation(i)[0]: loaded.GetTypeInfo(i) for i in range(loaded.GetTypeInfoCount())}


INFORMATION = type_information()


class Policy(policy.DesignatedWrapPolicy):
    def _wrap_(self, ob):
        super()._wrap_(ob)
        self._typeinfos_ = [INFORMATION[ob.kind]]


def served(ob):
    return util.wrap(ob, usePolicy=Policy)


class Object:
    """An object with fixed properties."""

    _public_methods_ = ()

    def __init__(self, kind, **properties):
        self.kind = kind
        self.__dict__.update(properties)
        self._public_attrs_ = list(properties)


def sheet():
    application = served(Object("_Application", Hwnd=0, Version="16.0", Visible=True))
    book = served(
        Object(
            "_Workbook",
            Name="Book1.xlsx",
            FullName="C:\\x\\Book1.xlsx",
            Application=application,
            Path="C:\\x",
        )
    )
    return served(Object("_Worksheet", Name="Design", Parent=book, Application=application, Index=1))


class Range(Object):
    """A range over a block of cells."""

    def __init__(self, rows, areas):
        def count(n):
            return served(Object("Range", Count=n))

        on = sheet()
        super().__init__("Range", Areas=count(areas), Row=1, Column=1, Rows=count(len(rows)), Columns=count(len(rows[0])),
                         Count=len(rows) * len(rows[0]), Worksheet=on, Parent=on)  # fmt: skip
        self._public_attrs_ += ["Value", "Value2"]
        self.cells = rows

    def _of(self, cell):
        block = [[cell(c) for c in row] for row in self.cells]
        return block[0][0] if self.Count == 1 else block

    @property
    def Value(self):  # noqa: N802
        def sent(cell):
            if isinstance(cell, Money):
                return decimal.Decimal(cell)
            return VARIANT(pythoncom.VT_EMPTY, None) if cell is None else cell

        return self._of(sent)

    @property
    def Value2(self):  # noqa: N802
        return self._of(lambda c: float(c.exact) if isinstance(c, Money) else c)


class Money(decimal.Decimal):
    """What Value gives for a cell formatted as a currency: four decimals. `exact` is what the cell holds."""

    exact = 0.0


class Make:
    @staticmethod
    def error(code):
        return VARIANT(pythoncom.VT_ERROR, code - (1 << 32))

    @staticmethod
    def date(text):
        return pywintypes.Time(dt.datetime.fromisoformat(text).replace(tzinfo=dt.UTC))

    @staticmethod
    def currency(value):
        money = Money(f"{value:.4f}")
        money.exact = value
        return money

    @staticmethod
    def block(rows):
        return rows

    @staticmethod
    def range(rows):
        areas = (
            rows[0].pop() if isinstance(rows[0][-1], str) and rows[0][-1].startswith("areas=") else "areas=1"
        )
        return served(Range(rows, int(areas[6:])))


if __name__ == "__main__":
    class_id, asked, told = sys.argv[1:]
    server = win32com.client.Dispatch(
        pythoncom.CoCreateInstance(
            pywintypes.IID(class_id), None, pythoncom.CLSCTX_LOCAL_SERVER, pythoncom.IID_IDispatch
        )
    )
    with open(asked, encoding="utf-8") as f:
        calls = json.load(f)
    results = []
    for name, arguments in calls:
        try:
            results.append(["ok", server.CallUDF(MODULE, name, [decoded(a, Make) for a in arguments])])
        except pythoncom.com_error as error:
            results.append(["failed", str(error)])
    with open(told, "w", encoding="utf-8") as f:
        json.dump(results, f)
