"""What each cause has given to the bodies since the ledger was opened."""

import numpy as np

# Where each entry lies in the row of numbers; the kernels write to the same places.
LIGHT_WORK, BIAS_WORK, BATH_WORK, ABSORBED = 0, 1, 2, 3
PAIR, LIGHT, BIAS, BATH = 4, 7, 10, 13  # first of three components
OPENING = 16
ENTRIES = 17


def _entry(where, text):
    return property(lambda self: self.values[where], doc=text)


class Ledger:
    """Sums over bodies and half kicks; all zero when opened.

    Work of a source in one half kick is ½(ω⁻ + ω⁺)·τ dt/2 + ½(V⁻ + V⁺)·F dt/2, exactly the
    kinetic energy it brings, so ΔH0 = light_work + bias_work + bath_work up to the bounded
    O(dt²) residual of the splitting. Impulses are ∫Σ torque dt about the bodies' own centres,
    and ΔL of the sum of angular momenta is their sum to rounding.
    """

    light_work = _entry(LIGHT_WORK, "Mechanical work of the light. [u nm²/ps²]")
    bias_work = _entry(BIAS_WORK, "Work of the static bias field. [u nm²/ps²]")
    bath_work = _entry(BATH_WORK, "Energy from the thermostat. [u nm²/ps²]")
    absorbed_energy = _entry(
        ABSORBED, "∫½ωΣ e*·αD e dt by the trapezoid rule; not put into the bodies. [u nm²/ps²]")
    pair_impulse = _entry(slice(PAIR, PAIR + 3), "(3,) of the interactions. [u nm²/ps]")
    light_impulse = _entry(slice(LIGHT, LIGHT + 3), "(3,) of the light. [u nm²/ps]")
    bias_impulse = _entry(slice(BIAS, BIAS + 3), "(3,) of the bias field. [u nm²/ps]")
    bath_impulse = _entry(slice(BATH, BATH + 3), "(3,) of the thermostat. [u nm²/ps]")

    opening_energy = _entry(OPENING, "H0 when it was opened, NaN until known. [u nm²/ps²]")

    def __init__(self):
        self.values = np.zeros(ENTRIES)
        self.values[OPENING] = np.nan

    @property
    def work(self):
        """Everything that has changed H0: light, bias field and bath. [u nm²/ps²]"""
        return self.light_work + self.bias_work + self.bath_work

    @property
    def impulse(self):
        """(3,) everything that has changed the sum of angular momenta. [u nm²/ps]"""
        return self.pair_impulse + self.light_impulse + self.bias_impulse + self.bath_impulse

    def to_array(self):
        """(17,) a copy of all entries, for a checkpoint."""
        return self.values.copy()

    @classmethod
    def from_array(cls, values):
        """The ledger whose `to_array` gave these numbers."""
        ledger = cls()
        ledger.values[:] = values
        return ledger
