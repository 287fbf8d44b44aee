"""The verdict: exact measures of windows, honest limits, and reasons a designer can act on."""

from dataclasses import dataclass, replace

import numpy as np
import pytest

from tests.transport.stacks import CLOSED_OFF, END_WELLS, FREE, LEAD, LOSSY, PLAIN, UNEQUAL, barrier, well
from transport import (
    Layer,
    Lead,
    Stack,
    Target,
    Verdict,
    Window,
    bloch,
    dwell_time,
    lattice_bands,
    load_scenario,
    measured_transmission,
    period_verdict,
    spectrum,
)
from transport.constants import HBAR


@dataclass(frozen=True)
class Asked:
    """A scenario as far as a verdict needs it."""

    stack: Stack
    target: Target | None
    resolution: float = 0.0


def passing(bottom: float, top: float, transmission: float, measure: str = "minimum") -> Window:
    return Window("pass", bottom, top, transmission, measure)  # type: ignore[arg-type]


def blocking(bottom: float, top: float, transmission: float, measure: str = "maximum") -> Window:
    return Window("block", bottom, top, transmission, measure)  # type: ignore[arg-type]


def verdict(stack: Stack, *windows: Window, most: int = 30, resolution: float = 0.0) -> Verdict:
    return period_verdict(Asked(stack, Target(windows, most), resolution))


@pytest.mark.parametrize("stack", [PLAIN, CLOSED_OFF, UNEQUAL, END_WELLS, LOSSY], ids=repr)
@pytest.mark.parametrize("window", [
    passing(0.075, 0.088, 0.3), passing(0.075, 0.088, 0.3, "mean"), blocking(0.12, 0.22, 1e-3),
    blocking(0.12, 0.22, 1e-3, "mean"), blocking(0.06, 0.11, 0.5), passing(0.05, 0.4, 0.1, "mean"),
], ids=repr)
def test_margins_are_those_of_a_dense_grid(stack: Stack, window: Window) -> None:
    """Brute force: a grid so fine that its own error stays below the tolerance."""
    found = verdict(stack, window, most=12)
    energy = np.linspace(window.bottom, window.top, 2_000_001)
    for periods in (1, 5, 12):
        value = spectrum(stack.with_periods(periods), energy).transmission
        mean = np.trapezoid(value, energy) / (window.top - window.bottom)
        measured = {"minimum": value.min(), "maximum": value.max(), "mean": mean}[window.measure]
        margin = 10 * np.log10(measured / window.transmission) * (1 if window.kind == "pass" else -1)
        assert found.per_period[periods - 1].margin_dB == pytest.approx(margin, abs=2e-5)


def test_the_minimum_tends_to_the_ripple_floor_and_never_below() -> None:
    found = verdict(UNEQUAL, passing(0.075, 0.09, 0.9), most=400)
    lows = np.array([check.values[0] for check in found.per_period])
    assert found.ripple_floor is not None
    assert lows.min() >= found.ripple_floor * (1 - 1e-9)
    assert lows[-1] == pytest.approx(found.ripple_floor, rel=3e-2)
    assert lows[0] > found.ripple_floor  # a single count may beat the floor


def test_the_mean_tends_to_its_limit() -> None:
    found = verdict(UNEQUAL, passing(0.075, 0.09, 0.9, "mean"), most=300)
    assert found.per_period[-1].values[0] == pytest.approx(found.mean_limit, rel=2e-2)
    wider = verdict(UNEQUAL, passing(0.06, 0.11, 0.9, "mean"), most=300)
    assert wider.per_period[-1].values[0] == pytest.approx(wider.mean_limit, rel=2e-2)


def test_matched_end_layers_raise_the_floor() -> None:
    """Half barriers at both ends: the symmetric cell's impedance is real throughout the band (common practice)."""
    bare = Stack(LEAD, (), (barrier(3.0), well(5.0)), 8, (barrier(3.0),), LEAD)
    window = passing(0.08, 0.085, 0.5)
    halves = Stack(LEAD, (barrier(1.5),), (well(5.0), barrier(3.0)), 8, (well(5.0), barrier(1.5)), LEAD)
    assert (verdict(halves, window).ripple_floor or 0) > 2 * (verdict(bare, window).ripple_floor or 1)


def test_the_fewest_and_the_whole_set_are_reported() -> None:
    found = verdict(CLOSED_OFF, blocking(0.12, 0.25, 1e-4))
    assert found.fewest == min(found.meeting)
    assert [c.periods for c in found.per_period if c.meets] == list(found.meeting)
    assert found.reason is None
    assert found.sentence.startswith(f"Fewest periods: {found.fewest}.")


