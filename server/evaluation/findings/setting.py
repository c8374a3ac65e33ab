"""What the findings of one evaluation look at."""

from dataclasses import dataclass

from server.evaluation.bench_record import BenchRecord
from server.evaluation.circumstances import Circumstances, Limits
from server.evaluation.methods.standardization_v1 import Evaluation, ReplicateValue
from server.evaluation.replicate_reading import Replicate
from server.evaluation.taken_curve import TakenCurve


@dataclass(frozen=True, slots=True)
class Setting:
    """A record, its evaluation, and what is known around it."""

    record: BenchRecord
    evaluation: Evaluation
    circumstances: Circumstances
    components: dict[str, float]
    with_all: Evaluation | None
    curves: tuple[TakenCurve, ...] = ()

    @property
    def limits(self) -> Limits:
        """The limits that findings are judged by."""
        return self.circumstances.limits

    @property
    def counting(self) -> list[tuple[Replicate, ReplicateValue]]:
        """The replicates that count, as read and as evaluated."""
        pairs = zip(self.record.replicates, self.evaluation.replicates, strict=True)
        return [(read, value) for read, value in pairs if read.excluded is None]

    @property
    def counting_curves(self) -> list[TakenCurve]:
        """The curves of the replicates that count."""
        listed = self.record.replicates
        return [one for one in self.curves if listed[one.index].excluded is None]

    @property
    def values(self) -> list[float]:
        """The values of the replicates that count, mol/L."""
        return [value.value for _, value in self.counting if value.value is not None]
