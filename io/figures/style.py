"""
The look of the pictures: colours, lines, and what keeps two runs alike to the byte.

The colours are those of Okabe, M., and K. Ito, 2008: Color Universal Design (from memory), which
the common kinds of colour blindness leave apart. Each has a line style, a marker or a hatch of its
own beside it, so that nothing rests on colour.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

INK = "#222222"
FAINT = "#8c8c8c"
PALE = "#e4e4e4"
BLUE = "#0072B2"
VERMILION = "#D55E00"
GREEN = "#009E73"
ORANGE = "#E69F00"
SKY = "#56B4E9"
PURPLE = "#CC79A7"

#: What a person's own matplotlibrc must not change.
STYLE: Mapping[str, Any] = {
    "font.family": ["DejaVu Sans"],
    "font.size": 8.5,
    "axes.titlesize": 9.5,
    "axes.titleweight": "bold",
    "axes.titlelocation": "left",
    "axes.labelsize": 8.5,
    "axes.edgecolor": FAINT,
    "axes.labelcolor": INK,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.unicode_minus": True,
    "text.color": INK,
    "xtick.color": INK,
    "ytick.color": INK,
    "xtick.labelsize": 8.0,
    "ytick.labelsize": 8.0,
    "legend.fontsize": 7.5,
    "legend.frameon": False,
    "hatch.linewidth": 0.6,
    "lines.solid_capstyle": "round",
    "figure.dpi": 100.0,
    "savefig.dpi": 150.0,
    "svg.fonttype": "path",
    "svg.hashsalt": "backveer",
    "pdf.fonttype": 42,
}

#: Dates and the like that a format would write by itself, taken out.
METADATA: Mapping[str, Mapping[str, Any]] = {
    ".svg": {"Date": None, "Creator": "backveer"},
    ".pdf": {"CreationDate": None, "Creator": "backveer", "Producer": None},
    ".png": {"Software": "backveer"},
}
