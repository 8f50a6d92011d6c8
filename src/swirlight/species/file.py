"""The species file: its model, and the rigid body it describes.

What is written in any frame and in any unit becomes a `Species` in its body frame and in
internal units; every refusal names file, line and key.
"""

from contextlib import contextmanager
from typing import Annotated

import numpy as np
from pydantic import ValidationError, field_validator, model_validator

from swirlight.config.reader import shown
from swirlight.config.validate import Section, validate
from swirlight.config.values import Choice, Matrix, Problems, Quantity, Text, Vector
from swirlight.errors import ConfigError, InputError
from swirlight.species.body import LiquidState, OpticalResponse, Species
from swirlight.species.frame import body_frame
from swirlight.species.response import hold_against, require_absorbing, to_body_frame
from swirlight.species.symmetry import point_group

SOURCE = 'a paper, or "invented for demonstration"'
Source = Annotated[str, Text(SOURCE, longest=2000)]
SAME_WAVELENGTH = 1e-3  # relative: two blocks this close are given for one carrier
MOST_SITES = 100  # of one body
SYMMETRIC = 1e-6  # of the largest entry of a polarizability


class Site(Section):
    """One point of the body: it may carry mass, charge, Lennard-Jones, or some of them."""

    label: Annotated[str, Text("O", longest=20)]
    at: Annotated[tuple, Vector("length", "-100 nm", "100 nm", "0 0 0.117 nm")]
    mass: Annotated[float, Quantity("mass", "0 u", "1e6 u")] = "0 u"
    charge: Annotated[float, Quantity("charge", "-100 e", "100 e")] = "0 e"
    sigma: Annotated[float | None, Quantity("length", "0 nm", "10 nm", "0.34 nm")] = None
    epsilon: Annotated[float | None, Quantity("energy", "0 kJ/mol", "1e4 kJ/mol")] = None

    @model_validator(mode="after")
    def _whole(self):
        if (self.sigma is None) != (self.epsilon is None):
            missing = "sigma" if self.sigma is None else "epsilon"
            raise Problems(((), f"missing {missing}: sigma and epsilon belong together"))
        if self.epsilon and not self.sigma:
            raise Problems((("sigma",), "is 0 although epsilon is not"))
        if "." in self.label or any(c.isspace() for c in self.label):
            raise Problems((("label",), f"{shown(self.label)} has a point or a blank; expected one"
                                        " word, for example O"))
        return self


def _tensor(kind):
    """A section for a (3, 3) tensor: its whole matrix, or its diagonal along the file's axes."""

    class Tensor(Section):
        matrix: Annotated[tuple | None, Matrix(kind)] = None
        principal: Annotated[tuple | None, Vector(kind)] = None

        @model_validator(mode="after")
        def _one_form(self):
            if (self.matrix is None) == (self.principal is None):
                raise Problems(((), "needs either matrix or principal"))
            return self

        def array(self):
            """(3, 3) in the frame of the file."""
            return np.diag(self.principal) if self.matrix is None else np.array(self.matrix)

    return Tensor


class Polarizability(_tensor("polarizability")):
    """A real symmetric tensor, in the frame in which the sites are given."""

    @model_validator(mode="after")
    def _is_symmetric(self):
        tensor = self.array()
        if np.abs(tensor - tensor.T).max() > SYMMETRIC * np.abs(tensor).max():
            raise Problems((("matrix",), "is not symmetric; the antisymmetric part goes under"
                                         " gyration"))
        return self


class Rectification(_tensor("rectification")):
    """Static dipole per conjugate product, in the frame in which the sites are given."""


class LightResponse(Section):
    """Response to light near one carrier, or to any when `at` is left out."""

    at: Annotated[float | None, Quantity("carrier", "1e-6 THz", "1e5 THz", "800 nm")] = None
    polarizability: Polarizability | None = None
    absorptive_polarizability: Polarizability | None = None
    gyration: Annotated[tuple | None, Vector("polarizability")] = None
    rectification: Rectification | None = None
    symmetry: Annotated[str, Choice("checked", "ignore")] = "checked"
    source: Annotated[str | None, Text(SOURCE, longest=2000)] = None

    def tensors(self):
        """{key: array in the frame of the file} of the parts that are given."""
        parts = {}
        for name in ("polarizability", "absorptive_polarizability", "rectification"):
            if (given := getattr(self, name)) is not None:
                parts[name] = given.array()
        if self.gyration is not None:
            parts["gyration"] = np.array(self.gyration)
        return parts


class HeatCapacity(Section):
    """C_V of one body in the liquid, for heating by absorption."""

    value: Annotated[float, Quantity("heat capacity", "1 J/mol/K", "1e5 J/mol/K")]
    source: Source


class Liquid(Section):
    """A state in which the real liquid exists; shown, and a start for a config."""

    temperature: Annotated[float, Quantity("temperature", "0.01 K", "100000 K")]
    density: Annotated[float, Quantity("density", "1e-6 g/cm^3", "30 g/cm^3")]
    source: Source


