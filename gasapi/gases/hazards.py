"""From hazard data to the sentences that go with an answer.

The rules by which a component of a mixture counts are cautious and simple, and stand here in one place:

* toxic, carcinogenic, corrosive, and without hazard data: at any fraction above zero;
* pyrophoric, decomposing, associating: from 0.1 %;
* harmful (not tagged toxic, but with an exposure limit of at most 500 ppm or with a remark): where the undiluted gas exceeds
  the limit;
* flammable: where the fractions, each divided by its lower flammable limit, sum to a quarter or more (Le Chatelier's rule,
  with a quarter because gas alarms are commonly set there and hot gas burns leaner); a limit that is not held is taken as
  0.5 %, below nearly every limit in the data;
* oxidising: oxygen and nitrous oxide above 23.5 % together, any other oxidiser from 1 %;
* fuel with oxidiser: flammable as above, with 2 % of oxygen and nitrous oxide or about 0.1 % of another oxidiser;
* asphyxiant: every gas with less than 19.5 % of oxygen, tagged or not;
* a remark on a component goes with the reason that it belongs to: toxic, harmful, oxidising or flammable as above, and where
  none of these is meant, from 50 %.

The 23.5 %, 19.5 %, 2 % and 0.1 % are common practice, no source.
"""

from __future__ import annotations

from collections.abc import Callable, Container, Iterable, Sequence
from functools import lru_cache
from typing import NamedTuple

from gasapi.gases.records import Constant, Gas, Hazard

__all__ = ["GENERAL_CAUTION", "Cautions"]

GENERAL_CAUTION = (
    "Not for safety instrumented functions, relief sizing or custody transfer without licensed review and the local codes. "
    "A hazard that is not named here is not known here; that does not make the gas safe."
)
"""Belongs to every answer, whatever the gas."""

_TRACE = 1e-3
_HALF = 0.5
_HARMFUL_LIMIT_PPM = 500.0
_FUEL_SHARE = 0.25
_UNKNOWN_FLAMMABLE_LIMIT = 0.005
_OXYGEN_TO_BREATHE = 0.195
_OXYGEN_RICH = 0.235
_OXIDISER_WITH_FUEL = 0.02
_MILD_OXIDISERS = ("oxygen", "nitrous-oxide")

# what the key of kept sentences says of a component beyond its id
_ABOVE_TRACE = 1
_ABOVE_LIMIT = 2
_ABOVE_HALF = 4
_BROUGHT_ALONG = 8

_CANCER = (("1", "Causes cancer"), ("2A", "Probably causes cancer"), ("2B", "Possibly causes cancer"))


class _Profile(NamedTuple):
    """What the rules need of a substance, worked out once: ``fuel`` is 1/lower limit or 0, ``oxidiser`` a weight or 0."""

    name: str
    hazard: Hazard
    flags: frozenset[str]
    fuel: float
    oxidiser: float
    limit: float
    harmful: bool
    known: bool


class _Verdict(NamedTuple):
    """What holds for the mixture as a whole."""

    flammable: bool
    oxidising: bool
    fuel_with_oxidiser: bool
    oxygen: int
    """0 none to speak of, 1 too little to breathe, 2 enough."""


