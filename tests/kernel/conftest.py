"""Every test of what the kernel computes runs on both engines."""

import pytest

from moletally.kernel.engine import using

ONE_ENGINE = {"test_structure", "test_status", "test_methods", "test_engines_agree", "test_engine_choice"}


def pytest_generate_tests(metafunc):
    if metafunc.module.__name__ not in ONE_ENGINE:
        metafunc.fixturenames.append("engine")
        metafunc.parametrize("engine", ["compiled", "reference"], indirect=True)


@pytest.fixture
def engine(request):
    with using(request.param) as chosen:
        yield chosen
