"""What an entry of the citation registry is; imports nothing of Fellspan."""

import math
from dataclasses import dataclass
from typing import Literal

Status = Literal["text", "code", "derived", "practice", "unconfirmed"]
"""How we know it: the published text was read; independent implementations agree, text not read; derived from first
principles here; common practice without a source; unconfirmed: from memory, checked by nobody, never shown as authoritative."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Validity:
    """One range that a source states for its formula; both ends included, infinite where open.

    `quantity` is in SI as the functions take it; `label`, `unit` and `scale` (SI per unit) serve people.
    """

    quantity: str
    label: str
    unit: str
    low: float = -math.inf
    high: float = math.inf
    scale: float = 1.0

    def text(self) -> str:
        """The range for people: '18 to 200 km', 'at least 30 MHz'."""
        low, high = f"{self.low / self.scale:.4g}", f"{self.high / self.scale:.4g}"
        if math.isinf(self.low):
            words = f"at most {high}"
        elif math.isinf(self.high):
            words = f"at least {low}"
        else:
            words = f"{low} to {high}"
        return f"{words} {self.unit}".rstrip()


@dataclass(frozen=True, slots=True, kw_only=True)
class Source:
    """A published method, or a practice, as the workings cite it."""

    key: str
    title: str
    document: str
    edition: str
    clause: str
    status: Status
    note: str = ""
    ranges: tuple[Validity, ...] = ()

    @property
    def reference(self) -> str:
        """One line: document, edition, clause."""
        name = f"{self.document}-{self.edition}" if self.document.startswith("Rec.") and self.edition else self.document
        return ", ".join(part for part in (name, self.clause) if part)