def test_a_larger_number_that_breaks_the_target_again_is_said() -> None:
    found = verdict(PLAIN, passing(0.081, 0.083, 0.045), most=30)
    gaps = set(range(found.meeting[0], found.meeting[-1])) - set(found.meeting)
    assert gaps, "the demo must have a set with holes"
    assert "Met by" in found.sentence


def reason(stack: Stack, *windows: Window, most: int = 30) -> str:
    found = verdict(stack, *windows, most=most)
    assert found.fewest is None and found.reason is not None
    return found.reason


def test_reasons_name_what_stands_in_the_way() -> None:
    assert "tends to" in reason(PLAIN, passing(0.075, 0.09, 0.9))
    assert "crosses the top of miniband 1 at 93.81 meV" in reason(PLAIN, passing(0.075, 0.1, 0.3))
    assert "crosses the bottom of miniband 1 at 71.61 meV" in reason(PLAIN, passing(0.06, 0.08, 0.3))
    between = reason(PLAIN, passing(0.1, 0.2, 0.3))
    assert "lies outside every miniband, between miniband 1" in between and "and miniband 2" in between
    assert "overlaps miniband 1 (71.61\N{EN DASH}93.81 meV) by 13.8 meV" in reason(PLAIN, blocking(0.08, 0.2, 1e-3))
    assert "below the lead edge at 30 meV" in reason(UNEQUAL, passing(0.02, 0.09, 0.01))
    assert "tends to" in reason(PLAIN, passing(0.075, 0.09, 0.9, "mean"))
    assert "would do" in reason(PLAIN, blocking(0.12, 0.25, 1e-30), most=10)
    both = reason(PLAIN, blocking(0.12, 0.25, 1e-4), passing(0.08, 0.085, 0.3), most=12)
    assert both.endswith(".")


def test_an_end_state_in_a_block_window_is_named() -> None:
    leaky = Stack(LEAD, (barrier(4.0), well(7.5), barrier(3.0)), (well(5.0), barrier(3.0)), 6,
                  (well(7.5), barrier(4.0)), LEAD)
    window = blocking(0.035, 0.065, 1e-9)
    found = verdict(leaky, window, most=6)
    assert found.fewest is None
    assert "an end state at 48.15 meV" in (found.reason or "")


def test_windows_that_are_met_in_turn_but_never_together_are_said() -> None:
    words = reason(CLOSED_OFF, passing(0.15, 0.16, 1e-3), blocking(0.12, 0.25, 1e-6), most=12)
    assert "meets every window at once" in words and "but" in words


def test_a_closed_lead_blocks_for_nothing_and_passes_nothing() -> None:
    blocked = verdict(UNEQUAL, blocking(0.0, 0.02, 1e-3), most=3)
    assert blocked.fewest == 1 and blocked.per_period[0].margin_dB is None
    passed = verdict(UNEQUAL, passing(0.0, 0.02, 1e-3), most=3)
    assert passed.fewest is None
    assert passed.per_period[0].margin_dB is None and passed.per_period[0].limiting_window == 0


def test_with_dephasing_no_floor_is_claimed_and_more_periods_lose_current() -> None:
    found = verdict(LOSSY, passing(0.075, 0.088, 0.9))
    assert (found.ripple_floor, found.mean_limit) == (None, None)
    assert "with dephasing further periods only lose current" in (found.reason or "")
    values = [check.values[0] for check in found.per_period]
    assert values[-1] < values[9] / 10


def test_with_a_beam_resolution_the_measured_curve_is_judged() -> None:
    window, width = passing(0.078, 0.088, 0.1), 0.004
    found = period_verdict(Asked(CLOSED_OFF, Target((window,), 9), width))
    energy = np.linspace(window.bottom, window.top, 2001)
    for periods in (3, 9):
        value = measured_transmission(CLOSED_OFF.with_periods(periods), energy, width).min()
        assert found.per_period[periods - 1].values[0] == pytest.approx(value, rel=1e-6)
    late = period_verdict(Asked(CLOSED_OFF, Target((window,), 150), width))
    assert late.per_period[-1].values[0] == pytest.approx(late.ripple_floor, rel=1e-3)


def test_a_window_that_asks_for_all_is_met_where_all_passes() -> None:
    found = verdict(FREE, passing(0.05, 0.4, 1.0), most=3)
    assert found.fewest == 1 and found.per_period[0].margin_dB == 0


