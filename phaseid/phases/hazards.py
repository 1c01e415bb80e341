"""Which phases call for a word of caution."""

from __future__ import annotations

import re

import numpy as np
from numpy.typing import NDArray

from phaseid.phases.mixture import is_mixture
from phaseid.phases.oxidation import valence_needed
from phaseid.phases.records import Phase
from phaseid.physics.elements import SYMBOLS

Floats = NDArray[np.float64]

# Regulated or radioactive in every form that matters in a laboratory: symbol and words that name it.
ELEMENTS: dict[str, tuple[str, ...]] = {
    "Be": ("beryll",),
    "Pb": ("lead",),
    "As": ("arsen",),
    "Hg": ("mercur",),
    "Cd": ("cadmium",),
    "Tl": ("thallium",),
    "U": ("uran", "radioactiv"),
    "Th": ("thorium", "radioactiv"),
    "Ra": ("radium", "radioactiv"),
    "Np": ("neptunium", "radioactiv"),
    "Pu": ("plutonium", "radioactiv"),
    "Am": ("americium", "radioactiv"),
}
# Fibres regulated as asbestos, and erionite.
FIBRES = (
    "asbestos",
    "chrysotile",
    "crocidolite",
    "amosite",
    "tremolite",
    "actinolite",
    "anthophyllite",
    "riebeckite",
    "grunerite",
    "erionite",
)
SILICA = ("quartz", "cristobalite", "tridymite", "chalcedony", "flint", "moganite", "coesite")
# Below this mass fraction an element is a trace that calls for no word of its own.
TRACE = 0.002
# Chromium that must be above this state in the formula is chromate; CrO2 of magnetic tape is 4.
_CHROMATE = 4.5
_Z = {symbol: i for i, symbol in enumerate(SYMBOLS)}


def reasons(phase: Phase, mass_fractions: Floats) -> list[tuple[str, tuple[str, ...]]]:
    """Why a phase needs a hazard, each with words of which the sentence should hold one.

    Parameters
    ----------
    phase : Phase
    mass_fractions : ndarray of shape (V, 103)
        Its compositions.

    Returns
    -------
    list of (str, tuple of str)
    """
    most = mass_fractions.max(axis=0)
    found = [
        (f"holds {symbol}", words) for symbol, words in ELEMENTS.items() if most[_Z[symbol]] > TRACE
    ]
    words = set(re.findall(r"\w+", " ".join(phase.names).casefold()))
    found += [(f"{f} can be fibrous", ("fibr", "asbest", "erionite")) for f in FIBRES if f in words]
    if _is_silica(phase, mass_fractions, words):
        found.append(("is crystalline silica", ("silica",)))
    if most[_Z["Ni"]] > 0.05 and most[_Z["S"]] > 0.05 and most[_Z["O"]] == 0:
        found.append(("is a nickel sulphide", ("nickel",)))
    # Amounts in a mixture are too rough to tell a state from.
    present = mass_fractions[:, _Z["Cr"]] > TRACE
    chromium = mass_fractions[present & (not is_mixture(phase.formula))]
    if any(valence_needed(row, "Cr") > _CHROMATE for row in chromium):
        found.append(("holds chromium(VI)", ("chromium", "chromate")))
    return found


def _is_silica(phase: Phase, mass_fractions: Floats, words: set[str]) -> bool:
    if phase.crystal_system == "amorphous":
        return False
    middle = mass_fractions.mean(axis=0)
    if middle[_Z["Si"]] + middle[_Z["O"]] < 0.99 or not 0.45 < middle[_Z["Si"]] < 0.49:
        return False
    return phase.crystal_system is not None or bool(words & set(SILICA))
