"""A run's log: what the solver did and said, in plain text beside what came of it."""

from __future__ import annotations

from ..solver.result import Summary

LOG_FILE = "log.txt"


def text(summary: Summary) -> str:
    """All that a run has to tell but its temperatures, as lines."""
    mesh, balance = summary["mesh"], summary["balance"]
    lines = [
        f"{mesh['nodes']:,} nodes, {mesh['cells']:,} tetrahedra, order {mesh['order']}",
        *(f"{stage}: {seconds:.2f} s" for stage, seconds in summary["seconds"].items()),
        *(f"{stage}: {size / 2**20:,.0f} MiB of memory at most" for stage, size in summary.get("memory", {}).items()),
    ]
    if summary.get("reused"):
        lines.append(f"kept from the run before: {', '.join(summary['reused'])}")
    lines += [f"{name.replace('_', ' ')}: {value}" for name, value in summary["solver"].items()]
    lines.append(f"heat in {balance['in']:.6g} W, out {-balance['out']:.6g} W")
    for title, sentences in (
        ("Mended", summary["mending"]),
        ("Warnings", summary["warnings"]),
        ("Where the heat goes", summary.get("where_heat_goes", [])),
    ):
        if sentences:
            lines += ["", title, *(f"- {sentence}" for sentence in sentences)]
    return "\n".join(lines) + "\n"
