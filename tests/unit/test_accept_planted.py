"""Ten planted faults: the first cause named is the planted one in at least eight, and no wrong one is ever said to fit well.

Seeds 1 to 3 and 11 served, on these links, for choosing the weights of causes; seeds 21 to 23 were not looked at before.
"""

import pytest
from planted_faults import FAULTS, as_planned, found

WEST, SOUTH, SOUTHDOWN, CAPE = (
    "Beacon - West Point",
    "South Light - Ostrel Landing",
    "Harbour Office - Southdown Farm",
    "Harbour Office - Cape Light",
)
# Heights and k act where terrain stands in the way, chains where a radio has two: such faults go to a link that has them.
ROUNDS = {
    "5 GHz dishes": dict.fromkeys(FAULTS, WEST) | {"height": SOUTHDOWN, "low k": SOUTH},
    "11 GHz over water": dict.fromkeys(FAULTS, SOUTH) | {"height": CAPE, "one chain": CAPE, "power control": CAPE},
    "over a ridge": dict.fromkeys(FAULTS, SOUTHDOWN) | {"low k": SOUTH},
    "behind an island": dict.fromkeys(FAULTS, CAPE) | {"low k": SOUTH},
}
SLOW = [pytest.param(seed, marks=pytest.mark.slow) for seed in (1, 2, 3, 21, 22, 23)]


def _round(name: str, seed: int, *, full: bool) -> tuple[list[str], list[str]]:
    """Faults that were not named first, and wrong causes that were said to fit well."""
    missed, wrong = [], []
    for fault, link in ROUNDS[name].items():
        result = found(link, fault, seed, full=full)
        first = result.causes[0] if result.causes else None
        if first is None or first.key != fault:
            missed.append(f"{fault} ({'nothing' if first is None else f'{first.key}, {first.fit}'})")
        wrong += [f"{fault}: {one.key}" for one in result.causes if one.fit == "fits well" and one.key != fault]
    return missed, wrong


@pytest.mark.parametrize("seed", [11, *SLOW])
@pytest.mark.parametrize("name", ROUNDS)
def test_a_filled_sheet_names_the_planted_fault_first(name: str, seed: int) -> None:
    missed, wrong = _round(name, seed, full=True)
    assert wrong == []
    assert len(missed) <= 2, missed


@pytest.mark.slow
@pytest.mark.parametrize("seed", [1, 11, 21])
@pytest.mark.parametrize("name", ROUNDS)
def test_levels_alone_never_make_a_wrong_cause_fit_well(name: str, seed: int) -> None:
    # From levels alone a smaller antenna, a lossy line and a power control look the same: the planted one is named first in
    # about seven of ten, and the others stand beside it.
    missed, wrong = _round(name, seed, full=False)
    assert wrong == []
    assert len(missed) <= 5, missed


@pytest.mark.parametrize("name", [WEST, SOUTH])
def test_a_link_as_planned_is_accepted_and_nothing_is_blamed(name: str) -> None:
    # With 1 dB of noise on two readings and a band of 3 dB, one link in 200 is refused by chance: none of these seeds.
    for seed in range(31, 37):
        result = as_planned(name, seed, full=True)
        assert result.accepted, (seed, result.decision)
        assert result.causes == ()
