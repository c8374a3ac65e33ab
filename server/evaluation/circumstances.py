"""What a bench record does not hold but its findings need: limits, dates, history, end point."""

import dataclasses
from collections.abc import Mapping
from dataclasses import dataclass, field, fields
from types import MappingProxyType
from typing import Any

LIMIT_BASES: Mapping[str, str] = MappingProxyType(
    {
        "replicates_least": "common practice: at least 3, 6 advised",
        "replicates_advised": "common practice: at least 3, 6 advised",
        "spread_percent": "Ph. Eur. 4.2.2: relative standard deviation at most 0.2 %",
        "nominal_percent": "within 10 % of the nominal concentration (common pharmacopoeial limit)",
        "burette_least_percent": "USP <31>: at least 30 % of the burette's capacity",
        "burette_most_percent": "common practice: at most 90 % of the capacity, no reading at the "
        "end of the scale",
        "resolution_multiple": "common practice: 1000 times the resolution, so four figures",
        "range_one_percent": "GB/T 601: relative range of one person's four at most 0.15 %",
        "range_two_percent": "GB/T 601: relative range of two persons' eight at most 0.18 %",
        "slope_least_percent": "common practice: probe slope 95 to 102 % of the Nernst slope",
        "slope_most_percent": "common practice: probe slope 95 to 102 % of the Nernst slope",
        "offset_most_mV": "common practice: probe offset at most 30 mV",
        "method_margin_percent": "common practice: a titrant's concentration is wanted to 0.1 %",
    }
)


@dataclass(frozen=True, slots=True)
class Limits:
    """The limits that findings are judged by; each has a default and a stated basis.

    ``bases`` holds the laboratory's own words for limits that it set itself, by field name.
    """

    replicates_least: int = 3
    replicates_advised: int = 6
    spread_percent: float = 0.2
    nominal_percent: float = 10.0
    burette_least_percent: float = 30.0
    burette_most_percent: float = 90.0
    resolution_multiple: float = 1000.0
    range_one_percent: float = 0.15
    range_two_percent: float = 0.18
    slope_least_percent: float = 95.0
    slope_most_percent: float = 102.0
    offset_most_mV: float = 30.0
    method_margin_percent: float = 0.1
    bases: Mapping[str, str] = field(default_factory=dict)

    def basis(self, name: str) -> str:
        """Return the words on which a limit rests: the laboratory's own where it has any."""
        if name in self.bases:
            return self.bases[name]
        default = next(one.default for one in fields(self) if one.name == name)
        return LIMIT_BASES[name] if getattr(self, name) == default else "set by the laboratory"


@dataclass(frozen=True, slots=True)
class EndPoint:
    """How the recipe sees the end point, how it was seen, and how the titrant's use sees it.

    ``mode`` is ``visual`` or ``potentiometric``; ``used_with`` the end point in the titrant's use.
    """

    mode: str
    indicator_expected: str | None = None
    indicator_used: str | None = None
    used_with: str | None = None


@dataclass(frozen=True, slots=True)
class Resolution:
    """Smallest steps and decimals of balance and burette, as their registration states them."""

    balance_g: float | None = None
    balance_decimals: int | None = None
    burette_mL: float | None = None
    burette_decimals: int | None = None


@dataclass(frozen=True, slots=True)
class SampleMass:
    """Smallest masses: of the standard lot's certificate and of the balance."""

    lot_minimum_g: float | None = None
    balance_minimum_g: float | None = None


@dataclass(frozen=True, slots=True)
class InDate:
    """Whether one thing was in date when it was used; dates as ISO text, override as its reason."""

    what: str
    due: str | None
    used: str
    in_date: bool
    override: str | None = None


@dataclass(frozen=True, slots=True)
class Drying:
    """Drying as the lot's certificate asks for it, and as it was recorded (None: not recorded).

    ``verdict`` and ``says`` are there where the log was judged by what the certificate asks for.
    """

    required: str
    recorded: str | None = None
    verdict: str | None = None
    says: str = ""


