"""The fewest whole turns that keep the core below a flux density, and the gap for them."""

from __future__ import annotations

import math
import time
from dataclasses import dataclass, replace

from femag.design import Design
from femag.errors import InputError, NumericalError, number
from femag.geometry import core_cuts
from femag.geometry.windings import MOST_TURNS
from femag.target_gap import OutOfReach, TargetGap, gap_for

MOST_TRIALS = 40
"""Numbers of turns that are tried; about four are needed."""


@dataclass(frozen=True)
class TurnsTrial:
    """A number of turns that was tried.

    Parameters
    ----------
    turns : int
        Of the driven winding.
    flux_density : float or None
        Greatest section mean at the current with the gap that meets the inductance, T; None where
        no gap does.
    solutions : int
        Field solutions that it took.
    """

    turns: int
    flux_density: float | None
    solutions: int


@dataclass(frozen=True)
class TargetTurns:
    """Turns and gap that meet an inductance and keep the core below a flux density.

    Parameters
    ----------
    found : TargetGap
        The gap for those turns; its design holds both.
    limit : float
        Flux density that no section mean exceeds, T.
    trials : tuple of TurnsTrial
        All that was tried, in order.
    seconds : float
        Wall time.
    """

    found: TargetGap
    limit: float
    trials: tuple[TurnsTrial, ...]
    seconds: float

    @property
    def turns(self) -> int:
        """Turns of the driven winding."""
        return self.found.design.turns

    @property
    def solutions(self) -> int:
        """Field solutions of all trials."""
        return sum(trial.solutions for trial in self.trials)


def turns_for(
    design: Design,
    inductance: float,
    flux_density: float,
    current: float | None = None,
    tolerance: float | None = None,
) -> TargetTurns:
    """Return the fewest whole turns, and their gap, for an inductance and a flux density.

    At one inductance and current the flux linkage is one, so that the flux density falls as the
    turns rise; each number of turns needs a gap of its own. A trial starts from the gap that the
    one before leads to. One turn fewer has been tried and found wanting.

    Parameters
    ----------
    design : Design
        What to change: the turns of its driven winding and its first gap.
    inductance : float
        Wanted energy inductance, H.
    flux_density : float
        No mean over a section of the core may exceed it at the current, T.
    current, tolerance : float, optional
        As of `gap_for`.

    Raises
    ------
    InputError
        If several windings are driven, the turns do not fit, or no number of turns will do.
    NumericalError
        If a field cannot be solved.
    """
    started = time.perf_counter()
    accepted = "a flux density above 0, such as '0.3 T'"
    if not 0.0 < number(flux_density, "flux_density", accepted) < math.inf:
        raise InputError("not usable", key="flux_density", value=flux_density, accepted=accepted)
    current = design.current if current is None else current
    search = _Search(replace(design, current=current), inductance, flux_density, tolerance)
    found = search.run()
    seconds = time.perf_counter() - started
    return TargetTurns(found, flux_density, tuple(search.trials), seconds)


def with_turns(design: Design, turns: int) -> Design:
    """Return a design whose driven winding has another number of turns.

    Raises
    ------
    InputError
        If several windings are driven, or the turns do not fit.
    """
    if len(design.driven_windings) > 1:
        raise InputError(
            "several windings are driven; their turns cannot be told apart", key="drive.winding",
            accepted="one driven winding",
        )  # fmt: skip
    (driven,) = design.driven_windings
    windings = tuple(
        replace(winding, turns=turns) if winding is driven else winding
        for winding in design.windings
    )
    return replace(design, windings=windings)


class _Search:
    """Bisection on whole turns, led by flux density over turns."""

    def __init__(
        self, design: Design, inductance: float, limit: float, tolerance: float | None
    ) -> None:
        self.design, self.inductance, self.limit = design, inductance, limit
        self.tolerance = tolerance
        self.trials: list[TurnsTrial] = []
        self.near: TargetGap | None = None

    def run(self) -> TargetGap:
        """Return the gap of the fewest turns that keep the limit."""
        few, enough = 0, MOST_TURNS + 1
        best: TargetGap | None = None
        turns = self._first_turns()
        while len(self.trials) < MOST_TRIALS:
            turns = min(max(turns, few + 1), enough - 1)
            found = self._tried(turns)
            if isinstance(found, OutOfReach):
                few = turns
                guess = math.ceil(turns * math.sqrt(self.inductance / found.inductance))
            elif found.flux_density > self.limit:
                few, guess = turns, self._led(found)
            else:
                enough, best, guess = turns, found, self._led(found)
            if best is not None and enough == few + 1:
                return best
            turns = guess
        raise NumericalError(f"no number of turns found in {len(self.trials)} trials")

    def _first_turns(self) -> int:
        """Return the turns that the flux linkage alone asks for in the least section."""
        cuts = core_cuts(self.design.core, self.design.gaps)
        least = min(cut.area for cut in cuts)
        linkage = abs(self.inductance * self.design.current)
        return min(max(math.ceil(linkage / (self.limit * least)), 1), MOST_TURNS)

    def _led(self, found: TargetGap) -> int:
        """Return the turns that a trial leads to: flux density falls with their inverse."""
        exact = found.design.turns * found.flux_density / self.limit
        return min(max(math.ceil(exact), 1), MOST_TURNS)

    def _tried(self, turns: int) -> TargetGap | OutOfReach:
        """Return the gap for a number of turns, or why they are too few for the inductance."""
        try:
            design = with_turns(self.design, turns)
            found = gap_for(design, self.inductance, None, self.tolerance, self._start(turns))
        except OutOfReach as error:
            if not error.too_few_turns:
                raise self._no_turns(turns, error) from error
            self.trials.append(TurnsTrial(turns, None, error.solutions))
            return error
        except InputError as error:
            if not (error.key or "").startswith("winding"):
                raise
            raise self._no_room(turns, error) from error
        self.trials.append(TurnsTrial(turns, found.flux_density, found.solutions))
        self.near = found
        return found

    def _start(self, turns: int) -> float | None:
        """Return the gap that the last trial leads to: the reluctance grows with turns squared."""
        if self.near is None:
            return None
        before, value = self.near.design.turns, self.near.inductance.value
        by_gap = -(before**2) * self.near.slope / value**2
        wanted = turns**2 / self.inductance - before**2 / value
        return self.near.gap + wanted / by_gap

    def _no_turns(self, turns: int, error: OutOfReach) -> InputError:
        return InputError(
            f"no number of turns keeps it: {turns} turns give {error.problem}", key="flux_density",
            value=self.limit, accepted="a higher flux density, a larger core or a lower inductance",
        )  # fmt: skip

    def _no_room(self, turns: int, error: InputError) -> InputError:
        return InputError(
            f"about {turns} turns are needed and do not fit ({error.problem})", key="flux_density",
            value=self.limit,
            accepted="a higher flux density, a thinner conductor or a larger core",
        )  # fmt: skip
