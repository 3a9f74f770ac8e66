"""One verdict over several states: what a job says of itself when more than one state stands behind it."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from gasapi.service.answers import PhaseWarning, QualityAnswer, StateAnswer
from gasapi.service.quality import LEVELS

__all__ = ["is_bad", "joined", "joined_quality", "relative_density_uncertainty"]


def is_bad(answer: StateAnswer) -> bool:
    """Return whether a state gives no number."""
    return answer.density is None


def relative_density_uncertainty(answer: StateAnswer) -> float | None:
    """Return the expanded uncertainty (k = 2) of a density, relative, None where no input uncertainty was given."""
    if answer.density is None or answer.density_expanded_uncertainty is None:
        return None
    return answer.density_expanded_uncertainty / answer.density


def joined_quality(qualities: Sequence[QualityAnswer]) -> QualityAnswer:
    """Return the worst of several qualities (the first of those as bad), with the reasons of all."""
    worst = max(qualities, key=lambda quality: LEVELS.index(quality.level))
    reasons = dict.fromkeys(reason for quality in qualities for reason in quality.reasons)
    return worst._replace(reasons=tuple(reasons))


def joined(answers: Sequence[StateAnswer], warnings: Iterable[PhaseWarning] = ()) -> StateAnswer:
    """Return the first of several states, or the first bad one, with the quality of all and the phase warnings of all.

    :param answers: states of one gas by one equation
    :param warnings: what the job itself has to say, told first
    """
    shown = next((answer for answer in answers if is_bad(answer)), answers[0])
    told = dict.fromkeys([*warnings, *(warning for answer in answers for warning in answer.phase.warnings)])
    return shown._replace(
        quality=joined_quality([answer.quality for answer in answers]),
        phase=shown.phase._replace(warnings=tuple(told)),
    )
