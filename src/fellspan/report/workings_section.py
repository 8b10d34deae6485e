"""How the figures of the signal were worked out, both directions side by side, each source told once. Computes nothing."""

from collections.abc import Iterable
from dataclasses import dataclass

from fellspan.links.result import LinkResult
from fellspan.links.signal_result import Working, WorkingInput
from fellspan.links.signal_words import rate_text
from fellspan.propagation.sources import SOURCES


@dataclass(frozen=True, slots=True, kw_only=True)
class WorkingRow:
    """One figure: its value A to B and B to A ('' where it is the same), and what went in; `source` counts from 1."""

    label: str
    there: str
    back: str
    formula: str
    inputs: str
    source: int | None
    notes: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class WorkingsSection:
    """`directions` name the two columns; a row without a source is what the study states."""

    directions: tuple[str, str]
    rows: tuple[WorkingRow, ...]
    sources: tuple[str, ...]


def workings_section(result: LinkResult) -> WorkingsSection | None:
    """The workings of a link; None where the result holds no signal."""
    signal = result.signal
    if signal is None:
        return None
    there, back = signal.a_to_b, signal.b_to_a
    others = {one.key: one for one in back.workings}
    pairs: list[tuple[Working | None, Working | None]] = [(one, others.pop(one.key, None)) for one in there.workings]
    pairs += [(None, one) for one in others.values()]
    keys = dict.fromkeys(one.source_key for pair in pairs for one in pair if one is not None)
    told = {key: number for number, key in enumerate((key for key in keys if key in SOURCES), start=1)}
    return WorkingsSection(
        directions=(
            f"{there.direction}: {there.transmitter} to {there.receiver}",
            f"{back.direction}: {back.transmitter} to {back.receiver}",
        ),
        rows=tuple(_row(one, other, told) for one, other in pairs),
        sources=tuple(_source(key) for key in told),
    )


def value_words(value: float | str | None, unit: str) -> str:
    """A figure with its unit, as many places as its kind deserves."""
    if value is None:
        return "–"
    if isinstance(value, str):
        return value
    if unit == "bit/s":
        return rate_text(value)
    if unit == "%":
        # An availability is told from 100 by its decimals, an outage by its first figures.
        text = f"{value:.5f}" if value > 50.0 else f"{value:.3g}"
    else:
        text = f"{value:.2f}" if unit in ("dB", "dBm", "dBi") else f"{value:.5g}"
    return f"{text.replace('-', '−')} {unit}".rstrip()


def _row(one: Working | None, other: Working | None, told: dict[str, int]) -> WorkingRow:
    first = one or other
    assert first is not None
    there, back = (("–" if each is None else value_words(each.value, each.unit)) for each in (one, other))
    same = one is not None and other is not None and there == back
    return WorkingRow(
        label=_both(_label(one), _label(other)),
        there=there,
        back="" if same else back,
        formula=_both(*("" if each is None else each.formula for each in (one, other))),
        inputs=_inputs(() if one is None else one.inputs, () if other is None else other.inputs),
        source=told.get(first.source_key),
        notes=tuple(dict.fromkeys(each.note for each in (one, other) if each is not None and each.note)),
    )


def _label(working: Working | None) -> str:
    if working is None:
        return ""
    # A figure of a modulation that its name does not say already.
    which = working.key.partition(":")[2]
    more = f" ({which})" if which and which not in working.label else ""
    return working.label[:1].upper() + working.label[1:] + more


def _both(one: str, other: str) -> str:
    return one if one == other or not other else other if not one else f"{one}; B to A: {other}"


def _inputs(one: Iterable[WorkingInput], other: Iterable[WorkingInput]) -> str:
    """What went in, once where it is the same in both directions."""
    there, back = (
        tuple(f"{each.label} {value_words(each.value, each.unit)}" for each in side) for side in (one, other)
    )
    if there == back or not back:
        return "; ".join(there)
    differing = [text for text in back if text not in there]
    if not there:
        return "; ".join(back)
    return "; ".join(there) + (f". B to A: {'; '.join(differing)}" if differing else "")


def _source(key: str) -> str:
    found = SOURCES[key]
    ranges = "; ".join(f"{one.label} {one.text()}" for one in found.ranges)
    return (
        f"{found.title}: {found.reference}"
        + (f". Valid for {ranges}" if ranges else "")
        + (". UNCONFIRMED" if found.status == "unconfirmed" else "")
    )
