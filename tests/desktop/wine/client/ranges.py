"""Range objects without Excel: the least of its object model that xlwings needs.

    ranges.py call CLASS_ID CALLS.json RESULTS.json     calls functions with them from here
    ranges.py serve CLASS_ID BLOCKS.json                gives them to another program: server.Item(number)

What makes one pass for a Range is its type information: xlwings compares the IID of the object's type with
Excel's Range. Written on the model of measurements made before this project.
"""

import datetime as dt
import decimal
import json
import os
import sys
import tempfile

import pythoncom
import pywintypes
import win32api
import win32com.client
import win32event
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


class Ranges:
    """Ranges by number, for a program that can make none."""

    _public_methods_ = ("Item",)

    def __init__(self, blocks):
        self.blocks = blocks

    def Item(self, number):  # noqa: N802
        return decoded(self.blocks[int(number)], Make)


def call(class_id, asked, told):
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


def serve(class_id, file):
    """Serve until the last object is let go."""
    with open(file, encoding="utf-8") as f:
        blocks = json.load(f)
    own = pywintypes.IID(class_id)

    class Given(policy.DefaultPolicy):
        def _CreateInstance_(self, asked, iid):  # noqa: N802
            return util.wrap(Ranges(blocks), iid)

    policy.DefaultPolicy = Given
    flags = pythoncom.REGCLS_MULTIPLEUSE
    number = pythoncom.CoRegisterClassObject(
        own, pythoncom.MakePyFactory(own), pythoncom.CLSCTX_LOCAL_SERVER, flags
    )
    pythoncom.EnableQuitMessage(win32api.GetCurrentThreadId())
    print("ranges are served", flush=True)
    while not pythoncom.PumpWaitingMessages():
        win32event.MsgWaitForMultipleObjects((), 0, win32event.INFINITE, win32event.QS_ALLEVENTS)
    pythoncom.CoRevokeClassObject(number)


if __name__ == "__main__":
    {"call": call, "serve": serve}[sys.argv[1]](*sys.argv[2:])
