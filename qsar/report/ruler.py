"""A pKa with its interval on a ruler, as SVG."""

from __future__ import annotations

from math import ceil, floor
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from qsar.model.model import StepPrediction

_WIDTH, _HEIGHT, _MARGIN = 560.0, 74.0, 24.0
_BAR, _INK = "#7FA8C9", "#111111"


def ruler_svg(step: StepPrediction, parent_pka: float | None = None) -> str:
    """The interval as a bar, the prediction as a diamond, the measured value as a ring, the parent as a tick.

    Parameters
    ----------
    step : StepPrediction
    parent_pka : float, optional

    Returns
    -------
    str
    """
    shown = [step.low, step.high, step.pka]
    shown += [v for v in (parent_pka, step.measured) if v is not None]
    first, last = floor(min(shown) - 0.4), ceil(max(shown) + 0.4)
    while last - first < 4:
        last += 1

    def x(value: float) -> float:
        return _MARGIN + (value - first) / (last - first) * (_WIDTH - 2 * _MARGIN)

    title = f"pKa {step.pka:.2f}, {100 * step.coverage:g} % interval {step.low:.2f} to {step.high:.2f}"
    parts = [
        f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {_WIDTH:g} {_HEIGHT:g}" class="ruler" role="img" '
        f'aria-label="{title}" font-family="sans-serif" font-size="11">',
        f'<line x1="{x(first):.1f}" x2="{x(last):.1f}" y1="46" y2="46" stroke="{_INK}"/>',
    ]
    for tick in range(2 * first, 2 * last + 1):
        whole = tick % 2 == 0
        at = x(tick / 2)
        parts.append(f'<line x1="{at:.1f}" x2="{at:.1f}" y1="46" y2="{54 if whole else 50}" stroke="{_INK}"/>')
        if whole:
            parts.append(f'<text x="{at:.1f}" y="67" text-anchor="middle">{tick // 2}</text>')
    parts.append(
        f'<rect x="{x(step.low):.1f}" y="32" width="{max(x(step.high) - x(step.low), 1):.1f}" height="10" '
        f'fill="{_BAR}" stroke="{_INK}" stroke-width="0.6"/>'
    )
    if parent_pka is not None:
        at = x(parent_pka)
        parts.append(f'<line x1="{at:.1f}" x2="{at:.1f}" y1="28" y2="46" stroke="{_INK}" stroke-dasharray="2 2"/>')
    at = x(step.pka)
    parts.append(f'<path d="M{at:.1f} 28l6 9l-6 9l-6 -9z" fill="{_INK}"/>')
    parts.append(
        f'<text x="{at:.1f}" y="20" text-anchor="middle" font-size="14" font-weight="bold">{step.pka:.2f}</text>'
    )
    if step.measured is not None:
        at = x(step.measured)
        parts.append(f'<circle cx="{at:.1f}" cy="37" r="5.5" fill="none" stroke="{_INK}" stroke-width="2"/>')
    parts.append("</svg>")
    return "".join(parts)