@dataclass(frozen=True, slots=True)
class LastCertificate:
    """The lot's earlier value (mol/L) with its components by root (signed, relative)."""

    number: str
    value: float
    u: float
    components: Mapping[str, float] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class Pooled:
    """Repeatability of one replicate from history or validation: relative s, its dof (None: ∞)."""

    relative_s: float
    dof: float | None = None
    source: str = "pooled history"


@dataclass(frozen=True, slots=True)
class BetweenDays:
    """Day-to-day spread from history: relative s, its dof, and the days this mean covers."""

    relative_s: float
    dof: float | None = None
    days: int = 1
    source: str = "pooled history"


@dataclass(frozen=True, slots=True)
class Probe:
    """The probe's last calibration: slope in percent of Nernst, offset in mV."""

    slope_percent: float
    offset_mV: float
    source: str = "buffer calibration"


@dataclass(frozen=True, slots=True)
class Interim:
    """The last check of an instrument between two calibrations, and the day it was used.

    ``name`` is the finding's (check weighing, buffer check); days as ISO text; ``on`` and
    ``verdict`` are None where there was no check before the use.
    """

    name: str
    thing: str
    used: str
    on: str | None = None
    verdict: str | None = None
    says: str = ""
    basis: str = ""


@dataclass(frozen=True, slots=True)
class Circumstances:
    """Everything around a record that its findings need; what is not known stays out.

    ``own_where_larger`` makes the run's own spread count where s² > F(0.95)·s_p² of the record's
    stated repeatability; without it the record's statement is used as it stands. ``pooled`` serves
    where the record states none, always under that rule. ``between_days`` adds its component.
    ``analysts`` names who titrated each replicate, in order; ``two_people`` is the recipe's wish
    for GB/T 601's check.
    """

    limits: Limits = field(default_factory=Limits)
    end_point: EndPoint | None = None
    resolution: Resolution | None = None
    sample_mass: SampleMass | None = None
    in_date: tuple[InDate, ...] = ()
    drying: Drying | None = None
    last_certificate: LastCertificate | None = None
    pooled: Pooled | None = None
    own_where_larger: bool = False
    between_days: BetweenDays | None = None
    probe: Probe | None = None
    interim: tuple[Interim, ...] = ()
    analysts: tuple[str, ...] = ()
    two_people: bool = False


_PARTS: Mapping[str, type[Any]] = MappingProxyType(
    {
        "limits": Limits,
        "end_point": EndPoint,
        "resolution": Resolution,
        "sample_mass": SampleMass,
        "drying": Drying,
        "last_certificate": LastCertificate,
        "pooled": Pooled,
        "between_days": BetweenDays,
        "probe": Probe,
    }
)


def to_document(circumstances: Circumstances) -> dict[str, Any]:
    """Return circumstances as a JSON-able document, for the snapshot."""
    return _plain(circumstances)  # type: ignore[no-any-return]


def read_circumstances(document: Mapping[str, Any]) -> Circumstances:
    """Return the circumstances that a snapshot's document holds.

    Raises:
        TypeError: a key that circumstances do not have.
    """
    values: dict[str, Any] = dict(document)
    for name, part in _PARTS.items():
        if values.get(name) is not None:
            values[name] = part(**values[name])
    values["in_date"] = tuple(InDate(**one) for one in values.get("in_date", ()))
    values["interim"] = tuple(Interim(**one) for one in values.get("interim", ()))
    values["analysts"] = tuple(values.get("analysts", ()))
    return Circumstances(**values)


def _plain(value: Any) -> Any:
    """Return dataclasses, tuples and mappings as dicts and lists."""
    if dataclasses.is_dataclass(value):
        return {one.name: _plain(getattr(value, one.name)) for one in fields(value)}
    if isinstance(value, Mapping):
        return {key: _plain(one) for key, one in value.items()}
    if isinstance(value, tuple | list):
        return [_plain(one) for one in value]
    return value