class SpeciesFile(Section):
    """A rigid body: its sites, and how it answers to light."""

    name: Annotated[str, Text("water", longest=80)]
    source: Source
    mixing: Annotated[str, Choice("lorentz-berthelot", "geometric")] = "lorentz-berthelot"
    sites: tuple[Site, ...]
    light_response: tuple[LightResponse, ...] = ()
    heat_capacity: HeatCapacity | None = None
    liquid: Liquid | None = None

    @field_validator("name")
    @classmethod
    def _is_a_name(cls, name):
        # It names a group in HDF5 files, where a slash nests and "." is the group itself.
        if "/" in name or not name.strip(".") or not name.isprintable():
            raise ValueError(f"{shown(name)} has a slash or an unprintable character;"
                             " expected a plain name, for example water")
        return name

    @field_validator("sites")
    @classmethod
    def _has_sites(cls, sites):
        if not 1 <= len(sites) <= MOST_SITES:
            raise ValueError(f"a list of {len(sites)}; expected 1 to {MOST_SITES} sites")
        return sites

    @field_validator("light_response", mode="wrap")
    @classmethod
    def _one_block_or_several(cls, value, handler):
        if not isinstance(value, dict):
            return handler(value)
        try:
            return handler([value])
        except ValidationError as error:
            # One block has no index in the file: its faults should not name one either.
            faults = [{key: fault[key] for key in ("type", "input", "ctx") if key in fault}
                      | {"loc": fault["loc"][1:]} for fault in error.errors()]
            raise ValidationError.from_exception_data("light_response", faults) from None

    @field_validator("light_response")
    @classmethod
    def _tell_the_wavelengths_apart(cls, blocks):
        problems = [((k, "at"), "missing: of several blocks each needs the wavelength it is for")
                    for k, block in enumerate(blocks) if block.at is None and len(blocks) > 1]
        for k, block in enumerate(blocks):
            if block.at and any(other.at and abs(other.at / block.at - 1) < SAME_WAVELENGTH
                                for other in blocks[:k]):
                problems.append(((k, "at"), "is the wavelength of an earlier block too"))
        if problems:
            raise Problems(*problems)
        return blocks


def species_schema():
    """JSON Schema of a species file, as a dict."""
    schema = SpeciesFile.model_json_schema()
    listed = schema["properties"]["light_response"]
    listed["anyOf"] = [dict(listed["items"]), {"type": "array", "items": listed.pop("items")}]
    listed.pop("type")
    return schema


def read_species(document):
    """The `Species` that a read YAML document describes.

    document : a `swirlight.config.reader.Document`.
    Raises ConfigError for anything in it that cannot be used.
    """
    given = validate(SpeciesFile, document)
    sites = given.sites
    mass, charge = np.array([s.mass for s in sites]), np.array([s.charge for s in sites])
    attracts = np.array([bool(s.epsilon) for s in sites])
    sigma = np.where(attracts, [s.sigma or 0.0 for s in sites], 0.0)
    epsilon = np.where(attracts, [s.epsilon or 0.0 for s in sites], 0.0)
    with _blaming(document, "sites"):
        frame = body_frame(np.array([s.at for s in sites]), mass, charge)
    group = point_group(frame.sites, frame.freedom, mass, charge, sigma, epsilon)
    responses, notes = [], []
    for k, block in enumerate(given.light_response):
        index = () if isinstance(document.tree["light_response"], dict) else (k,)
        path = ("light_response", *index)
        responses.append(_response(block, frame.rotation, group, document, path, notes))
    heat, liquid = given.heat_capacity, given.liquid
    return Species(
        name=given.name,
        source=given.source,
        labels=tuple(s.label for s in sites),
        sites=frame.sites,
        mass=mass,
        charge=charge,
        sigma=sigma,
        epsilon=epsilon,
        inertia=frame.inertia,
        freedom=frame.freedom,
        frame=frame.rotation,
        mixing=given.mixing,
        responses=tuple(responses),
        heat_capacity=heat.value if heat else None,
        heat_capacity_source=heat.source if heat else "",
        liquid=LiquidState(liquid.temperature, liquid.density, liquid.source) if liquid else None,
        notes=tuple(notes),
    )


def _response(block, rotation, group, document, path, notes):
    """One block in the body frame, held against the symmetry of the sites."""
    tensors = {"polarizability": np.zeros((3, 3)), "absorptive_polarizability": np.zeros((3, 3)),
               "gyration": np.zeros(3), "rectification": np.zeros((3, 3))}
    for name, tensor in block.tensors().items():
        with _blaming(document, *path, name):
            if name == "absorptive_polarizability":
                require_absorbing(tensor)
            turned = to_body_frame(tensor, rotation)
            tensors[name], note = hold_against(name, turned, group, block.symmetry == "ignore")
        if note:
            notes.append(note)
    return OpticalResponse(
        at=block.at,
        polarizability=tensors["polarizability"],
        absorptive=tensors["absorptive_polarizability"],
        gyration=tensors["gyration"],
        rectification=tensors["rectification"],
        source=block.source or "",
    )


@contextmanager
def _blaming(document, *path):
    """Give an InputError raised inside the place of a key."""
    try:
        yield
    except InputError as error:
        raise ConfigError(document.message(path, str(error))) from None
