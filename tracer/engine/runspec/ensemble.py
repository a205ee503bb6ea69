"""[ensemble]: how many particles, in which portions."""

from typing import Literal

from pydantic import Field

from tracer.engine.runspec.stop import StopTable
from tracer.inputs.number import Count, CountOrNone, SeveralOf, SpeedBins
from tracer.inputs.table import Table


class EnsembleTable(Table):
    """Number of particles and the seed of their random numbers."""

    particles_per_batch: Count = Field(20_000, description="Particles per batch and release.")
    batches: SeveralOf = Field(
        20, description="Batches, the unit of work and of error bars; 100 for the best error bars."
    )
    seed: CountOrNone = Field(20310601, description="Seed of the random numbers.")
    replicates: CountOrNone = Field(
        20,
        description="Groups of batches kept for the errors of sums; 0 switches them off, more than `batches` "
        "count as `batches`.",
    )
    emphasis: Literal["even", "far"] = Field(
        "even",
        description='`"even"` samples launches as often as they happen; `"far"` gives half of them to those, however '
        "rare, that reach far from the ground or escape, with less weight each: densities high up, tails and escape "
        "get smaller errors, what is near the ground errors larger by up to 1.4. Bounces are not biased.",
    )
    speed_bins: SpeedBins = Field(
        0,
        description="Bins of launch speed, one edge at the escape speed, by which the responses of images and vertical "
        "columns are kept: what an atom launched in a bin contributes. Any law of speed can then be evaluated without "
        "tracing again. It takes as many launches again, and for each bin two numbers a pixel; 32 serve most laws, 0 "
        "keeps none.",
    )
    stop: StopTable | None = Field(None, description="Run until good enough, instead of `batches`.")

    @property
    def most_batches(self) -> int:
        """Batches that the run has at the most."""
        return self.batches if self.stop is None else self.stop.at_most_batches
