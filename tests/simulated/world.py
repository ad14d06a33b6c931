"""One imaginary solution room with its true lots, meters and solutions, and how a reading comes about in it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, replace
from typing import Any

import numpy as np

from reconcile.records.arrays import BoolArray, FloatArray, IntArray
from reconcile.records.substances import Form, catalogue
from tests.simulated import chemistry_of_truth as chemistry
from tests.simulated.recipes import BOTTLES, DILUTE_BASE, WEIGHED, bottles_in_turn, choose_templates

ROOT3 = np.sqrt(3.0)


@dataclass(frozen=True)
class Room:
    """What kind of room is simulated. Half-widths t as the auditor's defaults; true values are normal, sd t/sqrt 3.

    n_batches, n_meters, readings_per_batch : size; batches_per_lot_set : batches that one set of about 15 lots serves
    noise [pH], noise_shape ("normal" or "t4", of that sd), resolution of the displays [pH]
    spread : multiplies every spread: meters, lots, preparation, temperature, constants and noise
    lot_percent, preparation_percent, accuracy, span_percent, temperature_k : half-widths
    strength_shape : "normal" or "rectangular"
    pka_u : multiplies the table's standard uncertainty of every constant; davies : true coefficient
    session_sd, meter_day_sd : spread between calibration sessions, and between days of one meter [pH]
    same_meter_chance : chance that a second reading is on the meter of the first
    temperature_low, temperature_high : of the solutions when read [°C]
    single_use_lots : components taken from a lot used nowhere else; confined_lot : one lot only on one meter
    checks_per_meter : readings of known solutions; calibrations : a calibration sheet, weekly
    shares : multiplies how often a kind of solution is made; dilute_bases : batches of dilute hydroxide
    hand_calculation : the record carries its own calculated pH
    """

    n_batches: int = 40
    n_meters: int = 5
    readings_per_batch: int = 2
    batches_per_lot_set: int = 40
    noise: float = 0.012
    noise_shape: str = "normal"
    resolution: float = 0.01
    spread: float = 1.0
    lot_percent: float = 1.0
    preparation_percent: float = 0.3
    accuracy: float = 0.02
    span_percent: float = 0.5
    temperature_k: float = 0.5
    strength_shape: str = "normal"
    pka_u: float = 1.0
    davies: float = 0.3
    session_sd: float = 0.0
    meter_day_sd: float = 0.0
    same_meter_chance: float = 0.1
    temperature_low: float = 18.0
    temperature_high: float = 27.0
    weeks: int = 8
    single_use_lots: int = 0
    confined_lot: bool = False
    checks_per_meter: int = 0
    calibrations: bool = False
    shares: tuple[tuple[str, float], ...] = ()
    dilute_bases: int = 0
    hand_calculation: bool = False

    def but(self, **changes: Any) -> Room:
        """The same room with some settings changed; TypeError for one that does not exist."""
        return replace(self, **changes)


@dataclass
class World:
    """The truth in the making. Arrays: (s,) solutions, (c,) contributions, (l,) lots, (m,) meters, (n,) readings."""

    room: Room
    rng: np.random.Generator
    kind: list[str] = field(default_factory=list)
    made: FloatArray = field(default_factory=lambda: np.zeros(0))
    """Day each solution was made, from the first day of the record."""
    lot_label: list[str] = field(default_factory=list)
    lot_name: list[str] = field(default_factory=list)
    lot_factor: FloatArray = field(default_factory=lambda: np.zeros(0))
    solution: IntArray = field(default_factory=lambda: np.zeros(0, np.intp))
    label: list[str] = field(default_factory=list)
    actual: list[str] = field(default_factory=list)
    """Name of the form that really is in each contribution; the label says what should be."""
    lot: IntArray = field(default_factory=lambda: np.zeros(0, np.intp))
    amount: FloatArray = field(default_factory=lambda: np.zeros(0))
    factor: FloatArray = field(default_factory=lambda: np.zeros(0))
    """True over stated amount of each contribution, without its lot's factor."""
    co2: FloatArray = field(default_factory=lambda: np.zeros(0))
    read_solution: IntArray = field(default_factory=lambda: np.zeros(0, np.intp))
    meter: IntArray = field(default_factory=lambda: np.zeros(0, np.intp))
    day: FloatArray = field(default_factory=lambda: np.zeros(0))
    celsius: FloatArray = field(default_factory=lambda: np.zeros(0))
    celsius_true: FloatArray = field(default_factory=lambda: np.zeros(0))
    offset: FloatArray = field(default_factory=lambda: np.zeros(0))
    span: FloatArray = field(default_factory=lambda: np.zeros(0))
    pka_shift: dict[tuple[str, int], float] = field(default_factory=dict)
    sessions: list[tuple[int, float, str]] = field(default_factory=list)
    """Calibrations: meter, day, buffer lots joined by a comma."""
    known: FloatArray = field(default_factory=lambda: np.zeros(0))
    """True pH of the known solution of each reading; NaN for a reading of a batch."""
    errors: list[Callable[[FloatArray], FloatArray]] = field(default_factory=list)
    """Reading errors that faults add: true pH (n,) -> error (n,)."""
    displays: list[Callable[[FloatArray], FloatArray]] = field(default_factory=list)
    """What faults do to the numbers shown or written down."""
    calculated: list[Callable[[FloatArray], FloatArray]] = field(default_factory=list)
    taken: set[object] = field(default_factory=set)
    """Subjects that a fault has already, so that no two are planted on one."""

    def meter_name(self, index: int) -> str:
        return f"Meter {index + 1}"

    def batch_name(self, index: int) -> str:
        return f"B{index + 1:04d}"

    def form(self, name: str) -> Form:
        return catalogue().by_name[name]

    @property
    def weighed(self) -> BoolArray:
        return np.array([name in WEIGHED for name in self.label], bool)

    def true_ph(self, nominal: bool = False) -> FloatArray:
        """PH (n,) of what was read; nominal: as the labels, recipes, table and read temperatures say."""
        names = self.label if nominal else self.actual
        unique = list(dict.fromkeys(names))
        parts = [chemistry.brings(self.form(name)) for name in unique]
        acid_names = sorted({a for p in parts for a, _ in p.acids} | {"carbonic acid"})
        share = np.zeros((len(unique), len(acid_names) + 2))
        for i, part in enumerate(parts):
            for acid, units in part.acids:
                share[i, acid_names.index(acid)] = units
            share[i, -2:] = part.charge, part.squares
        which = np.array([unique.index(name) for name in names], np.intp)
        amount = self.amount / chemistry.KG_WATER_PER_LITRE
        if not nominal:
            amount = amount * self.factor * self.lot_factor[self.lot]
        content = np.zeros((len(self.made), share.shape[1]))
        np.add.at(content, self.solution, amount[:, None] * share[which])
        if not nominal:
            content[:, acid_names.index("carbonic acid")] += self.co2
        batch = np.isnan(self.known)
        rows = content[self.read_solution[batch]]
        ph = self.known.copy()
        ph[batch] = chemistry.solve_ph(
            rows[:, :-2],
            acid_names,
            rows[:, -2],
            rows[:, -1],
            (self.celsius if nominal else self.celsius_true)[batch],
            0.3 if nominal else self.room.davies,
            {} if nominal else self.pka_shift,
        )
        return ph

    def read(self, ph: FloatArray) -> FloatArray:
        """Displayed pH of every reading, from the true pH of what it reads."""
        room, rng, n = self.room, self.rng, len(self.meter)
        shown = ph + self.offset[self.meter] + self.span[self.meter] * (ph - 7.0)
        for error in self.errors:
            shown = shown + error(ph)
        if room.meter_day_sd:
            days = np.unique(np.stack([self.meter, self.day.astype(np.intp)], axis=1), axis=0, return_inverse=True)[1]
            shown = shown + rng.normal(0.0, room.meter_day_sd, n)[days.reshape(-1)]
        if room.session_sd:
            session = self.meter * 1000 + (self.day // 7).astype(np.intp)
            shown = shown + rng.normal(0.0, room.session_sd, session.max() + 1)[session]
        unit = rng.standard_normal(n) if room.noise_shape == "normal" else rng.standard_t(4, n) / np.sqrt(2.0)
        shown = np.round((shown + room.noise * room.spread * unit) / room.resolution) * room.resolution
        for change in self.displays:
            shown = change(shown)
        return np.asarray(np.round(shown, 6))


def build(room: Room, rng: np.random.Generator) -> World:
    """A clean world: recipes, lots, meters, readings, and all the small errors that a clean record holds."""
    world = World(room, rng)
    sets = max(1, round(room.n_batches / room.batches_per_lot_set))
    templates = choose_templates(rng, room.n_batches - room.dilute_bases, sets, dict(room.shares))
    for _ in range(room.dilute_bases):
        templates.insert(int(rng.integers(len(templates) + 1)), DILUTE_BASE)
    world.kind = [t.kind for t in templates]
    span = room.weeks * 7.0
    world.made = np.sort(rng.uniform(0.0, span - 2.0, room.n_batches))
    drawn = [t.draw(rng) for t in templates]
    world.solution = np.repeat(np.arange(room.n_batches), [len(t.substances) for t in templates])
    world.label = [s for t in templates for s in t.substances]
    world.actual = list(world.label)
    world.amount = np.array([float(f"{a:.3g}") for d in drawn for a in d])
    _open_bottles(world, sets)
    u = room.spread / ROOT3 / 100.0
    world.factor = np.exp(rng.normal(0.0, room.preparation_percent * u, len(world.amount)))
    world.co2 = np.zeros(room.n_batches)
    world.offset = rng.normal(0.0, room.accuracy * room.spread / ROOT3, room.n_meters)
    world.span = rng.normal(0.0, room.span_percent * u, room.n_meters)
    for acid in sorted({a for name in set(world.label) for a, _ in chemistry.brings(world.form(name)).acids}):
        for step, u_pka in enumerate(chemistry.acids()[acid].u, start=1):
            world.pka_shift[acid, step] = float(rng.normal(0.0, u_pka * room.pka_u * room.spread))
    _take_readings(world, span)
    return world


def _open_bottles(world: World, sets: int) -> None:
    room, rng = world.room, world.rng
    labels = np.array(world.label, object)
    world.lot = np.zeros(len(labels), np.intp)
    for substance, bottles in BOTTLES.items():
        uses = np.flatnonzero(labels == substance)
        if not len(uses):
            continue
        turn = bottles_in_turn(rng, len(uses), bottles * sets)
        world.lot[uses] = len(world.lot_label) + turn
        world.lot_label += [substance] * (int(turn.max()) + 1)
    for index in rng.choice(len(labels), room.single_use_lots, replace=False):
        world.lot[index] = len(world.lot_label)
        world.lot_label.append(world.label[index])
    count = dict.fromkeys(world.lot_label, 0)
    for label in world.lot_label:
        count[label] += 1
        initials = "".join(word[0] for word in label.split()).upper()
        world.lot_name.append(f"{initials}-{100 * (list(BOTTLES).index(label) + 1) + count[label]}")
    width = room.lot_percent / 100.0 * room.spread
    size = len(world.lot_label)
    drawn = (
        rng.normal(0.0, width / ROOT3, size) if room.strength_shape == "normal" else rng.uniform(-width, width, size)
    )
    world.lot_factor = np.exp(drawn)


def _take_readings(world: World, span: float) -> None:
    room, rng = world.room, world.rng
    n, r = room.n_batches, room.readings_per_batch
    if r <= room.n_meters:
        meters = np.argsort(rng.random((n, room.n_meters)), axis=1)[:, :r]
    else:
        meters = rng.integers(room.n_meters, size=(n, r))
    again = rng.random((n, r)) < room.same_meter_chance
    again[:, 0] = False
    meters = np.where(again, meters[:, :1], meters)
    if room.confined_lot:
        often = np.flatnonzero(np.bincount(world.lot) >= 3)
        lot = int(rng.choice(often))
        only = int(rng.integers(room.n_meters))
        meters[np.unique(world.solution[world.lot == lot])] = only
        world.taken.add(("confined", lot, only))
    wait = np.sort(rng.uniform(0.05, 1.5, (n, r)), axis=1)
    solution, meter, day = np.repeat(np.arange(n), r), meters.reshape(-1), (world.made[:, None] + wait).reshape(-1)
    known = np.full(n * r, np.nan)
    if room.checks_per_meter:
        checks = room.checks_per_meter * room.n_meters
        solution = np.concatenate([solution, np.full(checks, -1)])
        meter = np.concatenate([meter, np.tile(np.arange(room.n_meters), room.checks_per_meter)])
        day = np.concatenate([day, rng.uniform(0.0, span, checks)])
        known = np.concatenate([known, rng.choice([4.005, 6.865, 9.180], checks)])
    order = np.argsort(day, kind="stable")
    world.read_solution, world.meter, world.day, world.known = solution[order], meter[order], day[order], known[order]
    celsius = np.round(rng.uniform(room.temperature_low, room.temperature_high, len(order)), 1)
    world.celsius = np.where(np.isnan(world.known), celsius, 25.0)
    u = room.temperature_k * room.spread / ROOT3
    world.celsius_true = world.celsius + rng.normal(0.0, u, len(order)) * np.isnan(world.known)
    if room.calibrations:
        for week in range(room.weeks):
            buffers = ",".join(f"BUF{ph}-{'A' if week < room.weeks / 2 else 'B'}" for ph in (4, 7, 10))
            world.sessions += [(m, 7.0 * week, buffers) for m in range(room.n_meters)]
