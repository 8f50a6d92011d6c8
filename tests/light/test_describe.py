"""What `check` says of light: figures, warnings, decisions."""

from math import pi, sqrt

import numpy as np
import pytest

from swirlight.errors import InputError
from swirlight.light.describe import achieved, describe, describe_beats, end_of_light
from swirlight.light.envelope import FlatTop, Gaussian, Rectangle, Sech2
from swirlight.light.limits import sample_statements, strength_for, which_field
from swirlight.light.pulse import Pulse, amplitude_of_intensity, intensity_of_amplitude
from swirlight.light.regime import rotation_rate
from swirlight.species.body import OpticalResponse
from swirlight.units import BOLTZMANN, HBAR, LIGHT_SPEED, VACUUM_PERMITTIVITY, VOLT_PER_METRE
from tests.light.bodies import isotropic, response, sample, species

GREEN = 2 * pi * LIGHT_SPEED / 532.0


def pulse(**parts):
    given = {"carrier": GREEN, "amplitude": amplitude_of_intensity(1e10),
             "envelope": Gaussian(1.0), "centre": 2.5, "reason": "as asked"}
    return Pulse(**{**given, **parts})


def terahertz(cycles=10.0, **parts):
    given = {"carrier": 2 * pi, "coupling": "resolved", "envelope": Gaussian(cycles),
             "centre": 2.5 * cycles}
    return pulse(**{**given, **parts})


def test_strengths_stand_side_by_side():
    figures = describe(pulse(ellipticity=0.3)).figures
    value, unit = figures["intensity"]
    assert (value, unit) == (pytest.approx(1e10), "W/cm^2")
    amplitude = figures["amplitude"][0]
    assert figures["largest field"] == (pytest.approx(amplitude * np.cos(0.3)), "V/m")
    assert figures["s3 |amplitude|^2"] == (pytest.approx(amplitude**2 * np.sin(0.6)), "V^2/m^2")
    assert figures["fluence"] == (pytest.approx(1.06446701943e-2), "J/cm^2")
    assert figures["photon energy"][0] == pytest.approx(2.33053, rel=1e-5)  # 1239.842 eV nm/532
    assert figures["wavelength"][0] == pytest.approx(532.0)
    assert figures["cycles per duration"][0] == pytest.approx(563.519, rel=1e-5)


@pytest.mark.parametrize("chi", [pi / 4, 0.3, 0.0])
@pytest.mark.parametrize("envelope", [Gaussian(20.0), Sech2(20.0), FlatTop(20.0, 8.0)])
def test_many_cycles_achieve_what_the_envelope_says(chi, envelope):
    p = terahertz(envelope=envelope, centre=70.0, ellipticity=chi)
    peak, width, fluence = achieved(p)
    assert peak == pytest.approx(p.peak_field, rel=2e-3)
    assert width == pytest.approx(20.0, rel=1e-3)
    assert fluence == pytest.approx(p.fluence, rel=2e-3)


def test_fluence_of_few_cycles_is_that_of_the_field_itself():
    """∫ε0c E² dt of E = −dA/dt by an independent derivative and sum."""
    p = terahertz(cycles=1.2, ellipticity=0.0, phase=0.5)
    t = np.linspace(-8.0, 8.0, 400_001)
    potential = (p.amplitude * np.sqrt(p.envelope.intensity(t)) / p.carrier
                 * np.sin(p.carrier * t + 0.5))
    field = np.gradient(potential, t)
    expected = 2 * intensity_of_amplitude(1.0) * np.trapezoid(field**2, t) * 1e-12
    peak, _, fluence = achieved(p)
    assert fluence == pytest.approx(expected, rel=1e-6)
    assert peak == pytest.approx(np.abs(field).max(), rel=2e-3)
    assert fluence > 1.01 * p.fluence


def test_less_than_a_cycle_is_warned_of():
    assert "area" in describe(terahertz(cycles=0.7)).warnings[0]
    assert not describe(terahertz(cycles=2.0)).warnings


def test_steps_per_cycle_are_given_warned_of_and_refused():
    said = describe(terahertz(), timestep=0.002)
    assert said.figures["steps per cycle"][0] == pytest.approx(500.0) and not said.warnings
    assert "40" in describe(terahertz(), timestep=0.03).warnings[0]
    with pytest.raises(InputError, match="longest timestep"):
        describe(terahertz(), timestep=0.1)


def test_a_cut_pulse_names_a_centre_and_a_length_that_suffice():
    said = describe(pulse(centre=1.0), length=2.0)
    assert said.figures["intensity at the start of the stage"][0] == pytest.approx(0.0625)
    assert said.figures["intensity at the end of the stage"][0] == pytest.approx(0.0625)
    # half width at 1e-4 of a Gaussian: τ √(ln 1e4/(4 ln 2)) = 1.82262
    assert "at least 1.823 ps" in said.warnings[0] and "3.646 ps" in said.warnings[0]
    assert not describe(pulse(centre=1.823), length=3.646).warnings
    assert not describe(pulse(envelope=Rectangle(1.0), centre=0.5), length=1.0).warnings
    train = pulse(centre=2.0, count=3, period=5.0)
    assert "13.83 ps long" in describe(train, length=12.5).warnings[0]
    assert not describe(train, length=13.83).warnings


