"""The whole run file."""

from collections.abc import Iterable, Iterator

from pydantic import Field, PrivateAttr, model_validator

from tracer.engine.runspec.body import BodyTable
from tracer.engine.runspec.domain import DomainTable
from tracer.engine.runspec.ensemble import EnsembleTable
from tracer.engine.runspec.gas import GasTable, LossTable
from tracer.engine.runspec.grid import GridTable
from tracer.engine.runspec.image import ImageTable, product_name
from tracer.engine.runspec.order import is_below
from tracer.engine.runspec.release import ReleaseTable
from tracer.engine.runspec.spectral_line import SpectralLineTable
from tracer.engine.runspec.speed import MaxwellFlux, MaxwellGas
from tracer.engine.runspec.sticking import ExponentialSticking
from tracer.engine.runspec.sun import SunTable
from tracer.engine.runspec.sunless import dead_without_sun, unheated_without_sun
from tracer.engine.runspec.surface import SurfaceTable
from tracer.inputs.table import FileTable, conflict
from tracer.inputs.text import Line

_COMPANIONS = ("", "_standard_error", "_replicates")
"""Endings of the variables that the product keeps for each image."""


class RunSpec(FileTable):
    """A run file as the user wrote it, checked, with the defaults filled in.

    Values keep their units. Two are equal where all keys are, wherever their files lie.
    """

    title: Line = Field(description="Title of the run, carried into the product.")
    body: BodyTable = Field(description="What holds the gas.")
    sun: SunTable | None = Field(None, description="Light and tide.")
    gas: GasTable = Field(description="The gas that is traced.")
    release: tuple[ReleaseTable, ...] = Field(description="Sources, one or more.")
    surface: SurfaceTable = Field(SurfaceTable(), description="What a landing atom meets.")
    domain: DomainTable = Field(DomainTable(), description="Where and when a particle's life is cut.")
    grid: GridTable = Field(GridTable(), description="Cells of the density grid.")
    image: tuple[ImageTable, ...] = Field((), description="Column-density images, any number.")
    ensemble: EnsembleTable = Field(EnsembleTable(), description="Number of particles, batches and seed.")

    _file: str = PrivateAttr(default="run file")

    def __eq__(self, other: object) -> bool:
        """Whether all keys are equal; file and folder are no keys."""
        return isinstance(other, RunSpec) and dict(self) == dict(other)

    def __hash__(self) -> int:
        """Hash of the keys."""
        return hash(tuple(value for _, value in self))

    @model_validator(mode="after")
    def _agrees_with_itself(self) -> "RunSpec":
        if not self.release:
            raise conflict("release", "missing; must be at least one table, headed [[release]]")
        for problem in (
            *_repeated_names("release", self.release),
            *_repeated_names("gas.line", self.gas.line),
            *_repeated_names("gas.loss", self.gas.loss),
            *_colliding_images(self),
            *_missing_temperature(self),
            *_buried_outer_radius(self),
            *(_without_sun(self) if self.sun is None else ()),
        ):
            raise problem
        return self


def _repeated_names(
    path: str, entries: Iterable[ReleaseTable | SpectralLineTable | LossTable]
) -> Iterator[Exception]:
    known: dict[str, int] = {}
    for number, entry in enumerate(entries, 1):
        if (first := known.setdefault(entry.name, number)) != number:
            yield conflict(f"{path}[{number}].name", f'"{entry.name}" is already the name of {path}[{first}]')


def _colliding_images(spec: RunSpec) -> Iterator[Exception]:
    kept: dict[str, int] = {}
    for number, image in enumerate(spec.image, 1):
        names = [product_name(image.name) + ending for ending in _COMPANIONS]
        if (first := next((kept[name] for name in names if name in kept), number)) != number:
            yield conflict(
                f"image[{number}].name",
                f'"{image.name}" becomes {names[0]} in the product, which collides with image[{first}]',
            )
        kept.update(dict.fromkeys(names, number))


def _without_sun(spec: RunSpec) -> Iterator[Exception]:
    yield from dead_without_sun(spec.gas)
    yield from unheated_without_sun(spec.surface)


def _missing_temperature(spec: RunSpec) -> Iterator[Exception]:
    if spec.surface.temperature is not None:
        return
    example = 'write for example { law = "uniform", value = "250 K" }'
    for number, release in enumerate(spec.release, 1):
        if isinstance(release.speed, MaxwellFlux | MaxwellGas) and release.speed.temperature == "surface":
            yield conflict("surface.temperature", f"missing; release[{number}].speed takes it; {example}")
    if spec.surface.adsorbed == "desorbed":
        yield conflict("surface.temperature", f"missing; adsorbed atoms leave again by its heat; {example}")
    sticking = spec.surface.sticking
    lands = spec.body.gm is None or spec.body.gm.value > 0.0
    if isinstance(sticking, ExponentialSticking):
        yield conflict(
            "surface.temperature", f'missing; surface.sticking "{sticking.law}" takes it; {example}'
        )
    elif lands and sticking < 1.0 and spec.surface.accommodation > 0.0:
        yield conflict("surface.temperature", f"missing; atoms bounce where sticking is below 1; {example}")


def _buried_outer_radius(spec: RunSpec) -> Iterator[Exception]:
    radius, outer = spec.body.radius, spec.domain.outer_radius
    if radius is not None and outer is not None and not is_below(radius, outer):
        yield conflict("domain.outer_radius", f'"{outer}" is not above the ground; body.radius is "{radius}"')
