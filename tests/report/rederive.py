"""Numbers of a report made again: from the plan's JSON, or by the check's own walk.

The report follows the route with `report.replay`; here the check's follower does, with
its own arithmetic, so that the two have to agree.
"""

from __future__ import annotations

import re
from collections import defaultdict
from html.parser import HTMLParser
from typing import Any

from placer.check.case import Case, open_case
from placer.check.follow import Follower
from placer.problem import every_recipe
from placer.report.facts import written
from placer.report.words import percent, significant

CAUSES_OF_TWO = ("two_qubit", "level2")


class Diary(Follower):
    """The check's walk, with a note of every payment: cause, step, sites."""

    def __init__(self, case: Case) -> None:
        self.paid: list[tuple[str, int, tuple[int, ...], int]] = []
        self.began: dict[int, int] = {}
        self.ended: dict[int, int] = {}
        self.now: tuple[int, tuple[int, ...]] = (-1, ())
        self.pending: list[tuple[str, int, tuple[int, ...], int]] = []
        super().__init__(case)

    def _prepare(self) -> None:
        super()._prepare()
        program = self.case.program
        first: dict[int, int] = {}
        for step in self.case.order():
            for lease in step.leases:
                if lease.kind == "clean":
                    cost = self.numbers.prep(lease.site)
                    self.paid.append(
                        ("preparation", step.op.index, (lease.site,), cost)
                    )
            for wire in step.op.wires:
                first.setdefault(wire, step.op.index)
        for wire, index in first.items():
            if program.register_at(wire).start == "zero":
                site = self.case.sites[wire]
                cost = self.numbers.prep(site)
                self.paid.append(("preparation", index, (site,), cost))

    def _pay(self, cause: str, cost: int) -> None:
        super()._pay(cause, cost)
        step, sites = self.now
        self.paid.append((cause, step, sites, cost))

    def _alone(self, act):
        self.now = (act.step.op.index, (self.tokens[act.tokens[0]].site,))
        return super()._alone(act)

    def _gate(self, number, label):
        act = self.layout.acts[number]
        sites = tuple(self.tokens[t].site for t in act.tokens)
        self.now = (act.step.op.index, sites)
        super()._gate(number, label)

    def _perform(self, number, time):
        act = self.layout.acts[number]
        index = act.step.op.index
        self.now = (index, ())
        super()._perform(number, time)
        self.began[index] = min(self.began.get(index, act.end - time), act.end - time)
        self.ended[index] = max(self.ended.get(index, 0), act.end)

    def _swap(self, label, a, b):
        self.now = (self._purpose(a, b), (a, b))
        super()._swap(label, a, b)

    def _charge(self, token, until):
        step, sites = self.now
        if until == self.walk.last and self.finished:
            step = -1
        self.now = (step, (token.site,))
        super()._charge(token, until)
        self.now = (step, sites)

    def _purpose(self, a: int, b: int) -> int:
        """Return the step of the earliest next two-body gate of either token."""
        found = []
        for home in (self.token_at[a], self.token_at[b]):
            queue = self.layout.queues.get(home, [])
            for number in queue[self.tokens[home].place :]:
                if self.layout.acts[number].is_two_body:
                    found.append((self.rank[number], number))
                    break
        return self.layout.acts[min(found)[1]].step.op.index if found else -1

    finished = False

    def follow(self):
        # The order of the route: gap by gap, the gates of a gap by their number.
        order = [
            gate
            for runs in self.case.data["route"]["gaps"]
            for first, last in sorted(runs)
            for gate in range(first, last + 1)
        ]
        self.rank = {self.layout.gates[gate]: k for k, gate in enumerate(order)}
        route = self.case.data["route"]
        for token in self.tokens:
            self._run_free([token.home])
        self._follow_all(route["gaps"], route["swaps"])
        self.finished = True
        for token in self.tokens:
            if token.charged:
                self._charge(token, self.walk.last)
        return self.walk


