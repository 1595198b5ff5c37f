"""Many random problems, with a table of what became of them: `python -m tests.fuzz --help`."""

from __future__ import annotations

import os

os.environ.setdefault("OMP_NUM_THREADS", "1")  # before numpy: one process, one thread
os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")

import argparse
import sys
import tempfile
import time
from collections import Counter
from concurrent.futures import ProcessPoolExecutor, as_completed
from multiprocessing import get_context
from pathlib import Path

from tests.fuzz.judge import judge
from tests.fuzz.problems import PAIRS, library, random_problem
from tests.fuzz.shrink import shrink
from tests.fuzz.work import judge_some, kind_of, write_failure

OUTCOMES = ("settled", "no end state", "refused", "failed")


def main() -> int:
    parser = argparse.ArgumentParser(prog="python -m tests.fuzz", description=__doc__)
    parser.add_argument("--count", type=int, default=20_000)
    parser.add_argument("--first", type=int, default=0, help="first seed")
    parser.add_argument("--processes", type=int, default=2)
    parser.add_argument(
        "--failures", type=Path, default=Path(tempfile.gettempdir()) / "thalweg-fuzz"
    )
    parser.add_argument("--keep-going", type=int, default=40, help="failures made small at most")
    given = parser.parse_args()
    library()
    begin = time.monotonic()
    table: Counter[tuple[str, str]] = Counter()
    worst: dict[str, tuple[float, int]] = dict.fromkeys(
        ("elements", "traces", "energy", "gap"), (0.0, -1)
    )
    slow: list[tuple[float, int, str]] = []
    failures: list[tuple[int, str]] = []
    seeds = range(given.first, given.first + given.count)
    shown = begin
    done = 0
    with ProcessPoolExecutor(given.processes, mp_context=get_context("spawn")) as pool:
        jobs = [pool.submit(judge_some, seeds[k : k + 20]) for k in range(0, given.count, 20)]
        for job in as_completed(jobs):
            for seed, pair, verdict in job.result():
                done += 1
                table[pair, verdict.kind] += 1
                slow.append((verdict.seconds, seed, pair))
                if verdict.failed:
                    failures.append((seed, verdict.text))
                    print(f"  failed: seed {seed} {pair}: {verdict.text[:200]}", flush=True)
                for name, (value, _) in worst.items():
                    if abs(getattr(verdict, name)) > value:
                        worst[name] = (abs(getattr(verdict, name)), seed)
            if time.monotonic() - shown > 10.0:
                shown = time.monotonic()
                print(
                    f"{done} of {given.count}, {len(failures)} failed, {shown - begin:.0f} s",
                    file=sys.stderr,
                    flush=True,
                )
    print(f"\n{given.count} problems from seed {given.first}, {time.monotonic() - begin:.0f} s")
    print("pair " + "".join(f"{outcome:>14}" for outcome in OUTCOMES))
    for pair in PAIRS:
        print(f"{pair:5}" + "".join(f"{table[pair, outcome]:14}" for outcome in OUTCOMES))
    print("all  " + "".join(f"{sum(table[p, o] for p in PAIRS):14}" for o in OUTCOMES))
    for name, (value, seed) in worst.items():
        print(f"worst {name:9} {value:.1e}  (seed {seed})")
    print("slowest: " + ", ".join(f"{t:.1f} s seed {s} {p}" for t, s, p in sorted(slow)[::-1][:8]))
    seen: Counter[str] = Counter()
    for seed, text in failures[: given.keep_going]:
        kind = kind_of(text)
        seen[kind] += 1
        if seen[kind] > 6:
            continue
        problem = shrink(
            random_problem(seed),
            lambda p, kind=kind: (v := judge(p)).failed and kind_of(v.text) == kind,
        )
        given.failures.mkdir(exist_ok=True)
        path = given.failures / f"seed{seed}.py"
        write_failure(problem, judge(problem).text or text, path)
        print(f"made small: {path}")
    return 1 if failures else 0


if __name__ == "__main__":
    sys.exit(main())
