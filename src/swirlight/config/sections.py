"""The sections of a launch config except light: sample, forces, stages, exposures, record."""

from typing import Annotated

from pydantic import BeforeValidator, Field, WrapSerializer, model_validator

from swirlight.config.validate import Section
from swirlight.config.values import (
    Choice,
    Count,
    File,
    Flag,
    Number,
    Problems,
    Quantity,
    Text,
    Value,
    Vector,
)

Timestep = Annotated[float, Quantity("time", "0.0001 fs", "100 fs", example="2 fs")]
Stride = Annotated[float, Quantity("time", "0.0001 fs", "1 us", example="20 fs")]
Length = Annotated[float, Quantity("time", "0.0001 fs", "1 ms", example="10 ps")]


class SpeciesEntry(Section):
    """One kind of body and how many of it."""

    use: Annotated[str, File("acetonitrile", names=True)]
    count: Annotated[int, Count(1, 10_000_000, 256)]


class Sample(Section):
    """What is in the box, and its state."""

    species: tuple[SpeciesEntry, ...]
    density: Annotated[float | None, Quantity("density", "1e-6 g/cm^3", "30 g/cm^3")] = None
    edges: Annotated[
        tuple[float, float, float] | None,
        Vector("length", "0.1 nm", "10 um", example="3.1 3.1 3.1 nm"),
    ] = None
    begin_from: Annotated[str | None, File("other-run/starts/000.h5")] = None
    temperature: Annotated[float, Quantity("temperature", "0.01 K", "100000 K")]
    arrangement: Annotated[str, Choice("lattice")] = "lattice"

    @model_validator(mode="after")
    def _one_box(self):
        keys = ("begin_from", "density", "edges")
        given = [key for key in keys if getattr(self, key) is not None]
        problems = [((key,), f"{given[0]} is given too; expected only one of density, edges, "
                             "begin_from") for key in given[1:]]
        if not given:
            problems.append(((), "none of density, edges, begin_from is given; expected one, for "
                                 "example density: 0.777 g/cm^3"))
        if not self.species:
            problems.append((("species",), "a list of 0; expected at least one species, for "
                                           "example {use: acetonitrile, count: 256}"))
        names = [entry.use for entry in self.species]
        for i, name in enumerate(names):
            if name in names[:i]:
                problems.append((("species", i, "use"), f"{name} is listed twice; add the counts "
                                                        "and keep one entry"))
        if problems:
            raise Problems(*problems)
        return self


class Mesh(Section):
    """The mesh of the Ewald sum."""

    order: Annotated[int | None, Count(4, 8, 5)] = None
    spacing: Annotated[float | None, Quantity("length", "0.01 nm", "1 nm", "0.1 nm")] = None


class SiteName(Value):
    """A site of a species, ``water.O``."""

    def expected(self):
        return "a species and one of its sites, for example water.O"

    def read(self, value, folder=None):
        if not isinstance(value, str) or not all(value.partition(".")[::2]) or len(value) > 200:
            raise self.refusal(value)
        return value

    def schema(self):
        return {"type": "string", "pattern": r"^[^.]+\..+$"}


class PairOverride(Section):
    """Lennard-Jones parameters between two kinds of sites, in place of the mixed ones."""

    between: tuple[Annotated[str, SiteName()], ...]
    sigma: Annotated[float, Quantity("length", "0.01 nm", "10 nm", "0.33 nm")]
    epsilon: Annotated[float, Quantity("energy", "0 kJ/mol", "1000 kJ/mol")]

    @model_validator(mode="after")
    def _two_sites(self):
        if len(self.between) != 2:
            raise Problems((("between",), f"a list of {len(self.between)}; expected two sites, "
                                          "for example [water.O, acetonitrile.Me]"))
        return self

    @property
    def sites(self):
        """((species, label), (species, label))."""
        return tuple(tuple(name.partition(".")[::2]) for name in self.between)


