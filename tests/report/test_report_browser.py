"""Reports as a browser shows them: no error, no request, nothing beyond the screen."""

from __future__ import annotations

import re

import pytest

from placer.report.html import report_html
from tests.report.browser import Browser, needs_browser
from tests.report.report_samples import NAMES, plan_data

SECTIONS = ("limits", "choices", "error", "map", "timeline", "calls", "sure", "source")
OVERFLOW = "document.documentElement.scrollWidth - document.documentElement.clientWidth"
# Texts inside drawings and cells that reach out of their box.
CUT = """(() => {
  const found = [];
  for (const svg of document.querySelectorAll("svg.map, svg.timeline, svg.chart")) {
    const outer = svg.getBoundingClientRect();
    for (const text of svg.querySelectorAll("text")) {
      const box = text.getBoundingClientRect();
      if (box.width && (box.left < outer.left - 1.5 || box.right > outer.right + 1.5
          || box.top < outer.top - 1.5 || box.bottom > outer.bottom + 1.5))
        found.push(text.textContent);
    }
  }
  return found;
})()"""
# Ticks of one chart that lie on top of each other.
CROWDED = """(() => {
  const found = [];
  for (const svg of document.querySelectorAll("svg.chart")) {
    const boxes = [...svg.querySelectorAll("text")].map(
      t => [t.textContent, t.getBoundingClientRect()]);
    for (let i = 0; i < boxes.length; i++) for (let k = 0; k < i; k++) {
      const [a, x] = boxes[i], [b, y] = boxes[k];
      if (x.left < y.right - 1 && y.left < x.right - 1
          && x.top < y.bottom - 3 && y.top < x.bottom - 3) found.push(a + " | " + b);
    }
  }
  return found;
})()"""


@pytest.fixture(scope="module")
def browser(tmp_path_factory):
    with Browser(tmp_path_factory.mktemp("profile")) as made:
        yield made


@pytest.fixture(scope="module")
def page_of(tmp_path_factory):
    folder = tmp_path_factory.mktemp("pages")

    def make(name):
        file = folder / f"{name}.html"
        if not file.exists():
            file.write_text(report_html(plan_data(name)), encoding="utf-8")
        return file

    return make


@needs_browser
@pytest.mark.parametrize("width", [360, 1280])
@pytest.mark.parametrize("name", NAMES)
def test_opens_without_a_word(browser, page_of, name, width):
    browser.open(page_of(name), width)
    assert browser.complaints() == []
    assert browser.requests() == []
    assert browser.value(OVERFLOW) == 0
    assert browser.value(CUT) == []
    assert browser.value(CROWDED) == []
    for section in SECTIONS:
        height = f"document.getElementById('{section}').getBoundingClientRect().height"
        assert browser.value(height) > 10, section


@needs_browser
@pytest.mark.parametrize("name", ["small", "failing"])
def test_prints_on_a4(browser, page_of, name):
    # 794 pixels are the width of A4; what scrolls on a screen must not be cut there.
    browser.open(page_of(name), 700, media="print")
    assert browser.value(OVERFLOW) == 0
    pdf = browser.pdf()
    assert pdf.startswith(b"%PDF")
    boxes = re.findall(rb"/MediaBox ?\[0 0 ([\d.]+) ([\d.]+)\]", pdf)
    assert boxes
    assert all(abs(float(w) - 595) < 2 and abs(float(h) - 842) < 2 for w, h in boxes)


@needs_browser
def test_hover_links_call_timeline_and_map(browser, page_of):
    browser.open(page_of("small"), 1280)
    lit = "document.querySelectorAll('.lit').length"
    assert browser.value(lit) == 0
    over = "new MouseEvent('mouseover', {bubbles: true})"
    browser.value(f"document.querySelector('svg a[data-call]').dispatchEvent({over})")
    # The bar in the timeline, the row of the table of error, and the call itself.
    assert browser.value(lit) >= 3
    browser.value(
        "document.querySelector('svg a[data-call]').dispatchEvent("
        "new MouseEvent('mouseout', {bubbles: true}))"
    )
    assert browser.value(lit) == 0
    browser.value(
        "(() => {const c = document.getElementById('clock'); c.value = c.max;"
        " c.dispatchEvent(new Event('input'))})()"
    )
    held = "document.querySelectorAll('#map-roles g[data-state]').length"
    assert browser.value(held) > 3
    browser.value("document.getElementById('clock-off').click()")
    assert browser.value(held) == 0


@needs_browser
@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_follows_light_and_dark(browser, page_of, scheme):
    browser.open(page_of("small"), 1280, scheme=scheme)
    colour = browser.value("getComputedStyle(document.body).backgroundColor")
    light = sum(int(n) for n in re.findall(r"\d+", colour)[:3]) > 380
    assert light == (scheme == "light")


@needs_browser
def test_hostile_names_do_nothing(browser, page_of):
    browser.open(page_of("hostile"), 1280)
    # A dialog would have stopped the page; a script or picture of the input is none.
    assert browser.named("Page.javascriptDialogOpening") == []
    assert browser.value("document.querySelectorAll('img').length") == 0
    assert browser.value("document.querySelectorAll('script').length") == 2
