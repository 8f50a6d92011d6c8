"""One trajectory: stages one after the other, recorded, and resumed as if nothing had happened.

Steps of different stages may differ in length, so that time in a file is counted in ticks,
the greatest common divisor of the timesteps: one number for rows, segments and checkpoints.
A checkpoint holds the state, the ledger, what the neighbour list was built from, and the
frames of the unfinished segment. A step whose energies were recorded has its forces
calculated again with energies on resume: the same kernel, the same bits.
"""

import contextlib
import math
import time
from dataclasses import dataclass, field
from fractions import Fraction

from swirlight.errors import StopRequested
from swirlight.forces.field import ForceField
from swirlight.light.light import Light
from swirlight.motion.ledger import Ledger
from swirlight.motion.step import Mover
from swirlight.motion.thermostats import make_thermostat
from swirlight.store.durable import make_folder, write_json
from swirlight.store.writer import TrajectoryWriter, load_checkpoint, segment_steps

REPORT_EVERY = 1.0  # s between progress reports
SAVE_EVERY = 300.0  # s at most that a kill may cost; files do not depend on it


@dataclass(frozen=True)
class Leg:
    """One stage of a trajectory.

    steps : how many; timestep : [ps]
    thermostat : keyword arguments of `make_thermostat`.
    pulses, bias : the light of this stage, empty and None where there is none.
    """

    name: str
    steps: int
    timestep: float
    thermostat: dict
    pulses: tuple = ()
    bias: object = None


@dataclass(frozen=True)
class Clock:
    """Ticks of a sequence of legs. tick : [ps]; ratio : ticks in a step of each leg."""

    tick: float
    ratio: tuple

    @classmethod
    def of(cls, legs):
        """The coarsest clock that counts the steps of every leg."""
        steps = [Fraction(leg.timestep).limit_denominator(10**9) for leg in legs]
        common = math.lcm(*(s.denominator for s in steps))
        tick = Fraction(math.gcd(*(int(s * common) for s in steps)), common)
        return cls(float(tick), tuple(int(s / tick) for s in steps))

    def stride(self, interval):
        """An interval [ps] in whole ticks."""
        return round(interval / self.tick)


@dataclass
class Trajectory:
    """What is to be done; `travel` does it.

    system : System.
    legs : at least one Leg; clock : their Clock.
    recorder : Recorder, what is due when.
    header : a function box -> store Header.
    workdir, final : where it is kept under way and when complete.
    leg_done : called with (leg index, state) as each leg ends, before anything is removed.
    pace : steps per second of the last `travel`, everything included.
    """

    system: object
    legs: tuple
    clock: Clock
    recorder: object
    header: object
    workdir: object
    final: object
    leg_done: object = field(default=lambda index, state: None)
    pace: float = 0.0

    @property
    def steps(self):
        """Steps in all."""
        return sum(leg.steps for leg in self.legs)

    @property
    def ticks(self):
        """The same in ticks."""
        return sum(n.steps * r for n, r in zip(self.legs, self.clock.ratio, strict=True))

    def travel(self, begin, stop, report=lambda facts: None):
        """Run, or go on from the newest checkpoint, until the final file is in place.

        begin : function giving the first State; called only if there is no checkpoint.
        stop : has `requested()`; a request saves a checkpoint and raises StopRequested.
        report : called about once a second with {step, steps, rate, temperature, residual}.
        Returns the last State. Raises RunError when the work cannot be finished.
        """
        make_folder(self.workdir)
        saved = load_checkpoint(self.workdir)
        state = saved.payload["state"] if saved else begin()
        self._field = ForceField(self.system, state.box)
        header = self.header(state.box)
        size = segment_steps(header.elements, self.ticks)
        if saved:
            self._field.restore(saved.payload["field"])
            writer = TrajectoryWriter.reopen(self.workdir, header, size, saved)
            at = saved.payload["leg"], saved.payload["leg_step"]
            self._tick = saved.payload["tick"]
        else:
            writer = TrajectoryWriter.create(self.workdir, header, size)
            at, self._tick = (0, 0), 0
        self._writer, self._stop, self._report = writer, stop, report
        self._reported, self._timed_steps, self._seconds = 0.0, 0, 0.0
        self._saved = time.monotonic()
        try:
            for index in range(at[0], len(self.legs)):
                first = index == at[0]
                self._run_leg(state, index, at[1] if first else 0, saved if first else None)
            self.pace = self._timed_steps / self._seconds if self._timed_steps else None
            writer.finish(self.final)
        finally:
            writer.close()
        return state

    def _run_leg(self, state, index, done, saved):
        leg, recorder, writer = self.legs[index], self.recorder, self._writer
        mover = Mover(
            self.system, self._field, Light(self.system, leg.pulses, leg.bias), leg.timestep,
            make_thermostat(self.system, **leg.thermostat),
        )
        energies = recorder.energies_due
        mover.begin(state, done * leg.timestep, energies=energies(self._tick) or done == 0)
        if saved is not None and done > 0:
            mover.ledger = Ledger.from_array(saved.payload["ledger"])
        elif self._tick == 0:
            writer.append(0, recorder.frames(0, state, mover))
        for step in range(done + 1, leg.steps + 1):
            self._tick += self.clock.ratio[index]
            mover.advance(state, energies=energies(self._tick) or step == leg.steps)
            due = recorder.frames(self._tick, state, mover)
            if due:
                writer.append(self._tick, due)
            if writer.seal_due(self._tick) or time.monotonic() - self._saved > SAVE_EVERY:
                self._checkpoint(state, index, step, mover)
            number = self._stop.requested()
            if number:
                self._checkpoint(state, index, step, mover)
                self._tell(recorder, index, step, 0.0)
                raise StopRequested(state.step, number)
            now = time.monotonic()
            if step == done + 1:  # it may have compiled, which is no measure of pace
                started, before = now, step
            if now - self._reported > REPORT_EVERY:
                self._reported = now
                self._tell(recorder, index, step, (step - before) / max(now - started, 1e-9))
        if leg.steps > done:
            self._timed_steps += leg.steps - before
            self._seconds += time.monotonic() - started
        self.leg_done(index, state)

    def _checkpoint(self, state, index, step, mover):
        self._saved = time.monotonic()
        self._writer.checkpoint(self._tick, {
            "state": state,
            "field": self._field.memory(),
            "ledger": mover.ledger.to_array(),
            "leg": index,
            "leg_step": step,
            "tick": self._tick,
        })

    def _tell(self, recorder, index, step, rate):
        done = sum(leg.steps for leg in self.legs[:index]) + step
        facts = {"step": done, "steps": self.steps, "rate": rate, "stage": self.legs[index].name,
                 **recorder.latest}
        with contextlib.suppress(OSError):  # a full disk is the writer's to report
            write_json(self.workdir / "progress.json", facts, sync=False)
        self._report(facts)
