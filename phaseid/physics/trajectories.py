"""Single-scattering Monte Carlo of electron trajectories: for what has no closed form.

Each electron flies straight, collides elastically, and loses energy all along its way. The
electrons are followed many abreast in fixed blocks with a random stream each, so the answer for a
seed does not depend on how the blocks are shared among threads.

References
----------
Joy 1995, Monte Carlo Modeling for Electron Microscopy and Microanalysis, for the scheme;
`phaseid.physics.scattering` for cross-sections and stopping power.
"""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import Future, ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np

from phaseid.errors import InputError
from phaseid.physics.exits import Exits
from phaseid.physics.samples import Bulk, Film, Inclusion, Interface, Sample
from phaseid.physics.scattering import LOWEST_KEV, Floats32, Material, Tables, tabulate
from phaseid.physics.stepping import EXIT_COLUMNS, Start, run_block

__all__ = [
    "Bulk",
    "Exits",
    "Film",
    "Inclusion",
    "Interface",
    "Material",
    "Start",
    "block_size",
    "simulate",
    "simulate_to",
]

_SMALLEST_BLOCK, _LARGEST_BLOCK = 16_384, 65_536

Progress = Callable[[int, int], object]
StopAsked = Callable[[], bool]


@dataclass(frozen=True)
class _Run:
    sample: Sample
    tables: Tables
    start: Start
    cutoff_keV: float
    seed: int

    def block(self, number: int, electrons: int) -> Floats32:
        stream = np.random.SeedSequence(self.seed, spawn_key=(number,))
        rng = np.random.Generator(np.random.SFC64(stream))
        return run_block(self.sample, self.tables, self.start, self.cutoff_keV, electrons, rng)


def simulate(
    sample: Sample,
    start: Start | float = 20.0,
    *,
    electrons: int = 50_000,
    seed: int = 0,
    cross_section: str = "browning",
    cutoff_keV: float = LOWEST_KEV,
    workers: int = 2,
    progress: Progress | None = None,
    stop: StopAsked | None = None,
) -> Exits:
    """Shoot electrons at a sample and collect those that come back.

    Parameters
    ----------
    sample : Bulk, Film, Inclusion or Interface
    start : Start or float
        Beam, or its energy in keV at normal incidence.
    electrons : int
    seed : int
        The result depends on it, on `electrons` and on nothing else.
    cross_section : {"browning", "rutherford"}
        Empirical form of the Mott cross-section (Browning et al. 1994) or screened Rutherford,
        which is too high by a tenth or more for heavy elements.
    cutoff_keV : float
        Electrons are given up below this energy, and not counted when they leave with less.
    workers : int
        Threads.
    progress : callable, optional
        Called as ``progress(electrons_done, electrons)`` after each block, from this thread.
    stop : callable, optional
        Asked after each block; when it answers True the rest is left out.

    Returns
    -------
    Exits

    Raises
    ------
    InputError
        For energies, counts or names that cannot be used.
    """
    beam = start if isinstance(start, Start) else Start(float(start))
    _check(beam, electrons, cutoff_keV, workers)
    tables = tabulate(sample.materials, beam.energy_keV, cross_section, cutoff_keV)
    run = _Run(sample, tables, beam, cutoff_keV, seed)
    block = block_size(electrons)
    sizes = [min(block, electrons - first) for first in range(0, electrons, block)]
    blocks = _run_blocks(run, sizes, workers, progress, stop)
    return _gathered(blocks, sum(sizes[: len(blocks)]), beam, complete=len(blocks) == len(sizes))


def block_size(electrons: int) -> int:
    """Electrons that share a random stream and are followed abreast.

    Large blocks let two threads work at once, as numpy holds the interpreter's lock between
    operations; small jobs are split in two. It must not depend on the number of workers.
    """
    return int(np.clip(-(-electrons // 2), _SMALLEST_BLOCK, _LARGEST_BLOCK))


def simulate_to(
    sample: Sample,
    start: Start | float = 20.0,
    *,
    eta_se: float = 0.002,
    seed: int = 0,
    most_electrons: int = 4_000_000,
    cross_section: str = "browning",
    workers: int = 2,
    progress: Progress | None = None,
    stop: StopAsked | None = None,
) -> Exits:
    """As `simulate`, with as many electrons as bring the standard error of eta to `eta_se`.

    A short trial gives a rough eta, from which the number follows; so the result still depends on
    the seed and the wanted error only.
    """
    if not 0 < eta_se < 1:
        raise InputError(f"A standard error of {eta_se:g} cannot be reached; ask for 0.002 or so.")
    trial = 4096
    first = simulate(
        sample, start, electrons=trial, seed=seed, cross_section=cross_section, workers=1
    )
    # Not below one event per trial, or a dark sample would stop at once.
    rough = max(first.eta, 1.0 / trial)
    wanted = int(np.ceil(rough * (1 - rough) / eta_se**2))
    return simulate(
        sample,
        start,
        electrons=int(np.clip(wanted, trial, most_electrons)),
        seed=seed,
        cross_section=cross_section,
        workers=workers,
        progress=progress,
        stop=stop,
    )


def _run_blocks(
    run: _Run,
    sizes: list[int],
    workers: int,
    progress: Progress | None,
    stop: StopAsked | None,
) -> list[Floats32]:
    """Results of the blocks in order; fewer when stopped."""
    total, finished, done = sum(sizes), 0, []
    with ThreadPoolExecutor(max_workers=workers) as pool:
        waiting: list[Future[Floats32]] = []
        try:
            # Only a few blocks ahead, so that stopping is prompt and memory bounded.
            for number in range(len(sizes) + workers):
                if number < len(sizes):
                    waiting.append(pool.submit(run.block, number, sizes[number]))
                if len(waiting) > workers or (number >= len(sizes) and waiting):
                    done.append(waiting.pop(0).result())
                    finished += sizes[len(done) - 1]
                    if progress is not None:
                        progress(finished, total)
                    if stop is not None and stop():
                        break
            else:
                done += [future.result() for future in waiting]
                waiting.clear()
        finally:
            for future in waiting:
                future.cancel()
    return done


def _gathered(blocks: list[Floats32], electrons: int, beam: Start, *, complete: bool) -> Exits:
    empty = np.zeros((len(EXIT_COLUMNS), 0), dtype=np.float32)
    rows = np.concatenate([empty, *blocks], axis=1)
    return Exits(electrons, beam, rows[0], rows[1:4], rows[4:6], rows[6], complete)


def _check(beam: Start, electrons: int, cutoff_keV: float, workers: int) -> None:
    if electrons < 1 or workers < 1:
        raise InputError("A simulation needs at least one electron and one worker.")
    if not LOWEST_KEV <= cutoff_keV < beam.energy_keV <= 100:
        raise InputError(
            f"A beam of {beam.energy_keV:g} keV with a cut-off at {cutoff_keV:g} keV cannot be "
            f"simulated; the cut-off must be at least {LOWEST_KEV:g} keV and below the beam "
            "energy, that at most 100 keV."
        )
    if not 0 <= beam.tilt_deg <= 85:
        raise InputError(f"A tilt of {beam.tilt_deg:g} degrees cannot be simulated; give 0 to 85.")
