"""Clearance criteria: lists of (k, fraction of the first Fresnel zone), with their sources."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True, kw_only=True)
class Criterion:
    """One rule: at this k the ray clears the surface by this fraction of the first Fresnel zone radius.

    `k` may be infinite or negative (1/k is what counts).
    """

    name: str
    k: float
    fraction: float
    source: str
    note: str = ""
