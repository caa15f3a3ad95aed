"""Runs the benchmarks of this folder once and prints a table: best of five."""

from __future__ import annotations

import time

import bench_solve


def main() -> None:
    for case in (bench_solve.Sweep, bench_solve.DemoStar, bench_solve.Polytrope):
        for parameter in getattr(case, "params", (None,)):
            arguments = () if parameter is None else (parameter,)
            bench = case()
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
