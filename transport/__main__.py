"""The command line: python -m transport COMMAND SCENARIO [options]."""

from __future__ import annotations

import argparse
import os
import sys
from collections.abc import Callable, Sequence
from dataclasses import replace
from importlib.metadata import entry_points
from pathlib import Path
from typing import NoReturn

import numpy as np

from transport import report
from transport.allowance import verdict_range
from transport.handoff import grower_csv
from transport.lattice import default_range, lattice_bands, lowest_energy
from transport.matching import matched_ends
from transport.measured import measured_peaks, read_peaks
from transport.nearest import MOST_MONOLAYERS, nearest_stacks
from transport.parameters import PARAMETERS
from transport.peaks import FIGURES, compare_peaks, fit_peaks
from transport.periods import no_progress, period_verdict
from transport.resonance import resonances
from transport.scenario import Scenario, load_scenario, read_text, save_scenario, save_text
from transport.sheet import read_rates
from transport.spectrum import Spectrum, spectrum
from transport.structure import Stack

Handler = Callable[[Scenario, argparse.Namespace], str]


def main(arguments: Sequence[str] | None = None) -> int:
    """Run one command; returns the exit status: 0 done, 2 bad input, 1 anything else."""
    options = _parser().parse_args(arguments)
    handler: Handler = options.handler
    try:
        answer = handler(load_scenario(options.scenario), options)
        print(_printable(answer))
        sys.stdout.flush()
    except ValueError as error:
        print(error, file=sys.stderr)
        return 2
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 1
    except OSError as error:
        print(f"the answer cannot be written ({error.strerror}); choose another place for it", file=sys.stderr)
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 1
    except KeyboardInterrupt:
        print("stopped", file=sys.stderr)
        return 1
    return 0


def _printable(text: str) -> str:
    """The text as the terminal's encoding has it; what that lacks is written as an escape."""
    encoding = sys.stdout.encoding or "utf-8"
    return text.encode(encoding, "backslashreplace").decode(encoding)


class _Parser(argparse.ArgumentParser):
    """A parser that says what is wrong in one sentence."""

    def error(self, message: str) -> NoReturn:
        """Print the sentence and leave with status 2."""
        self.exit(2, f"{message[:1].lower()}{message[1:]}; {self.prog} --help lists what there is\n")


def _parser() -> argparse.ArgumentParser:
    parser = _Parser(
        prog="python -m transport", description="Finite periodic barrier stacks: what passes, and how many periods."
    )
    commands = parser.add_subparsers(title="commands", required=True, metavar="COMMAND")
    _command(commands, "check", _check, "say whether a scenario is sound, with its warnings")
    command = _command(commands, "spectrum", _spectrum, "transmission and reflection over energy")
    command.add_argument("--energies-meV", type=_numbers, metavar="LIST",
                         help="energies, such as 10,20.5 (--energies-meV=-50,10 where the first is negative)")
    command.add_argument("--from-meV", type=_number, metavar="A", help="start of the range (default: lowest lead edge)")
    command.add_argument("--to-meV", type=_number, metavar="B", help="end (default: a tenth above the highest barrier)")
    command.add_argument("--points", type=_whole("points"), metavar="N",
                         help="evenly spaced energies (default: as many as no feature is missed with)")
    command.add_argument("--periods", type=_whole("periods"), metavar="N", help="periods (default: the file's)")
    command = _command(commands, "bands", _bands, "the infinite lattice's bands, certified")
    command.add_argument("--from-meV", type=_number, metavar="A", help="start of the range (default: the lowest band)")
    command.add_argument("--to-meV", type=_number, metavar="B", help="end (default: a tenth above the highest barrier)")
    command = _command(commands, "periods", _periods, "how many periods the target needs")
    command.add_argument("--most", type=_whole("most_periods"), metavar="N",
                         help="largest count tried (default: the target's most_periods)")
    command.add_argument("--range", action="store_true",
                         help="also the range of the verdict (without it, only where the file has [growth])")
    command = _command(commands, "ends", _ends, "end layers that raise what the pass windows tend to")
    command.add_argument("--whole-monolayers", action="store_true", help="only layers of whole monolayers")
    command.add_argument("--cells", type=_whole("cells"), metavar="N", help="longest taper, in cells (default: 4)")
    command.add_argument("--save", metavar="FILE", help="write the scenario with the best ends to a new file")
    command = _command(commands, "remedy", _remedy, "the nearest stacks that meet the target")
    command.add_argument("--monolayers", type=_whole("remedy_monolayers"), metavar="N",
                         help="by how many monolayers a layer of the cell may change (default: 3)")
    command.add_argument("--save", metavar="FILE", help="write the nearest stack that meets the target to a new file")
    command = _command(commands, "resonances", _resonances, "every resonance, certified")
    command.add_argument("--from-meV", type=_number, metavar="A", help="start of the range (default: lowest lead edge)")
    command.add_argument("--to-meV", type=_number, metavar="B", help="end (default: a tenth above the highest barrier)")
    command.add_argument("--periods", type=_whole("periods"), metavar="N", help="periods (default: the file's)")
    command = _command(commands, "peaks", _peaks, "measured peaks beside computed resonances, and a fit")
    command.add_argument("--measured", metavar="FILE", help="CSV of peaks: energy_meV or bias_V, width_meV, "
                         "uncertainty_meV (default: the scenario's [measured])")
    command.add_argument("--fit", metavar="LIST", type=lambda text: text.split(","),
                         help=f"figures to fit, out of {', '.join(FIGURES)}")
    command = _command(commands, "layers", _layers, "the grower's sheet")
    command.add_argument("--csv", action="store_true",
                         help="every layer in the order of growth as CSV, in whole monolayers with the rounding shown")
    command.add_argument("--rate", metavar="LIST", default="",
                         help="monolayers a second for --csv, for all or by material: 0.8, or GaAs=0.8,AlGaAs=1.1")
    command = _command(commands, "report", _report, "everything worked out, in one HTML file that works offline")
    command.add_argument("--save", metavar="FILE", help="the new file to write (default: the scenario's name, .html)")
    return parser


