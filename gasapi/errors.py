"""The exceptions of gasapi: fields first, words last. No status codes and no HTTP words here; the edge maps them."""

from __future__ import annotations

from collections.abc import Sequence

__all__ = ["FractionsInvalid", "GasapiError", "ModelCannotServe", "UnknownGas", "UnknownModel"]


class GasapiError(Exception):
    """The root of the family."""


class UnknownGas(GasapiError):
    """No catalogue gas, site gas or substance of the question has this name."""

    def __init__(self, name: str, nearest: Sequence[str] = ()) -> None:
        self.name = name
        self.nearest = tuple(nearest)
        hint = f"; nearest names: {', '.join(self.nearest)}" if self.nearest else ""
        super().__init__(f"no gas is called {name!r} here{hint}")


class UnknownModel(GasapiError):
    """No equation of state has this id."""

    def __init__(self, model: str, known: Sequence[str]) -> None:
        self.model = model
        self.known = tuple(known)
        super().__init__(f"no equation of state is called {model!r}; known: {', '.join(self.known)}")


class ModelCannotServe(GasapiError):
    """The equation exists but cannot serve this gas at all."""

    def __init__(self, model: str, gas: str, why: str) -> None:
        self.model = model
        self.gas = gas
        self.why = why
        super().__init__(f"{model} cannot serve {gas}: {why}")


class FractionsInvalid(GasapiError):
    """Fractions that make no gas; ``component`` names the one at fault where there is one."""

    def __init__(self, why: str, component: str | None) -> None:
        self.why = why
        self.component = component
        super().__init__(why)
