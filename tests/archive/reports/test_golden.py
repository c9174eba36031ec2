"""The whole text of both reports, held against the last one that a person read.

`STILLROOM_RENEW_GOLDEN=1` writes them anew; the difference is read before it is committed.
"""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from archive.reports import methods_appendix, run_sheet_html
from tests.archive.reports.factories import film_view, finding

GOLDEN = Path(__file__).parents[2] / "golden"


def written():
    """Return both reports of one small cooldown with a waived warning."""
    view = film_view(findings=[finding(waived=True)])
    files = methods_appendix([view], ["2026-03/s001@film-transition.1"], title="Films on polyimide")
    return {"run-sheet.html": run_sheet_html(view), "appendix.tex": files["appendix.tex"].decode()}


@pytest.mark.parametrize("name", ["run-sheet.html", "appendix.tex"])
def test_the_report_reads_as_before(name):
    text, file = written()[name], GOLDEN / name
    if os.environ.get("STILLROOM_RENEW_GOLDEN") == "1":
        file.write_text(text, encoding="utf-8")
    assert text.splitlines() == file.read_text(encoding="utf-8").splitlines()