class Forces(Section):
    """How the sites act on each other."""

    cutoff: Annotated[float, Quantity("length", "0.1 nm", "10 nm")] = "1.0 nm"
    cutoff_form: Annotated[
        str, Choice("switched", "tail-corrected", "force-shifted", "plain")] = "switched"
    electrostatics: Annotated[
        str, Choice("mesh-ewald", "direct-ewald", "reaction-field", "damped-shifted", "none")
    ] = "mesh-ewald"
    tolerance: Annotated[float, Number(1e-14, 0.1, 1e-4)] = 1e-4
    splitting: Annotated[
        float | None,
        Quantity("inverse length", "0.1 /nm", "100 /nm", words={"auto": None}),
    ] = "auto"
    mesh: Annotated[
        Mesh | None,
        BeforeValidator(lambda value: None if value == "auto" else value,
                        json_schema_input_type=Mesh | Annotated[str, Choice("auto")]),
        WrapSerializer(lambda mesh, write: write(mesh) if isinstance(mesh, Mesh) else "auto"),
    ] = "auto"
    mesh_every: Annotated[int, Count(1, 10, 2)] = 1
    reaction_permittivity: Annotated[
        float, Number(1.0, 1e9, 78.4, words={"conducting": float("inf")})] = "conducting"
    damping: Annotated[float, Quantity("inverse length", "0 /nm", "100 /nm")] = "2.0 /nm"
    mixing: Annotated[str, Choice("lorentz-berthelot", "geometric")] = "lorentz-berthelot"
    pairs: tuple[PairOverride, ...] = ()
    precision: Annotated[str, Choice("mixed", "double")] = "mixed"

    @model_validator(mode="after")
    def _mesh_every(self):
        if self.mesh_every > 1 and self.electrostatics != "mesh-ewald":
            raise Problems((("mesh_every",), f"{self.mesh_every}, and electrostatics is "
                            f"{self.electrostatics}, which has no mesh; expected 1, or "
                            "electrostatics: mesh-ewald"))
        return self


class Thermostat(Section):
    """What keeps the temperature."""

    method: Annotated[str, Choice("none", "langevin")]
    friction: Annotated[float | None, Quantity("rate", "0 /ps", "1e6 /ps")] = None
    acts_on: Annotated[str, Choice("all", "translation", "rotation")] = "all"

    @model_validator(mode="after")
    def _friction(self):
        if self.method == "langevin" and self.friction is None:
            raise Problems((("friction",), 'missing; expected a rate, for example "2 /ps"'))
        if self.method == "none" and self.friction is not None:
            raise Problems((("friction",), "belongs to method langevin, and method is none"))
        return self


class Stage(Section):
    """A stretch of time under fixed rules."""

    name: Annotated[str | None, Text("equilibrate", longest=100)] = None
    length: Length | None = None
    after_light: Annotated[
        float | None, Quantity("time", "0 ps", "1 ms", example="6 ps")] = None
    timestep: Timestep | None = None
    thermostat: Thermostat = Field(
        default_factory=lambda: {"method": "none"}, validate_default=True)
    lit: Annotated[bool, Flag()] = False

    @property
    def steps(self):
        """How many timesteps the stage has."""
        return round(self.length / self.timestep)

    @model_validator(mode="after")
    def _one_length(self):
        if self.after_light is not None and not self.lit:
            raise Problems((("after_light",), "only a lit stage can have it; expected length, for "
                                              'example "10 ps"'))
        if self.length is not None and self.after_light is not None:
            raise Problems((("after_light",), "length is given too; keep one of the two"))
        if self.length is None and self.after_light is None:
            raise Problems((("length",), 'missing; expected a time, for example "10 ps"'))
        return self


class Exposures(Section):
    """Which twins run from how many starts. `spacing` None: chosen while equilibrating."""

    kinds: tuple[Annotated[str, Choice("plus", "minus", "dark")], ...] = ("plus", "minus", "dark")
    starts: Annotated[int, Count(1, 100_000, 16)] = 16
    spacing: Annotated[float | None, Quantity("time", "0.0001 fs", "1 ms", "10 ps")] = None
    carrier_phases: Annotated[int, Count(1, 16, 2)] = 2

    @model_validator(mode="after")
    def _kinds(self):
        if not self.kinds or len(set(self.kinds)) < len(self.kinds):
            raise Problems((("kinds",), "expected each kind once, for example [plus, minus, dark]"))
        return self


VECTORS = ("position", "velocity", "force", "torque", "light_torque", "angular_momentum",
           "angular_velocity", "orientation", "axes", "dipole")  # fmt: skip


class Record(Section):
    """What is written, and how often."""

    every: Stride = "20 fs"
    vectors: tuple[Annotated[str, Choice(*VECTORS)], ...] = (
        "light_torque", "torque", "angular_momentum", "orientation")  # fmt: skip
    precision: Annotated[str, Choice("single", "double")] = "single"
    totals_every: Stride = "10 fs"

    @model_validator(mode="after")
    def _vectors(self):
        for i, name in enumerate(self.vectors):
            if name in self.vectors[:i]:
                raise Problems((("vectors", i), f"{name} is listed twice; keep one"))
        return self
