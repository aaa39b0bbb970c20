"""Every number of a report is in the plan's JSON, or follows from it."""

from __future__ import annotations

import json
from typing import Any

import pytest

from placer.report.html import report_html
from placer.report.story import of_cause, read_story
from placer.report.timeline import ticks, unit_of
from placer.report.words import percent, significant
from tests.report.rederive import NUMBER, Again, Page, faults_of
from tests.report.report_samples import NAMES, plan_data


def texts_of(value: Any) -> list[str]:
    """Return all texts inside data, keys included."""
    if isinstance(value, str):
        return [value]
    if isinstance(value, dict):
        return [t for k, v in value.items() for t in (k, *texts_of(v))]
    if isinstance(value, list):
        return [t for one in value for t in texts_of(one)]
    return []


def numbers_in(text: str) -> set[str]:
    return {one.strip(".,-%") for one in NUMBER.findall(text)}


def titles_of_the_map(data: dict[str, Any]) -> set[str]:
    """Return the numbers that sites and links of the map have in their titles."""
    again = Again(data)
    figures = again.device_figures()
    total = data["figures"]["cost"]
    texts = {percent(error) for error in figures["link"]}
    texts |= {significant(life) for life in figures["site"]}
    texts |= {
        percent(cost / total)
        for path, cost in again.sums.items()
        if path.startswith(("by/site", "by/link")) and path.endswith("total")
    }
    return {number for text in texts for number in numbers_in(text)}


@pytest.mark.parametrize("name", NAMES)
def test_every_number_is_found_again(name):
    data = plan_data(name)
    page = Page(report_html(data))
    assert len(page.facts) > 50
    assert faults_of(page, Again(data)) == []


@pytest.mark.parametrize("name", NAMES)
def test_no_other_number_is_shown(name):
    # What is no fact is the plan's own words, a name of a site, step, line or wire, a
    # tick of the time axis, or how many rows a list has.
    data = plan_data(name)
    story = read_story(data)
    allowed: set[str] = set()
    for text in texts_of(data):
        allowed |= numbers_in(text)
    for text in (*story.names, story.device.lattice):
        allowed |= numbers_in(text)
    for step in story.steps:
        allowed |= numbers_in(step.operation.title)
    end = story.replay.end
    allowed |= {f"{time / unit_of(end)[1]:g}" for time in ticks(end)}
    most = max(len(story.device.sites), len(story.device.links), len(story.steps))
    allowed |= {str(k) for k in range(max(most, len(story.lives)) + 1)}
    allowed |= {str(call["line"]) for call in data["calls"]}
    allowed |= titles_of_the_map(data)
    page = Page(report_html(data))
    shown = set()
    for text in page.rest:
        shown |= numbers_in(text)
    assert shown - allowed == set()


def test_a_wrong_number_is_found():
    data = plan_data("small")
    text = report_html(data)
    wrong = data["figures"]["swaps"] + 1
    broken = text.replace(
        f'data-from="figures/swaps" data-as="count">{data["figures"]["swaps"]}<',
        f'data-from="figures/swaps" data-as="count">{wrong}<',
    )
    assert broken != text
    assert faults_of(Page(broken), Again(data))


@pytest.mark.parametrize("name", NAMES)
def test_splits_sum_up_to_the_figures(name):
    data = plan_data(name)
    story = read_story(data)
    assert of_cause(story) == data["figures"]["costs"]
    assert story.total == data["figures"]["cost"]
    places = sum(part.total for part in story.of_site.values())
    places += sum(part.total for part in story.of_link.values())
    assert places == data["figures"]["cost"]
    assert story.replay.end == data["figures"]["time_ns"]
    worst = story.lives[0].share if story.lives else 0.0
    assert worst == data["figures"]["worst_share"]


@pytest.mark.parametrize("name", NAMES)
def test_stretches_of_a_site_do_not_overlap(name):
    story = read_story(plan_data(name))
    last: dict[int, int] = {}
    for stretch in sorted(story.replay.stretches):
        assert stretch.start >= last.get(stretch.site, 0)
        assert stretch.end > stretch.start
        last[stretch.site] = stretch.end


def test_same_plan_same_bytes():
    data = plan_data("small")
    assert report_html(data) == report_html(json.loads(json.dumps(data)))
