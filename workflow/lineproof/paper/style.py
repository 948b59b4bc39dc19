"""How figures look, and how they are saved: the same figure always gives the same bytes."""

from __future__ import annotations

import io
from collections.abc import Iterator
from contextlib import contextmanager

import matplotlib as mpl
from matplotlib.figure import Figure

from lineproof.paper.palette import LIGHT

WIDE, NARROW = 190 / 25.4, 140 / 25.4  # inches
_RC = {
    "font.family": "STIXGeneral",
    "mathtext.fontset": "stix",
    "font.size": 8.5,
    "axes.titlesize": 8.5,
    "axes.labelsize": 8.5,
    "xtick.labelsize": 8,
    "ytick.labelsize": 8,
    "legend.fontsize": 8.5,
    "legend.frameon": False,
    "legend.handlelength": 2.4,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.linewidth": 0.6,
    "axes.edgecolor": LIGHT["soft"],
    "axes.labelcolor": LIGHT["ink"],
    "axes.titlelocation": "left",
    "axes.titlepad": 3.5,
    "axes.titlecolor": LIGHT["ink"],
    "axes.facecolor": LIGHT["paper"],
    "figure.facecolor": LIGHT["paper"],
    "savefig.facecolor": LIGHT["paper"],
    "text.color": LIGHT["ink"],
    "xtick.color": LIGHT["soft"],
    "ytick.color": LIGHT["soft"],
    "xtick.labelcolor": LIGHT["ink"],
    "ytick.labelcolor": LIGHT["ink"],
    "xtick.major.size": 2.5,
    "ytick.major.size": 2.5,
    "xtick.major.width": 0.6,
    "ytick.major.width": 0.6,
    "axes.formatter.useoffset": False,
    "axes.unicode_minus": True,
    "pdf.fonttype": 42,
    "svg.fonttype": "path",
}
# Times, versions and names of the software would differ between runs and machines.
_METADATA = {
    "pdf": {"CreationDate": None, "ModDate": None, "Creator": None, "Producer": None},
    "svg": {"Date": None, "Creator": None},
    "png": {"Software": None},
}


@contextmanager
def styled(name: str) -> Iterator[None]:
    """Draw and save the figure of this name inside; settings of the user's machine play no part."""
    with mpl.rc_context():
        mpl.rcdefaults()
        mpl.rcParams.update({**_RC, "svg.hashsalt": name})
        yield


def saved(figure: Figure, form: str) -> bytes:
    """The figure as "pdf", "svg" or "png" (300 dots an inch), at the size it was made."""
    sink = io.BytesIO()
    figure.savefig(sink, format=form, dpi=300, metadata=_METADATA[form])
    return sink.getvalue()
