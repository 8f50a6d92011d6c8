"""Who keeps the total momentum of the box, and who loses three degrees of freedom for it."""

from types import SimpleNamespace

import numpy as np
import pytest

from swirlight.motion.freedom import conserves_momentum, degrees_of_freedom

NEUTRAL = SimpleNamespace(charge=np.array([1.0, -1.0]), bodies=2, freedom=np.array([3, 2]))
CHARGED = SimpleNamespace(charge=np.array([1.0, 1.0]), bodies=2, freedom=np.array([3, 2]))
NVE, BATH = None, SimpleNamespace(conserves_momentum=False)


def light(*couplings, bias=None):
    return SimpleNamespace(pulses=[SimpleNamespace(coupling=c) for c in couplings], bias=bias)


@pytest.mark.parametrize("system, thermostat, fields, kept", [
    (NEUTRAL, NVE, None, True),
    (NEUTRAL, NVE, light("resolved", bias=1), True),
    (CHARGED, NVE, None, True),
    (CHARGED, NVE, light("averaged"), True),
    (CHARGED, NVE, light("averaged", "resolved"), False),
    (CHARGED, NVE, light(bias=1), False),
    (NEUTRAL, BATH, None, False),
])
def test_who_keeps_momentum(system, thermostat, fields, kept):
    assert conserves_momentum(system, thermostat, fields) is kept
    assert degrees_of_freedom(system, kept).total == 6 + 5 - 3 * kept
