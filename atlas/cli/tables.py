"""Plain tables on standard output, aligned, without decoration."""

from __future__ import annotations

from collections.abc import Sequence

from atlas.output.batch import Outcome
from atlas.plan import Need, size_text


def table(head: Sequence[str], rows: Sequence[Sequence[str]], right: Sequence[int] = ()) -> str:
    """Return rows under a head, columns aligned; those listed in right flush right."""
    widths = [max(len(row[k]) for row in (head, *rows)) for k in range(len(head))]
    lines = []
    for row in (head, *rows):
        cells = [
            cell.rjust(width) if k in right else cell.ljust(width)
            for k, (cell, width) in enumerate(zip(row, widths, strict=True))
        ]
        lines.append("  ".join(cells).rstrip())
    return "\n".join(lines)


def outcome_table(outcomes: Sequence[Outcome]) -> str:
    """Return what was made, skipped and failed."""
    rows = [
        (
            one.name,
            one.kind,
            one.status,
            f"{one.seconds:.1f}" if one.status != "skipped" else "",
            count(one.samples),
        )
        for one in outcomes
    ]
    made = sum(one.status == "made" for one in outcomes)
    failed = sum(one.status == "failed" for one in outcomes)
    text = table(("output", "kind", "", "seconds", "samples"), rows, right=(3, 4))
    return f"{text}\n{made} made, {len(outcomes) - made - failed} skipped, {failed} failed"


def need_table(needs: Sequence[tuple[str, str, Need]]) -> str:
    """Return what outputs need."""
    rows = [
        (
            name,
            kind,
            f"{need.pixels[0]} x {need.pixels[1]}",
            count(need.samples),
            f"{need.seconds:.1f}",
            size_text(need.memory),
        )
        for name, kind, need in needs
    ]
    return table(("output", "kind", "pixels", "samples", "seconds", "memory"), rows, right=(2, 3, 4, 5))


def count(number: int) -> str:
    """Return a count for people: three digits and a power of ten from a million on."""
    if number == 0:
        return ""
    if number < 1_000_000:
        return str(number)
    digits, exponent = f"{number:.2e}".split("e")
    return f"{digits}e{int(exponent)}"
