"""The text of a report: offline, escaped, with landmarks; a picture for notebooks."""

from __future__ import annotations

import json
import re
import subprocess
import sys

import pytest

from placer.plan import to_json
from placer.planread import plan_of_data
from placer.report.html import report_html
from tests.report.rederive import Page
from tests.report.report_samples import BAD_NAME, NAMES, plan_data


@pytest.mark.parametrize("name", NAMES)
def test_asks_for_nothing_from_anywhere(name):
    text = report_html(plan_data(name))
    page = Page(text)
    for tag, values in page.tags:
        assert "src" not in values, tag
        for key in ("href", "xlink:href", "action", "data", "srcset", "poster"):
            link = values.get(key, "#")
            assert link.startswith(("#", "data:,")), (tag, key, link)
    for sign in ("@import", "fetch(", "XMLHttpRequest", "WebSocket", "sendBeacon"):
        assert sign not in text
    assert not re.search(r"url\((?!#)", text)


@pytest.mark.parametrize("name", NAMES)
def test_is_sound_html(name):
    page = Page(report_html(plan_data(name)))
    assert page._open == []  # every element is closed
    assert len(page.ids) == len(set(page.ids))
    ids = set(page.ids)
    for tag, values in page.tags:
        for key in ("href", "aria-labelledby", "for"):
            goal = values.get(key, "")
            if key == "href" and not goal.startswith("#"):
                continue
            assert not goal or goal.removeprefix("#") in ids, (tag, key, goal)


def test_what_users_wrote_is_escaped():
    text = report_html(plan_data("hostile"))
    assert BAD_NAME in plan_data("hostile")["program"]["path"]
    assert "alert(1)" in text
    assert "alert(2)" in text
    scripts = re.findall(r"<script[^>]*>", text)
    assert scripts == ['<script type="application/json" id="events">', "<script>"]
    assert "</code></ol>" not in text
    events = text.split('id="events">')[1].split("</script>")[0]
    assert json.loads(events)["end"] == plan_data("hostile")["figures"]["time_ns"]


@pytest.mark.parametrize("name", NAMES)
def test_drawings_have_labels_and_twins(name):
    page = Page(report_html(plan_data(name)))
    tags = [tag for tag, _ in page.tags]
    assert tags.count("main") == tags.count("header") == tags.count("footer") == 1
    assert tags.count("h1") == 1
    assert "nav" in tags
    drawings = [v for tag, v in page.tags if tag == "svg"]
    for values in drawings:
        has_label = values.get("role") == "img" and values.get("aria-label")
        assert has_label or values.get("aria-hidden") == "true"
    for tag, values in page.tags:
        if tag == "div" and values.get("class") == "scroll":
            assert values["aria-label"]
            assert values["tabindex"] == "0"


@pytest.mark.parametrize("name", NAMES)
def test_a_plan_is_read_back_as_it_was_written(name):
    data = plan_data(name)
    text = json.dumps(data, indent=1, ensure_ascii=False) + "\n"
    assert to_json(plan_of_data(data)) == text


def test_a_notebook_shows_map_and_timeline():
    shown = plan_of_data(plan_data("lent"))._repr_html_()
    page = Page(shown)
    classes = [v.get("class") for tag, v in page.tags if tag == "svg"]
    assert classes.count("map") == 1
    assert classes.count("timeline") >= 2
    assert "<script" not in shown


def test_reports_are_loaded_only_when_asked_for():
    code = (
        "import sys, placer.cli, placer.api; "
        "print([m for m in ('matplotlib', 'jinja2') if m in sys.modules])"
    )
    answer = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True
    )
    assert answer.stdout.strip() == "[]"
