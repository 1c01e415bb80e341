"""phaseid quadrants RIGHT UP LEFT DOWN --out DIR"""

from __future__ import annotations

from pathlib import Path

import click


@click.command(
    name="quadrants", help="Combine the four images of a divided detector: sum, slopes, mask."
)
@click.argument("images", nargs=4, metavar="RIGHT UP LEFT DOWN")
@click.option(
    "--out",
    type=click.Path(path_type=Path),
    required=True,
    metavar="DIR",
    help="Where sum.tif, mask.tif and slope.tif go.",
)
@click.option(
    "--dark", type=float, default=0.0, show_default=True, metavar="GREY", help="Grey with no beam."
)
def command(images: tuple[str, ...], out: Path, dark: float) -> int:
    from phaseid.image.quadrants import combine
    from phaseid.image.reading import read_image
    from phaseid.report.labels import grey_tiff

    found = combine([read_image(path) for path in images], dark=dark)
    from phaseid.files import write_bytes

    size = found.composition.pixel_size_nm
    for name, data in (
        ("sum.tif", found.composition.data),
        ("slope.tif", found.slope_deg),
        ("mask.tif", found.sloped.astype("uint8") * 255),
    ):
        write_bytes(out / name, grey_tiff(data, size))
        click.echo(f"wrote {out / name}", err=True)
    for finding in found.composition.flags:
        click.echo(f"{finding.message} {finding.remedy}")
    click.echo(
        f"Go on with: phaseid candidates {out / 'sum.tif'} --exclude {out / 'mask.tif'} --energy KEV"
    )
    return 0
