"""What there is to say about a species, as plain values with units and as text."""

import textwrap

import numpy as np

from swirlight import units
from swirlight.species.body import ATOM, GENERAL, LINEAR
from swirlight.species.response import PARTS, allowed_by
from swirlight.species.symmetry import point_group

KINDS = {ATOM: "atom", LINEAR: "linear body", GENERAL: "general body"}
DEBYE = units.parse("1 D", "dipole")
J_PER_MOL_K = units.parse("1 J/mol/K", "heat capacity")
GRAM_PER_CM3 = units.parse("1 g/cm^3", "density")
RECTIFICATION = units.parse("1 C m^3/V^2", "rectification")
_UNITS = {"rectification": ("C m^3/V^2", RECTIFICATION)}
_ATTRIBUTES = {"absorptive_polarizability": "absorptive"}


def rotational_constants(inertia):
    """(3,) h/(8π²cI) in 1/cm, infinite where the moment is 0 (IUPAC Gold Book R05409).

    inertia : (3,) principal moments. [u nm²]
    """
    with np.errstate(divide="ignore"):
        return units.HBAR / (4 * np.pi * units.LIGHT_SPEED * np.asarray(inertia)) * 1e7


def group_of(species):
    """The `PointGroup` of a species."""
    return point_group(species.sites, species.freedom, species.mass, species.charge,
                       species.sigma, species.epsilon)


def describe(species):
    """A species as a dict of plain values, each key ending in its unit; for `--json`.

    Positions, dipole and tensors are those of the body frame.
    """
    group = group_of(species)
    allowed = allowed_by(group.operations)
    constants = rotational_constants(species.inertia)
    return {
        "name": species.name,
        "source": species.source,
        "mixing": species.mixing,
        "kind": KINDS[species.freedom],
        "rotational_degrees_of_freedom": species.freedom,
        "mass_u": species.total_mass,
        "charge_e": _plain(species.total_charge, 1e-10),
        "inertia_u_nm2": _plain(species.inertia),
        "rotational_constants_per_cm": [_plain(c) if np.isfinite(c) else None for c in constants],
        "frame": _plain(species.frame),
        "dipole_D": _plain(species.dipole / DEBYE, 1e-10),
        "sites": [_site(species, k) for k in range(len(species.labels))],
        "symmetry": {
            "group": group.name,
            "allowed": {part: allowed.words(part) for part in PARTS},
            "forbidden": {part: allowed.forbidden(part) for part in PARTS},
        },
        "light_response": [_response(r) for r in species.responses],
        "heat_capacity": species.heat_capacity and {
            "value_J_per_mol_K": _plain(species.heat_capacity / J_PER_MOL_K),
            "source": species.heat_capacity_source,
        },
        "liquid": species.liquid and {
            "temperature_K": species.liquid.temperature,
            "density_g_per_cm3": _plain(species.liquid.density / GRAM_PER_CM3),
            "source": species.liquid.source,
        },
        "notes": list(species.notes),
    }


def _plain(value, floor=0.0):
    """Plain Python numbers of 12 digits, those below `floor` or of rounding size 0."""
    value = np.asarray(value)
    kept = np.where(np.abs(value) > max(1e-12 * np.abs(value).max(), floor), value, 0.0)
    return np.vectorize(lambda x: float(f"{x:.12g}"))(kept).tolist()


def _site(species, k):
    has_lennard_jones = species.epsilon[k] > 0
    return {
        "label": species.labels[k],
        "mass_u": float(species.mass[k]),
        "charge_e": float(species.charge[k]),
        "sigma_nm": _plain(species.sigma[k]) if has_lennard_jones else None,
        "epsilon_kJ_per_mol": _plain(species.epsilon[k] / units.KJ_PER_MOL)
        if has_lennard_jones else None,
        "position_nm": _plain(species.sites[k], 1e-10),
    }


def _response(response):
    """The parts of one response that are not zero."""
    found = {
        "at_nm": response.at and _plain(2 * np.pi * units.LIGHT_SPEED / response.at),
        "source": response.source or None,
    }
    for part in PARTS:
        unit, size = _UNITS.get(part, ("angstrom^3", units.CUBIC_ANGSTROM))
        tensor = getattr(response, _ATTRIBUTES.get(part, part))
        if tensor.any():
            found[part] = {"value": _plain(tensor / size), "unit": unit}
    return found


