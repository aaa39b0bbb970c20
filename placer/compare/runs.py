"""Go through programs and devices; keep every finished row, use known ones again.

In: jobs and perhaps a results file.  Out: rows, one after the other.  The file has one
row of JSON a line, written as soon as it is known, so that an interrupted sweep goes on
where it was.
"""

from __future__ import annotations

import os
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from placer.api import plan
from placer.compare.rows import key_of, of_line, row_of, to_line
from placer.errors import InputError, NoPlan, OutOfTime, Place

if TYPE_CHECKING:
    from collections.abc import Callable, Iterator, Sequence

    from placer.compare.rows import Options, Row
    from placer.device.model import Device
    from placer.program.model import Program


@dataclass(frozen=True, slots=True)
class Job:
    """One program on one device."""

    program: Program
    device: Device


def sweep(
    jobs: Sequence[Job],
    options: Options,
    *,
    results: str | None = None,
    progress: Callable[[str], None] = lambda _: None,
) -> Iterator[Row]:
    """Return the row of each job as soon as it is known.

    Raises
    ------
    InputError
        If the results file cannot be read or written, or holds something else.
    """
    known = {} if results is None else read_results(results)
    for number, job in enumerate(jobs, start=1):
        title = f"{number} of {len(jobs)}: {job.program.name} on {job.device.name}"
        key = key_of(job.program, job.device, options)
        if key in known:
            yield known[key]
            continue
        progress(title)

        def say(text: str, title: str = title) -> None:
            progress(f"{title}; {text}")

        row = _plan_one(job, options, say)
        if results is not None:
            _append(results, to_line(row))
        known[key] = row
        yield row


def _plan_one(job: Job, options: Options, say: Callable[[str], None]) -> Row:
    """Plan one pair; a pair that cannot run is a row with its reason."""
    try:
        found = plan(
            job.program,
            job.device,
            budget=options.budget_on(job.device),
            only=options.only,
            effort=options.effort,
            seed=options.seed,
            open_inputs=options.open_inputs,
            progress=say,
        )
    except (InputError, NoPlan, OutOfTime) as error:
        return row_of(job.program, job.device, options, error)
    return row_of(job.program, job.device, options, found)


def read_results(path: str) -> dict[str, Row]:
    """Return the rows of a results file by their keys; none if there is no file.

    A last line that was cut off by a crash is taken away.

    Raises
    ------
    InputError
        If it cannot be read, or a line is no row.
    """
    file = Path(path)
    if not file.exists():
        return {}
    try:
        text = file.read_text(encoding="utf-8")
    except (OSError, UnicodeDecodeError) as error:
        raise InputError.at(
            Place(path), "not-read", f"'{path}' cannot be read ({error})"
        ) from error
    whole, _, rest = text.rpartition("\n")
    found: dict[str, Row] = {}
    for number, line in enumerate(whole.splitlines(), start=1):
        try:
            row = of_line(line)
        except ValueError as error:
            raise InputError.at(
                Place(path, number),
                "not-a-row",
                "this line is no row of a comparison",
                "name another file; rows of this one were not written by placer",
            ) from error
        found[row.key] = row
    if rest:
        os.truncate(file, len((whole + "\n").encode()) if whole else 0)
    return found


def _append(path: str, line: str) -> None:
    try:
        with Path(path).open("a", encoding="utf-8", newline="\n") as stream:
            stream.write(line)
            stream.flush()
            os.fsync(stream.fileno())
    except OSError as error:
        raise InputError.at(
            Place(path), "not-written", f"'{path}' cannot be written ({error.strerror})"
        ) from error
