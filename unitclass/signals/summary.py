"""Rate, medians and spreads of a condition's cycles, with and without those left out."""

from __future__ import annotations

import numpy as np

from unitclass.records import Cycles, FloatArray
from unitclass.signals.nerves import OtherNerve, agreement, coupling

TAGS = {"n_sigh": "sigh", "n_after_sigh": "after a sigh", "n_apnoea": "apnoea", "n_doublet": "doublet",
        "n_swallow": "swallow-like", "n_gap": "gap", "n_truncated": "truncated", "n_excluded": "excluded"}

MEASURES = (("rate_per_min", "rate", "/min"), ("ttot_s", "TTOT", "s"), ("ti_s", "TI", "s"), ("te_s", "TE", "s"),
            ("duty", "duty (TI/TTOT)", ""), ("cv_ttot", "CV of TTOT", ""), ("cv_ti", "CV of TI", ""),
            ("cv_te", "CV of TE", ""), ("cv_peak", "CV of burst height", ""))
"""What a summary holds, in words and with its unit."""


def summarised(cycles: Cycles, others: list[OtherNerve]) -> dict[str, float]:
    """Return the summary by name; names that end in `_all` include cycles that were left out."""
    whole = cycles.select(np.array([k != "edge" for k in cycles.kind], bool) & np.isfinite(cycles.offset_s))
    used = cycles.used()
    out = {"n_cycles": float(cycles.n_cycles), "n_used": float(used.n_cycles)}
    out |= _durations(used, "") | _durations(whole, "_all")
    out |= {name: float(sum(r.startswith(word) for r in cycles.reason)) for name, word in TAGS.items()}
    out["n_artefact"] = float(sum(k == "artefact" for k in cycles.kind))
    for nerve in others:
        out |= _of_nerve(used, nerve)
    if (used.late_e >= 0).any():
        found = coupling(used.late_e)
        out |= {"late_e_share": found.share, "coupling_n": float(found.n), "coupling_confidence": found.confidence}
    if np.isfinite(used.post_i_end_s).any():
        out["post_i_s"] = float(np.nanmedian(used.post_i_end_s - used.offset_s))
        out["post_i_share"] = float(np.mean(np.isfinite(used.post_i_end_s)))
    return out


def _durations(cycles: Cycles, suffix: str) -> dict[str, float]:
    if not cycles.n_cycles:
        return {}
    ttot = float(np.median(cycles.ttot_s))
    out = {"rate_per_min": 60 / ttot, "ttot_s": ttot, "ti_s": float(np.median(cycles.ti_s)),
           "te_s": float(np.median(cycles.te_s)), "duty": float(np.median(cycles.ti_s / cycles.ttot_s)),
           "cv_ti": _cv(cycles.ti_s), "cv_te": _cv(cycles.te_s), "cv_ttot": _cv(cycles.ttot_s),
           "cv_peak": _cv(cycles.peak)}
    return {name + suffix: value for name, value in out.items()}


def _cv(values: FloatArray) -> float:
    return float(np.std(values, ddof=1) / np.mean(values)) if values.size > 1 else float("nan")


def _of_nerve(used: Cycles, nerve: OtherNerve) -> dict[str, float]:
    name = nerve.fine.name
    lead = used.lead_ms.get(name, np.empty(0))
    lead = lead[np.isfinite(lead)]
    out = {f"agreement_{name}": agreement(used, nerve.marks)}
    if lead.size:
        low, mid, high = np.percentile(lead, [25, 50, 75])
        out |= {f"lead_ms_{name}": float(mid), f"lead_iqr_ms_{name}": float(high - low)}
    return out