def library_text(species):
    """One line for each species of an iterable."""
    rows = [("name", "sites", "kind", "mass/u", "dipole/D", "light response", "source")]
    for s in species:
        parts = {p for r in s.responses for p in PARTS
                 if getattr(r, _ATTRIBUTES.get(p, p)).any()}
        answer = " ".join(p.split("_")[0] for p in PARTS if p in parts) or "none"
        rows.append((s.name, str(len(s.labels)), KINDS[s.freedom], f"{s.total_mass:.3f}",
                     f"{np.linalg.norm(s.dipole) / DEBYE:.3f}", answer, s.source.split(":")[0]))
    widths = [max(len(row[k]) for row in rows) for k in range(len(rows[0]) - 1)]
    return "\n".join("  ".join([*(c.ljust(w) for c, w in zip(row, widths, strict=False)), row[-1]])
                     for row in rows)


def species_text(species):
    """All about one species, in lines of at most about 90 characters."""
    d = describe(species)
    lines = [f"{d['name']}: {d['kind']}, {len(d['sites'])} "
             f"site{'s' if len(d['sites']) > 1 else ''}, symmetry {d['symmetry']['group']}"]
    lines += _entry("source", d["source"])
    lines += _entry("mass", f"{d['mass_u']:.6g} u, charge {d['charge_e']:.6g} e,"
                            f" mixing {d['mixing']}")
    lines += _entry("dipole", f"{_numbers(d['dipole_D'])} D, size "
                              f"{np.linalg.norm(d['dipole_D']):.5g} D")
    if species.freedom != ATOM:
        lines += _entry("inertia", f"{_numbers(d['inertia_u_nm2'])} u nm^2 about x y z")
        lines += _entry("constants", f"{_numbers(d['rotational_constants_per_cm'])} /cm"
                                     " (rotational, about x y z)")
        lines += _entry("frame", "body = frame (file - centre of mass), rows x y z:")
        lines += _matrix(d["frame"])
    lines += ["", f"  {'site':<8}{'mass/u':>9}{'charge/e':>10}{'sigma/nm':>10}{'eps kJ/mol':>12}"
                  "    position in the body frame/nm"]
    lines += [_site_line(site) for site in d["sites"]]
    lines += ["", "  the symmetry of the sites, in the body frame"]
    for part in PARTS:
        gone = ", ".join(d["symmetry"]["forbidden"][part])
        kept = d["symmetry"]["allowed"][part]
        words = f"allows {kept}" + (f"; forbids {gone}" if gone else "")
        lines += _entry(part.replace("_", " "), "forbidden" if kept == "none" else words, 27)
    for response in d["light_response"]:
        lines += ["", *_response_lines(response)]
    if not d["light_response"]:
        lines += ["", "  no light response: the body does not see averaged light"]
    lines.append("")
    if heat := d["heat_capacity"]:
        lines += _entry("C_V", f"{heat['value_J_per_mol_K']:.6g} J/mol/K: {heat['source']}")
    else:
        lines += _entry("C_V", "not given: the kinetic part alone stands for it, so that heating"
                               " is an upper bound")
    if liquid := d["liquid"]:
        lines += _entry("liquid", f"{liquid['density_g_per_cm3']:.6g} g/cm^3 at "
                                  f"{liquid['temperature_K']:g} K: {liquid['source']}")
    for note in d["notes"]:
        lines += _entry("note", note)
    return "\n".join(lines)


def _entry(key, text, width=12):
    return textwrap.wrap(" ".join(text.split()), 92, initial_indent=f"  {key:<{width}}",
                         subsequent_indent=" " * (width + 2))


def _numbers(values):
    return " ".join("-" if v is None else f"{v:.6g}" for v in values)


def _matrix(rows):
    return ["  " + " " * 12 + "".join(f"{v:>14.6g}" for v in row) for row in rows]


def _site_line(site):
    sigma, epsilon = (f"{site[key]:.6g}" if site[key] else "-"
                      for key in ("sigma_nm", "epsilon_kJ_per_mol"))
    position = "".join(f"{v:>11.6f}" for v in site["position_nm"])
    return (f"  {site['label']:<8}{site['mass_u']:>9.6g}{site['charge_e']:>10.6g}{sigma:>10}"
            f"{epsilon:>12}{position}")


def _response_lines(response):
    at = f"at {response['at_nm']:.6g} nm" if response["at_nm"] else "at every carrier"
    lines = [f"  response to light {at}"]
    if response["source"]:
        lines += _entry("source", response["source"])
    for part in PARTS:
        if part in response:
            value, unit = response[part]["value"], response[part]["unit"]
            lines.append(f"  {part.replace('_', ' ')} / {unit}")
            lines += _matrix(np.atleast_2d(value))
    return lines
