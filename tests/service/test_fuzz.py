"""The HTTP interface under whatever its own schema allows, and some that it does not (schemathesis)."""

from __future__ import annotations

from typing import Any

import pytest
from hypothesis import HealthCheck, Phase, given, settings
from service.conftest import missing

try:
    import schemathesis
    from schemathesis.checks import not_a_server_error
    from schemathesis.specs.openapi.checks import (
        content_type_conformance,
        negative_data_rejection,
        response_schema_conformance,
        status_code_conformance,
        unsupported_method,
    )
except ImportError:
    schemathesis = None


@pytest.fixture(scope="module")
def api_schema(client: Any, server: str) -> Any:
    """The schema that the running service publishes."""
    return schemathesis.openapi.from_url(f"{server}/openapi.json")


def examine(operation: Any, mode: Any, examples: int) -> None:
    @settings(
        max_examples=examples,
        deadline=None,
        derandomize=True,
        database=None,
        phases=(Phase.explicit, Phase.generate),
        suppress_health_check=list(HealthCheck),
    )
    @given(case=operation.as_strategy(generation_mode=mode))
    def ask(case: Any) -> None:
        case.call_and_validate(
            checks=[
                not_a_server_error,
                status_code_conformance,
                content_type_conformance,
                response_schema_conformance,
                negative_data_rejection,
                unsupported_method,
            ],
            timeout=60,
        )

    ask()


@pytest.mark.parametrize("mode", ["POSITIVE", "NEGATIVE"])
def test_answers_keep_to_the_schema(request: pytest.FixtureRequest, mode: str) -> None:
    if schemathesis is None:
        missing("needs the Python package schemathesis (pip install 'qsar[test]')")
    schema = request.getfixturevalue("api_schema")
    operations = [found.ok() for found in schema.get_all_operations()]
    assert len(operations) >= 15
    for operation in operations:
        if mode == "NEGATIVE" and not operation.body and not list(operation.iter_parameters()):
            continue  # takes nothing, so nothing is wrong with it
        examine(operation, getattr(schemathesis.GenerationMode, mode), 5)
