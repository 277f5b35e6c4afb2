"""One position of the sun: where the light of every ray tube lands.

The tubes are worked off in generations. Each generation is lit, asks whether it sees the sun and
what its beams meet, and then every tube is one of

- *dark*: turned away from the sun, or in shadow;
- *gone*: all its rays meet the sky, or all meet something that is no receiver;
- *landed*: all its rays meet one chart and three corners describe its image well enough;
- *bounced*: all its rays meet one mirror: it goes on as a beam from there, once, and leaves its
  load on the mirror if that is a receiver too;
- *settled*: its rays disagree, and it is small: its receiver samples ask one by one;
- *halved*: anything else; the halves form the next generation, and inherit what is known.

Every watt is entered in a ledger as it goes.
"""

from __future__ import annotations

from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, field
from typing import Any, NamedTuple

import numpy as np

from causticload.light.blur import Blur, make_blur
from causticload.light.bounce import Reflected, bounce
from causticload.light.prepare import LitScene
from causticload.light.settle import settle
from causticload.light.splat import sample_counts, splat
from causticload.light.targets import (
    BLOCKED,
    MIRROR,
    SKY,
    UNKNOWN,
    count_sun,
    distinct_charts,
    find_targets,
    meanings_of,
    spread_targets,
)
from causticload.light.tubes import (
    GRAZES,
    LIT,
    TURNED_AWAY,
    Beams,
    Tubes,
    halve,
    image_errors,
    light_tubes,
)
from causticload.scene.model import Bools, Floats, Ints

# A tube is small enough when it misplaces the middle of an image's edge by less than this share
# of the radius of the sun's image...
LINEAR = 0.12
# ...or by less than this many metres, which no receiver cell or eye can tell.
LINEAR_FLOOR_M = 0.002
# A straddling tube with no more samples than this asks for each instead of being halved.
SETTLE_SAMPLES = 512
# Rays that share out the light of a settled tube among the sky, obstructions and mirrors.
SPREAD_RAYS = 16
# No tube is halved more often than this on its own account: 2^-20 of a facet is dust.
MOST_HALVINGS = 20
# A tube of which a corner ray runs along the plane that the others meet is halved this often.
SKIM_HALVINGS = 9
# A tube that straddles the edge of a mirror is halved this often; what is left is not followed.
MIRROR_HALVINGS = 7


class Generation(NamedTuple):
    """Tubes at work and what is known of them. ``n`` tubes."""

    tubes: Tubes
    sun: Floats  # (n,) share of the tube that sees the sun, or UNKNOWN
    target: Ints  # (n,) what the whole beam meets, or UNKNOWN
    age: Ints  # (n,) halvings so far

    def take(self, index: Ints | Bools) -> Generation:
        """Return the tubes at ``index``."""
        return Generation(
            self.tubes.take(index), self.sun[index], self.target[index], self.age[index]
        )


def halve_generation(parents: Generation, edge: Ints) -> Generation:
    """Halve tubes at an edge; the halves keep what holds for the whole of their parent."""
    sun = np.where(parents.sun == 1.0, 1.0, UNKNOWN)
    return Generation(
        halve(parents.tubes, edge),
        np.tile(sun, 2),
        np.tile(parents.target, 2),
        np.tile(parents.age + 1, 2),
    )


@dataclass
class Field:
    """What one position of the sun does, for a direct normal irradiance of 1 W/m²."""

    load: Floats  # (n,) reflected irradiance over direct normal irradiance, mean over cells [1]
    images: Ints  # (n,) reflected images of the sun in view
    ledger: dict[str, float]  # flux over direct normal irradiance [m²]
    tubes: int = 0  # tubes that landed or settled
    rays: int = 0
    bounced: list[Bounced] = field(default_factory=list)

    def merge(self, other: Field) -> None:
        """Add the light of other tubes under the same sun."""
        self.load += other.load
        self.images += other.images
        self.tubes += other.tubes
        self.rays += other.rays
        self.bounced += other.bounced
        for key, value in other.ledger.items():
            self.ledger[key] += value


