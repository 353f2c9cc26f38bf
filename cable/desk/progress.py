"""How far long work has come: a bar on a terminal, nothing in a pipe."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager


@contextmanager
def progress(label: str) -> Iterator[Callable[[float], None]]:
    """A function that hears the share that is done, from 0 to 1, and shows it with the time left."""
    if not sys.stderr.isatty():
        yield lambda share: None
        return
    from rich.progress import BarColumn, Progress, TextColumn, TimeElapsedColumn, TimeRemainingColumn

    from cable.desk.terminal import console

    columns = TextColumn("{task.description}", markup=False), BarColumn(), TimeElapsedColumn(), TextColumn("left")
    with Progress(*columns, TimeRemainingColumn(), console=console(stderr=True), transient=True) as bar:
        task = bar.add_task(label, total=1.0)
        yield lambda share: bar.update(task, completed=share)