def test_what_was_decided_is_said():
    said = describe(pulse(reason="because"))
    assert "averaged: because" in said.notes
    assert any("refractive_index 1" in n for n in said.notes)
    assert describe(pulse(refractive_index=1.3)).notes == ["averaged: as asked"]


def test_beats_are_said():
    system = sample(species(response()))
    near, far = GREEN + 2 * pi, GREEN + 40 * rotation_rate(system)
    lines = describe_beats((pulse(), pulse(carrier=near), pulse(carrier=far)), system)
    assert "beat" in lines[0] and "1 THz apart" in lines[0] and "in 1 ps" in lines[0]
    assert "coherency matrices" in lines[1]


def test_end_of_light():
    assert end_of_light(()) == 0.0
    assert end_of_light((pulse(), pulse(envelope=Rectangle(2.0), centre=9.0))) == 10.0


def test_limits_are_the_formulas_of_the_trade():
    block = response(3)
    kind, kt = species(block), BOLTZMANN * 300.0
    spread = np.ptp(np.linalg.eigvalsh(block.polarizability))
    for chi, well in ((0.0, 4.0), (pi / 4, 8.0)):
        p = pulse(ellipticity=chi)
        square = p.amplitude**2
        figures, _ = strength_for(p, kind, 300.0)
        assert figures["alignment well"][0] == pytest.approx(spread * square / (well * kt))
        # Kerr impulse Δα F/(2 ε0 c n)/√(I kT), half of it for circular light
        intensity_area = 0.5 * VACUUM_PERMITTIVITY * LIGHT_SPEED * square * 1.06446701943
        kerr = spread * intensity_area / (2 * VACUUM_PERMITTIVITY * LIGHT_SPEED)
        assert figures["alignment impulse"][0] == pytest.approx(
            kerr * 4.0 / well / sqrt(0.02 * kt), rel=1e-9)
    g = np.linalg.norm(block.gyration)
    assert figures["gyration well"][0] == pytest.approx(g * square / (4 * kt))
    mean = np.trace(block.absorptive) / 3
    assert figures["absorption impulse"][0] == pytest.approx(
        0.5 * mean * square * 1.06446701943 / sqrt(0.02 * kt), rel=1e-9)
    assert figures["photons absorbed"][0] == pytest.approx(
        0.5 * mean * square * 1.06446701943 / HBAR, rel=1e-9)
    dipole = np.linalg.norm(kind.dipole)
    figures, _ = strength_for(terahertz(), kind, 300.0)
    field = terahertz().peak_field
    assert figures["dipole energy"][0] == pytest.approx(dipole * field / kt)
    assert figures["dipole impulse"][0] == pytest.approx(
        dipole * field / (0.02 * 2 * pi * sqrt(kt / 0.02)))


def test_too_many_visible_photons_are_warned_of():
    absorber = species(isotropic(1e-4))
    strong = pulse(amplitude=1e6 * VOLT_PER_METRE * 1e3)
    figures, warnings = strength_for(strong, absorber, 300.0)
    assert figures["photons absorbed"][0] > 0.1
    assert any("photons absorbed" in w for w in warnings)
    slow = pulse(amplitude=strong.amplitude, carrier=2 * pi * 10, coupling="averaged")
    assert not any("photons absorbed" in w for w in strength_for(slow, absorber, 300.0)[1])


def test_statements_on_the_sample():
    def signed(sign, name):
        block = response(3)
        return species(OpticalResponse(None, block.polarizability, block.absorptive,
                                       sign * block.gyration, np.eye(3)), name=name)

    single = sample_statements((pulse(),), sample(signed(1, "right")))
    assert any("one sign of gyration" in s for s in single)
    assert any("permanent dipole" in s for s in single)
    assert not any("rectification" in s for s in single)
    both = sample_statements((pulse(),), sample(signed(1, "right"), signed(-1, "left")))
    assert not any("one sign" in s for s in both)
    bare = OpticalResponse(None, np.zeros((3, 3)), np.zeros((3, 3)), np.zeros(3), np.eye(3))
    assert any("rectification without absorption" in s
               for s in sample_statements((pulse(),), sample(species(bare))))
    assert sample_statements((terahertz(),), sample(signed(1, "right"))) == []


def test_which_field_a_resolved_or_static_one_is():
    assert which_field("mesh-ewald") is None and which_field("none") is None
    assert "ε_RF" in which_field("reaction-field") and "Ewald" in which_field("damped-shifted")
