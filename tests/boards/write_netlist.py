"""Writes an IPC-D-356A netlist. In: Board; out: the file as text, in 0.0001 inch or 0.001 mm. Shares no code with impcheck.

Columns as IPC-D-356 gives them (from memory): 1-3 operation, 4-17 net, 21-26 part, 27 hyphen, 28-31 pin, 32 midpoint, 33-38 hole, 39-41
access, 42-57 place, 58-71 size, 73-74 mask.
"""

from __future__ import annotations

from tests.boards.model import Board, Point


def netlist(board: Board, unit: str = "inch") -> str:
    """One record per pin and via. Names over 14 characters get an alias."""
    per = 25.4 / 10000 if unit == "inch" else 0.001
    aliases: dict[str, str] = {}
    lines = [f"C  netlist of {board.name}", "P  JOB   " + board.name, f"P  UNITS CUST {0 if unit == 'inch' else 1}", "P  VER   IPC-D-356A"]

    def short(net: str) -> str:
        if len(net) <= 14:
            return net
        return aliases.setdefault(net, f"NNAME{len(aliases) + 1}")

    def place(at: Point) -> str:
        x, y = round(at[0] / per), round(at[1] / per)
        return f"X{x:+07d}Y{y:+07d}"

    def size(w: float, h: float, turn: float = 0.0) -> str:
        return f"X{min(round(w / per), 9999):04d}Y{min(round(h / per), 9999):04d}R{round(turn) % 360:03d}"

    body = []
    for pad in board.pads:
        net = short(pad.net) if pad.component else ""
        if net:
            access = 1 if pad.layer == 0 else board.last + 1
            body.append(
                f"327{net:<14}   {pad.component:<6}-{pad.pin:<4}       A{access:02d}{place(pad.at)}{size(*pad.size, pad.rotation)} "
                f"S{2 if pad.layer == 0 else 1}"
            )
    for via in board.vias:
        drill = f"D{round(via.drill / per):04d}P"
        if via.component:
            body.append(f"317{short(via.net):<14}   {via.component:<6}-{via.pin:<4} {drill}A00{place(via.at)}{size(via.pad, via.pad)} S0")
        elif board.span(via) == (0, board.last):  # blind and buried vias are left to the copper
            body.append(f"317{short(via.net):<14}   {'VIA':<6}-{'':<4}M{drill}A00{place(via.at)}{size(via.pad, via.pad)} S3")
    lines += [f"P  {alias}  {net}" for net, alias in aliases.items()]
    return "\n".join([*lines, *body, "999", ""])
