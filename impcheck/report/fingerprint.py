"""A name for a finding that lasts. In: findings; out: one short hexadecimal string each, the same when unrelated parts of the board
move."""

from __future__ import annotations

import hashlib
from collections import Counter
from collections.abc import Sequence

from impcheck.checks.finding import Finding

CELL = 2.0  # mm: a finding that moves less than this along its own net usually keeps its name
OFFSET = 0.137  # mm: keeps round numbers, which boards are full of, off the borders of the cells


def fingerprints(findings: Sequence[Finding]) -> list[str]:
    """One fingerprint a finding, same order.

    Made of the rule, the net, the layer and the cell of the place along the net, counted from the pin where the walk starts: no
    coordinate of the board goes in, so an origin or another part that moves changes nothing. Several findings of one rule in one cell
    are numbered.
    """
    seen: Counter[str] = Counter()
    found = []
    for finding in findings:
        place = "" if finding.along is None else str(int((sum(finding.along) / 2 + OFFSET) // CELL))
        key = "\x1f".join((finding.rule, finding.net, finding.layer, place))
        text = f"{key}\x1f{seen[key]}"
        seen[key] += 1
        found.append(hashlib.sha256(text.encode()).hexdigest()[:16])
    return found
