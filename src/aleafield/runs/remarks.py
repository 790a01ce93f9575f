"""What the values of a run tell about the study itself: activity that fills the domain, fronts that are gone."""

from __future__ import annotations

import numpy as np

from aleafield.archive.ensemble_reader import EnsembleReader
from aleafield.quantities import ActiveWidth, FrontPosition, FrontSpeed
from aleafield.study.study import Study

WHOLE = 1.0 - 1e-9
"""Share of the domain's length above which all of it is active."""


def runs_word(repeats: int) -> str:
    """What single solver runs are called: samples, or realizations where each sample has several."""
    return "samples" if repeats == 1 else "realizations"


def remarks(reader: EnsembleReader, study: Study) -> tuple[str, ...]:
    """Sentences for the warnings of the summary."""
    found = []
    valid = reader.valid()
    count = f"{int(valid.sum())} {runs_word(reader.repeats)}"
    for quantity in study.quantities:
        if isinstance(quantity, ActiveWidth):
            values = reader.values(quantity.name)[valid]
            full = int((values >= WHOLE * study.equation.domain.length).sum())
            if full:
                found.append(
                    f"{quantity.name}: in {full} of {count} the whole domain is active; the width then "
                    "is that of the domain, not of a patch"
                )
        elif isinstance(quantity, FrontPosition | FrontSpeed):
            gone = int(np.isnan(reader.values(quantity.name)[valid]).sum())
            if gone:
                found.append(
                    f"{quantity.name}: in {gone} of {count} no front is inside the domain at the time "
                    "asked for: none has formed, or it has left; its mean is that of the others"
                )
    return tuple(found)
