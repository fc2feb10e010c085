"""A sample of the damaged data sets of the benchmark: only values or plain errors."""

import tempfile
from functools import cache
from pathlib import Path

from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from benchmarks.hostile_input import LIMIT_S, Files, load_sources, run_case


@cache
def sources() -> list[Files]:
    return load_sources()


# derandomize: the suite checks the same cases every time; the benchmark is for more.
@settings(
    max_examples=300,
    deadline=None,
    derandomize=True,
    database=None,
    suppress_health_check=[HealthCheck.too_slow],
)
@given(seed=st.integers(min_value=0, max_value=2**32))
def test_damaged_data_give_a_value_or_one_plain_sentence(seed: int) -> None:
    with tempfile.TemporaryDirectory() as scratch:
        found, seconds = run_case(sources(), seed, Path(scratch))
    assert found in ("value", "refused")
    assert seconds < LIMIT_S