def _command(commands: argparse._SubParsersAction, name: str, handler: Handler, words: str) -> argparse.ArgumentParser:  # type: ignore[type-arg]
    command: argparse.ArgumentParser = commands.add_parser(name, help=words, description=words)
    command.add_argument("scenario", metavar="SCENARIO", help="scenario file (TOML)")
    command.add_argument("--json", action="store_true", help="print one JSON object")
    command.set_defaults(handler=handler)
    return command


def _number(text: str) -> float:
    try:
        value = float(text)
    except ValueError:
        value = float("nan")
    bound = PARAMETERS["energy_eV"].high * 1e3
    if not abs(value) <= bound:
        raise argparse.ArgumentTypeError(f"{text!r} must be a number of meV, at most {bound:g} in size")
    return value


def _numbers(text: str) -> list[float]:
    return [_number(part) for part in text.split(",")]


def _whole(name: str) -> Callable[[str], int]:
    low, high = int(PARAMETERS[name].low), int(PARAMETERS[name].high)

    def parse(text: str) -> int:
        try:
            value = int(text)
        except ValueError:
            value = low - 1
        if not low <= value <= high:
            raise argparse.ArgumentTypeError(f"{text!r} must be a whole number from {low} to {high:,}")
        return value

    return parse


def _check(scenario: Scenario, options: argparse.Namespace) -> str:
    return report.to_json(report.check_record(scenario)) if options.json else report.check_text(scenario)


def _spectrum(scenario: Scenario, options: argparse.Namespace) -> str:
    record = report.spectrum_record(scenario, _asked_spectrum(scenario, options))
    return report.to_json(record) if options.json else report.columns_text(record)


def _asked_spectrum(scenario: Scenario, options: argparse.Namespace) -> Spectrum:
    stack = scenario.stack if options.periods is None else scenario.stack.with_periods(options.periods)
    if options.energies_meV is not None:
        if (options.from_meV, options.to_meV, options.points) != (None, None, None):
            raise ValueError("--energies-meV: give either a list, or a range with --from-meV, --to-meV, --points")
        return spectrum(stack, np.array(options.energies_meV) / 1e3)
    low, high = _range(stack, options)
    if options.points is not None:
        return spectrum(stack, np.linspace(low, high, options.points))
    return spectrum(stack, between=(low, high))


def _range(stack: Stack, options: argparse.Namespace) -> tuple[float, float]:
    """The range asked for (eV); an end left out is the stack's own."""
    low, high = default_range(stack)
    low = low if options.from_meV is None else options.from_meV / 1e3
    high = high if options.to_meV is None else options.to_meV / 1e3
    if not low < high:
        raise ValueError(f"--from-meV, --to-meV: {low * 1e3:g} to {high * 1e3:g} is no range, give the lower end first")
    return low, high


