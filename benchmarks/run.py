"""Runs the benchmarks of this folder once and prints a table: best of five.

    python benchmarks/run.py [NAME...]

NAME is a class, such as DemoStar; without any, all are run.
"""

from __future__ import annotations

import sys
import time

import bench_grid
import bench_solve


def main() -> None:
    cases = [
        case
        for module in (bench_solve, bench_grid)
        for case in vars(module).values()
        if isinstance(case, type) and case.__module__ == module.__name__
        if not case.__name__.startswith("_") and (not sys.argv[1:] or case.__name__ in sys.argv)
    ]
    for case in cases:
        for parameter in getattr(case, "params", (None,)):
            arguments = () if parameter is None else (parameter,)
            bench = case()
            if hasattr(bench, "setup"):
                bench.setup(*arguments)
            print(f"{case.__name__} {parameter if arguments else ''}")
            for name in sorted(vars(case)):
                if name.startswith("time_"):
                    print(f"  {name:34s} {_best(getattr(bench, name), arguments):.3e} s")
                elif name.startswith("track_"):
                    print(f"  {name:34s} {getattr(bench, name)(*arguments):.6g}")


def _best(function, arguments: tuple) -> float:
    times = []
    for _ in range(5):
        started = time.perf_counter()
        function(*arguments)
        times.append(time.perf_counter() - started)
    return min(times)


if __name__ == "__main__":
    main()
