"""Reading: formats, pages, arrays, and every bad file in one sentence."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import tifffile
import xarray
from PIL import Image

from phaseid.errors import InputError
from phaseid.image.reading import from_array, read_image

RNG = np.random.default_rng(1)
GREY8 = RNG.integers(10, 240, (40, 50), dtype=np.uint8)
GREY16 = RNG.integers(100, 60000, (40, 50), dtype=np.uint16)


def one_sentence(error: pytest.ExceptionInfo[InputError]) -> str:
    text = str(error.value)
    assert "\n" not in text
    assert text.endswith(".")
    return text


@pytest.mark.parametrize("data", [GREY8, GREY16, GREY16.astype(np.float32) / 7])
def test_tiff_keeps_greys(tmp_path: Path, data: np.ndarray) -> None:
    path = tmp_path / "a.tif"
    tifffile.imwrite(path, data)
    image = read_image(path)
    np.testing.assert_array_equal(image.data, data)
    assert image.data.dtype == data.dtype
    assert image.bits == 8 * data.dtype.itemsize
    assert len(image.sha256) == 64


@pytest.mark.parametrize(
    "options", [{"tile": (16, 16)}, {"compression": "zlib"}, {"compression": "lzw"}]
)
def test_tiled_and_compressed_tiff(tmp_path: Path, options: dict[str, object]) -> None:
    path = tmp_path / "a.tif"
    tifffile.imwrite(path, GREY16, **options)
    np.testing.assert_array_equal(read_image(path).data, GREY16)


def test_white_is_zero_is_turned_round(tmp_path: Path) -> None:
    path = tmp_path / "a.tif"
    tifffile.imwrite(path, GREY8, photometric="miniswhite")
    np.testing.assert_array_equal(read_image(path).data, 255 - GREY8)


def test_png_of_8_and_16_bits(tmp_path: Path) -> None:
    for data in (GREY8, GREY16):
        path = tmp_path / f"{data.dtype}.png"
        Image.fromarray(data).save(path)
        np.testing.assert_array_equal(read_image(path).data, data)


def test_grey_palette_carries_the_grey_in_the_index(tmp_path: Path) -> None:
    path = tmp_path / "a.tif"
    ramp = np.arange(256, dtype=np.uint16) * 257
    tifffile.imwrite(path, GREY8, photometric="palette", colormap=np.stack([ramp] * 3))
    np.testing.assert_array_equal(read_image(path).data, GREY8)


def test_false_colours_carry_the_grey_in_the_index(tmp_path: Path) -> None:
    path = tmp_path / "a.png"
    picture = Image.fromarray(GREY8, mode=None)
    picture = picture.convert("P")
    picture.putdata(list(GREY8.ravel()))
    ramp = [v for k in range(256) for v in (k, 255 - k, (k // 2) % 256)]
    picture.putpalette(ramp)
    picture.save(path)
    image = read_image(path)
    np.testing.assert_array_equal(image.data, GREY8)
    assert "false-colour" in {f.code for f in image.flags}


def test_equal_channels_are_grey(tmp_path: Path) -> None:
    path = tmp_path / "a.png"
    Image.fromarray(np.stack([GREY8] * 3, axis=-1)).save(path)
    np.testing.assert_array_equal(read_image(path).data, GREY8)


def test_annotations_in_colour_are_left_out(tmp_path: Path) -> None:
    colour = np.stack([GREY8] * 3, axis=-1)
    colour[5:7, 10:20] = (255, 0, 0)
    path = tmp_path / "a.png"
    Image.fromarray(colour).save(path)
    image = read_image(path)
    assert image.unusable is not None
    assert image.unusable[5:7, 10:20].all()
    assert image.unusable.mean() < 0.1
    assert "annotated" in {f.code for f in image.flags}


def test_largest_page_is_chosen_and_said(tmp_path: Path) -> None:
    path = tmp_path / "a.tif"
    with tifffile.TiffWriter(path) as file:
        file.write(GREY8[::4, ::4])
        file.write(GREY8)
    image = read_image(path)
    assert (image.page, image.pages) == (1, 2)
    np.testing.assert_array_equal(image.data, GREY8)
    assert "several-pages" in {f.code for f in image.flags}
    np.testing.assert_array_equal(read_image(path, page=0).data, GREY8[::4, ::4])


def test_missing_page(tmp_path: Path) -> None:
    path = tmp_path / "a.tif"
    tifffile.imwrite(path, GREY8)
    with pytest.raises(InputError, match="page 3 does not exist") as error:
        read_image(path, page=3)
    one_sentence(error)


def bad_files(folder: Path) -> dict[str, Path]:
    """One file for everything that can be wrong."""
    whole = folder / "whole.tif"
    tifffile.imwrite(whole, GREY8)
    content = whole.read_bytes()
    files = {
        "cut short": content[: len(content) // 2],
        "cut-off": content[:9],
        "not an image": b"hello, this is text\n" * 40,
        "empty": b"",
    }
    paths = {}
    for n, (words, data) in enumerate(files.items()):
        paths[words] = folder / f"{n}.tif"
        paths[words].write_bytes(data)
    png = folder / "png.png"
    Image.fromarray(GREY8).save(png)
    cut = folder / "cut.png"
    cut.write_bytes(png.read_bytes()[:300])
    paths["damaged or cut short"] = cut
    colour = folder / "colour.png"
    Image.fromarray(RNG.integers(0, 255, (40, 50, 3), dtype=np.uint8)).save(colour)
    paths["colour image"] = colour
    black = folder / "black.png"
    Image.fromarray(np.zeros((40, 50), np.uint8)).save(black)
    paths["nothing to tell apart"] = black
    tiny = folder / "tiny.tif"
    tifffile.imwrite(tiny, np.zeros((1, 1), np.uint8))
    paths["1 x 1 pixels"] = tiny
    nan = folder / "nan.tif"
    values = GREY8.astype(np.float32)
    values[3, 4] = np.nan
    tifffile.imwrite(nan, values)
    paths["not finite"] = nan
    paths["is a folder"] = folder
    paths["does not exist"] = folder / "nowhere.tif"
    return paths


def test_every_bad_file_is_one_sentence(tmp_path: Path) -> None:
    for words, path in bad_files(tmp_path).items():
        with pytest.raises(InputError, match=words) as error:
            read_image(path)
        assert path.name in one_sentence(error)


def test_arrays_and_objects_like_them() -> None:
    image = from_array(GREY8, energy_keV=15, pixel_size_nm=120.0)
    assert image.energy_keV == 15
    assert image.data is not GREY8
    labelled = xarray.DataArray(
        GREY16, dims=("y", "x"), attrs={"energy_keV": 20.0, "detector": "BSE"}
    )
    image = from_array(labelled)
    assert (image.energy_keV, image.detector, image.bits) == (20.0, "BSE", 16)
    np.testing.assert_array_equal(image.data, GREY16)
    assert from_array(GREY8.astype(np.int64)).data.dtype == np.uint16


@pytest.mark.parametrize(
    "data", [np.zeros((5, 4, 3, 2)), "text", np.zeros((20, 20), bool), np.full((20, 20), np.inf)]
)
def test_bad_arrays(data: object) -> None:
    with pytest.raises(InputError) as error:
        from_array(data)
    one_sentence(error)
