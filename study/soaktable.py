"""What the soak left at every position, as cells of a table; nothing is computed."""

from midradius.study.result import Position, Result


def uneven(result: Result) -> bool:
    """Whether the soak deserves a table: the part was heated, so that positions differ."""
    return result.heating is not None


def soaks(result: Result) -> tuple[list[str], list[list[str]]]:
    """Heads and rows: temperature reached, austenite, and what did not dissolve."""
    heads = ["position", "reached\ndegC", "carbon in\nsolution, %", "ferrite\nleft, %"]
    heads += ["cementite\nleft, %", "grain\nASTM", "intercept\num"]
    return heads, [_row(p) for p in result.positions]


def _row(p: Position) -> list[str]:
    if p.austenite_grain_astm is None:
        return [p.name, f"{p.soak_degC:.0f}", "not austenitised", "-", "-", "-", "-"]
    return [
        p.name,
        f"{p.soak_degC:.0f}",
        f"{p.carbon_in_solution_pct:.3f}",
        f"{100.0 * p.undissolved_ferrite:.1f}",
        f"{100.0 * p.undissolved_cementite:.1f}",
        f"{p.austenite_grain_astm:.1f}",
        "-" if p.austenite_grain_um is None else f"{p.austenite_grain_um:.0f}",
    ]
