"""Runs Basic functions of a macro file in LibreOffice; for the Python that LibreOffice's bindings belong to.

    run_basic.py FILE < CALLS > RESULTS

CALLS: JSON list of ["Module.Function", [arguments]]; texts and floats only, as others arrive changed.
RESULTS: JSON list of what each gave. The library is the file's VBA project, named moletally.
"""

import json
import os
import subprocess
import sys
import tempfile
import time
import uuid

import uno
from com.sun.star.beans import PropertyValue
from com.sun.star.connection import NoConnectException

START_WITHIN = 60  # s


def prop(name, value):
    made = PropertyValue()
    made.Name, made.Value = name, value
    return made


def office(profile):
    """A LibreOffice of our own and its context; the first start with a new profile may end at once."""
    pipe = "moletally" + uuid.uuid4().hex
    command = ["soffice", "--headless", "--norestore", "--nologo", f"-env:UserInstallation=file://{profile}",
               f"--accept=pipe,name={pipe};urp;"]  # fmt: skip
    local = uno.getComponentContext()
    resolver = local.ServiceManager.createInstanceWithContext("com.sun.star.bridge.UnoUrlResolver", local)
    process = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
    until = time.monotonic() + START_WITHIN
    while time.monotonic() < until:
        try:
            return process, resolver.resolve(f"uno:pipe,name={pipe};urp;StarOffice.ComponentContext")
        except NoConnectException:
            if process.poll() is not None:
                process = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
            time.sleep(0.25)
    raise SystemExit("LibreOffice does not start")


def loaded(desktop, path):
    how = (prop("Hidden", True), prop("ReadOnly", True), prop("MacroExecutionMode", 4),
           prop("FilterName", "Calc MS Excel 2007 VBA XML"))  # fmt: skip
    for _ in range(20):
        document = desktop.loadComponentFromURL("file://" + os.path.abspath(path), "_blank", 0, how)
        if document is not None:
            return document
        time.sleep(0.5)  # still busy with its own start
    raise SystemExit("LibreOffice does not load the file")


def main(path):
    calls = json.load(sys.stdin)
    with tempfile.TemporaryDirectory() as profile:
        process, context = office(profile)
        desktop = context.ServiceManager.createInstanceWithContext("com.sun.star.frame.Desktop", context)
        try:
            provider = loaded(desktop, path).getScriptProvider()
            results = []
            for name, arguments in calls:
                script = provider.getScript(
                    f"vnd.sun.star.script:moletally.{name}?language=Basic&location=document"
                )
                results.append(script.invoke(tuple(arguments), (), ())[0])
            print(json.dumps(results))
        finally:
            process.terminate()
            process.wait(20)


if __name__ == "__main__":
    main(sys.argv[1])
