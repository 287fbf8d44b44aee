"""What one session has had worked out is there for all, as long as it is the same question."""

from __future__ import annotations

import pytest

from transport import load_scenario
from webapp.latest import Stop, remembered
from webapp.results import question
from webapp.work import band_of, range_of, verdict


def test_equal_requests_are_worked_out_once_and_failures_each_time() -> None:
    asked: list[int] = []

    @remembered
    def work(request: int, stop: Stop) -> int:
        asked.append(request)
        if request < 0:
            raise ValueError("no answer")
        return 2 * request

    assert [work(n, Stop()) for n in (1, 2, 1)] == [2, 4, 2] and asked == [1, 2]
    for _ in range(2):
        with pytest.raises(ValueError, match="no answer"):
            work(-1, Stop())
    assert asked == [1, 2, -1, -1]


def test_only_the_last_results_are_kept() -> None:
    asked: list[int] = []

    @remembered
    def work(request: int, stop: Stop) -> int:
        asked.append(request)
        return request

    for request in range(100):
        work(request, Stop())
    work(99, Stop())
    work(0, Stop())
    assert len(asked) == 101 and asked[-1] == 0


def test_verdict_range_and_band_of_one_question_are_the_same_objects_for_two_sessions() -> None:
    one, two = (load_scenario("scenarios/heron-gate.toml") for _ in range(2))

    assert verdict(question(one), Stop(), lambda share: None) is verdict(question(two), Stop(), lambda share: None)
    found = range_of(one, Stop())
    assert found is not None and found is range_of(two, Stop())
    assert band_of((one, found), Stop()) is band_of((two, found), Stop())
