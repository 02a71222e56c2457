"""What the add-in's VBA does with xlwings' DLL: dll.py DLL PLAN.json RESULTS.json

PLAN: a list of steps, each with a result:
    ["start", command]          seconds, and the process id, or the words of the DLL
    ["call", name, arguments]   what came back
    ["kill"]                    ends the server's process, as a task manager would
    ["many", count]             calls with ever other inputs: seconds in all, wrong answers, memory before and after
    ["time", name, arguments, count]   milliseconds of each call
    ["let go"]                  as when Excel closes
"""

import ctypes
import json
import sys
import time

import rawcom
from calls import MODULE, Make
from wire import decoded


class Memory(ctypes.Structure):
    _fields_ = [("cb", ctypes.c_ulong), ("faults", ctypes.c_ulong)] + [
        (n, ctypes.c_size_t) for n in "abcdefgh"
    ]


kernel32, psapi = ctypes.WinDLL("kernel32"), ctypes.WinDLL("psapi")
kernel32.OpenProcess.restype = ctypes.c_void_p
kernel32.OpenProcess.argtypes = [ctypes.c_ulong, ctypes.c_int, ctypes.c_ulong]
kernel32.TerminateProcess.argtypes = [ctypes.c_void_p, ctypes.c_uint]
psapi.GetProcessMemoryInfo.argtypes = [ctypes.c_void_p, ctypes.c_void_p, ctypes.c_ulong]


class Client:
    def __init__(self, dll):
        self.activate = ctypes.WinDLL(dll).XLPyDLLActivateAuto
        self.activate.argtypes = [ctypes.POINTER(rawcom.VARIANT), ctypes.c_char_p, ctypes.c_long]
        self.server = self.process = None

    def start(self, command):
        answer, begun = rawcom.VARIANT(), time.monotonic()
        failed = self.activate(ctypes.byref(answer), command.encode("mbcs"), 1)
        seconds = time.monotonic() - begun
        if failed:
            return {"seconds": seconds, "words": rawcom.get(answer)}
        self.server = rawcom.Dispatch(answer.val)
        self.process = int(dict(self.call("about", []))["process"])
        return {"seconds": seconds, "process": self.process}

    def call(self, name, arguments):
        return self.server.call("CallUDF", MODULE, name, [decoded(a, Make) for a in arguments])

    def kill(self):
        kernel32.TerminateProcess(kernel32.OpenProcess(1, 0, self.process), 9)
        time.sleep(1)

    def memory(self):
        counted = Memory()
        counted.cb = ctypes.sizeof(counted)
        psapi.GetProcessMemoryInfo(
            kernel32.OpenProcess(0x1010, 0, self.process), ctypes.byref(counted), counted.cb
        )
        return counted.h  # bytes that are the process' own

    def many(self, count):
        """First-order tank with a closed form: A/(1 + k tau)."""
        reactions = [["Reaction", "Rate", "k"], ["A -> B", "k*A", 0.5]]
        feed = [["Species", "Feed"], ["A", 2.0], ["B", 0.0]]
        wrong, memory, begun = 0, 0, time.monotonic()
        for n in range(count):
            if n == count * 3 // 4:  # the memory of answers is full by then
                memory = self.memory()
            tau = 0.001 * n
            got = self.server.call("CallUDF", MODULE, "MOLE_CSTR", [reactions, feed, tau])
            wrong += abs(got[0][0] - 2.0 / (1 + 0.5 * tau)) > 1e-9
        return {"seconds": time.monotonic() - begun, "wrong": wrong, "memory": [memory, self.memory()]}

    def time(self, name, arguments, count):
        arguments = [decoded(a, Make) for a in arguments]
        taken = []
        for _ in range(count):
            begun = time.perf_counter()
            self.server.call("CallUDF", MODULE, name, arguments)
            taken.append(1000 * (time.perf_counter() - begun))
        return taken

    def let_go(self):
        rawcom.method(self.server.p, 2)(self.server.p)

    def step(self, what, *rest):
        try:
            return getattr(self, what.replace(" ", "_"))(*rest)
        except rawcom.ComError as error:
            return {"error": str(error)}


if __name__ == "__main__":
    dll, plan, told = sys.argv[1:]
    client = Client(dll)
    with open(plan, encoding="utf-8") as f:
        results = [client.step(*step) for step in json.load(f)]
    with open(told, "w", encoding="utf-8") as f:
        json.dump(results, f)
    rawcom.ole32.CoUninitialize()
