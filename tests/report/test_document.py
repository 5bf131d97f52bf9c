"""Values that JSON can hold."""

import json

import numpy as np

from optimiser.report.document import as_json


def test_arrays_become_lists_and_infinities_null() -> None:
    value = {
        "array": np.array([1.0, np.inf, np.nan]),
        "nested": [(np.float64(2.5), np.int64(3), np.bool_(True))],
        "text": "shim",
        "nothing": None,
        "below": -np.inf,
    }
    assert as_json(value) == {
        "array": [1.0, None, None],
        "nested": [[2.5, 3, True]],
        "text": "shim",
        "nothing": None,
        "below": None,
    }
    json.dumps(as_json(value), allow_nan=False)
