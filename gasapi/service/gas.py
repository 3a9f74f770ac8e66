"""Which gas is meant: names to catalogue entries, fractions checked, blends spread over their components."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final, Literal

from gasapi.errors import FractionsInvalid
from gasapi.gases.catalogue import Catalogue
from gasapi.gases.records import Gas, Substance
from gasapi.service.questions import GasSpec

__all__ = ["ResolvedGas", "resolve_gas"]

# fractions whose sum is off by more than the first are scaled and say so, by more than the second are refused
_SCALED_ABOVE: Final = 1e-6
_REFUSED_ABOVE: Final = 0.02
# each fraction was rounded once when it was divided by the sum
_ROUNDING: Final = 2.0**-51


@dataclass(frozen=True, slots=True)
class ResolvedGas:
    """A gas as the models see it. Hashable; equal gases have equal compositions.

    ``components`` are catalogue ids (or ids of the question's own substances) in catalogue order, ``shares`` their fractions in
    ``basis``, all above 0 and summing to 1. ``reference_id`` names a reference equation that covers the gas as a whole; ``own``
    are the components that the question brought along.
    """

    id: str | None
    components: tuple[str, ...]
    shares: tuple[float, ...]
    basis: Literal["mole", "mass"]
    substances: tuple[Substance, ...]
    reference_id: str | None
    gerg: bool
    scaled: bool
    site: bool = False
    own: tuple[str, ...] = ()

    def __hash__(self) -> int:
        # the long substance records follow from the components, or are compared when two gases meet in one slot
        return hash((self.components, self.shares, self.basis))

    @property
    def is_pure(self) -> bool:
        """Whether there is one component only."""
        return len(self.components) == 1

    def mole_fractions(self, molar_masses: Sequence[float]) -> tuple[float, ...]:
        """Return mole fractions; mass fractions are converted with the molar masses of the model that asks.

        :param molar_masses: of each component, kg/mol
        """
        if self.basis == "mole" or len(self.shares) == 1:
            return self.shares
        amounts = [w / m for w, m in zip(self.shares, molar_masses, strict=True)]
        total = math.fsum(amounts)
        return tuple(n / total for n in amounts)


def resolve_gas(spec: GasSpec, catalogue: Catalogue) -> ResolvedGas:
    """Return the gas that a question names.

    :param spec: the gas as named
    :param catalogue: where names are looked up, after the question's own substances
    :raises UnknownGas: for a name that nothing has
    :raises FractionsInvalid: for fractions that are negative, not finite, none, or whose sum is off by more than 0.02
    """
    own = {s.id.casefold(): s for s in spec.substances}
    if spec.name is not None:
        substance = own.get(spec.name.strip().casefold())
        if substance is not None:
            return _pure(substance.id, substance, None, False, own=(substance.id,))
        gas = catalogue.find(spec.name)
        if gas.substance is not None:
            return _pure(gas.id, gas.substance, catalogue.reference_id(gas.id), catalogue.gerg_component(gas.id))
        site = gas.kind == "site"
        if gas.mass_fractions is not None:
            return _mixture(gas.id, dict(gas.mass_fractions), "mass", False, catalogue, own, site)
        return _mixture(gas.id, _spread(gas, 1.0), "mole", False, catalogue, own, site)
    return _from_fractions(spec, catalogue, own)


def _from_fractions(spec: GasSpec, catalogue: Catalogue, own: dict[str, Substance]) -> ResolvedGas:
    assert spec.fractions is not None
    shares: dict[str, float] = {}
    for name, value in spec.fractions:
        if not math.isfinite(value) or value < 0.0:
            raise FractionsInvalid("a fraction is a finite number and not negative", name)
        substance = own.get(name.strip().casefold())
        if substance is not None:
            _add(shares, substance.id, value)
            continue
        gas = catalogue.find(name)
        if gas.substance is not None:
            _add(shares, gas.id, value)
        elif spec.basis == "mole":
            for component, part in _spread(gas, value).items():
                _add(shares, component, part)
        else:
            for component, part in _mass_spread(gas, value, catalogue).items():
                _add(shares, component, part)
    total = math.fsum(shares.values())
    if not abs(total - 1.0) <= _REFUSED_ABOVE + 1e-12:
        raise FractionsInvalid(f"the fractions sum to {total:.9g}; they must sum to 1 within {_REFUSED_ABOVE}", None)
    scaled = abs(total - 1.0) > _SCALED_ABOVE
    # a sum that is 1 but for rounding is left alone, so that the fractions of an answer, asked again, stay what they are
    divisor = 1.0 if abs(total - 1.0) <= _ROUNDING else total
    parts = {k: v / divisor for k, v in shares.items() if v > 0.0}
    if len(parts) == 1:
        (only,) = parts
        substance = own.get(only.casefold())
        if substance is not None:
            return _pure(only, substance, None, False, scaled, (only,))
        gas = catalogue.find(only)
        assert gas.substance is not None
        return _pure(only, gas.substance, catalogue.reference_id(only), catalogue.gerg_component(only), scaled)
    return _mixture(None, parts, spec.basis, scaled, catalogue, own, False)


def _add(shares: dict[str, float], component: str, value: float) -> None:
    shares[component] = shares.get(component, 0.0) + value


def _spread(gas: Gas, share: float) -> dict[str, float]:
    """Return the mole fractions of a blend's components, times its share."""
    assert gas.blend is not None
    return {component: share * fraction for component, fraction in gas.blend}


def _mass_spread(gas: Gas, share: float, catalogue: Catalogue) -> dict[str, float]:
    """Return the mass fractions of a blend's components, times its share."""
    assert gas.blend is not None
    masses = {c: x * catalogue.substance(c).molar_mass for c, x in gas.blend}
    total = math.fsum(masses.values())
    return {c: share * m / total for c, m in masses.items()}


def _pure(
    id: str,
    substance: Substance,
    reference_id: str | None,
    gerg: bool,
    scaled: bool = False,
    own: tuple[str, ...] = (),
) -> ResolvedGas:
    return ResolvedGas(id, (id,), (1.0,), "mole", (substance,), reference_id, gerg, scaled, own=own)


def _mixture(
    id: str | None,
    parts: dict[str, float],
    basis: Literal["mole", "mass"],
    scaled: bool,
    catalogue: Catalogue,
    own: dict[str, Substance],
    site: bool,
) -> ResolvedGas:
    # one order whatever the order of the request, so that the same composition has the same bits
    components = tuple(sorted(parts))
    substances = tuple(own.get(c.casefold()) or catalogue.substance(c) for c in components)
    return ResolvedGas(
        id,
        components,
        tuple(parts[c] for c in components),
        basis,
        substances,
        catalogue.reference_id(id) if id is not None else None,
        all(c.casefold() not in own and catalogue.gerg_component(c) for c in components),
        scaled,
        site,
        tuple(c for c in components if c.casefold() in own),
    )
