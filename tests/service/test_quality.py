"""The table from reasons to OPC UA quality."""

from __future__ import annotations

import numpy as np
import pytest

from gasapi.service.quality import BAD, UNCERTAIN, Reason, level_codes, quality_of, status_codes

# OPC UA part 4, table of common codes, and part 8, data-access codes (IEC 62541-4 and -8), from memory of the published list
CODES = {
    "Good": 0x00000000,
    "Uncertain": 0x40000000,
    "UncertainEngineeringUnitsExceeded": 0x40940000,
    "UncertainSensorNotAccurate": 0x40930000,
    "UncertainSubNormal": 0x40950000,
    "Bad": 0x80000000,
    "BadNoData": 0x809B0000,
    "BadOutOfRange": 0x803C0000,
    "BadNotSupported": 0x803D0000,
    "BadInvalidArgument": 0x80AB0000,
    "BadInvalidState": 0x80AF0000,
}


@pytest.mark.parametrize("reason", list(Reason), ids=lambda r: r.name)
def test_every_reason_has_a_level_a_code_and_a_word(reason):
    """Severity bits and symbol agree with the level, and the number is the standard's."""
    quality = quality_of(int(reason))
    expected = "bad" if reason & BAD else "uncertain" if reason & UNCERTAIN else "good"
    assert quality.level == expected
    assert quality.symbol.lower().startswith(expected)
    assert quality.status_code == CODES[quality.symbol]
    assert len(quality.reasons) == 1
    assert quality.reasons[0].replace("_", "").isalpha()


def test_the_worst_reason_gives_the_level_and_all_are_told():
    """A gauge reading near the dew point, then beyond all limits."""
    flags = int(Reason.AMBIENT_PRESSURE_ASSUMED | Reason.NEAR_DEW_POINT)
    assert quality_of(flags).level == "uncertain"
    assert quality_of(flags).reasons == ("ambient_pressure_assumed", "near_dew_point")
    worse = quality_of(flags | int(Reason.OUTSIDE_LIMITS))
    assert (worse.level, worse.symbol) == ("bad", "BadOutOfRange")


def test_a_word_is_told_once():
    """The assumed ambient that matters is the same word as the one that does not."""
    both = int(Reason.AMBIENT_PRESSURE_ASSUMED | Reason.AMBIENT_PRESSURE_MATTERS)
    assert quality_of(both).reasons == ("ambient_pressure_assumed",)


def test_blocks_and_single_states_agree():
    """Levels and codes of a thousand random sets of reasons."""
    rng = np.random.default_rng(1)
    bits = np.array([int(r) for r in Reason])
    flags = np.array([int(np.bitwise_or.reduce(rng.choice(bits, rng.integers(1, 4)))) for _ in range(1000)] + [0])
    levels = [quality_of(int(f)).level for f in flags]
    assert [("good", "uncertain", "bad")[i] for i in level_codes(flags)] == levels
    assert status_codes(flags).tolist() == [quality_of(int(f)).status_code for f in flags]
    assert status_codes(np.zeros(0, dtype=np.int64)).size == 0
