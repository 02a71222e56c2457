"""Calls functions over plain COM: calls.py CLASS_ID CALLS.json RESULTS.json

CALLS: a list of [name, [arguments]]; RESULTS: a list of ["ok", block or value] or ["failed", words].
"""

import datetime as dt
import json
import sys

import rawcom
from wire import decoded

MODULE = "moletally.hosts.windows.worksheet"


class Make:
    """Cells as this client sends them."""

    error = staticmethod(rawcom.Err)
    currency = staticmethod(rawcom.Cy)

    @staticmethod
    def date(text):
        return rawcom.Date(
            (dt.datetime.fromisoformat(text) - dt.datetime(1899, 12, 30)) / dt.timedelta(days=1)
        )

    @staticmethod
    def block(rows):
        return rows


def answers(server, calls):
    for name, arguments in calls:
        try:
            yield ["ok", server.call("CallUDF", MODULE, name, [decoded(a, Make) for a in arguments])]
        except rawcom.ComError as error:
            yield ["failed", str(error)]


if __name__ == "__main__":
    class_id, asked, told = sys.argv[1:]
    with open(asked, encoding="utf-8") as f:
        calls = json.load(f)
    with open(told, "w", encoding="utf-8") as f:
        json.dump(list(answers(rawcom.connect(class_id), calls)), f)
