"""The passes over an image, in order, and the decisions between them."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field, replace

import numpy as np
from numpy.typing import NDArray

from phaseid.errors import InputError
from phaseid.image.canvas import Canvas, Tile
from phaseid.image.clusters import Cluster
from phaseid.image.counting import grey_step
from phaseid.image.deciding import finding_of
from phaseid.image.fitness import assess
from phaseid.image.flatness import STEPS, FlatCounts, count_flat
from phaseid.image.greyimage import GreyImage
from phaseid.image.infobar import used_rows
from phaseid.image.judging import border_width, judge_borders, palette_of
from phaseid.image.labelling import Palette
from phaseid.image.labelpass import Evidence, label_image
from phaseid.image.leftovers import leftover_modes
from phaseid.image.modes import Mode, find_modes
from phaseid.image.noise import NoiseLaw, estimate_noise
from phaseid.image.notices import Finding
from phaseid.image.rare import DEFAULT_BLUR, RarePhase, Sorted, sort_specks
from phaseid.image.response import Response, response
from phaseid.image.rows import row_offsets
from phaseid.image.shading import Shading, surface_from_slopes
from phaseid.image.specks import STEP as SPECK_STEP
from phaseid.image.stabilise import NoiseAxis

# Pixels that decide on shading and on what no mode explains; the greys themselves come from all pixels.
SURVEY_PIXELS = 4_000_000
# Shading smaller than this share of the noise is left alone.
LEAST_SHADING = 0.15
# Loss of entropy that makes a shading believable.
LEAST_SHARPER = 0.02
MOST_LABELS = 60
# What is thin everywhere and covers less than this is lines and specks, not a phase with an inside.
MOST_THIN = 0.15
LEAST_LINES = 2e-4
# Pores are darker than the commonest phase by this share of all greys, and this many noises.
VOID_SHARE = 0.35
VOID_STEP = 3.0


@dataclass(frozen=True, eq=False)
class Found:
    """Labels of an image and what was learned on the way.

    Attributes
    ----------
    labels : ndarray of uint8, shape (rows, columns)
        Of the whole image, any numbers; 0 where left out.
    noise : NoiseLaw
    shading : Shading
    crop : (first row, end row, first column, end column)
    warnings : tuple of Finding
    blur_px : float
    specks : mapping from label to (grey, standard error)
        Greys of phases that occur only in specks, blur taken off.
    before : mapping from id to Cluster
        Clusters this was made from, where it was.
    automatic : bool
        Whether clusters may still be merged.
    muted : ndarray of bool or None
        Rows of the crop whose greys do not count.
    """

    labels: NDArray[np.uint8]
    noise: NoiseLaw
    shading: Shading
    crop: tuple[int, int, int, int]
    warnings: tuple[Finding, ...]
    blur_px: float
    specks: Mapping[int, tuple[float, float]] = field(default_factory=dict)
    before: Mapping[int, Cluster] = field(default_factory=dict)
    automatic: bool = False
    muted: NDArray[np.bool_] | None = None


def find_clusters(
    image: GreyImage,
    outside: NDArray[np.bool_] | None,
    progress: Callable[[float, str], None],
    random_state: int,
) -> Found:
    """Label an image.

    Parameters
    ----------
    image : GreyImage
    outside : ndarray of bool or None
        Pixels to leave out.
    progress : callable
    random_state : int

    Returns
    -------
    Found
    """
    first, end = used_rows(image.data, image.provenance.get("image_rows"))
    crop = (first, end, 0, image.data.shape[1])
    data = image.data[first:end]
    if image.unusable is not None:
        outside = image.unusable if outside is None else outside | image.unusable
    left_out = None if outside is None else outside[first:end]
    if left_out is not None and left_out.all():
        raise InputError("Nothing of the image is left; exclude less.")
    progress(0.0, "noise")
    noise = estimate_noise(data)
    warnings = assess(image, noise)
    answer = response(noise.row, noise.column, STEPS)
    axis = NoiseAxis(noise)
    canvas = Canvas(data, axis, Shading(data.shape), left_out)
    canvas, counts = _flattened(canvas, answer, warnings, progress)
    span = _span(canvas)
    if counts.pixels < canvas.data.size:
        counts = count_flat(
            canvas, answer, canvas.tiles(), span, lambda s: progress(0.15 + 0.2 * s, "greys")
        )
    modes = find_modes(counts, answer, noise.correlated_pixels, _quantum(canvas))
    if not modes:
        modes = [Mode(float(axis.forward(np.median(data))), 1.0, 1, 1.0)]
    palette = palette_of(modes, answer.level, float(np.sqrt(noise.correlated_pixels)))
    more = leftover_modes(canvas, palette, _survey(canvas.tiles()), span)
    modes = sorted([*modes, *more], key=lambda m: m.position)[:MOST_LABELS]
    progress(0.4, "labels")
    labels = np.zeros(image.shape, dtype=np.uint8)
    part = labels[first:end]
    modes, evidence, group = _labelled(canvas, answer, modes, part, warnings, progress)
    position = np.array([m.position for m in modes])
    palette = palette_of(modes, answer.level, float(np.sqrt(noise.correlated_pixels)))
    blur = border_width(evidence, palette)
    void = _void(evidence, palette, group)
    rare = sort_specks(
        evidence.specks,
        position,
        blur,
        float(answer.level[SPECK_STEP]),
        (span[0] + 3.0, span[1] - 3.0),
        void,
    )
    part[...] = _grouped(group)[part]
    specks = _stamp(part, rare, group, axis)
    _say_lines(rare, data.size, warnings)
    progress(0.85, "regions")
    return Found(
        labels,
        noise,
        canvas.shading,
        crop,
        tuple(warnings),
        blur or DEFAULT_BLUR,
        specks,
        automatic=True,
    )


def _span(canvas: Canvas) -> tuple[float, float]:
    low, high = canvas.axis.forward([canvas.data.min(), canvas.data.max()])
    return float(low) - 3.0, float(high) + 3.0


def _quantum(canvas: Canvas) -> Callable[[NDArray[np.float64]], NDArray[np.float64]] | None:
    """Distance between neighbouring greys, on the noise axis."""
    if canvas.data.dtype.kind != "u":
        return None
    step = grey_step(canvas.data)

    def at(position: NDArray[np.float64]) -> NDArray[np.float64]:
        return np.asarray(
            step / (canvas.axis.noise.sd(canvas.axis.back(position)) * canvas.axis.unit)
        )

    return at


def _survey(tiles: Sequence[Tile]) -> list[Tile]:
    pixels = [(t.rows.stop - t.rows.start) * (t.columns.stop - t.columns.start) for t in tiles]
    step = max(1, int(np.ceil(sum(pixels) / SURVEY_PIXELS)))
    # A step that shares no factor with the tiles of a row spreads over all columns.
    return list(tiles[::step]) or list(tiles)


def _flattened(
    canvas: Canvas,
    answer: Response,
    warnings: list[Finding],
    progress: Callable[[float, str], None],
) -> tuple[Canvas, FlatCounts]:
    """Take off shading, line noise and charging bands where that makes the greys sharper."""
    tiles = _survey(canvas.tiles())
    span = _span(canvas)

    def counted(shading: Shading, share: float) -> tuple[Canvas, FlatCounts]:
        trial = replace(canvas, shading=shading)
        step = 0.03
        return trial, count_flat(
            trial, answer, tiles, span, lambda s: progress(share + step * s, "shading")
        )

    best, counts = counted(canvas.shading, 0.02)
    middle = float(np.median(canvas.data[::7, ::7]))
    unit = float(canvas.axis.noise.sd(middle)) * canvas.axis.unit
    offsets = row_offsets(canvas)
    options = [
        ("line-noise", offsets.lines, offsets.line_sd),
        ("charging-bands", offsets.bands, offsets.largest_jump),
    ]
    for code, lines, amount in options:
        if lines is None:
            continue
        trial, found = counted(replace(canvas.shading, lines=lines), 0.05)
        if counts.bluntness() - found.bluntness() > LEAST_SHARPER:
            best, counts = trial, found
            warnings.append(finding_of(code, amount * unit))
            if code == "charging-bands":
                best = replace(best, muted=offsets.doubtful)
    surface = surface_from_slopes(counts.slopes, best.shading.shape)
    if surface is not None and surface.amplitude() >= LEAST_SHADING:
        trial, found = counted(replace(surface, lines=best.shading.lines), 0.11)
        trial = replace(trial, muted=best.muted)
        if counts.bluntness() - found.bluntness() > LEAST_SHARPER:
            best, counts = trial, found
            warnings.append(finding_of("shading", surface.amplitude() * unit))
    return best, counts


def _labelled(
    canvas: Canvas,
    answer: Response,
    modes: list[Mode],
    part: NDArray[np.uint8],
    warnings: list[Finding],
    progress: Callable[[float, str], None],
) -> tuple[list[Mode], Evidence, NDArray[np.intp]]:
    """Label with all modes; label once more without those that turn out to be none."""
    scale = float(np.sqrt(canvas.axis.noise.correlated_pixels))
    for round_ in (0, 1, 2):
        palette = palette_of(modes, answer.level, scale)
        start = 0.4 + 0.2 * min(round_, 1)
        evidence = label_image(
            canvas,
            answer,
            palette,
            part,
            progress=lambda s, start=start: progress(start + 0.2 * s, "labels"),  # type: ignore[misc]
        )
        verdict = judge_borders(evidence, palette)
        dropped = (verdict.group < 0) | _only_specks(evidence)
        if not dropped.any() or round_ == 2:
            break
        share = float(evidence.pixels[verdict.group < 0].sum() / max(evidence.pixels.sum(), 1))
        if share > 1e-5 and not any(w.code == "blends" for w in warnings):
            warnings.append(finding_of("blends", share))
        modes = [m for m, d in zip(modes, dropped, strict=True) if not d]
    return modes, evidence, np.where(verdict.group < 0, np.arange(len(modes)), verdict.group)


def _void(evidence: Evidence, palette: Palette, group: NDArray[np.intp]) -> int | None:
    """The darkest label, if it is far darker than the commonest one: most likely pores."""
    common = int(np.argmax(evidence.pixels))
    darkest = int(np.argmin(palette.position))
    if group[darkest] == group[common]:
        return None
    reach = float(palette.position[-1] - palette.position[darkest])
    away = float(palette.position[common] - palette.position[darkest])
    rough = (
        palette.variance[darkest] > 1.2 or evidence.pixels[darkest] < 0.25 * evidence.pixels.sum()
    )
    return darkest if rough and away > VOID_SHARE * reach and away > VOID_STEP else None


def _only_specks(evidence: Evidence) -> NDArray[np.bool_]:
    """Labels that occur in nothing but small regions; these are looked for as specks instead."""
    only = evidence.small > 0.9 * np.maximum(evidence.pixels, 1)
    only &= evidence.pixels < MOST_THIN * evidence.pixels.sum()
    if len(only):
        only[np.argmax(evidence.pixels)] = False
    return np.asarray(only)


def _grouped(group: NDArray[np.intp]) -> NDArray[np.uint8]:
    table = np.zeros(256, dtype=np.uint8)
    table[1 : len(group) + 1] = group + 1
    return table


def _stamp(
    part: NDArray[np.uint8], rare: Sorted, group: NDArray[np.intp], axis: NoiseAxis
) -> dict[int, tuple[float, float]]:
    """Write the specks into the label map, and take cracks and scratches out of it."""
    found: dict[int, tuple[float, float]] = {}
    label = len(group)
    for s in rare.lines:
        rows = slice(max(s.row, 0), s.row + s.mask.shape[0])
        columns = slice(max(s.column, 0), s.column + s.mask.shape[1])
        box = part[rows, columns]
        cut = s.mask[max(-s.row, 0) :, max(-s.column, 0) :][: box.shape[0], : box.shape[1]]
        box[cut] = 0
    for phase in rare.phases:
        if phase.label is not None:
            value = int(group[phase.label]) + 1
        else:
            label += 1
            value = label
            found[value] = _grey(phase, axis)
        for s in phase.specks:
            box = part[s.row : s.row + s.mask.shape[0], s.column : s.column + s.mask.shape[1]]
            box[s.mask & (box > 0)] = value
    return found


def _grey(phase: RarePhase, axis: NoiseAxis) -> tuple[float, float]:
    grey = float(axis.back(phase.position))
    upper = float(axis.back(phase.position + phase.position_se))
    return grey, max(upper - grey, 1e-9)


def _say_lines(rare: Sorted, pixels: int, warnings: list[Finding]) -> None:
    if rare.dark_line_pixels > LEAST_LINES * pixels:
        warnings.append(finding_of("cracks", rare.dark_line_pixels / pixels))
    if rare.bright_line_pixels > LEAST_LINES * pixels:
        warnings.append(finding_of("scratches", rare.bright_line_pixels / pixels))
    if rare.alone:
        warnings.append(finding_of("lone-specks", float(len(rare.alone))))