class Again:
    """Every number of a report by its path, made again."""

    def __init__(self, data: dict[str, Any]) -> None:
        case = open_case(data)
        assert isinstance(case, Case), case
        self.data, self.case = data, case
        self.diary = Diary(case)
        walk = self.diary.follow()
        assert not case.findings, case.findings
        shares = [(share, walk.names[h]) for h, share in walk.shares.items() if share]
        shares += [
            (share, f"{walk.names[h]} in level 2")
            for h, share in walk.stays.items()
            if share
        ]
        self.lives = sorted(shares, key=lambda row: (-row[0], row[1]))
        self.sums: defaultdict[str, int] = defaultdict(int)
        calls = {step.op.index for step in case.steps if step.op.is_call}
        for cause, step, sites, cost in self.diary.paid:
            sort = {"swaps": "swaps", "decay": "waiting"}.get(cause, "gates")
            name = str(step) if step in calls else "end" if step < 0 else "plain"
            self._add(f"by/step/{name}", sort, cost)
            if cause == "swaps" or cause in CAUSES_OF_TWO:
                a, b = sorted(sites)
                self._add(f"by/link/{a}-{b}", sort, cost)
            else:
                self._add(f"by/site/{sites[0]}", sort, cost)

    def _add(self, base: str, sort: str, cost: int) -> None:
        self.sums[f"{base}/{sort}"] += cost
        self.sums[f"{base}/total"] += cost

    def value(self, path: str) -> float | None:
        """Return the number at a path, from the plan or made again."""
        keys = path.split("/")
        maker = {
            "by": lambda: self.sums.get(path, 0),
            "when": lambda: self._when(*keys[1:]),
            "life": lambda: self.lives[int(keys[1])][0],
            "site": lambda: self._site(int(keys[1]), keys[2]),
            "class": lambda: None,
            "recipe": lambda: self._recipe(int(keys[1]), *keys[2:]),
        }.get(keys[0])
        return self._in_plan(keys) if maker is None else maker()

    def _in_plan(self, keys: list[str]) -> float | None:
        found: Any = self.data
        for key in keys[:-1]:
            found = found[int(key)] if isinstance(found, list) else found[key]
        last = keys[-1]
        if isinstance(found, list):
            return found[int(last)]
        if "+" in last:
            return sum(found[key] for key in last.split("+"))
        return 1 - found[last[1:]] if last.startswith("-") else found[last]

    def _when(self, index: str, which: str) -> int:
        rows = self.diary.began if which == "start" else self.diary.ended
        return rows.get(int(index), 0)

    def _site(self, number: int, what: str) -> float | None:
        site = self.case.device.sites[number]
        if what in ("t1_us", "t2_us"):
            return getattr(site, what)
        return sum(
            1
            for step in self.case.steps
            for lease in step.leases
            if lease.site == number and (lease.lender is None) == (what == "leases")
        )

    def _recipe(self, number: int, name: str, what: str) -> int:
        op = self.case.program.operations[self.data["calls"][number]["index"]]
        built = next(b for b in every_recipe(op) if b.recipe == name)
        names = [one.name for one in built.fine.ops]
        return {
            "clean": built.slots.count("clean"),
            "borrowed": built.slots.count("borrowed"),
            "level2": len(built.level2_wires),
            "two_body": sum(names.count(n) for n in ("cx", "cz", "level2")),
            "t": names.count("t") + names.count("tdg"),
        }[what]

    def device_figures(self) -> dict[str, set[float]]:
        """Return the figures that the map's legend may name."""
        device = self.case.device
        return {
            "site": {
                min(t for t in (s.t1_us, s.t2_us) if t is not None)
                for s in device.sites
                if s.in_service and (s.t1_us or s.t2_us)
            },
            "link": {k.error for k in device.links if device.is_usable(k)},
        }


class Page(HTMLParser):
    """The numbers of a page with their paths, and all other visible text."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.facts: list[tuple[dict[str, str], str]] = []
        self.rest: list[str] = []
        self.ids: list[str] = []
        self.tags: list[tuple[str, dict[str, str]]] = []
        self._open: list[str] = []
        self._fact: dict[str, str] | None = None
        self.feed(text)

    def handle_starttag(self, tag, attrs):
        values = {k: v or "" for k, v in attrs}
        self.tags.append((tag, values))
        if "id" in values:
            self.ids.append(values["id"])
        if tag in ("meta", "link", "input", "br"):
            return
        self._open.append("chart" if values.get("class") == "chart" else tag)
        if tag == "data":
            self._fact = values

    def handle_endtag(self, tag):
        self._open.pop()
        if tag == "data":
            self._fact = None

    def handle_data(self, data):
        if self._fact is not None:
            self.facts.append((self._fact, data))
        elif not {"script", "style", "chart"} & set(self._open):
            self.rest.append(data)


def faults_of(page: Page, again: Again) -> list[str]:
    """Return every number of a page that is not what its path gives."""
    found = []
    figures = again.device_figures()
    for values, shown in page.facts:
        path, way = values["data-from"], values["data-as"]
        raw = float(values["value"])
        if path.startswith("class/"):
            good = raw in figures[path.split("/")[1]]
            expected = written(raw, way)
        else:
            made = again.value(path)
            if made is None:
                found.append(f"{path}: nothing there")
                continue
            if "data-of" in values:
                whole = again.value(values["data-of"])
                made = made / whole if whole else 0.0
            good = abs(made - raw) <= 1e-9 * max(1.0, abs(made))
            if way == "times":
                expected = significant(made)
            elif "data-of" in values:
                expected = percent(made)
            else:
                expected = written(made, way)
        if not good or expected != shown:
            found.append(f"{path} as {way}: {shown} shown, {expected} is right")
    return found


NUMBER = re.compile(r"[0-9][0-9.,e+%-]*")
