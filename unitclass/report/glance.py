"""A unit at a glance: a small picture written by hand, so that a page of a thousand units opens at once."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from unitclass.records import FloatArray, NerveProfile, UnitResult
from unitclass.report.two_cycles import doubled

WIDTH, HEIGHT = 240, 64


def glance(unit: UnitResult, nerve: NerveProfile | None) -> str:
    """Return an SVG element: rate by phase over two cycles, the family behind it, the nerve above.

    It holds numbers only, no text of a file.
    """
    rate = np.nan_to_num(unit.histogram.rate_hz)
    fitted = unit.suggestion.fitted_rate_hz
    has_fit = fitted.size == rate.size
    top = max(float(rate.max(initial=0.0)), float(fitted.max(initial=0.0)) if has_fit else 0.0, 1e-9)
    parts = [f'<svg class="glance" viewBox="0 0 {WIDTH} {HEIGHT}" preserveAspectRatio="none" role="img" '
             'aria-label="rate by phase, two cycles">',
             *(f'<rect class="insp" x="{x}" y="0" width="{WIDTH // 4}" height="{HEIGHT}"/>' for x in (0, WIDTH // 2)),
             f'<path class="bars" d="{_steps(doubled(rate) / top)}"/>']
    if nerve is not None and np.isfinite(nerve.mean).any():
        span = float(np.nanmax(nerve.mean) - np.nanmin(nerve.mean)) or 1.0
        parts.append(f'<path class="nerve" d="{_line(doubled((nerve.mean - np.nanmin(nerve.mean)) / span))}"/>')
    if has_fit:
        parts.append(f'<path class="family" d="{_line(doubled(fitted) / top)}"/>')
    return "".join([*parts, "</svg>"])


def _steps(level: FloatArray) -> str:
    x, y = _x(level.size + 1), _y(level)
    body = "".join(f"H{x[i]}V{y[i]}" for i in range(level.size))
    return f"M0 {HEIGHT}{body}H{WIDTH}V{HEIGHT}Z"


def _line(level: FloatArray) -> str:
    places = _x(2 * level.size + 1)[1::2]
    points = [f"{x} {y}" for x, y, v in zip(places, _y(np.nan_to_num(level)), level, strict=True) if v == v]
    return "M" + "L".join(points)


def _x(n: int) -> Sequence[str]:
    return [f"{v:g}" for v in np.round(np.linspace(0, WIDTH, n), 1)]


def _y(level: FloatArray) -> Sequence[str]:
    return [f"{v:g}" for v in np.round(HEIGHT - 2 - (HEIGHT - 8) * level, 1)]