@pytest.mark.filterwarnings("error")
@pytest.mark.parametrize("measure", ["minimum", "mean"])
def test_windows_from_the_lead_edge_itself_are_decided_without_a_warning(measure: str) -> None:
    for stack in (CLOSED_OFF, UNEQUAL, FREE):
        found = verdict(stack, passing(0.0, 0.05, 0.1, measure), blocking(0.0, 0.05, 0.1), most=4)
        assert all(c.margin_dB is None or np.isfinite(c.margin_dB) for c in found.per_period)


def test_a_floor_is_null_where_no_window_lies_in_a_miniband() -> None:
    assert verdict(PLAIN, passing(0.1, 0.2, 0.3)).ripple_floor is None
    crossing = verdict(PLAIN, passing(0.06, 0.08, 0.3))
    assert crossing.ripple_floor == 0
    bottom = lattice_bands(PLAIN, between=(0.0, 0.2)).bands[0].bottom
    assert crossing.ripple_floor_energy == pytest.approx(bottom, abs=1e-12)


def test_deep_rejection_does_not_underflow() -> None:
    found = verdict(PLAIN, blocking(0.13, 0.2, 1e-4), blocking(0.13, 0.2, 1e-4, "mean"), most=300)
    per_period = 20 / np.log(10) * bloch(PLAIN, np.linspace(0.13, 0.2, 2001)).decay.min()
    last, before = found.per_period[299], found.per_period[298]
    assert last.margin_dB is not None and before.margin_dB is not None
    assert last.margin_dB - before.margin_dB == pytest.approx(per_period, rel=1e-6)


def test_progress_is_told_and_can_stop_the_work() -> None:
    told: list[float] = []
    period_verdict(Asked(PLAIN, Target((passing(0.075, 0.09, 0.3),), 200)), progress=told.append)
    assert told == sorted(told) and told[-1] == pytest.approx(1.0)

    class StopWork(Exception):
        pass

    def stop(share: float) -> None:
        raise StopWork

    with pytest.raises(StopWork):
        period_verdict(Asked(PLAIN, Target((passing(0.075, 0.09, 0.3),), 200)), progress=stop)


def test_a_verdict_needs_windows_and_at_least_one_period() -> None:
    with pytest.raises(ValueError, match=r"target.windows: give at least one pass or block window to decide by"):
        period_verdict(Asked(PLAIN, None))
    with pytest.raises(ValueError, match=r"most: 0 periods asked for, give 1 or more"):
        period_verdict(Asked(PLAIN, Target((passing(0.07, 0.08, 0.1),), 5)), most=0)


def test_the_periods_of_the_stack_itself_do_not_matter() -> None:
    window = passing(0.075, 0.09, 0.3)
    assert verdict(PLAIN, window) == verdict(replace(PLAIN, periods=3), window)


def test_a_beam_sees_above_a_lead_edge_from_a_window_below_it() -> None:
    """The window lies wholly below the right lead's edge, and the beam is wide: what is measured decides."""
    stack = Stack(LEAD, (), (Layer(5.0, 0.05, 0.067),), 1, (), Lead(0.05, 0.067))
    found = verdict(stack, blocking(0.03, 0.049, 1e-3), most=2, resolution=0.03)
    expected = measured_transmission(stack, [0.049], 0.03)[0]
    assert found.fewest is None
    assert found.per_period[0].values[0] == pytest.approx(expected, rel=1e-6)


def test_with_dephasing_the_verdict_says_beyond_which_count_periods_only_lose_current() -> None:
    """By definition: no larger count passes more in any pass window, and a smaller one would leave a gain to come."""
    heron = load_scenario("scenarios/heron-gate.toml")
    lossy = Asked(replace(heron.stack, dephasing=4e-3), heron.target)
    verdict = period_verdict(lossy, most=30)
    place = next(i for i, window in enumerate(verdict.windows) if window.kind == "pass")
    passed = [check.values[place] for check in verdict.per_period]
    assert verdict.loses_beyond == 1 + passed.index(max(passed)) < 30
    assert verdict.sentence.endswith("further ones only lose current (coherent part only).")
    assert period_verdict(heron, most=30).loses_beyond is None


def test_what_is_absorbed_is_what_neither_passes_nor_returns() -> None:
    """Against the probability stored in the stack: absorbed = dephasing/hbar times the dwell time (continuity)."""
    heron = load_scenario("scenarios/heron-gate.toml")
    stack, energy = replace(heron.stack, dephasing=2e-3), np.linspace(0.05, 0.25, 7)
    expected = stack.dephasing / HBAR * dwell_time(stack, energy)
    assert spectrum(stack, energy).absorption == pytest.approx(expected, rel=1e-9)
    assert not spectrum(heron.stack, energy).absorption.any()
