"""A small review for the pack's tests: a few frames of the sample's flood under a title that tries to be a script."""

from __future__ import annotations

import shutil
from pathlib import Path

import xarray as xr

from dashboard.choices import Choices
from dashboard.stops import keep
from hydro.queries import ask
from hydro.review import SAMPLE, Review, new_review

TITLE = "Two piers <script>window.harmed = 1</script>"
RUN = '<img src=x onerror="window.harmed = 2">'
QUERY = "Was the bay surveyed? </script><script>window.harmed = 3</script>"
PERSON = "P. Personsson"
FRAMES = slice(20, 29)


def small_review(folder: Path) -> Review:
    """Nine frames of the sample's flood, 10 s apart, with a query, a reviewer and two saved views."""
    review = new_review(folder, TITLE)
    shutil.copy(SAMPLE / "lines.gpkg", folder / "lines.gpkg")
    with xr.open_dataset(SAMPLE / "results" / "existing_flood.nc", engine="h5netcdf", decode_cf=False) as whole:
        whole.isel(time=FRAMES).to_netcdf(folder / "secret-folder-name.nc", engine="h5netcdf")

    def fill(document) -> None:
        document["reviewer"] = {"name": PERSON, "role": "engineer", "organisation": "Examplesson (invented)"}
        document["runs"] = [{"id": "flood", "name": RUN, "design": "existing", "file": "secret-folder-name.nc"}]

    review = review.edit(fill, who=PERSON, what="filled it")
    at = review.open("flood").mesh.to_world([[400.0, 300.0]])[0]
    ask(folder, QUERY, who=PERSON, run="flood", x=float(at[0]), y=float(at[1]), seconds=30.0)
    review = keep(review, Choices(run="flood", seconds=0.0), "The river before it rises.", who=PERSON)
    return keep(review, Choices(run="flood", seconds=60.0, view=(float(at[0]), float(at[1]), 300.0)), "A minute later.", who=PERSON)
