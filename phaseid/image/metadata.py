"""What instruments write beside the pixels, in whichever dialect.

Every dialect is flattened to pairs of a dotted name and a value; the few quantities that matter are
then looked for by name. Units come from the value's own unit, else from the dialect's habit.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from phaseid.image.metadata_text import flatten, sidecar
from phaseid.image.notices import Finding

# Names are compared in lower case without spaces, underscores and dots.
ENERGY = (
    "eht",
    "ehttarget",
    "actualkv",
    "hv",
    "acceleratingvoltage",
    "accelvolt",
    "accvoltage",
    "cmaccelvolt",
    "highvoltage",
    "beamenergy",
    "beamenergykev",
    "voltage",
    "kv",
    "energykev",
)
DETECTOR = (
    "detectorname",
    "detectorsname",
    "apdetector",
    "dpdetectorchannel",
    "dpdetectortype",
    "detector",
    "detector0",
    "signalname",
    "cmsignal",
    "cmsignalname",
    "signal",
    "detectortype",
    "detectors",
)
PIXEL = (
    "imagepixelsize",
    "apimagepixelsize",
    "appixelsize",
    "pixelsize",
    "pixelwidth",
    "pixelsizex",
    "pixelsizenm",
    "physicalsizex",
)
FIELD_WIDTH = ("hfw", "horfieldsize", "fieldwidth", "viewfield", "apwidth", "imagewidthm")
TILT = (
    "stagetiltangle",
    "staget",
    "stagetilt",
    "apstageatt",
    "tiltangle",
    "tilt",
    "specimentilt",
    "tiltdeg",
)
HEIGHT = ("resolutiony", "imageheight", "imagesizey", "fullimageheight")
GAMMA = ("digitalgamma", "gamma", "cmgamma", "dpgamma")
CONTRAST = ("digitalcontrast",)
BRIGHTNESS = ("digitalbrightness",)
# Lengths in one metre, and factors for energies in kilovolts.
LENGTH_NM = {
    "m": 1e9,
    "mm": 1e6,
    "um": 1e3,
    "µm": 1e3,
    "μm": 1e3,
    "micron": 1e3,
    "microns": 1e3,
    "nm": 1.0,
    "pm": 1e-3,
    "a": 0.1,
    "å": 0.1,
}
SAME_SIZE = 0.02
SECONDARY = re.compile(
    r"\b(SE|SE1|SE2|SEI|ETD|TLD|InLens|LVSED|LFD|GSED|SED|secondary electrons?)\b", re.I
)


@dataclass
class Conditions:
    """What was found."""

    pixel_size_nm: float | None = None
    energy_keV: float | None = None
    detector: str | None = None
    tilt_deg: float | None = None
    provenance: dict[str, Any] = field(default_factory=dict)
    flags: list[Finding] = field(default_factory=list)


def read_conditions(metadata: Mapping[str, Any], shape: tuple[int, int], path: Path) -> Conditions:
    """Find beam energy, pixel size, detector and tilt in any dialect.

    Parameters
    ----------
    metadata : mapping
        Parsed dialects, tags and texts of the file.
    shape : (int, int)
        Rows and columns of the image.
    path : Path
        Of the image; a text file of the same name beside it is read too.

    Returns
    -------
    Conditions
    """
    pairs = flatten(metadata)
    pairs += sidecar(path)
    found = Conditions()
    found.energy_keV = _energy(pairs)
    _pixel_size(pairs, shape, found)
    _detector(pairs, found)
    found.tilt_deg = _tilt(pairs)
    _contrast(pairs, found)
    height = _first_number(pairs, HEIGHT)
    if height and 0 < shape[0] - height < 0.35 * shape[0]:
        found.provenance["image_rows"] = int(height)
    return found


def _plain(name: str) -> str:
    return re.sub(r"[^a-z0-9]", "", name.lower())


def _matches(
    pairs: list[tuple[str, Any, str]], names: tuple[str, ...]
) -> list[tuple[str, Any, str]]:
    """Pairs whose last part is one of the names, in the order of the names."""
    by_name: dict[str, list[tuple[str, Any, str]]] = {}
    for name, value, unit in pairs:
        parts = name.rsplit("/", 2)
        by_name.setdefault(_plain(parts[-1]), []).append((name, value, unit))
        if len(parts) > 1:
            by_name.setdefault(_plain("".join(parts[-2:])), []).append((name, value, unit))
    return [pair for name in names for pair in by_name.get(name, [])]


def _number(value: Any) -> float | None:
    if isinstance(value, bool):
        return None
    if isinstance(value, int | float):
        return float(value)
    if isinstance(value, str):
        matched = re.match(r"\s*=?\s*([-+]?\d+(?:[.,]\d+)?(?:[eE][-+]?\d+)?)", value)
        if matched:
            return float(matched.group(1).replace(",", "."))
    return None


def _unit(value: Any, unit: str) -> str:
    if unit:
        return unit.strip().lower()
    if isinstance(value, str):
        matched = re.match(
            r"\s*=?\s*[-+]?\d+(?:[.,]\d+)?(?:[eE][-+]?\d+)?(?![eE]?[-+]?\d)\s*([a-zA-Zµμå°]+)(?![-+\d])",
            value,
        )
        if matched:
            return matched.group(1).lower()
    return ""


def _first_number(pairs: list[tuple[str, Any, str]], names: tuple[str, ...]) -> float | None:
    for _, value, _unit_text in _matches(pairs, names):
        number = _number(value)
        if number is not None:
            return number
    return None


def _energy(pairs: list[tuple[str, Any, str]]) -> float | None:
    for _, value, unit in _matches(pairs, ENERGY):
        number = _number(value)
        if number is None or number <= 0:
            continue
        unit = _unit(value, unit)
        # Without a unit, a number of hundreds can only be volts: no microscope of this kind goes to 100 kV.
        volts = unit in ("v", "volt", "volts", "ev") or (not unit and number > 100)
        energy = number / 1000.0 if volts else number
        if 0.01 <= energy <= 400:
            return energy
    return None


def _length_nm(value: Any, unit: str, name: str) -> float | None:
    number = _number(value)
    if number is None or number <= 0:
        return None
    unit = _unit(value, unit)
    if unit in LENGTH_NM:
        return number * LENGTH_NM[unit]
    if _plain(name).endswith("nm"):
        return number
    if unit:
        return None
    # Dialects without units write metres; a pixel of the order of one can only be nanometres.
    return number * 1e9 if number < 1e-2 else number


def _pixel_size(
    pairs: list[tuple[str, Any, str]], shape: tuple[int, int], found: Conditions
) -> None:
    sizes: list[tuple[str, float]] = []
    for name, value, unit in _matches(pairs, PIXEL):
        size = _length_nm(value, unit, name)
        if size is not None and 1e-3 < size < 1e6:
            sizes.append((name, size))
    for name, value, unit in _matches(pairs, FIELD_WIDTH):
        width = _length_nm(value, unit, name)
        if width is not None:
            sizes.append((f"{name} / {shape[1]} columns", width / shape[1]))
    tag = _resolution_tag(pairs)
    if tag is not None and not sizes:
        sizes.append(("resolution tag", tag))
    if not sizes:
        return
    # Two sources that agree outvote the dialect's first; a size stated for the scan instead of the
    # image is off by a factor of two or so.
    votes = [sum(abs(s / t - 1) < SAME_SIZE for _, t in sizes) for _, s in sizes]
    best = votes.index(max(votes))
    found.pixel_size_nm = sizes[best][1]
    found.provenance["pixel_size_from"] = sizes[best][0]
    others = [(n, s) for n, s in sizes if abs(s / sizes[best][1] - 1) >= SAME_SIZE]
    if others:
        found.flags.append(
            Finding(
                "pixel-sizes-differ",
                f"The metadata give two pixel sizes: {sizes[best][1]:.4g} nm ({sizes[best][0]}) is used, "
                f"{others[0][1]:.4g} nm ({others[0][0]}) is not.",
                "Check against the scale bar.",
            )
        )


def _resolution_tag(pairs: list[tuple[str, Any, str]]) -> float | None:
    """Pixel size of the TIFF's own resolution, where it cannot be a printing resolution."""
    numbers: dict[str, Any] = {n.rsplit("/", 1)[-1]: v for n, v, _ in pairs}
    value, unit = numbers.get("XResolution"), numbers.get("ResolutionUnit")
    if not (isinstance(value, tuple) and len(value) == 2 and value[0] and value[1]):
        return None
    per_unit = value[0] / value[1]
    unit_nm = {"2": 25.4e6, "3": 1e7}.get(str(int(unit)) if unit is not None else "")
    if unit_nm is None:
        return None
    size = unit_nm / per_unit
    # Printing resolutions are 72 to 1200 per inch: 21 to 353 um.
    return size if size < 2e4 else None