class Cautions:
    """Writes the cautions of a composition. The sentences of a set of components are kept, so that they are written once."""

    def __init__(self, gases: Iterable[Gas]) -> None:
        """Work out the profiles of all pure gases among ``gases``; an id that is not among them has no hazard data."""
        self._profiles = {gas.id: _profile(gas) for gas in gases if gas.substance is not None}
        self._write: Callable[[tuple[tuple[str, int], ...], _Verdict], tuple[str, ...]]
        self._write = lru_cache(maxsize=4096)(self._sentences)

    def of(self, components: Iterable[tuple[str, float]], brought_along: Container[str] = ()) -> tuple[str, ...]:
        """Return the cautions of a composition in plain sentences, ``GENERAL_CAUTION`` not among them.

        :param components: (id of a pure gas or of a substance of the question, mole fraction) pairs; they sum to 1
        :param brought_along: ids that mean substances of the question, even where a gas of the catalogue has the same id:
            somebody's own "oxygen" is not to be taken for a gas to breathe
        """
        fuel = oxidiser = oxygen = 0.0
        counted = []
        for id, fraction in components:
            if not fraction > 0.0:
                continue
            bits = (_ABOVE_TRACE if fraction >= _TRACE else 0) | (_ABOVE_HALF if fraction >= _HALF else 0)
            if id in brought_along:
                bits |= _BROUGHT_ALONG
            elif (profile := self._profiles.get(id)) is not None:
                fuel += fraction * profile.fuel
                oxidiser += fraction * profile.oxidiser
                if fraction >= profile.limit:
                    bits |= _ABOVE_LIMIT
                if id == "oxygen":
                    oxygen += fraction
            counted.append((id, bits))
        verdict = _Verdict(
            flammable=fuel >= _FUEL_SHARE,
            oxidising=oxidiser > _OXYGEN_RICH,
            fuel_with_oxidiser=fuel >= _FUEL_SHARE and oxidiser >= _OXIDISER_WITH_FUEL,
            oxygen=2 if oxygen >= _OXYGEN_TO_BREATHE else 1 if oxygen >= _TRACE else 0,
        )
        return self._write(tuple(counted), verdict)

    def tags(self, components: Iterable[tuple[str, float]]) -> tuple[str, ...]:
        """Return the hazard tags of all components above zero, in alphabetical order: what a list of gases shows."""
        found: set[str] = set()
        for id, fraction in components:
            profile = self._profiles.get(id)
            if profile is not None and fraction > 0.0:
                found.update(profile.hazard.tags)
        return tuple(sorted(found))

    def _profile_of(self, id: str, bits: int) -> _Profile:
        return _unknown(id) if bits & _BROUGHT_ALONG else self._profiles.get(id) or _unknown(id)

    def _sentences(self, counted: tuple[tuple[str, int], ...], verdict: _Verdict) -> tuple[str, ...]:
        present = [(self._profile_of(id, bits), bits) for id, bits in counted]
        sentences: list[str] = []

        toxic = [profile for profile, _ in present if "toxic" in profile.hazard.tags]
        if toxic:
            sentences.append(f"Toxic: {_listed(_with_limits(p) for p in toxic)}.")
        for group, words in _CANCER:
            names = [p.name for p, _ in present if p.hazard.carcinogen_group == group]
            if names:
                sentences.append(f"{words} (IARC group {group}): {_listed(names)}.")
        corrosive = [p.name for p, _ in present if "corrosive" in p.hazard.tags]
        if corrosive:
            sentences.append(f"Corrosive, attacks eyes, skin, airways and many materials: {_listed(corrosive)}.")
        pyrophoric = [p.name for p, bits in present if "pyrophoric" in p.hazard.tags and bits & _ABOVE_TRACE]
        if pyrophoric:
            sentences.append(f"Pyrophoric, catches fire by itself in air: {_listed(pyrophoric)}.")
        if verdict.flammable:
            sentences.append(_flammable(present))
        if verdict.fuel_with_oxidiser:
            sentences.append("Holds fuel and oxidiser together: it may burn or explode without any air.")
        if verdict.oxidising:
            names = [p.name for p, bits in present if p.oxidiser and bits & _ABOVE_TRACE]
            sentences.append(f"Oxidising, feeds a fire more than air does: {_listed(names)}.")
        harmful = [p for p, bits in present if p.harmful and bits & _ABOVE_LIMIT]
        if harmful:
            sentences.append(f"Harmful above its exposure limit: {_listed(_with_limits(p) for p in harmful)}.")
        sentences.extend(_limits_from([*toxic, *harmful]))
        if verdict.oxygen == 0 and counted:
            sentences.append("Asphyxiant: displaces oxygen, and can suffocate without any warning.")
        elif verdict.oxygen == 1:
            sentences.append(
                "Asphyxiant: holds less than the 19.5 % of oxygen that breathing needs, and can suffocate without any warning."
            )
        for profile, bits in present:
            if _remarked(profile, bits, verdict):
                sentences.extend(profile.hazard.remarks)
        decomposing = [p.name for p, bits in present if "decomposes" in p.flags and bits & _ABOVE_TRACE]
        if decomposing:
            sentences.append(
                f"Can decompose or react by itself, so that the state may not be reachable: {_listed(decomposing)}."
            )
        associating = [p.name for p, bits in present if "associating" in p.flags and bits & _ABOVE_TRACE]
        if associating:
            sentences.append(
                "Associates in the vapour, so that its density from corresponding states cannot be trusted and the molar mass "
                f"is that of the single molecule: {_listed(associating)}."
            )
        unknown = [p.name for p, _ in present if not p.known]
        if unknown:
            sentences.append(f"No hazard data are held for {_listed(unknown)}: not known is not safe.")
        return tuple(sentences)


