"""Random histories for property tests.  Times are whole 64ths of a second: breaks are then exact floats."""

from __future__ import annotations

from hypothesis import strategies as st

_value = st.integers(-40, 40).map(lambda n: n / 8)
_at = st.integers(0, 96).map(lambda n: n / 64)
_span = st.integers(1, 96).map(lambda n: n / 64)
_pause = st.integers(0, 64).map(lambda n: n / 64)


def _kind(name: str, optional: dict | None = None, **keys: st.SearchStrategy) -> st.SearchStrategy:
    return st.tuples(st.just(name), st.fixed_dictionaries(keys, optional=optional or {}))


_changes = {"from": _value, "at": _at}


@st.composite
def _table(draw: st.DrawFn) -> tuple[str, dict]:
    count = draw(st.integers(2, 8))
    times = [draw(_pause)]
    for _ in range(count - 1):
        jumped = len(times) > 1 and times[-1] == times[-2]
        times.append(times[-1] + draw(_span if jumped else _pause))
    values = draw(st.lists(_value, min_size=count, max_size=count))
    return "table", {"times": times, "values": values, "interpolation": draw(st.sampled_from(["linear", "smooth"]))}


simple = st.one_of(
    _kind("step", _changes, to=_value),
    _kind("ramp", _changes, to=_value, over=_span),
    _kind("smooth_ramp", _changes, to=_value, over=_span),
    _kind("s_curve", _changes, to=_value, acceleration=_span, jerk=_span),
    _kind("trapezoid", _changes, to=_value, rise=_pause, hold=_span, fall=_pause),
    _kind("lag", _changes, to=_value, time_constant=_span),
    _kind("sine", {"phase": _value, "mean": _value, "at": _at}, amplitude=_value, period=_span),
    _kind("sine", {"phase": _value, "mean": _value, "at": _at}, amplitude=_value, frequency=_span),
    _kind("half_sine", {"at": _at}, amplitude=_value, over=_span),
    _table(),
)

histories = st.recursive(
    simple,
    lambda part: st.one_of(
        _kind("sum", parts=st.lists(part, min_size=1, max_size=3)),
        _kind("repeat", {"times": st.integers(1, 5)}, part=part, every=_span),
    ),
    max_leaves=4,
)
