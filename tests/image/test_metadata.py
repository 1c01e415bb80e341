"""What instruments write beside the pixels, in invented files of each dialect."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import tifffile

from phaseid.image.metadata import is_secondary, read_conditions
from phaseid.image.reading import read_image

SHAPE = (100, 200)
DATA = np.random.default_rng(0).integers(1, 250, SHAPE, dtype=np.uint8)


def conditions(metadata: dict[str, object], shape: tuple[int, int] = SHAPE):  # type: ignore[no-untyped-def]
    return read_conditions(metadata, shape, Path("nowhere/a.tif"))


def test_si_units_without_labels() -> None:
    found = conditions(
        {
            "fei_metadata": {
                "Beam": {"HV": 15000},
                "EScan": {"PixelWidth": 2e-7},
                "Detectors": {"Name": "CBS"},
                "CBS": {"Signal": "BSE"},
                "Stage": {"StageT": 0.5235988},
                "Image": {"DigitalGamma": 1, "ResolutionY": 90},
            }
        }
    )
    assert found.energy_keV == 15.0
    assert found.pixel_size_nm == pytest.approx(200.0)
    assert found.detector == "CBS (BSE)"
    assert found.tilt_deg == pytest.approx(30.0, abs=1e-3)
    assert found.provenance["image_rows"] == 90
    assert not found.flags


def test_labelled_values_with_units() -> None:
    found = conditions(
        {
            "sem_metadata": {
                "ap_actualkv": ("EHT", 20.0, "kV"),
                "ap_image_pixel_size": ("Image Pixel Size", 55.8, "nm"),
                "dp_detector_channel": ("Signal A", "AsB"),
                "ap_stage_at_t": ("Stage at T", 0.0, "°"),
            }
        }
    )
    assert found.energy_keV == 20.0
    assert found.pixel_size_nm == pytest.approx(55.8)
    assert found.detector == "AsB"
    assert found.tilt_deg == 0.0


def test_sections_of_key_and_value() -> None:
    text = "[MAIN]\r\nMagnification=1000\r\nPixelSizeX=1.25e-7\r\n[SEM]\r\nHV=10000\r\nDetector=BSE\r\nGamma=1.4\r\n"
    found = conditions({"tags": {"50431": text}})
    assert (found.energy_keV, found.detector) == (10.0, "BSE")
    assert found.pixel_size_nm == pytest.approx(125.0)
    assert [f.code for f in found.flags] == ["gamma"]
    assert found.flags[0].severity == "serious"


def test_text_file_beside_the_image(tmp_path: Path) -> None:
    path = tmp_path / "a.tif"
    tifffile.imwrite(path, DATA)
    (tmp_path / "a.txt").write_text("$CM_ACCEL_VOLT 12.00\n$CM_SIGNAL SEI\n$CM_PIXEL_SIZE 40 nm\n")
    image = read_image(path)
    assert image.energy_keV == 12.0
    assert image.detector == "SEI"


def test_xml_without_a_parser() -> None:
    text = (
        '<Divider><pixelWidth unit="nm">65.1</pixelWidth>'
        "<acceleratingVoltage>15000</acceleratingVoltage></Divider>"
    )
    found = conditions({"tags": {"ImageDescription": text}})
    assert found.pixel_size_nm == pytest.approx(65.1)
    assert found.energy_keV == 15.0


def test_two_pixel_sizes_are_said() -> None:
    found = conditions(
        {"a": {"ImagePixelSize": "100 nm", "PixelSize": "200 nm", "HFW": 200 * 200e-9}}
    )
    # The field of view agrees with one of them: that one is right.
    assert found.pixel_size_nm == pytest.approx(200.0)
    assert [f.code for f in found.flags] == ["pixel-sizes-differ"]


def test_printing_resolution_is_no_pixel_size(tmp_path: Path) -> None:
    path = tmp_path / "a.tif"
    tifffile.imwrite(path, DATA, resolution=(72, 72), resolutionunit="INCH")
    assert read_image(path).pixel_size_nm is None


def test_nothing_known_is_none() -> None:
    found = conditions({"tags": {"Software": "something"}})
    assert (found.energy_keV, found.pixel_size_nm, found.detector, found.tilt_deg) == (None,) * 4


@pytest.mark.parametrize(
    ("name", "secondary"),
    [
        ("ETD", True),
        ("SE2", True),
        ("InLens", True),
        ("CBS (BSE)", False),
        ("SE+BSE", False),
        ("BSED", False),
        (None, False),
    ],
)
def test_secondary_detectors(name: str | None, secondary: bool) -> None:
    assert is_secondary(name) is secondary
