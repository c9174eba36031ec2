"""Life stories: what is drawn leads to its result, revisions side by side, calibrations in mK, what rests on what."""

from __future__ import annotations

import re
from pathlib import Path

import pytest
from starlette.testclient import TestClient

from archive import Archive
from archive.errors import UnknownAddress
from archive.reduction.monte_carlo import Request
from archive.web import application
from tests.filled_archive import PLAIN
from tests.revisable_cooldown import write_calibrated


def _drawing(text: str) -> str:
    return text[text.index("<svg xmlns") : text.index("</svg>")]


def test_what_is_drawn_over_time_is_in_the_table_and_leads_to_its_result(client: TestClient) -> None:
    text = client.get("/at/TO-1").text
    drawing = _drawing(text)
    path = f"/at/{PLAIN}/s001@empty-cell.1/empty_period"
    assert f'href="/at/{PLAIN}"' in drawing
    # The readings of the empty cell begin at 1 ms + 1e-6 x 0.2 ms, each with 2 ps.
    assert re.search(rf'href="{path}"[^>]*><title>[^<]*empty period = 1\.000000\d*\(\d+\)\u2009?.ms', drawing)
    assert f'class="address" href="{path}"' in text
    assert client.get(path).status_code == 200


def test_revisions_stand_side_by_side_and_only_what_differs_is_marked(client: TestClient) -> None:
    text = client.get("/at/TO-1").text
    table = text[text.index('<table class="side">') :]
    table = table[: table.index("</table>")]
    rows = dict(re.findall(r'<tr><th scope="row">([^<]*)</th>(.*?)</tr>', table, re.DOTALL))
    marked = {name for name, row in rows.items() if "\u2260" in row or "&ne;" in row}
    # 7.5 mm and 7500 um are one radius.
    assert marked == {"changed", "valid from", "empty period"}
    assert "by data steward: measured &lt;b&gt;again&lt;/b&gt;" in rows["came in"]
    assert "seal &lt;i&gt;renewed" in rows["changed"]
    assert f'href="/at/{PLAIN}.a1"' in rows["came in"]


def test_each_calibration_is_held_against_the_last_in_millikelvin(client: TestClient, root: Path) -> None:
    text = client.get("/at/SALT-1").text
    # T = C/M: 1.01 times C gives 1.01 times T for the same reading. Of 25 temperatures from 10 mK to 1 K the second gives the
    # last no value, since that is beyond 1 K; the one before it is 100^(23/24) times 10 mK, and 0.1 per cent goes in twice.
    assert "SALT-1-cal.r2 less SALT-1-cal.r1" in text
    rows = dict(re.findall(r'class="n">([0-9.]+)</th>\s*<td class="n">([^<]*)</td>', text))
    assert set(rows) >= {"0.01", "0.8254"}
    assert rows["0.8254"] == "8.3(1.2)\u00a0mK"
    with Archive.open(root, read_only=True) as lab:
        every, (found,) = lab.calibrations_against_last("SALT-1")
    assert [each.address for each in every] == ["SALT-1-cal.r1", "SALT-1-cal.r2"]
    assert found.found is not None
    assert found.found.difference == pytest.approx(0.01 * found.found.temperature, rel=1e-9)


def test_where_a_thing_was_used_and_what_rests_on_it(client: TestClient, root: Path) -> None:
    with Archive.open(root, read_only=True) as lab:
        story = lab.life("TO-1")
        assert [(each.cooldown, each.record, each.sweeps) for each in story.uses] == [(PLAIN, "TO-1.r1", 2)]
        plan = lab.resting("empty-cell.r1")
        assert [each.reduction for each in plan.direct] == [f"{PLAIN}/s001@empty-cell.1"]
        assert not plan.cut
        with pytest.raises(UnknownAddress):
            lab.life("TO-9")
    text = client.get("/at/empty-cell").text
    assert f'href="/at/{PLAIN}/s001@empty-cell.1">s001@empty-cell.1</a>' in text
    assert "background-fit" in text


def test_a_revision_that_is_not_there_says_which_are(client: TestClient) -> None:
    answer = client.get("/at/TO-1.r7")
    assert answer.status_code == 404
    assert "TO-1.r2" in answer.text


def test_a_result_tells_its_budget_its_use_and_how_it_stands(client: TestClient, root: Path) -> None:
    own = f"{PLAIN}/s001@empty-cell.1"
    text = client.get(f"/at/{own}/empty_period").text
    assert re.search(r'class="value">empty period = 1\.000000\d*\(\d+\)', text)
    table = text[text.index('<table class="budget">') :]
    table = table[: table.index("</table>")]
    shares = [float(each) for each in re.findall(r">([0-9.e-]+) %</td>", table)]
    assert sum(shares[:-1]) == pytest.approx(shares[-1], abs=1.0)
    assert shares[-1] == 100
    # A bar for each share, and every bar of the budget as long as its share of 159 px.
    bars = [float(each) for each in re.findall(r'y="2" width="([0-9.]+)"', table)]
    assert bars == pytest.approx([1.59 * each for each in shares], abs=1.0)
    assert f'href="/at/{PLAIN}.a1:empty.csv"' in text
    assert "Nothing rests on it" in text
    assert client.get(f"/at/{own}/no_such_thing").status_code == 404
    with Archive.open(root, read_only=True) as lab:
        assert lab.trace(f"{own}#empty_period", forward=True).children == ()


def test_a_result_that_was_found_again_says_so_and_shows_both(tmp_path: Path) -> None:
    first, second = (f"2026-03/s001@empty-cell.{number}" for number in (1, 2))
    with Archive.create(tmp_path / "lab") as lab:
        lab.ingest(write_calibrated(tmp_path / "2026-03"))
        for trials in (None, Request(trials=20)):
            (outcome,) = lab.reduce("2026-03", plan="empty-cell", sweep="s001", monte_carlo=trials)
            assert outcome.problem is None
        with TestClient(application(lab.root), base_url="http://localhost") as visitor:
            old = visitor.get(f"/at/{first}/empty_period").text
            assert f'superseded by</strong>: <a class="address" href="/at/{second}"' in old
            table = old[old.index('<h2 id="others">') :]
            states = re.findall(r"<td>(current|superseded|withdrawn)</td>", table)
            assert states == ["superseded", "current"]
            assert "20 trials" in visitor.get(f"/at/{second}/empty_period").text
            lab.withdraw("2026-03/s001", why="the wrong cell was cabled", by="data steward")
            assert "the wrong cell was cabled" in visitor.get(f"/at/{second}/empty_period").text