def _detector(pairs: list[tuple[str, Any, str]], found: Conditions) -> None:
    texts = [str(v).strip() for _, v, _ in _matches(pairs, DETECTOR) if isinstance(v, str)]
    texts = [t for t in texts if t and not t.replace(".", "").isdigit()]
    if not texts:
        return
    signals = [
        str(v)
        for n, v, _ in pairs
        if _plain(n.rsplit("/", 1)[-1]) == "signal" and isinstance(v, str)
    ]
    text = texts[0]
    if signals and signals[0] not in text:
        text = f"{text} ({signals[0]})"
    found.detector = text
    found.provenance["detector"] = text


def is_secondary(detector: str | None) -> bool:
    """Whether a detector's name says that it records secondary electrons."""
    if not detector:
        return False
    if re.search(r"BSE|BSD|QBSD|backscatter|CBS|DBS|ABS|SSD|COMPO", detector, re.I):
        return False
    return bool(SECONDARY.search(detector))


def _tilt(pairs: list[tuple[str, Any, str]]) -> float | None:
    for name, value, unit in _matches(pairs, TILT):
        number = _number(value)
        if number is None:
            continue
        unit = _unit(value, unit)
        radians = unit in ("rad", "radian") or (
            not unit and name.startswith("fei_metadata")  # this dialect writes SI units, unlabelled
        )
        degrees = number * 57.29577951308232 if radians else number
        if abs(degrees) <= 90:
            return round(degrees, 3)
    return None


def _contrast(pairs: list[tuple[str, Any, str]], found: Conditions) -> None:
    for names, neutral, what in (
        (GAMMA, 1.0, "gamma"),
        (CONTRAST, 1.0, "digital contrast"),
        (BRIGHTNESS, 0.0, "digital brightness"),
    ):
        number = _first_number(pairs, names)
        if number is None:
            continue
        found.provenance[what.replace(" ", "_")] = number
        if abs(number - neutral) > 1e-6:
            linear = what != "gamma"
            found.flags.append(
                Finding(
                    "digital-contrast" if linear else "gamma",
                    f"The metadata give a {what} of {number:g}: the greys were changed after recording"
                    + ("." if linear else " and are not linear in the detector signal."),
                    f"Record with {what} {neutral:g}.",
                    "caution" if linear else "serious",
                )
            )
