"""The catalogue: every gas by any of its names. It finds; it computes no property.

Built once and never changed, so that it can be shared between threads without a lock.
"""

from __future__ import annotations

from collections.abc import Container, Iterable
from typing import TYPE_CHECKING

from gasapi.errors import UnknownGas
from gasapi.gases.hazards import Cautions
from gasapi.gases.loader import load_blends, load_gerg, load_substances, reference_ids
from gasapi.gases.names import NearestNames, folded, loose
from gasapi.gases.reading import DataError
from gasapi.gases.records import Gas, Substance

if TYPE_CHECKING:
    from gasapi.gases.site import Site

__all__ = ["AmbiguousName", "Catalogue"]

_LONGEST_NAME = 120


class AmbiguousName(UnknownGas):
    """A formula that several gases share: ``name`` and, in ``nearest``, the ids of the gases it may mean."""

    def __init__(self, name: str, candidates: Iterable[str]) -> None:
        super().__init__(name, tuple(candidates))
        self.args = (f"{name!r} may mean {', '.join(self.nearest)}; name one of them",)


class Catalogue:
    """All gases that the service knows by name: pure gases, named blends, and the gases of the site."""

    def __init__(self, gases: Iterable[Gas]) -> None:
        """Index the gases by all their names.

        :raises DataError: two gases claim the same id, name or synonym
        """
        self.gases: tuple[Gas, ...] = tuple(gases)
        self._by_id = {gas.id: gas for gas in self.gases}
        self._by_name: dict[str, Gas] = {}
        self._by_loose_name: dict[str, Gas] = {}
        self._by_formula: dict[str, list[Gas]] = {}
        for gas in self.gases:
            self._index(gas)
        for gas in self.gases:
            self._index_as_typed(gas)
        self._nearest = NearestNames((name, gas.id) for gas in self.gases for name in _names(gas))
        self._cautions = Cautions(self.gases)
        self._gerg = frozenset(component.id for component in load_gerg().components)
        self._reference = self._map_references()

    @classmethod
    def load(cls) -> Catalogue:
        """Return the catalogue of the package's own data.

        :raises DataError: a data file does not hold what it must
        """
        return cls((*load_substances(), *load_blends()))

    def with_site(self, site: Site) -> Catalogue:
        """Return a new catalogue that holds the gases and substances of a site as well."""
        return Catalogue((*self.gases, *site.substances, *site.gases))

    def find(self, name: str) -> Gas:
        """Return the gas that a name means.

        :param name: id, name, synonym, formula or CAS number; case, surrounding blanks and hyphens do not matter
        :raises AmbiguousName: a formula that several gases share
        :raises UnknownGas: nothing is called so; carries the ids of the gases with the nearest names
        """
        gas = self._by_name.get(name)
        return gas if gas is not None else self._find_folded(name)

    def gas(self, id: str) -> Gas:
        """Return the gas with an id.

        :raises UnknownGas: no gas has this id
        """
        gas = self._by_id.get(id)
        if gas is None:
            raise UnknownGas(id, self.nearest(id))
        return gas

    def substance(self, id: str) -> Substance:
        """Return the constants of a pure gas.

        :raises UnknownGas: no pure gas has this id
        """
        substance = self.gas(id).substance
        if substance is None:
            raise UnknownGas(id)
        return substance

    def nearest(self, text: str, count: int = 5) -> tuple[str, ...]:
        """Return the ids of at most ``count`` gases whose names resemble a text, the likest first."""
        return self._nearest.of(text, count)

    def search(self, text: str) -> tuple[Gas, ...]:
        """Return the gases that a text may mean: exact names first, then names that begin with it, then that hold it.

        An empty text means all gases. Where no name, formula or CAS number holds the text, the nearest names are answered.
        """
        wanted = folded(text)
        if not wanted:
            return self.gases
        short = loose(text)
        ranked = []
        for place, gas in enumerate(self.gases):
            names = {folded(name) for name in (*_names(gas), gas.formula or "", gas.cas or "")}
            names |= {loose(name) for name in _names(gas)}
            if wanted in names or short in names:
                ranked.append((0, place))
            elif any(name.startswith(wanted) for name in names):
                ranked.append((1, place))
            elif any(wanted in name for name in names):
                ranked.append((2, place))
        if ranked:
            return tuple(self.gases[place] for _, place in sorted(ranked))
        return tuple(self._by_id[id] for id in self.nearest(text))

    def components(self, gas: Gas) -> tuple[tuple[str, float], ...]:
        """Return (id, mole fraction) of what a gas is made of: itself for a pure gas."""
        return gas.blend if gas.blend is not None else ((gas.id, 1.0),)

    def reference_id(self, gas_id: str) -> str | None:
        """Return the id of the reference equation that describes a gas, for ``load_reference``, or None."""
        return self._reference.get(gas_id)

    def gerg_component(self, gas_id: str) -> bool:
        """Return whether a pure gas is a component of GERG-2008."""
        return gas_id in self._gerg

    def cautions(self, components: Iterable[tuple[str, float]], brought_along: Container[str] = ()) -> tuple[str, ...]:
        """Return the cautions of a composition in plain sentences; see ``hazards``. The general caution is not among them.

        :param components: (id, mole fraction) pairs, substances that the question brought along included
        :param brought_along: the ids of these substances
        """
        return self._cautions.of(components, brought_along)

    def hazard_tags(self, gas: Gas) -> tuple[str, ...]:
        """Return the hazard tags of a gas, for a blend those of its components, in alphabetical order."""
        return self._cautions.tags(self.components(gas))

    def _find_folded(self, name: str) -> Gas:
        if len(name) > _LONGEST_NAME:
            # no gas is called so, and neither work nor the message may grow with what a caller sends
            raise UnknownGas(f"{name[:_LONGEST_NAME]}...")
        wanted = folded(name)
        gas = self._by_name.get(wanted)
        if gas is not None:
            return gas
        candidates = self._by_formula.get(wanted)
        if candidates is not None:
            if len(candidates) > 1:
                raise AmbiguousName(name, (gas.id for gas in candidates))
            return candidates[0]
        gas = self._by_loose_name.get(loose(name))
        if gas is not None:
            return gas
        raise UnknownGas(name, self.nearest(name))

    def _index(self, gas: Gas) -> None:
        for name in _names(gas):
            for index, key in ((self._by_name, folded(name)), (self._by_loose_name, loose(name))):
                holder = index.setdefault(key, gas)
                if holder is not gas:
                    raise DataError("catalogue", gas.id, f"the name {name!r} belongs to {holder.id} already")
        if gas.cas is not None:
            # forms of one substance (hydrogen, parahydrogen) share a number, which then means the first of them
            self._by_name.setdefault(folded(gas.cas), gas)
        if gas.formula is not None:
            sharing = self._by_formula.setdefault(folded(gas.formula), [])
            if all(other.cas != gas.cas for other in sharing):
                sharing.append(gas)

    def _index_as_typed(self, gas: Gas) -> None:
        # the usual spellings, so that a known name costs one look into a dictionary
        for name in _names(gas):
            self._by_name.setdefault(name, gas)
        if gas.formula is not None and len(self._by_formula[folded(gas.formula)]) == 1:
            self._by_name.setdefault(gas.formula, self._by_formula[folded(gas.formula)][0])

    def _map_references(self) -> dict[str, str]:
        ids = {self.find(id).id: id for id in reference_ids()}
        blends = {self._by_id[gas_id].blend: id for gas_id, id in ids.items() if self._by_id[gas_id].blend is not None}
        # a blend with the very composition of a pseudo-pure equation is served by it, whatever it is called
        ids.update({gas.id: blends[gas.blend] for gas in self.gases if gas.blend in blends})
        return ids


def _names(gas: Gas) -> tuple[str, ...]:
    return (gas.id, gas.name, *gas.synonyms)
