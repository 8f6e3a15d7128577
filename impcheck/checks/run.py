"""All rules over all nets. In: what was walked and solved, and a deck; out: findings and remarks."""

from __future__ import annotations

from collections.abc import Sequence

from impcheck.artwork.parts import Artwork
from impcheck.checks.context import Context
from impcheck.checks.deck import Deck
from impcheck.checks.discover import all_rules
from impcheck.checks.finding import Finding
from impcheck.checks.track import Track
from impcheck.copper.copper import Copper
from impcheck.errors import Remark, RemarkKind
from impcheck.fields.profile import NetProfile
from impcheck.nets.nets import Nets


def run_checks(
    artwork: Artwork, copper: Copper, nets: Nets, profiles: Sequence[NetProfile], deck: Deck
) -> tuple[tuple[Finding, ...], tuple[Remark, ...]]:
    """Every finding, in the order of nets and rules, and what limits them."""
    context = Context(artwork, copper, nets, [Track(profile) for profile in profiles], deck)
    found: list[Finding] = []
    for name, rule in all_rules().items():
        limits = deck.limits[name]
        if rule.check_board is not None:
            found.extend(rule.check_board(limits, context))
        if rule.check is not None:
            for track in context.tracks:
                if len(track):
                    found.extend(rule.check(track, limits, context))
    pairs = sorted({profile.walk.net.pair for profile in profiles} - {""})
    if pairs:
        shown = ", ".join(pairs[:5]) + (", ..." if len(pairs) > 5 else "")
        text = (
            f"of pairs ({shown}) each leg is walked and its geometry judged; differential impedance, gap, coupling and skew are "
            "not judged by this version"
        )
        context.remarks.append(Remark(RemarkKind.LIMIT, text, artwork.board.file))
    return tuple(found), tuple(dict.fromkeys(context.remarks))
