"""A stress with a known answer."""

import numpy as np
import pytest


@pytest.fixture
def strike_slip_axes():
    """sigma1 020/00, sigma2 vertical, sigma3 110/00."""
    a = np.radians(20.0)
    return np.array([[np.sin(a), np.cos(a), 0.0], [0, 0, -1.0], [-np.cos(a), np.sin(a), 0.0]])
