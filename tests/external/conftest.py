"""Collects what the checks got; a full run writes docs/verification.md."""

import json
from pathlib import Path

import pytest
from verification_page import page

HERE = Path(__file__).parent
GOT: dict[tuple[str, str], float] = {}


@pytest.fixture
def verified():
    def note(check, got):
        GOT[check.case, check.what] = got

    return note


def pytest_sessionfinish(session, exitstatus):
    """After a run of all checks the page is written anew; its numbers are rounded so that it stays still."""
    from external_stiff import CHECKS

    if len(GOT) == len(CHECKS):
        sources = json.loads((HERE / "sources.json").read_text(encoding="utf-8"))
        text = page(CHECKS, sources, GOT)
        target = HERE.parents[1] / "docs" / "verification.md"
        if not target.exists() or target.read_text(encoding="utf-8") != text:
            target.write_text(text, encoding="utf-8")
