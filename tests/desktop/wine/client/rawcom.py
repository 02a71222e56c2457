"""A late-bound COM client in plain ctypes: no pywin32, so every VARIANT is seen as it is on the wire.

Runs in Windows Python. Written for the measurements that came before this project.
"""

import ctypes
import struct
from ctypes import (
    POINTER,
    byref,
    c_long,
    c_uint,
    c_uint16,
    c_uint64,
    c_ulong,
    c_void_p,
    c_wchar_p,
)

ole32, oleaut = ctypes.WinDLL("ole32"), ctypes.WinDLL("oleaut32")
VT = {
    0: "EMPTY",
    1: "NULL",
    2: "I2",
    3: "I4",
    4: "R4",
    5: "R8",
    6: "CY",
    7: "DATE",
    8: "BSTR",
    9: "DISPATCH",
    10: "ERROR",
    11: "BOOL",
    12: "VARIANT",
    14: "DECIMAL",
    20: "I8",
    21: "UI8",
    0x200C: "ARRAY|VARIANT",
}


class GUID(ctypes.Structure):
    _fields_ = [("d", ctypes.c_ubyte * 16)]


class VARIANT(ctypes.Structure):
    _fields_ = [
        ("vt", c_uint16),
        ("r1", c_uint16),
        ("r2", c_uint16),
        ("r3", c_uint16),
        ("val", c_uint64),
        ("val2", c_uint64),
    ]


class BOUND(ctypes.Structure):
    _fields_ = [("n", c_ulong), ("lb", c_long)]


class SAFEARRAY(ctypes.Structure):
    _fields_ = [
        ("cDims", c_uint16),
        ("fFeatures", c_uint16),
        ("cbElements", c_ulong),
        ("cLocks", c_ulong),
        ("pvData", c_void_p),
        ("b", BOUND * 4),
    ]


class DISPPARAMS(ctypes.Structure):
    _fields_ = [("args", POINTER(VARIANT)), ("named", c_void_p), ("nargs", c_uint), ("nnamed", c_uint)]


class EXCEPINFO(ctypes.Structure):
    _fields_ = [
        ("wCode", c_uint16),
        ("r", c_uint16),
        ("source", c_void_p),
        ("desc", c_void_p),
        ("help", c_void_p),
        ("ctx", c_ulong),
        ("pv", c_void_p),
        ("fn", c_void_p),
        ("scode", c_long),
    ]


oleaut.SysAllocString.restype = c_void_p
oleaut.SysAllocString.argtypes = [c_wchar_p]
oleaut.SysStringLen.argtypes = [c_void_p]
oleaut.SafeArrayCreate.restype = POINTER(SAFEARRAY)
oleaut.SafeArrayCreate.argtypes = [c_uint16, c_uint, POINTER(BOUND)]
ole32.CoInitialize(None)


class Err:
    def __init__(self, scode):
        self.scode = scode & 0xFFFFFFFF

    def __repr__(self):
        if self.scode >> 16 == 0x800A:
            return f"CVErr({self.scode & 0xFFFF})"
        return f"ERROR 0x{self.scode:08X}"


class Date(float):
    pass


class Cy(float):
    pass


class Null:
    pass


def put(v, x):
    """Fill VARIANT v."""
    if x is None:
        v.vt = 0
    elif x is Null:
        v.vt = 1
    elif isinstance(x, bool):
        v.vt, v.val = 11, 0xFFFF if x else 0
    elif isinstance(x, Err):
        v.vt, v.val = 10, x.scode
    elif isinstance(x, Date):
        v.vt, v.val = 7, struct.unpack("<Q", struct.pack("<d", x))[0]
    elif isinstance(x, Cy):
        v.vt, v.val = 6, round(x * 10000) & (2**64 - 1)
    elif isinstance(x, int):
        v.vt, v.val = 3, x & 0xFFFFFFFF
    elif isinstance(x, float):
        v.vt, v.val = 5, struct.unpack("<Q", struct.pack("<d", x))[0]
    elif isinstance(x, str):
        v.vt, v.val = 8, oleaut.SysAllocString(x)
    elif isinstance(x, (list, tuple)):
        # rows of plain values: a 2-D range; anything else: the 1-D argument list
        two = bool(x) and all(
            isinstance(r, (list, tuple)) and not any(isinstance(y, (list, tuple)) for y in r) for r in x
        )
        lb = 1 if two else 0  # Range.Value is 1-based, VBA's Array() 0-based
        bounds = (BOUND * 2)(BOUND(len(x), lb), BOUND(len(x[0]) if two else 0, lb))
        sa = oleaut.SafeArrayCreate(12, 2 if two else 1, bounds)
        data = ctypes.cast(sa.contents.pvData, POINTER(VARIANT))
        if two:
            n = len(x)
            for i, row in enumerate(x):
                for j, y in enumerate(row):
                    put(data[j * n + i], y)  # column-major
        else:
            for i, y in enumerate(x):
                put(data[i], y)
        v.vt, v.val = 0x200C, ctypes.cast(sa, c_void_p).value
    elif isinstance(x, Dispatch):
        v.vt, v.val = 9, x.p
        x.addref()
    else:
        raise TypeError(x)