class Bounced(NamedTuple):
    """Beams after a second reflection, as they were before it, and what made them."""

    beams: Beams
    sources: Beams
    tubes: Tubes
    sheet: Ints  # (k,) row of the sun's discs that blurs them
    kept: Floats  # (k,) share of their power that stays in the mirror direction
    shows: Bools  # (k,) they count as images of the sun
    mirror: Ints  # (k,) row of the tables of the second mirror


class _Landing(NamedTuple):
    """What beams off one sheet of a mirror come to. ``k`` beams."""

    code: Ints  # (k, 4)
    under: Ints  # (k, 4)
    ring: Ints  # (k,)
    edge: Ints  # (k,) where to halve those that are not fine
    fine: Bools  # (k,) small enough to be laid down, or none of this sheet's
    lands: Bools  # (k,) they meet one chart
    straddles: Bools  # (k,) they meet a chart and more


class _Images(NamedTuple):
    """How beams land on charts. ``p`` pairs of a beam and a chart."""

    beam: Ints  # (p,)
    chart: Ints  # (p,)
    error: Floats  # (p,) m, largest miss of the middle of an image's edge
    length: Floats  # (p,) m, longest edge of the image
    depth: Floats  # (p,) m, -1 where a corner ray does not reach the chart's plane
    rho: Floats  # (p,) m, radius of the sun's image
    samples: Floats  # (p,) samples in the footprint

    def any_of(self, holds: Bools, n: int) -> Bools:
        """Whether something holds of any chart of each of ``n`` beams."""
        result = np.zeros(n, bool)
        np.logical_or.at(result, self.beam, holds)
        return result

    def all_of(self, holds: Bools, n: int) -> Bools:
        """Whether something holds of every chart of each of ``n`` beams."""
        return ~self.any_of(~holds, n)

    def bent(self, age: Ints) -> Bools:
        """Whether three corners do not describe a beam's images, and halving may help, (n,)."""
        off = self.error > np.maximum(LINEAR * self.rho, LINEAR_FLOOR_M)
        skims = self.any_of(self.depth < 0.0, len(age))
        # A corner ray that runs along a plane never meets it: halve until that hardly matters.
        limit = np.where(skims, SKIM_HALVINGS, MOST_HALVINGS)
        return (skims | self.any_of(off, len(age))) & (age < limit)


LEDGER = (
    "intercepted",
    "absorbed",
    "receivers",
    "obstructions",
    "sky",
    "scattered",
    "unfollowed",
    "rereflected",
)


def solve_field(
    lit: LitScene, *, sun_direction: Floats, sun_radius: float, threads: int = 1
) -> Field:
    """Find where the light of every reflector lands for one position of the sun.

    Parameters
    ----------
    lit : LitScene
        The prepared scene.
    sun_direction : (3,) float
        Unit vector to the sun, scene frame.
    sun_radius : float
        Angular radius of the sun. [rad]
    threads : int
        Threads to share the tubes among.

    Returns
    -------
    field : Field
        Loads, images and ledger for a direct normal irradiance of 1 W/m².
    """
    blur = make_blur(*lit.rings(sun_radius))
    s = np.ascontiguousarray(sun_direction, dtype=np.float64)

    def work(share: Ints) -> Field:
        shown = lit.shows[lit.base.sheet[share]]
        own = _Walk(lit, s, blur).run(lit.base.take(share[shown]))
        if not shown.all():
            # Sheets that share one image of the sun with another sheet add light but no image.
            more = _Walk(lit, s, blur).run(lit.base.take(share[~shown]))
            more.images[:] = 0
            own.merge(more)
        return own

    shares = [np.arange(i, len(lit.base.facet), threads) for i in range(max(1, threads))]
    if len(shares) == 1:
        total = work(shares[0])
    else:
        with ThreadPoolExecutor(len(shares)) as pool:
            total, *rest = pool.map(work, shares)
        for part in rest:
            total.merge(part)
    # What a mirror that is a receiver too takes in is entered where the mirror is.
    landed = total.load * lit.point_areas
    total.ledger["receivers"] = float(landed[~lit.mirror_point].sum())
    return total


