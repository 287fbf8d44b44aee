"""What every benchmark shares: medians of alternating runs, and the line that says where they were made."""

from __future__ import annotations

import os
import platform
import statistics
import time
from collections.abc import Callable

import numpy
import scipy

Run = Callable[[int], object]


def machine() -> str:
    """Processor, cores and versions, for the head of a report."""
    return (
        f"{platform.machine()}, {os.cpu_count()} cores, Python {platform.python_version()}, "
        f"NumPy {numpy.__version__}, SciPy {scipy.__version__}"
    )


def median_ms(run: Run, repeats: int = 15) -> float:
    """Median time of a run in ms, after one run to warm up. The run is told its number, to ask something new."""
    run(0)
    return statistics.median(_ms(run, i) for i in range(1, repeats + 1))


def median_ratio(run: Run, reference: Run, repeats: int = 40) -> tuple[float, float, float]:
    """Median of run / reference over alternating runs, and the medians (ms) of both."""
    run(0), reference(0)
    pairs = [(_ms(run, i), _ms(reference, i)) for i in range(1, repeats + 1)]
    ratio = statistics.median(ours / theirs for ours, theirs in pairs)
    return ratio, statistics.median(p[0] for p in pairs), statistics.median(p[1] for p in pairs)


def _ms(run: Run, number: int) -> float:
    begin = time.perf_counter()
    run(number)
    return (time.perf_counter() - begin) * 1e3
