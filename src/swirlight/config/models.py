"""The launch config: its sections, and the rules between them."""

import math
import pathlib
import re
from typing import Annotated

from pydantic import Field, PrivateAttr, field_validator, model_validator

from swirlight.config.light import BiasField, Pulse
from swirlight.config.reader import Document, parse_path
from swirlight.config.sections import Exposures, Forces, Record, Sample, Stage
from swirlight.config.validate import Section, plain
from swirlight.config.values import Count, Problems, Text, is_path

_LEADING_KEY = re.compile(r"([a-z_]+(?:\[\d+\])?(?:\.[a-z_]+(?:\[\d+\])?)*): ")


class Config(Section):
    """A launch config. Attributes are called as the keys; values are in internal units.

    Carriers are angular frequencies [rad/ps], angles in rad, intensities in W/cm², fluences in
    J/cm². Defaults that follow from other keys are filled in: centres of pulses, names and
    timesteps of stages, the length that `after_light` asks for.
    """

    title: Annotated[str, Text("Spinning up a chilled polar solvent")] = "untitled"
    seed: Annotated[int, Count(0, 2**63 - 1, 41)] = 41
    author: Annotated[str, Text("A. Person")] = "not given"
    sample: Sample
    forces: Forces = Field(default_factory=dict, validate_default=True)
    light: tuple[Pulse, ...] | None = ()
    bias_field: BiasField | None = None
    stages: tuple[Stage, ...]
    exposures: Exposures | None = None
    record: Record = Field(default_factory=dict, validate_default=True)
    output: Annotated[str, Text("runs/first", longest=1000)] = "runs/untitled"

    _path: pathlib.Path | None = PrivateAttr(None)
    _text: str = PrivateAttr("")
    _document: Document | None = PrivateAttr(None)

    @property
    def path(self):
        """The file the config was read from; None if it came from text."""
        return self._path

    @property
    def folder(self):
        """The folder of that file."""
        return self._path.parent if self._path else pathlib.Path(".")

    @property
    def text(self):
        """The file verbatim, without overrides."""
        return self._text

    def message(self, reason, key=""):
        """One line, ``FILE:LINE:COL: key: reason``, about something found after reading.

        reason : text; a key it begins with itself (``light[0]: ...``) wins over `key`.
        """
        named = _LEADING_KEY.match(reason)
        if named and (not key or named[1].startswith(re.match(r"\w+", key)[0])):
            key, reason = named[1], reason[named.end():]
        if self._document is None:
            return f"{key}: {reason}" if key else reason
        return self._document.message((key and parse_path(key)) or (), reason)

    def resolved(self):
        """The config as plain YAML values, every default written out, paths absolute.

        Reading it again gives an equal Config.
        """
        return plain(self)

    def __eq__(self, other):
        return isinstance(other, Config) and self.resolved() == other.resolved()

    __hash__ = None

    @field_validator("stages")
    @classmethod
    def _fill_stages(cls, stages):
        """Names, and timesteps of stages that take the one before."""
        if not stages:
            raise Problems(((), "a list of 0; expected at least one stage, for example "
                                "{length: 10 ps, timestep: 2 fs}"))
        timestep, names = None, []
        for number, stage in enumerate(stages, start=1):
            timestep = stage.timestep or timestep
            if timestep is None:
                raise Problems(((0, "timestep"), 'missing; expected a time, for example "2 fs"'))
            name = stage.name or f"stage-{number}"
            if name in names:
                raise Problems(((number - 1, "name"), f"there are two stages {name}; expected "
                                                      "different names"))
            names.append(name)
            stage.fill(timestep=timestep, name=name)
        return stages

    @model_validator(mode="after")
    def _agree(self):
        if self.light is None:
            self.fill(light=())
        problems = [*self._lit_stage()]
        if not problems:
            self._length_after_light()
            problems = [*self._whole_steps(), *self._exposed(), *self._pair_names()]
        if problems:
            raise Problems(*problems)
        return self

    def _lit_stage(self):
        """With light the last stage is lit, and no other; without light none is."""
        last = len(self.stages) - 1
        for i, stage in enumerate(self.stages):
            if stage.lit and not self.light:
                yield ("stages", i, "lit"), "true, but there is no light; remove it, or give light"
            elif stage.lit and i < last:
                yield ("stages", i, "lit"), "only the last stage can be lit; expected lit: true " \
                                            "there and nowhere else"
        if self.light and not any(stage.lit for stage in self.stages):
            yield ("stages", last), "there is light, but no stage is lit; expected lit: true in " \
                                    "the last stage"

    def _length_after_light(self):
        """Turn `after_light` into the length, rounded up to whole steps (of the mesh)."""
        stage = self.stages[-1]
        if stage.after_light is not None:
            wanted = max(0.0, *(pulse.end for pulse in self.light)) + stage.after_light
            block = self.forces.mesh_every
            steps = block * max(1, math.ceil(wanted / (block * stage.timestep) - 1e-6))
            # As few digits as the timestep has: what is printed reads back as the same number.
            length = float(f"{steps * stage.timestep:.12g}")
            stage.fill(length=length, after_light=None)

    def _whole_steps(self):
        """Every length and stride is a whole multiple of the timestep it is counted in.

        With a mesh that acts every n-th step: of n timesteps, from the beginning of each stage.
        """
        block = self.forces.mesh_every
        *unlit, recorded = self.stages if self.stages[-1].lit else (*self.stages, self.stages[-1])
        for i, stage in enumerate(self.stages):
            yield from _multiple(("stages", i, "length"), stage.length, stage, block)
            yield from _multiple(("record", "totals_every"), self.record.totals_every, stage,
                                 block)
        yield from _multiple(("record", "every"), self.record.every, recorded, block)
        if self.exposures and self.exposures.spacing and unlit:
            yield from _multiple(("exposures", "spacing"), self.exposures.spacing, unlit[-1],
                                 block)
        for i in range(1, len(self.stages) - 1) if block > 1 else ():  # sampled as one trajectory
            begin = sum(stage.length for stage in self.stages[:i])
            yield from _multiple(("stages", i), begin, self.stages[i], block,
                                 "with the stages before it, it begins at {}, which")

    def _exposed(self):
        if self.exposures is None:
            return
        lit_kinds = [kind for kind in self.exposures.kinds if kind != "dark"]
        if lit_kinds and not self.light:
            yield ("exposures", "kinds"), f"{' and '.join(lit_kinds)} without light; expected " \
                                          "light, or kinds: [dark]"
        if self.exposures.starts > 1 and len(self.stages) < 2:
            yield ("exposures", "starts"), f"{self.exposures.starts} starts need a stage before " \
                "the last, which is continued from one start to the next; expected such a stage, " \
                "or starts: 1"

    def _pair_names(self):
        """Species that pair overrides name are in the sample (files tell their names later)."""
        names = [entry.use for entry in self.sample.species]
        if any(is_path(name) for name in names):
            return
        for i, pair in enumerate(self.forces.pairs):
            for j, (species, _) in enumerate(pair.sites):
                if species not in names:
                    yield ("forces", "pairs", i, "between", j), f"{species} is not in the " \
                        f"sample; expected a site of {' or '.join(names)}"


def _multiple(path, length, stage, block, what="{}"):
    """A problem, if this is not a whole multiple of `block` of the stage's timesteps."""
    unit = block * stage.timestep
    ratio = length / unit
    if abs(ratio - round(ratio)) > 1e-6 or round(ratio) < 1:
        below = max(1, math.floor(ratio)) * unit
        steps = "the timestep" if block == 1 else f"{block} timesteps (forces.mesh_every)"
        yield path, f"{what.format(f'{length:.9g} ps')} is no whole multiple of {steps} of stage " \
                    f"{stage.name}, {unit:.9g} ps; expected one, for example " \
                    f'"{below:.9g} ps"'
