"""The label map as a TIFF that other programs read."""

from __future__ import annotations

import io
import json
from typing import Any

from numpy.typing import NDArray

from phaseid.image.clustering import Clustering


def label_tiff(clustering: Clustering, pixel_size_nm: float | None) -> bytes:
    """Encode the label map.

    Parameters
    ----------
    clustering : Clustering
    pixel_size_nm : float or None

    Returns
    -------
    bytes
        A deflate-compressed TIFF of the image's size; 0 where no cluster is assigned, else the
        cluster's id. The description holds the clusters' mean greys as JSON.
    """
    description = json.dumps(
        {
            "schema": "phaseid-labels/1",
            "clusters": {str(c.id): round(float(c.grey_mean), 4) for c in clustering.clusters},
        }
    )
    return grey_tiff(clustering.labels, pixel_size_nm, description)


def grey_tiff(data: NDArray[Any], pixel_size_nm: float | None, description: str = "") -> bytes:
    """Encode an image as a deflate-compressed TIFF with its pixel size.

    Parameters
    ----------
    data : ndarray of shape (rows, columns)
    pixel_size_nm : float or None
    description : str

    Returns
    -------
    bytes
    """
    import tifffile

    options: dict[str, Any] = {}
    if pixel_size_nm:
        # Pixels per centimetre, the usual unit of the resolution tags.
        per_centimetre = 1e7 / pixel_size_nm
        options = {"resolution": (per_centimetre, per_centimetre), "resolutionunit": "CENTIMETER"}
    stream = io.BytesIO()
    tifffile.imwrite(
        stream,
        data,
        compression="zlib",
        description=description,
        metadata=None,
        software="phaseid",
        **options,
    )
    return stream.getvalue()