class _Walk:
    """The generations of one share of the tubes."""

    def __init__(self, lit: LitScene, s: Floats, blur: Blur) -> None:
        self.lit, self.s, self.blur = lit, s, blur
        n = lit.scene.point_count
        self.field = Field(np.zeros(n), np.zeros(n, np.int32), dict.fromkeys(LEDGER, 0.0))

    def run(self, base: Tubes) -> Field:
        """Work off all tubes."""
        n = len(base.facet)
        generation = Generation(
            base, np.full(n, float(UNKNOWN)), np.full(n, UNKNOWN, np.int32), np.zeros(n, np.int32)
        )
        while len(generation.age):
            generation = self._next(generation)
        return self.field

    def _next(self, generation: Generation) -> Generation:
        """Do what can be done with a generation and return the halves of the rest."""
        generation, beams = self._light(generation)
        if not len(generation.age):
            return generation
        code, under = self._targets(generation, beams)
        agreed = (code == code[:, :1]).all(axis=1)
        # The halves of a tube at a mirror ask again: which chart lies under it differs.
        passed_on = agreed & (code[:, 0] > MIRROR)
        generation = generation._replace(
            target=np.where(passed_on, code[:, 0], UNKNOWN).astype(np.int32)
        )
        receiving = ((code >= 0) | (code <= MIRROR)).any(axis=1)
        whole = agreed & (generation.sun == 1.0)

        def pick(mask: Any, *more: Ints) -> Any:
            return generation.take(mask), beams.take(mask), *(a[mask] for a in more)

        self._lose(*pick(~receiving, code))
        return join_generations(
            [
                self._land(*pick(whole & (code[:, 0] >= 0), code)),
                self._mirror(*pick(whole & (code[:, 0] <= MIRROR), under)),
                self._straddle(*pick(~whole & receiving, code, under)),
            ]
        )

    def _light(self, generation: Generation) -> tuple[Generation, Beams]:
        """Light a generation and leave out what is dark."""
        lit = self.lit
        beams, outcome = light_tubes(lit.F, lit.R, generation.tubes, sun_direction=self.s)
        sun = np.where(outcome == TURNED_AWAY, 0.0, generation.sun)
        asks = sun == UNKNOWN
        if asks.any():
            seen = count_sun(
                beams.take(asks),
                tracer=lit.tracer,
                sun_direction=self.s,
                clearance_m=lit.clearance_m,
            )
            self.field.rays += 4 * len(seen)
            sun[asks] = seen / 4.0
        generation = generation._replace(sun=sun)
        lost = np.flatnonzero((outcome == GRAZES) & (sun > 0.0))
        self._add("unfollowed", self._take_in(generation.take(lost), beams.take(lost)))
        keep = (outcome == LIT) & (sun > 0.0)
        if keep.all():
            return generation, beams
        return generation.take(keep), beams.take(keep)

    def _targets(self, generation: Generation, beams: Beams) -> tuple[Ints, Ints]:
        """Return what each beam's rays meet and the charts under mirrors, (n, 4) each.

        Rays are sent where it is not known.
        """
        code = np.repeat(generation.target[:, None], 4, axis=1)
        under = np.full(code.shape, -1, np.int32)
        asks = generation.target == UNKNOWN
        if asks.any():
            code[asks], under[asks] = self._find(beams.take(asks), generation.tubes.sheet[asks])
        return code, under

    def _find(self, beams: Beams, ring: Ints) -> tuple[Ints, Ints]:
        lit = self.lit
        self.field.rays += 4 * len(ring)
        return find_targets(
            beams,
            F=lit.F,
            meanings=lit.meanings,
            tracer=lit.tracer,
            reach=self.blur.reach,
            ring=ring,
            clearance_m=lit.clearance_m,
        )

    # The ledger -------------------------------------------------------------------------------

    def _add(self, key: str, value: Floats) -> None:
        self.field.ledger[key] += float(np.sum(value))

    def _take_in(self, generation: Generation, beams: Beams) -> Floats:
        """Enter what tubes take in, keep and scatter; return the flux they mirror on, (n,)."""
        tubes = generation.tubes
        crossing = tubes.area * np.abs(self.lit.F.face_normal[tubes.facet] @ self.s)
        # The sheets of one facet share the light that falls on it: the first one enters it.
        taken = generation.sun * crossing * self.lit.first_sheet[tubes.sheet]
        returned = generation.sun * beams.solar
        scattered = returned * self.lit.scatter[tubes.sheet]
        self._add("intercepted", taken)
        self._add("absorbed", taken - returned)
        self._add("scattered", scattered)
        return returned - scattered

    def _lose(self, generation: Generation, beams: Beams, code: Ints) -> None:
        """Enter tubes that no receiver and no mirror sees."""
        self._split_flux(self._take_in(generation, beams), code)

    def _split_flux(self, flux: Floats, code: Ints) -> None:
        """Enter flux that meets the sky or an obstruction, by the share of rays that do.

        Rays whose code is UNKNOWN carry no light and have no say.
        """
        said = np.maximum(1, (code != UNKNOWN).sum(axis=1))
        for key, holds in (("sky", code == SKY), ("obstructions", code == BLOCKED)):
            self._add(key, flux * (holds.sum(axis=1) / said))

    def _unfollowed(self, flux: Floats, code: Ints) -> None:
        """Enter flux that meets a mirror and is not followed from there."""
        said = np.maximum(1, (code != UNKNOWN).sum(axis=1))
        self._add("unfollowed", flux * ((code <= MIRROR).sum(axis=1) / said))

    # Beams that agree -------------------------------------------------------------------------

    def _land(self, generation: Generation, beams: Beams, code: Ints) -> Generation:
        """Lay whole beams on the chart they meet; return the halves of those too large."""
        chart = code[:, 0]
        edge, fine = self._is_fine(beams, chart, generation.tubes.sheet, generation.age)
        ready, landed = generation.take(fine), beams.take(fine)
        self._take_in(ready, landed)
        self._splat(
            landed, landed.solar * self._mirrored(ready.tubes.sheet), ready.tubes.sheet, chart[fine]
        )
        return halve_generation(generation.take(~fine), edge[~fine])

    def _mirrored(self, sheet: Ints) -> Floats:
        return 1.0 - self.lit.scatter[sheet]

    def _is_fine(self, beams: Beams, chart: Ints, ring: Ints, age: Ints) -> tuple[Ints, Bools]:
        """Return the edge to halve, and whether three corners describe the image well enough."""
        G = self.lit.grids
        every = np.arange(len(chart), dtype=np.int32)
        error, length, depth = image_errors(beams, every, o=G.origin[chart], n=G.normal[chart])
        rho = (depth + beams.longest) * self.blur.reach[ring]
        worst = error.max(axis=1)
        fine = (worst <= np.maximum(LINEAR * rho, LINEAR_FLOOR_M)) | (age >= MOST_HALVINGS)
        edge = np.where(worst > 0.0, error.argmax(axis=1), length.argmax(axis=1))
        # A corner ray that runs along the plane never meets it: halve until that hardly matters.
        skims = depth < 0.0
        fine[skims] = age[skims] >= SKIM_HALVINGS
        edge[skims] = _longest_edge(beams)[skims]
        return edge, fine

    def _splat(self, beams: Beams, factor: Floats, ring: Ints, chart: Ints) -> None:
        self.field.tubes += len(chart)
        splat(
            beams,
            factor=factor,
            blur=self.blur,
            ring=ring,
            chart=chart,
            grids=self.lit.grids,
            load=self.field.load,
            images=self.field.images,
        )

    # Beams that disagree ----------------------------------------------------------------------

    def _straddle(
        self, generation: Generation, beams: Beams, code: Ints, under: Ints
    ) -> Generation:
        """Settle small beams that straddle an edge; return the halves of the others."""
        ring = generation.tubes.sheet
        small = self._is_small(beams, code, ring, generation.age)
        old = generation.age >= np.where(
            (code <= MIRROR).any(axis=1), MIRROR_HALVINGS, MOST_HALVINGS
        )
        done = (small & ~(code <= MIRROR).any(axis=1)) | old
        ready, settled = generation.take(done), beams.take(done)
        spread, spread_under, sun = self._spread(settled, ring[done], ready.sun == 1.0)
        ready = ready._replace(sun=sun)
        flux = self._take_in(ready, settled)
        self._split_flux(flux, spread)
        self._unfollowed(flux, spread)
        self.field.tubes += len(ready.age)
        self._settle(
            settled,
            None,
            np.hstack([code[done], under[done], spread, spread_under]),
            ready.sun == 1.0,
            settled.solar * self._mirrored(ring[done]),
            ring[done],
        )
        return halve_generation(generation.take(~done), _longest_edge(beams)[~done])

    def _images(self, beams: Beams, charts: Ints, ring: Ints) -> _Images:
        """How each beam lands on each of the charts given for it, (n, 4)."""
        G = self.lit.grids
        beam, chart = distinct_charts(charts)
        error, length, depth = image_errors(beams, beam, o=G.origin[chart], n=G.normal[chart])
        rho = self.blur.reach[ring[beam]] * (depth + beams.longest[beam])
        return _Images(
            beam,
            chart,
            error.max(axis=1),
            length.max(axis=1),
            depth,
            rho,
            sample_counts(beams.frame[beam, 0], edge=length, rho=rho, chart=chart, grids=G),
        )

    def _is_bent(self, beams: Beams, charts: Ints, ring: Ints, age: Ints) -> Bools:
        """Whether a beam's corners do not tell well enough where it lands on its charts."""
        return self._images(beams, charts, ring).bent(age)

    def _is_small(self, beams: Beams, code: Ints, ring: Ints, age: Ints) -> Bools:
        """Whether asking for each sample costs less than halving the beam again."""
        images = self._images(beams, code, ring)
        count = np.bincount(images.beam, weights=images.samples, minlength=len(ring))
        few = count <= SETTLE_SAMPLES
        # Halving is of no use once the sun's own disc fills most of the footprint.
        dust = images.all_of(images.length <= images.rho, len(ring))
        skims = images.any_of(images.depth < 0.0, len(ring))
        # Which point of the tube a sample asks is found by its corners: they must tell enough.
        return (few | dust | skims) & ~images.bent(age)

    def _settle(
        self,
        beams: Beams,
        sources: Beams | None,
        code: Ints,
        sun_clear: Bools,
        factor: Floats,
        ring: Ints,
        *,
        alone: bool = False,
    ) -> None:
        """Settle beams on the charts that their rays meet.

        What hides a sample may be a receiver that no ray has met yet, such as the edge of a thin
        roof: it is settled too, unless the charts given are to stand ``alone``.
        """
        lit = self.lit
        beam, chart = distinct_charts(code)
        charts = len(lit.grids.spacing)
        known = np.zeros(0, np.int64)
        while len(beam):
            done = settle(
                beams,
                sources=sources,
                beam=beam,
                chart=chart,
                sun_clear=sun_clear,
                factor=factor,
                blur=self.blur,
                ring=ring,
                grids=lit.grids,
                tracer=lit.tracer,
                sun_direction=self.s,
                clearance_m=lit.clearance_m,
                load=self.field.load,
                images=self.field.images,
            )
            self.field.rays += done.rays
            if alone:
                return
            known = np.concatenate([known, beam.astype(np.int64) * charts + chart])
            met, below = meanings_of(done.triangle, done.direction, F=lit.F, meanings=lit.meanings)
            met = np.maximum(met, below)
            pair = done.beam[met >= 0].astype(np.int64) * charts + met[met >= 0]
            pair = np.setdiff1d(pair, known)
            beam, chart = (pair // charts).astype(np.int32), (pair % charts).astype(np.int32)

    def _spread(self, beams: Beams, ring: Ints, sun_clear: Bools) -> tuple[Ints, Ints, Floats]:
        """Share out beams whose rays disagree by more rays than the four that said so.

        Returns what each of (n, m) rays meets, UNKNOWN for one whose start does not see the sun;
        the charts under mirrors; and the share of each beam that sees the sun, (n,).
        """
        lit = self.lit
        code, under, seen = spread_targets(
            beams,
            F=lit.F,
            meanings=lit.meanings,
            tracer=lit.tracer,
            reach=self.blur.reach,
            ring=ring,
            clearance_m=lit.clearance_m,
            sun_direction=None if sun_clear.all() else self.s,
            rays=SPREAD_RAYS,
        )
        self.field.rays += code.size * (1 if sun_clear.all() else 2)
        seen[sun_clear] = True
        return np.where(seen, code, UNKNOWN).astype(np.int32), under, seen.mean(axis=1)

    # Beams that meet a mirror -----------------------------------------------------------------

    def _mirror(self, generation: Generation, beams: Beams, under: Ints) -> Generation:
        """Follow whole beams off the mirror they meet; return the halves of those too large."""
        lit = self.lit
        bent = self._is_bent(beams, under, generation.tubes.sheet, generation.age)
        halves = halve_generation(generation.take(bent), _longest_edge(beams.take(bent)))
        generation, beams, under = generation.take(~bent), beams.take(~bent), under[~bent]
        if not len(generation.age):
            return halves
        bounced = [
            bounce(
                beams,
                F=lit.F,
                R=lit.R,
                sheet_of=lit.sheet_of,
                sheets_met=lit.sheets_met,
                place=place,
                meanings=lit.meanings,
                tracer=lit.tracer,
                clearance_m=lit.clearance_m,
            )
            for place in range(int(lit.sheets_met.max()))
        ]
        self.field.rays += 6 * len(generation.age) * len(bounced)
        whole = np.logical_and.reduce([b.good for b in bounced])
        torn = ~whole
        lost = torn & (generation.age >= MIRROR_HALVINGS)
        flux = self._take_in(generation.take(lost), beams.take(lost))
        self._add("unfollowed", flux)
        self._add("rereflected", flux)
        self._settle_under(generation.take(lost), beams.take(lost), under[lost])
        again, edge = self._follow(
            generation.take(whole),
            beams.take(whole),
            [b.take(whole) for b in bounced],
            under[whole],
        )
        torn &= ~lost
        return join_generations(
            [
                halves,
                halve_generation(generation.take(torn), _longest_edge(beams.take(torn))),
                halve_generation(again, edge),
            ]
        )

    def _settle_under(self, generation: Generation, beams: Beams, under: Ints) -> None:
        """Leave the load of beams on the mirror they meet, where it is a receiver too."""
        ring = generation.tubes.sheet
        factor = beams.solar * self._mirrored(ring)
        self._settle(beams, None, under, generation.sun == 1.0, factor, ring, alone=True)

    def _follow(
        self, generation: Generation, before: Beams, bounced: list[Reflected], under: Ints
    ) -> tuple[Generation, Ints]:
        """Land beams after their second reflection; return those too large and where to halve."""
        landings = [self._landing(generation, before, b) for b in bounced]
        edge = np.zeros(len(generation.age), np.int32)
        for landing in landings:
            edge = np.where(landing.fine, edge, landing.edge)
        fine = np.logical_and.reduce([landing.fine for landing in landings])

        first = self._take_in(generation.take(fine), before.take(fine))
        self._add("rereflected", first)
        self._add("absorbed", first)
        self._settle_under(generation.take(fine), before.take(fine), under[fine])
        for b, landing in zip(bounced, landings, strict=True):
            rows = fine & b.meets
            if rows.any():
                self._leave(generation.take(rows), before.take(rows), b.take(rows), landing, rows)
        return generation.take(~fine), edge[~fine]

    def _landing(self, generation: Generation, before: Beams, b: Reflected) -> _Landing:
        """Find what the beams off one sheet of a mirror meet and whether they are small enough."""
        own, after = generation.tubes.sheet, b.beams
        # The wider of the two blurs stands for both where surfaces are rough.
        wider = self.blur.reach[b.sheet] > self.blur.reach[own]
        ring = np.where(wider, b.sheet, own).astype(np.int32)
        code, under = self._find(after, ring)
        agreed = (code == code[:, :1]).all(axis=1)
        lands = agreed & (code[:, 0] >= 0)
        edge = np.zeros(len(ring), np.int32)
        fine = np.ones(len(ring), bool)
        edge[lands], fine[lands] = self._is_fine(
            after.take(lands), code[lands, 0], ring[lands], generation.age[lands]
        )
        straddles = ~agreed & (code >= 0).any(axis=1)
        small = self._is_small(
            after.take(straddles), code[straddles], ring[straddles], generation.age[straddles]
        )
        fine[straddles] = small | (generation.age[straddles] >= MOST_HALVINGS)
        edge[straddles] = _longest_edge(after.take(straddles))
        bent = fine & self._is_bent(after, under, ring, generation.age)
        edge[bent] = _longest_edge(before.take(bent))
        return _Landing(code, under, ring, edge, (fine & ~bent) | ~b.meets, lands, straddles)

    def _leave(
        self, generation: Generation, before: Beams, b: Reflected, landing: _Landing, rows: Bools
    ) -> None:
        """Enter and lay down what one sheet of a mirror sends on."""
        own, after = generation.tubes.sheet, b.beams
        code, under, ring = landing.code[rows], landing.under[rows], landing.ring[rows]
        lands, straddles = landing.lands[rows], landing.straddles[rows]
        onward = self._mirrored(own) * self._mirrored(b.sheet)
        factor = after.solar * onward
        returned = after.solar * self._mirrored(own)
        self._add("absorbed", -returned)
        self._add("scattered", returned - factor)
        whole = ~straddles
        self._split_flux(factor[whole], code[whole])
        self._unfollowed(factor[whole], code[whole])
        self._splat(after.take(lands), factor[lands], ring[lands], code[lands, 0])
        self.field.tubes += int(straddles.sum())
        spread, _, _ = self._spread(
            after.take(straddles), ring[straddles], np.ones(straddles.sum(), bool)
        )
        self._split_flux(factor[straddles], spread)
        self._unfollowed(factor[straddles], spread)
        met = np.full((len(code), 8 + SPREAD_RAYS), UNKNOWN, np.int32)
        met[straddles, :4], met[:, 4:8], met[straddles, 8:] = code[straddles], under, spread
        self._settle(after, before, met, np.ones(len(code), bool), factor, ring)
        self.field.bounced.append(
            Bounced(after, before, generation.tubes, ring, onward, self.lit.shows[own], b.sheet)
        )


def join_generations(parts: list[Generation]) -> Generation:
    """Put generations together.

    Parameters
    ----------
    parts : list of Generation
        At least one.

    Returns
    -------
    generation : Generation
        All their tubes.
    """
    tubes = Tubes(*(np.concatenate(a) for a in zip(*(g.tubes for g in parts), strict=True)))
    return Generation(
        tubes, *(np.concatenate(a) for a in zip(*(g[1:] for g in parts), strict=True))
    )


def _longest_edge(beams: Beams) -> Ints:
    """Return the longest edge of each beam where it starts, (n,)."""
    corner = beams.start[:, :3]
    length = np.linalg.norm(np.roll(corner, -1, axis=1) - corner, axis=2)
    return length.argmax(axis=1)