def get(v):
    vt, b = v.vt, struct.pack("<Q", v.val)
    if vt == 0:
        return None
    if vt == 1:
        return Null
    if vt == 5:
        return struct.unpack("<d", b)[0]
    if vt == 7:
        return Date(struct.unpack("<d", b)[0])
    if vt == 6:
        return Cy(struct.unpack("<q", b)[0] / 10000)
    if vt == 3:
        return struct.unpack("<i", b[:4])[0]
    if vt == 20:
        return struct.unpack("<q", b)[0]
    if vt == 8:
        return ctypes.wstring_at(v.val, oleaut.SysStringLen(v.val)) if v.val else ""
    if vt == 10:
        return Err(v.val & 0xFFFFFFFF)
    if vt == 11:
        return bool(v.val & 0xFFFF)
    if vt == 9:
        return Dispatch(v.val)
    if vt == 0x200C:
        sa = ctypes.cast(v.val, POINTER(SAFEARRAY)).contents
        data = ctypes.cast(sa.pvData, POINTER(VARIANT))
        dims = [sa.b[k].n for k in range(sa.cDims)][::-1]
        if sa.cDims == 1:
            return [get(data[i]) for i in range(dims[0])]
        n, m = dims
        return [[get(data[j * n + i]) for j in range(m)] for i in range(n)]
    return f"VT {VT.get(vt, vt)} 0x{v.val:x}"


class ComError(Exception):
    pass


def guid(s):
    g = GUID()
    if ole32.CLSIDFromString(c_wchar_p(s), byref(g)):
        raise ValueError(s)
    return g


def method(p, i, *types):
    vtbl = ctypes.cast(p, POINTER(c_void_p))[0]
    return ctypes.WINFUNCTYPE(c_long, c_void_p, *types)(ctypes.cast(vtbl, POINTER(c_void_p))[i])


IID_IDispatch = guid("{00020400-0000-0000-C000-000000000046}")
IID_NULL = GUID()


class Dispatch:
    def __init__(self, p):
        self.p, self.ids = p, {}

    def addref(self):
        method(self.p, 1)(self.p)

    def id(self, name):
        if name not in self.ids:
            d, n = c_long(), c_wchar_p(name)
            hr = method(self.p, 5, POINTER(GUID), POINTER(c_wchar_p), c_uint, c_ulong, POINTER(c_long))(
                self.p, byref(IID_NULL), byref(n), 1, 0, byref(d)
            )
            if hr < 0:
                raise ComError(f"GetIDsOfNames {name} 0x{hr & 0xFFFFFFFF:08x}")
            self.ids[name] = d.value
        return self.ids[name]

    def variant(self, name, *args, flags=1):
        a = (VARIANT * max(1, len(args)))()
        for k, x in enumerate(reversed(args)):
            put(a[k], x)
        dp = DISPPARAMS(a, None, len(args), 0)
        r, e, bad = VARIANT(), EXCEPINFO(), c_uint()
        hr = method(
            self.p,
            6,
            c_long,
            POINTER(GUID),
            c_ulong,
            c_uint16,
            POINTER(DISPPARAMS),
            POINTER(VARIANT),
            POINTER(EXCEPINFO),
            POINTER(c_uint),
        )(self.p, self.id(name), byref(IID_NULL), 0, flags, byref(dp), byref(r), byref(e), byref(bad))
        for k in range(len(args)):
            oleaut.VariantClear(byref(a[k]))
        if hr & 0xFFFFFFFF == 0x80020009:
            raise ComError(
                "0x%08X" % (e.scode & 0xFFFFFFFF),
                ctypes.wstring_at(e.source) if e.source else None,
                ctypes.wstring_at(e.desc) if e.desc else None,
            )
        if hr < 0:
            raise ComError("hr 0x%08X" % (hr & 0xFFFFFFFF), None, None)
        return r

    def call(self, name, *args, flags=1):
        r = self.variant(name, *args, flags=flags)
        out = get(r)
        if r.vt != 9:
            oleaut.VariantClear(byref(r))
        return out


def connect(clsid):
    g, p = guid(clsid), c_void_p()
    hr = ole32.CoCreateInstance(byref(g), None, 4, byref(IID_IDispatch), byref(p))
    if hr < 0:
        raise ComError("CoCreateInstance 0x%08x" % (hr & 0xFFFFFFFF))
    return Dispatch(p.value)
