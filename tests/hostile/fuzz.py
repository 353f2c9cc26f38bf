"""Try many hostile inputs: `python tests/hostile/fuzz.py --inputs 100000 --seed 1`.

Prints how many were refused and answered, the slowest input, the largest memory against that of good files, and every
defect with the input that made it. Ends with 1 where there was a defect.
"""

from __future__ import annotations

import argparse
import random
import resource
import sys
import tempfile
import time
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path

ROOT = Path(__file__).parents[2]
if __name__ == "__main__":
    sys.path[:0] = [str(ROOT), str(ROOT / "tests")]

from hostile import bases, mutators  # noqa: E402
from hostile.clothes import same_answer, same_scenario  # noqa: E402
from hostile.command_verdict import COMMANDS, try_command  # noqa: E402
from hostile.guards import Defect  # noqa: E402
from hostile.kernel_verdict import try_expression  # noqa: E402
from hostile.verdicts import try_scenario, try_swc  # noqa: E402

FAMILIES = ("swc", "scenario", "list", "expression")
WEIGHTS = (40, 30, 15, 15)
MEMORY_FACTOR = 2.0
COMMAND_SHARE = 0.03  # of scenarios that a command, drawn at random, is run on
MEMORY_LIMIT_B = 3 * 2**30


@dataclass
class Tally:
    """What a run saw."""

    verdicts: Counter[tuple[str, str]] = field(default_factory=Counter)
    defects: list[tuple[str, str, object]] = field(default_factory=list)
    slowest_s: dict[str, tuple[float, str]] = field(default_factory=dict)
    good_kB: int = 0
    growth_kB: int = 0


def peak_kB(reset: bool = False) -> int:
    """The largest resident memory of this process since the last reset, kB (Linux); 0 where it cannot be known."""
    try:
        if reset:
            Path("/proc/self/clear_refs").write_text("5")
        status = Path("/proc/self/status").read_text()
    except OSError:
        return 0
    return int(status.partition("VmHWM:")[2].split()[0])


def good_files(folder: Path, commands: bool = True) -> None:
    """Try every good file, and every command on one of them: each must be answered."""
    draw = random.Random(0)
    for name, text in bases.CELLS.items():
        assert try_swc(text.encode(), folder, draw) == "answered", name
    for text in (bases.SCENARIO, bases.LISTED):
        assert try_scenario(beside(text), folder, draw) == "answered"
    for text in bases.EXPRESSIONS:
        assert try_expression(text, folder, draw) == "answered", text
    for words in COMMANDS if commands else ():
        assert try_command(beside(bases.SCENARIO), folder, draw, words) == "answered", words


def beside(scenario: str | bytes, listed: str = bases.LIST, cell: str = bases.CELLS["forked"]) -> dict[str, bytes]:
    """A scenario with the files that it names."""
    raw = scenario if isinstance(scenario, bytes) else scenario.encode("utf-8", "surrogatepass")
    return {"scenario.toml": raw, "cell.swc": cell.encode(), "list.csv": listed.encode("utf-8", "surrogatepass")}


def hostile_input(draw: random.Random) -> tuple[str, object]:
    """The family and the content of one input: one to three changes of a good one."""
    family = draw.choices(FAMILIES, WEIGHTS)[0]
    changes = draw.choice((1, 1, 1, 2, 3))
    if family == "expression":
        text = draw.choice(bases.EXPRESSIONS)
        for _ in range(changes):
            text = (mutators.gently_spoiled if draw.random() < 0.3 else mutators.expression_spoiled)(text, draw)
        return family, text
    if family == "swc":
        data = draw.choice(list(bases.CELLS.values())).encode()
        for _ in range(changes):
            way = draw.random()
            if way < 0.35:
                data = mutators.gently_spoiled(data.decode("latin-1"), draw).encode("utf-8", "surrogatepass")
            elif way < 0.6:
                data = mutators.bytes_spoiled(data, draw)
            else:
                data = mutators.rows_spoiled(data.decode("latin-1"), draw).encode("utf-8", "surrogatepass")
        return family, data
    if family == "list":
        text = bases.LIST
        for _ in range(changes):
            text = (mutators.gently_spoiled if draw.random() < 0.3 else mutators.cells_spoiled)(text, draw)
        return family, beside(bases.LISTED, text)
    text = draw.choice((bases.SCENARIO, bases.LISTED))
    for _ in range(changes):
        text = (mutators.gently_spoiled if draw.random() < 0.5 else mutators.keys_spoiled)(text, draw)
    raw = text.encode("utf-8", "surrogatepass")
    return family, beside(mutators.bytes_spoiled(raw, draw) if draw.random() < 0.2 else raw)


