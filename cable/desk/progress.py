"""How far long work has come: a bar on a terminal, nothing in a pipe."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from threading import Timer

from cable.desk.terminal import console, is_quiet

PATIENCE_S = 1.0  # before a person is told that work goes on


@contextmanager
def progress(label: str) -> Iterator[Callable[[float], None]]:
    """A function that hears the share that is done, from 0 to 1, and shows it with the time left."""
    if is_quiet() or not sys.stderr.isatty():
        yield lambda share: None
        return
    from rich.progress import BarColumn, Progress, TextColumn, TimeElapsedColumn, TimeRemainingColumn

    columns = TextColumn("{task.description}", markup=False), BarColumn(), TimeElapsedColumn(), TextColumn("left")
    with Progress(*columns, TimeRemainingColumn(), console=console(stderr=True), transient=True) as bar:
        task = bar.add_task(label, total=1.0)
        yield lambda share: bar.update(task, completed=share)


@contextmanager
def waiting(label: str) -> Iterator[None]:
    """Say on a terminal that work goes on, and for how long, where it takes more than a second."""
    if is_quiet() or not sys.stderr.isatty():
        yield
        return
    from rich.progress import Progress, SpinnerColumn, TextColumn, TimeElapsedColumn

    columns = SpinnerColumn("line"), TextColumn("{task.description}", markup=False), TimeElapsedColumn()
    bar = Progress(*columns, console=console(stderr=True), transient=True)
    bar.add_task(label, total=None)
    timer = Timer(PATIENCE_S, bar.start)
    timer.daemon = True
    timer.start()
    try:
        yield
    finally:
        timer.cancel()
        timer.join()
        bar.stop()
