"""The candidates document: what programs read. Its schema is versioned and documented here.

Schema `phaseid-candidates/1`; one document per image. Fields are only ever added within a version.
"""

from __future__ import annotations

import json
import math
from collections.abc import Sequence
from typing import Any

from phaseid.image.reading import GreyImage
from phaseid.physics.conditions import Conditions
from phaseid.session.answers import Analysis, Candidate, ClusterAnswer, Notice

SCHEMA = "phaseid-candidates/1"


def document(
    analysis: Analysis, index: int, image: GreyImage, notices: Sequence[Notice], top: int
) -> dict[str, Any]:
    """Build the candidates document of one image.

    Parameters
    ----------
    analysis : Analysis
    index : int
        Which of the session's images.
    image : GreyImage
    notices : sequence of Notice
        Warnings of the image; those of the analysis are added.
    top : int
        Candidates listed per cluster; listed and accepted phases are added.

    Returns
    -------
    dict
        Plain data, ready for JSON: no NaN, no numpy types.
    """
    clusters = analysis.of_image(index)
    scale = analysis.scale
    row = analysis.images.index(index)
    first: dict[int | None, int] = {
        c.observation: c.id for c in reversed(clusters) if c.observation is not None
    }
    return {
        "schema": SCHEMA,
        "image": {
            "path": str(image.path),
            "sha256": image.sha256,
            "shape": [int(n) for n in image.data.shape],
            "bits": image.bits,
            "pixel_size_nm": number(image.pixel_size_nm),
        },
        "conditions": conditions_data(analysis.conditions),
        "context": list(analysis.contexts),
        "warnings": [
            {"code": n.code, "message": n.message, "remedy": n.remedy}
            for n in [*notices, *analysis.notices]
        ],
        "scale": None
        if scale is None
        else {
            "offset": number(scale.offset * analysis.drift[row, 0] + analysis.drift[row, 1]),
            "gain": number(scale.gain * analysis.drift[row, 0]),
            "offset_se": number(scale.offset_se),
            "gain_se": number(scale.gain_se),
            "references": list(scale.references),
        },
        "clusters": [_cluster(c, top) for c in clusters],
        "advice": [
            {
                "cluster": first[analysis.clusters[m.cluster].observation],
                "measure": m.text,
                "expected_bits": number(m.bits),
                "kind": m.kind,
                "cost": number(m.cost),
            }
            for m in analysis.advice
            if analysis.clusters[m.cluster].observation in first
        ],
    }


def conditions_data(conditions: Conditions) -> dict[str, Any]:
    """Plain data of the conditions."""
    coat, detector = conditions.coat, conditions.detector
    return {
        "energy_keV": number(conditions.energy_keV),
        "tilt_deg": number(conditions.tilt_deg),
        "coat": None
        if coat is None
        else {"material": coat.material, "thickness_nm": number(coat.thickness_nm)},
        "detector": {"kind": detector.kind, "threshold_keV": number(detector.lowest_energy_keV)},
        "model": getattr(conditions.model, "name", conditions.model),
        "rule": getattr(conditions.rule, "name", conditions.rule),
    }


def _cluster(cluster: ClusterAnswer, top: int) -> dict[str, Any]:
    shown = [c for n, c in enumerate(cluster.candidates) if n < top or c.listed]
    return {
        "id": cluster.id,
        "name": cluster.name or None,
        "grey_mean": number(cluster.grey_mean),
        "grey_se": number(cluster.grey_se),
        "grey_sd": number(cluster.grey_sd),
        "clipped": cluster.clipped,
        "area_fraction": number(cluster.area_fraction),
        "pixels": int(cluster.pixels),
        "regions": int(cluster.regions),
        "left_out": cluster.observation is None,
        "known": cluster.known,
        "accepted": cluster.accepted,
        "seen": list(cluster.seen),
        "unseen": list(cluster.unseen),
        "remarks": list(cluster.remarks),
        "resolution": number(cluster.resolution),
        "none_of_these": number(cluster.none_of_these),
        "candidates": [_candidate(c) for c in shown],
    }


def _candidate(candidate: Candidate) -> dict[str, Any]:
    return {
        "phase": candidate.name,
        "formula": candidate.formula,
        "database": candidate.database,
        "mean_atomic_number": number(candidate.mean_atomic_number),
        "eta": number(candidate.eta),
        "predicted_grey": number(candidate.predicted_grey),
        "predicted_grey_sd": number(candidate.predicted_grey_sd),
        "probability": number(candidate.probability),
        "group": candidate.group,
        "hazard": candidate.hazard,
        "note": candidate.note,
    }


def number(value: float | None) -> float | None:
    """A plain float, or None where there is none: JSON knows neither NaN nor numpy."""
    if value is None or not math.isfinite(value):
        return None
    return float(f"{float(value):.8g}")


def to_text(documents: Sequence[dict[str, Any]]) -> str:
    """JSON text: one image indented, several one document a line."""
    if len(documents) == 1:
        return json.dumps(documents[0], indent=2, ensure_ascii=False, allow_nan=False) + "\n"
    return "".join(json.dumps(d, ensure_ascii=False, allow_nan=False) + "\n" for d in documents)
