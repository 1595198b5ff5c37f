"""What the processes of a long run do."""

from __future__ import annotations

import json
from pathlib import Path

from tests.fuzz.judge import Verdict, judge
from tests.fuzz.problems import Problem, random_problem


def judge_some(seeds: range) -> list[tuple[int, str, Verdict]]:
    out = []
    for seed in seeds:
        problem = random_problem(seed)
        out.append((seed, problem.pair, judge(problem, lower_bound=seed % 8 == 0)))
    return out


def kind_of(text: str) -> str:
    """What two failures of one kind have in common: their words without the numbers."""
    return " ".join(word for word in text.split() if not any(c.isdigit() for c in word))[:60]


def write_failure(problem: Problem, text: str, path: Path) -> None:
    """A script that shows the failure."""
    path.write_text(
        f'"""{text}"""\n'
        "from tests.fuzz.judge import judge\n"
        "from tests.fuzz.problems import Problem\n\n"
        f"problem = Problem.of({json.loads(problem.to_json())!r})\n"
        'if __name__ == "__main__":\n'
        "    print(judge(problem, lower_bound=True))\n",
        encoding="utf-8",
    )
