"""The memo's page in a browser: tables sort, the model turns, nothing is asked of the network."""

import io
import sys
from pathlib import Path

import numpy as np
import pytest
from matplotlib.image import imread

sys.path.insert(0, str(Path(__file__).parent))
import chromium

pytestmark = pytest.mark.skipif(chromium.find() is None, reason="no Chromium is installed here")

CANVAS = "document.getElementById('view')"


@pytest.fixture(scope="module")
def page(memo_files):
    page = chromium.Page(memo_files.html.as_uri())
    try:
        page.until("document.readyState === 'complete'")
        yield page
    finally:
        page.close()


def column(page, key, k):
    rows = f"document.getElementById('{key}').nextElementSibling.querySelectorAll('tbody tr')"
    return page.value(f"[...{rows}].map((r) => r.cells[{k}].textContent)")


def press(page, key, k):
    heads = f"document.getElementById('{key}').nextElementSibling.querySelectorAll('th button')"
    page.value(f"{heads}[{k}].click()")


def test_tables_sort_by_number_and_back(page):
    key = "tab-receivers"
    press(page, key, 3)
    up = [float(x.replace(",", "")) for x in column(page, key, 3)]
    assert len(up) >= 2
    assert up == sorted(up)
    press(page, key, 3)
    down = [float(x.replace(",", "")) for x in column(page, key, 3)]
    assert down == sorted(up, reverse=True)


def test_dates_sort_by_time_and_names_by_letter(page):
    script = (
        "sortKey('9 March 2025, 10:00 (UTC+00:00)') < sortKey('1 October 2025, 09:00 (UTC+01:00)')"
    )
    assert page.value(script)
    assert page.value("sortKey('12,345 W/m²')") == 12345
    assert page.value("compare(sortKey('house'), sortKey('Ground')) > 0")


def shot(page):
    return imread(io.BytesIO(page.pixels(f"{CANVAS}.toDataURL('image/png')")))[:, :, :3]


def test_the_model_is_drawn_and_turns(page):
    page.until(f"{CANVAS}.dataset.ready === 'yes'")
    page.value(f"{CANVAS}.scrollIntoView({{block: 'center'}})")
    page.until(f"{CANVAS}.width > 100")
    before = shot(page)
    assert (before < 0.98).any(axis=2).mean() > 0.05  # something stands on the white
    assert len(np.unique(np.round(before, 2).reshape(-1, 3), axis=0)) > 20
    box = page.value(
        f"(({{x, y, width, height}}) => [x, y, width, height])({CANVAS}.getBoundingClientRect())"
    )
    x, y = box[0] + box[2] / 2, box[1] + box[3] / 2
    page.drag(x, y, 120, 30)
    turned = shot(page)
    assert np.abs(turned - before).max(axis=2).mean() > 0.02
    page.call("Input.dispatchMouseEvent", type="mouseWheel", x=x, y=y, deltaX=0, deltaY=-400)
    nearer = shot(page)
    assert (nearer < 0.98).any(axis=2).mean() > (turned < 0.98).any(axis=2).mean()


def test_no_request_left_the_page(page):
    asked = [u for u in page.requests if not u.startswith("data:")]
    assert [u.split(":", 1)[0] for u in asked] == ["file"]  # the page itself
    assert page.errors == []
