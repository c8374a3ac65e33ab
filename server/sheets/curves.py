"""A curve of a bench sheet as pages and scripts get it."""

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class CurveMethod:
    """What one method answers: its volume with u in mL and what is weak in it, or why it cannot.

    ``taken``: the sheet's volume is this one; ``proposed``: the program would take it; ``shape``
    is the mark that the pictures give it.
    """

    method: str
    shape: str
    volume: str | None
    u: str | None
    points_used: int
    says: str
    taken: bool
    proposed: bool


@dataclass(frozen=True, slots=True)
class CurveFindingView:
    """One thing looked at in a curve."""

    name: str
    verdict: str
    says: str
    basis: str


@dataclass(frozen=True, slots=True)
class ProbeLine:
    """Slope or offset: from this curve with its u, from the last buffers, and the difference."""

    name: str
    from_curve: str
    u: str
    from_buffers: str
    apart: str


@dataclass(frozen=True, slots=True)
class ProbeBeside:
    """The probe as the fit has it, beside its last calibration in buffers."""

    lines: tuple[ProbeLine, ...]
    name: str | None
    url: str | None
    calibration: str
    says: str


@dataclass(frozen=True, slots=True)
class CurvePictures:
    """The pictures as SVG; empty where there is nothing to draw."""

    whole: str
    residuals: str
    near: str
    slopes: str
    gran: str


@dataclass(frozen=True, slots=True)
class CurveView:
    """One replicate's curve with every method and which to believe.

    ``says`` tells the picture in words; ``problem`` why there is no analysis, and then volumes,
    methods and pictures are empty. ``choice`` says who chose the method, and why.
    """

    replicate: int
    label: str
    url: str
    chart_url: str
    points: int
    kind: str
    words: str
    written: str
    file_url: str | None
    set_aside: tuple[str, ...]
    problem: str | None
    taken: str | None
    volume: str
    u: str
    choice: str
    believe: str
    says: str
    methods: tuple[CurveMethod, ...]
    other_step: tuple[CurveMethod, ...]
    findings: tuple[CurveFindingView, ...]
    probe: ProbeBeside | None
    pictures: CurvePictures


@dataclass(frozen=True, slots=True)
class CurvePoint:
    """One point as it was read, the step up to it, and which methods used it."""

    number: int
    volume: str
    reading: str
    seconds: str
    slope: str
    residual: str
    used_by: str


@dataclass(frozen=True, slots=True)
class PointsPart:
    """A part of the table of points; ``parts`` are the others' names and addresses."""

    rows: tuple[CurvePoint, ...]
    timed: bool
    fitted: bool
    parts: tuple[tuple[str, str, bool], ...]


@dataclass(frozen=True, slots=True)
class CurvePage:
    """The page of one curve; ``others`` are the sheet's other curves by label and address."""

    sheet_id: str
    number: str
    state: str
    title: str
    lot_code: str
    lot_name: str
    curve: CurveView
    table: PointsPart
    others: tuple[tuple[str, str], ...]
