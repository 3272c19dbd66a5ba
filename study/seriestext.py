"""What given samples cost, in words and for a JSON document."""

from midradius.study.result import Resampling


def resampling_rows(cost: Resampling) -> list[tuple[str, str]]:
    """Rows of the part of the summary that says how far to trust it."""
    hv, share = float(cost.as_quenched_error_hv.max()), float(cost.phase_error.max())
    return [
        ("heat balance, grid", "not applicable: the temperatures were given"),
        ("largest fall of a sample", f"{cost.largest_fall_K:.3g} K while a node could transform"),
        (
            "without every 2nd sample",
            f"hardness as cooled moves by {cost.halved_hv:.2g} HV",
        ),
        ("cubic instead of lines", f"it moves by {cost.cubic_hv:.2g} HV"),
        ("hardness as cooled, samples", f"{hv:.2g} HV at most, {cost.worst_hardness}"),
        ("constituents, samples", f"{100.0 * share:.2g} % at most, {cost.worst_phase}"),
    ]


def resampling_document(cost: Resampling | None) -> dict[str, object] | None:
    """What given samples cost; None where the temperatures were computed here."""
    if cost is None:
        return None
    return {
        "n_sample": cost.n_sample,
        "largest_fall_K": cost.largest_fall_K,
        "without_every_second_sample_hv": cost.halved_hv,
        "cubic_instead_of_lines_hv": cost.cubic_hv,
        "hardness_as_quenched_error_hv": float(cost.as_quenched_error_hv.max()),
        "hardness_error_at": cost.worst_hardness,
        "phase_error": float(cost.phase_error.max()),
        "phase_error_at": cost.worst_phase,
    }