def _bands(scenario: Scenario, options: argparse.Namespace) -> str:
    high = default_range(scenario.stack)[1] if options.to_meV is None else options.to_meV / 1e3
    low = min(lowest_energy(scenario.stack), high - 1e-6) if options.from_meV is None else options.from_meV / 1e3
    if not low < high:
        raise ValueError(f"--from-meV, --to-meV: {low * 1e3:g} to {high * 1e3:g} is no range, give the lower end first")
    bands = lattice_bands(scenario.stack, (low, high))
    return report.to_json(report.bands_record(bands)) if options.json else report.bands_text(bands)


def _periods(scenario: Scenario, options: argparse.Namespace) -> str:
    if options.most is not None and scenario.target is not None:
        scenario = replace(scenario, target=replace(scenario.target, most_periods=options.most))
    verdict = period_verdict(scenario, progress=_progress())
    found = verdict_range(scenario, _progress()) if options.range or scenario.document.growth else None
    if options.json:
        extra = {"range": report.range_record(found)} if found else {}
        return report.to_json(report.verdict_record(verdict) | extra)
    return report.verdict_text(verdict) + (f"\nRange: {found.sentence}" if found else "")


def _ends(scenario: Scenario, options: argparse.Namespace) -> str:
    found = matched_ends(scenario, options.whole_monolayers, options.cells, _progress())
    _save([proposal.scenario for proposal in found.proposals], options.save)
    return report.to_json(report.ends_record(found)) if options.json else report.ends_text(found)


def _remedy(scenario: Scenario, options: argparse.Namespace) -> str:
    found = nearest_stacks(scenario, options.monolayers or MOST_MONOLAYERS, _progress())
    _save([proposal.scenario for proposal in found.proposals], options.save)
    return report.to_json(report.remedy_record(found)) if options.json else report.remedy_text(found)


def _resonances(scenario: Scenario, options: argparse.Namespace) -> str:
    stack = scenario.stack if options.periods is None else scenario.stack.with_periods(options.periods)
    found = resonances(stack, _range(stack, options))
    return report.to_json(report.resonances_record(found)) if options.json else report.resonances_text(found)


def _peaks(scenario: Scenario, options: argparse.Namespace) -> str:
    record = scenario.document.measured
    if options.measured is not None:
        record = read_peaks(read_text(options.measured), record.lever_arm if record else None)
    measured = measured_peaks(record) if record else None
    compared = compare_peaks(scenario, measured)
    fit = fit_peaks(scenario, options.fit, measured, _progress()) if options.fit else None
    return report.to_json(report.peaks_record(compared, fit)) if options.json else report.peaks_text(compared, fit)


def _report(scenario: Scenario, options: argparse.Namespace) -> str:
    path = options.save or f"{Path(options.scenario).stem}.html"
    _refuse_there(path)
    makers = entry_points(group="colonnade.reports", name="html")
    if not makers:
        raise ValueError("report: this installation has no part that makes reports; install the whole project")
    (maker,) = makers
    try:
        make = maker.load()
    except ImportError as error:
        raise ValueError(f"report: the part that makes reports lacks something ({error}); install the whole project"
                         ) from None
    text = make(scenario)
    save_text(path, text)
    size = len(text.encode())
    return report.to_json({"file": path, "bytes": size}) if options.json else f"{path}, {size / 1e6:.1f} MB"


def _refuse_there(path: str) -> None:
    if os.path.lexists(path):
        raise ValueError(f"--save: {path} is there already, choose another name")


def _save(proposals: Sequence[Scenario], path: str | None) -> None:
    """Write the first proposal to a new file, if that is wanted."""
    if path is None:
        return
    _refuse_there(path)
    if not proposals:
        raise ValueError("--save: there is no proposal to save; leave the option out to read why")
    save_scenario(proposals[0], path)


def _progress() -> Callable[[float], None]:
    return _told if sys.stderr.isatty() else no_progress


def _told(share: float) -> None:
    """Progress of long work, on one line of the terminal."""
    print(f"\r{share:4.0%}", end="" if share < 1 else "\r    \r", file=sys.stderr, flush=True)


def _layers(scenario: Scenario, options: argparse.Namespace) -> str:
    if options.csv:
        return grower_csv(scenario, read_rates(options.rate)).rstrip("\n")
    return report.to_json(report.layers_record(scenario)) if options.json else report.layers_text(scenario)


if __name__ == "__main__":
    sys.exit(main())
