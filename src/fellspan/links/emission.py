"""Designators of emissions as the ITU Radio Regulations, Appendix 1, write them: 40M0D7W. Knows nothing of radios."""

import math
import re
from decimal import ROUND_HALF_UP, Decimal
from typing import Final

from fellspan.errors import QuantityError

_LETTERS: Final = (("H", 0), ("K", 3), ("M", 6), ("G", 9))
_CLASS: Final = re.compile(r"[NAHRJBCFGDPKLMQVWX][0-3789X][NABCDEFWX](?:[A-HJ-NWX][NCFTWX])?")
_RANGE_HZ: Final = (0.001, 999e9)


def necessary_bandwidth(bandwidth_hz: float) -> str:
    """Necessary bandwidth as three numerals and a letter that stands for the decimal point: 12.5 kHz is 12K5, 40 MHz 40M0.

    Rounded to three significant figures, halves up.

    Raises
    ------
    QuantityError
        The bandwidth is not from 0.001 Hz to 999 GHz, which is what the form can hold.
    """
    low, high = _RANGE_HZ
    if not (math.isfinite(bandwidth_hz) and low <= bandwidth_hz <= high):
        raise QuantityError(f"bandwidth {bandwidth_hz:g} Hz has no designator", "allowed are 0.001 Hz to 999 GHz")
    exact = Decimal(repr(float(bandwidth_hz)))
    for letter, power in _LETTERS:
        scaled = exact.scaleb(-power)
        if letter == "H" and scaled < 1:
            thousandths = int((scaled * 1000).quantize(Decimal(1), ROUND_HALF_UP))
            if thousandths < 1000:
                return f"H{thousandths:03d}"
            scaled = Decimal(1)
        whole = len(str(int(scaled)))
        if whole > 3:
            continue
        figures = scaled.quantize(Decimal(1).scaleb(whole - 3), ROUND_HALF_UP)
        if figures >= 1000:
            continue
        if len(str(int(figures))) > whole:  # 9.999 has become 10.00
            figures = figures.quantize(Decimal(1).scaleb(whole - 2))
        text = str(figures)
        return text.replace(".", letter) if "." in text else text + letter
    raise QuantityError(f"bandwidth {bandwidth_hz:g} Hz has no designator", "allowed are 0.001 Hz to 999 GHz")


def emission_designator(bandwidth_hz: float, emission_class: str) -> str:
    """Necessary bandwidth and class of emission together.

    Parameters
    ----------
    bandwidth_hz
        Necessary bandwidth, Hz.
    emission_class
        Three symbols (modulation of the main carrier, signal, information), or five with the details of the signal and the
        multiplexing: 'D7W', 'D7WET'; letters in any case.

    Raises
    ------
    QuantityError
        The bandwidth cannot be written, or the class has a symbol that its place does not know.

    Notes
    -----
    ITU Radio Regulations, Appendix 1, sections I and II (from memory).
    """
    return necessary_bandwidth(bandwidth_hz) + class_of_emission(emission_class)


def class_of_emission(text: str) -> str:
    """A class of emission in capitals, checked symbol by symbol; see `emission_designator`."""
    plain = text.strip().upper()
    if not _CLASS.fullmatch(plain):
        shown = text if len(text) <= 20 else text[:17] + "..."
        raise QuantityError(
            f"{shown!r} is no class of emission",
            "three symbols or five, such as D7W: combined modulation, several channels of digital data, combined information",
        )
    return plain