def verdict_on(
    family: str, content: object, folder: Path, draw: random.Random, command_share: float = COMMAND_SHARE
) -> str:
    """The verdict on one input.

    Raises:
        Defect: what no input may bring about.
    """
    if family == "expression":
        return try_expression(str(content), folder, draw)
    if family == "swc":
        assert isinstance(content, bytes)
        verdict = try_swc(content, folder, draw)
        if verdict == "answered" and draw.random() < 0.25:
            same_answer(content, draw)
        return verdict
    assert isinstance(content, dict)
    verdict = try_scenario(content, folder, draw)
    if draw.random() < command_share:
        try_command(content, folder, draw)
    elif verdict == "answered" and draw.random() < 0.25:
        same_scenario(content, folder, draw)
    return verdict


def inputs(seed: int, first: int, count: int) -> Iterator[tuple[int, random.Random]]:
    """A generator of its own for each input, so that any of them can be made again alone."""
    for n in range(first, first + count):
        yield n, random.Random(f"{seed} {n}")


def run(count: int, seed: int = 1, first: int = 0, progress: int = 0, command_share: float = COMMAND_SHARE) -> Tally:
    """Try `count` inputs."""
    tally = Tally()
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        (folder / "loop").symlink_to("loop")
        good_files(folder, commands=command_share > 0)
        tally.good_kB = peak_kB()
        for n, draw in inputs(seed, first, count):
            family, content = hostile_input(draw)
            before = peak_kB(reset=True)
            begun = time.perf_counter()
            try:
                tally.verdicts[family, verdict_on(family, content, folder, draw, command_share)] += 1
            except Defect as defect:
                tally.verdicts[family, "DEFECT"] += 1
                tally.defects.append((f"{seed} {n}", str(defect), content))
                if progress:
                    print(f"input {seed} {n} ({family}): {defect}", flush=True)
            taken = time.perf_counter() - begun
            tally.slowest_s[family] = max(tally.slowest_s.get(family, (0.0, "")), (taken, f"{seed} {n}"))
            most = peak_kB()
            # the process keeps caches from input to input: an input is judged by what it adds
            if most - before > (MEMORY_FACTOR - 1) * tally.good_kB:
                tally.defects.append(
                    (f"{seed} {n}", f"took {most - before} kB, good files {tally.good_kB} kB", content)
                )
                if progress:
                    print(f"input {seed} {n} ({family}): took {most - before} kB of memory", flush=True)
            tally.growth_kB = max(tally.growth_kB, most - before)
            if progress and (n + 1 - first) % progress == 0:
                print(f"{n + 1 - first} inputs, {len(tally.defects)} defects", flush=True)
    return tally


def main() -> int:
    """Run as the command line says, and print the tally."""
    words = argparse.ArgumentParser(description=__doc__)
    words.add_argument("--inputs", type=int, default=2000)
    words.add_argument("--seed", type=int, default=1)
    words.add_argument("--first", type=int, default=0, help="number of the first input")
    words.add_argument("--show", action="store_true", help="print the inputs instead of trying them")
    said = words.parse_args()
    if said.show:
        for n, draw in inputs(said.seed, said.first, said.inputs):
            print(n, *hostile_input(draw), sep="\n")
        return 0
    # a hostile input that gets past the checks shall meet a MemoryError, and not take the machine along
    resource.setrlimit(resource.RLIMIT_AS, (MEMORY_LIMIT_B, MEMORY_LIMIT_B))
    begun = time.perf_counter()
    tally = run(said.inputs, said.seed, said.first, progress=10000)
    for (family, verdict), times in sorted(tally.verdicts.items()):
        print(f"{family:12} {verdict:14} {times:8}")
    for family, (taken, number) in sorted(tally.slowest_s.items()):
        print(f"{family:12} slowest {1e3 * taken:8.0f} ms (input {number})")
    print(f"memory: a run of good files {tally.good_kB} kB, one hostile input on top at most {tally.growth_kB} kB")
    print(f"{said.inputs} inputs in {time.perf_counter() - begun:.0f} s; {len(tally.defects)} defects")
    for name, said_of_it, content in tally.defects[:40]:
        print(f"--- {name}: {said_of_it}\n{content!r:.3000}")
    return 1 if tally.defects else 0


if __name__ == "__main__":
    sys.exit(main())
