"""What the compiled step and Python share about one lane: a record in memory that lives as long as the lane.

The host hands the step an array of addresses of such records, so lanes come and go without anything being moved.
"""

import numpy as np

ARRAYS = ("state", "coefficients", "keys", "meters", "marks", "trace")
"""The arrays that a kernel takes after its input and output, in its order; their addresses stand in the record."""

RECORD = np.dtype(
    [
        ("kernel", "<i8"),  # addresses
        ("output", "<i8"),
        *((name, "<i8") for name in ARRAYS),
        ("outputs", "<i8"),
        ("metered", "<i8"),
        ("frame", "<i8"),  # frames since the lane's reset
        ("not_a_number", "<i8"),
        ("peak", "<f8"),
        ("sum_of_squares", "<f8"),
    ]
)
