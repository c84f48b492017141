"""
What a diagnosis costs, as a ratio to the plain loop over causes and sizes, on circuits of the blind trial.

    python tests/benchmarks/diagnosis.py [--circuits N] [--runs N]

- One circuit as typed, five runs and two rounds: at most a tenth of the loop's time.
- Many circuits in batches of equal shape: at least 300 times as fast a circuit as the loop.

Both sides start from what was read, the loop from its rows and the batches from posed problems, and both end in
probabilities; the batches also give intervals, pairs of bad connections and words, which the loop does not. Median
of interleaved runs. The loop is timed on a share of the circuits that has every shape in its proportion. Below it: posing the
problems, one circuit judged as one types (rules included), and the memory of a batch.
"""

from __future__ import annotations

import argparse
import importlib.util
import statistics
import sys
import tempfile
import time
import tracemalloc
from collections.abc import Callable, Sequence
from pathlib import Path
from types import ModuleType
from typing import Any

from audit.intake.folder import read_folder
from rules import limits
from rules.assess import assess_circuit, prepare
from rules.case import CircuitCase, case_of
from rules.context import Context
from rules.diagnosis.diagnose import diagnose
from rules.diagnosis.problem import Problem
from rules.limits import Limits
from rules.measured import posed_by

TESTS = Path(__file__).parent.parent
ONE_AT_MOST = 0.1
"""Of the loop's time, for one circuit."""
MANY_AT_LEAST = 300.0
"""Times as fast as the loop, a circuit in batches."""
DRAWN = 1_000
"""Circuits that are drawn; more are the same ones again."""


def module(path: str) -> ModuleType:
    """A module of the tests by its path below ``tests``."""
    found = sys.modules.get(path)
    if found is None:
        spec = importlib.util.spec_from_file_location(path, TESTS / path)
        assert spec is not None
        assert spec.loader is not None
        found = sys.modules[path] = importlib.util.module_from_spec(spec)
        spec.loader.exec_module(found)
    return found


def survey(circuits: int, seed: int = 11) -> Context:
    """A prepared survey of the blind trial."""
    trial = module("trial/trial.py")
    with tempfile.TemporaryDirectory() as folder:
        trial.write(Path(folder), trial.draw(circuits, seed))
        site = read_folder(Path(folder) / "site")
    return prepare(site, limits.of(site))


def seconds(work: Callable[[], object]) -> float:
    """Time that the processor spends on some work: another program beside it changes little."""
    start = time.process_time()
    work()
    return time.process_time() - start


def interleaved(runs: int, *works: Callable[[], object]) -> list[list[float]]:
    """Times of several works, each run of one beside a run of the others."""
    times: list[list[float]] = [[] for _ in works]
    for _ in range(runs):
        for taken, work in zip(times, works, strict=True):
            taken.append(seconds(work))
    return times


def by_loop(loop: Any) -> dict[str, float]:
    """Probabilities of one circuit by the plain loop, slips and doubtful records included."""
    plain, slips = module("rules/diagnosis/plain.py"), module("rules/diagnosis/plain_slips.py")
    causes: dict[str, float] = loop.posterior(slips.slips(loop, plain))
    return causes


def by_shape(cases: Sequence[CircuitCase]) -> list[CircuitCase]:
    """Cases by their number of runs and rounds."""
    return sorted(cases, key=lambda case: (len(case.runs), len(case.rounds)))


def benchmark(circuits: int, looped: int, runs: int, say: Callable[[str], None]) -> tuple[float, float]:
    """Time both and say so; the ratios for one circuit and for many."""
    context = survey(min(circuits, DRAWN))
    cases = [case_of(context, circuit) for circuit in context.site.circuits]
    posed = [posed_by(context, context.measured[case.circuit.id]) for case in cases]
    problems = [problem for problem in posed if problem is not None]
    one = _one(context, by_shape(cases)[-1], runs, say)
    step = max(1, len(cases) // looped)
    loops = [module("rules/diagnosis/plain.py").Plain(case) for case in by_shape(cases)[step // 2 :: step]]
    many = (problems * (circuits // len(problems) + 1))[:circuits]
    diagnose(many[: len(problems)], context.limits)  # shapes and tables are made once a process
    batches, loop = interleaved(runs, lambda: diagnose(many, context.limits), lambda: [by_loop(loop) for loop in loops])
    ratios = [(b / len(loops)) / (a / len(many)) for a, b in zip(batches, loop, strict=True)]
    ratio = statistics.median(ratios)
    each, each_loop = statistics.median(batches) / len(many), statistics.median(loop) / len(loops)
    say(
        f"{len(many):,} circuits in batches   {ratio:6.0f} × as fast as the loop ({min(ratios):.0f} to {max(ratios):.0f}, at least "
        f"{MANY_AT_LEAST:g})   {1e6 * each:.0f} µs a circuit, {1 / each:,.0f} circuits a second; the loop {1e3 * each_loop:.1f} ms"
    )
    measured = [context.measured[case.circuit.id] for case in cases]
    posing = seconds(lambda: [posed_by(context, side) for side in measured])
    say(f"    posing the problems from their rounds {1e6 * posing / len(cases):.0f} µs a circuit")
    once, twice = (_memory(problems, context.limits) for problems in (many, many * 2))
    say(
        f"    memory beside the results: {once / 1e6:.1f} MB for {len(many):,}, {twice / 1e6:.1f} MB for {2 * len(many):,}"
    )
    return one, ratio


def _one(context: Context, case: CircuitCase, runs: int, say: Callable[[str], None]) -> float:
    """One circuit as typed against the loop."""
    problem = posed_by(context, context.measured[case.circuit.id])
    assert problem is not None
    loop = module("rules/diagnosis/plain.py").Plain(case)
    typed = context.measured[case.circuit.id].readings
    diagnose([problem], context.limits)
    works = (
        lambda: diagnose([problem], context.limits),
        lambda: by_loop(loop),
        lambda: assess_circuit(context, case.circuit, readings=typed),
    )
    alone, looped, whole = interleaved(runs, *works)
    ratios = [a / b for a, b in zip(alone, looped, strict=True)]
    ratio = statistics.median(ratios)
    say(
        f"one circuit, {len(case.runs)} runs, {len(case.rounds)} rounds   {ratio:6.3f} of the loop ({min(ratios):.3f} to "
        f"{max(ratios):.3f}, at most {ONE_AT_MOST})   {1e3 * statistics.median(alone):.1f} ms against "
        f"{1e3 * statistics.median(looped):.1f} ms; with all rules, as typed, {1e3 * statistics.median(whole):.1f} ms"
    )
    return ratio


def _memory(problems: list[Problem], in_force: Limits) -> int:
    """Most memory that a diagnosis takes beyond what it gives back. [bytes]"""
    tracemalloc.start()
    found = diagnose(problems, in_force)
    kept, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert len(found) == len(problems)
    return peak - kept


def main() -> None:
    """Draw, run everything, print the ratios."""
    parser = argparse.ArgumentParser(description="What a diagnosis costs, as a ratio to the plain loop.")
    parser.add_argument("--circuits", type=int, default=20_000)
    parser.add_argument("--looped", type=int, default=100)
    parser.add_argument("--runs", type=int, default=5)
    options = parser.parse_args()
    benchmark(options.circuits, options.looped, options.runs, print)


if __name__ == "__main__":
    main()
