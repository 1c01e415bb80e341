"""The user's edits, as the image package understands them."""

from __future__ import annotations

from collections.abc import Callable, Sequence

from phaseid.errors import InputError
from phaseid.image.areas import Area, MaskFile, Polygon, Rectangle
from phaseid.image.clustering import Clustering, cluster_image
from phaseid.image.reading import GreyImage
from phaseid.session.state import Edit

Progress = Callable[[float, str], None]


def cluster(image: GreyImage, edits: Sequence[Edit], progress: Progress | None) -> Clustering:
    """Cluster an image with the forced number and the excluded areas among the edits.

    Raises
    ------
    InputError
        If an area does not fit the image.
    """
    counts = [e.numbers[0] for e in edits if e.kind == "count"]
    areas = [_area(e) for e in edits if e.kind != "count"]
    number = int(counts[-1]) if counts else None
    return cluster_image(image, n_clusters=number, exclude=areas, progress=progress)


def shape(clustering: Clustering, edit: Edit) -> Clustering:
    """Merge, split or move a boundary; clusters are named by grey.

    Raises
    ------
    InputError
        If the edit does not fit the clusters.
    """
    numbers = edit.numbers
    if edit.kind == "merge":
        return clustering.merge([clustering.nearest(g).id for g in numbers])
    if edit.kind == "split":
        return clustering.split(clustering.nearest(numbers[0]).id, int(numbers[1]))
    first, second, grey = numbers
    return clustering.move_boundary(
        clustering.nearest(first).id, clustering.nearest(second).id, grey
    )


def _area(edit: Edit) -> Area:
    numbers = edit.numbers
    if edit.kind == "rectangle":
        row, column, height, width = (int(n) for n in numbers)
        return Rectangle(row, column, height, width)
    if edit.kind == "polygon":
        if len(numbers) % 2:
            raise InputError("A polygon needs a row and a column for each point; one is missing.")
        return Polygon(tuple(zip(numbers[::2], numbers[1::2], strict=True)))
    return MaskFile(edit.path)