def _profile(gas: Gas) -> _Profile:
    hazard = gas.hazard
    figures = dict(hazard.figures)
    fuel = 0.0
    if "flammable" in hazard.tags or "pyrophoric" in hazard.tags:
        limit = figures.get("lower_flammable_limit")
        fuel = 1.0 / (limit.value if limit is not None else _UNKNOWN_FLAMMABLE_LIMIT)
    oxidiser = 0.0
    if "oxidizer" in hazard.tags:
        # weighted so that 1 % of a strong oxidiser counts as the 23.5 % of oxygen do
        oxidiser = 1.0 if gas.id in _MILD_OXIDISERS else _OXYGEN_RICH / 0.01
    exposure = [constant.value for name, constant in hazard.figures if name.startswith("exposure_limit")]
    lowest = min(exposure, default=None)
    harmful = lowest is not None and "toxic" not in hazard.tags and (lowest <= _HARMFUL_LIMIT_PPM or bool(hazard.remarks))
    return _Profile(
        name=_in_a_sentence(gas.name),
        hazard=hazard,
        flags=gas.substance.flags if gas.substance is not None else frozenset(),
        fuel=fuel,
        oxidiser=oxidiser,
        limit=(lowest or 0.0) * 1e-6,
        harmful=harmful,
        known=bool(hazard.tags or hazard.figures or hazard.remarks or hazard.carcinogen_group),
    )


def _unknown(id: str) -> _Profile:
    return _Profile(id, Hazard(), frozenset(), 0.0, 0.0, 0.0, harmful=False, known=False)


def _in_a_sentence(name: str) -> str:
    return name[:1].lower() + name[1:] if name[1:2].islower() else name


def _listed(items: Iterable[str]) -> str:
    return "; ".join(dict.fromkeys(items))


def _with_limits(profile: _Profile) -> str:
    figures = dict(profile.hazard.figures)
    words = [
        f"{figures[key].value:g} ppm {meaning}"
        for key, meaning in (
            ("exposure_limit_average", "averaged over a shift"),
            ("exposure_limit_short_term", "short-term"),
            ("exposure_limit_ceiling", "never to be exceeded"),
        )
        if key in figures
    ]
    limits = f"exposure limit {', '.join(words)}" if words else "no exposure limit held"
    skin = ", also through the skin" if profile.hazard.absorbed_through_skin else ""
    return f"{profile.name} ({limits}{skin})"


def _sources(constants: Iterable[Constant]) -> str:
    return " and ".join(dict.fromkeys(constant.source.split(",")[0] for constant in constants))


def _limits_from(profiles: Sequence[_Profile]) -> list[str]:
    limits = [c for p in profiles for name, c in p.hazard.figures if name.startswith("exposure_limit")]
    words = f"Exposure limits of {_sources(limits)}, as an example: those of your place may differ."
    return [words] if limits else []


def _remarked(profile: _Profile, bits: int, verdict: _Verdict) -> bool:
    if "toxic" in profile.hazard.tags:
        return True
    if profile.harmful:
        return bool(bits & _ABOVE_LIMIT)
    if profile.oxidiser:
        return verdict.oxidising and bool(bits & _ABOVE_TRACE)
    if profile.fuel:
        return verdict.flammable and bool(bits & _ABOVE_TRACE)
    return bool(bits & _ABOVE_HALF)


def _flammable(present: Sequence[tuple[_Profile, int]]) -> str:
    fuels = [(p, bits) for p, bits in present if p.fuel]
    fuels = [(p, bits) for p, bits in fuels if bits & _ABOVE_TRACE] or fuels
    described = []
    limits: list[Constant] = []
    for profile, _ in fuels:
        figures = dict(profile.hazard.figures)
        low, high = figures.get("lower_flammable_limit"), figures.get("upper_flammable_limit")
        if low is None:
            described.append(f"{profile.name} (lower limit not held)")
            continue
        limits.append(low)
        upper = f" to {100.0 * high.value:g} %" if high is not None else ""
        described.append(f"{profile.name} (from {100.0 * low.value:g} %{upper} in air)")
    words = f"Flammable: {_listed(described)}."
    if limits:
        words += f" Limits of {_sources(limits)} at room conditions; hot or compressed gas burns in a wider range."
    return words
