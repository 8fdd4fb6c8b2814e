"""Deliberate faults, each a change of one line of source, and the tests that should see it."""

from __future__ import annotations

from dataclasses import dataclass

POTENTIAL = ("test_kernels_potential.py",)
PAIRS = ("test_kernels_pairs.py",)
FILL = ("test_kernels_fill.py",)
TARGETS = ("test_kernels_targets.py",)
WHOLE = ("test_extraction*.py", "test_exact*.py", "test_published*.py", "test_invariants*.py")


@dataclass(frozen=True)
class Fault:
    """One change.

    Args:
        what: in words.
        file: pattern of files below bem/.
        old: text that occurs exactly once in them.
        new: what takes its place.
        tests: files below tests/, or patterns of their names, or "file::test".
    """

    what: str
    file: str
    old: str
    new: str
    tests: tuple[str, ...]

    @property
    def compiled(self) -> bool:
        """Whether compiled code may hold the fault, so that no older cache may be used."""
        return self.file.startswith("kernels/")


KERNELS = (
    Fault(
        "solid angle added to the potential instead of subtracted",
        "kernels/*.py",
        "-= work[2, k] * angle",
        "+= work[2, k] * angle",
        POTENTIAL,
    ),
    Fault(
        "logarithm of a side cancels for points beyond its end",
        "kernels/*.py",
        "flip = t0 + t1 < 0.0",
        "flip = t0 + t1 < -1e300",
        POTENTIAL,
    ),
    Fault(
        "parallel rectangles: sign of the height in the last term",
        "kernels/*.py",
        "(uu + vv - 2.0 * ww) * r / 6.0",
        "(uu + vv + 2.0 * ww) * r / 6.0",
        PAIRS,
    ),
    Fault(
        "perpendicular rectangles: sign in a logarithm's factor",
        "kernels/*.py",
        "(uu / 2.0 - ww / 6.0) * aw",
        "(uu / 2.0 + ww / 6.0) * aw",
        PAIRS,
    ),
    Fault(
        "parallel polygons: orientation forgotten",
        "kernels/*.py",
        "return total if handed > 0.0 else -total",
        "return total",
        PAIRS,
    ),
    Fault(
        "far pairs: sign of the trace of the second moment",
        "kernels/*.py",
        "(3.0 * full * v2 - trace)",
        "(3.0 * full * v2 + trace)",
        FILL,
    ),
    Fault(
        "each pair taken from the row of the larger panel",
        "kernels/*.py",
        "if radius[i] < radius[j] else",
        "if radius[i] > radius[j] else",
        FILL,
    ),
    Fault(
        "a digit of the logarithm's series",
        "kernels/*.py",
        "0.1428571438032084",
        "0.1428571838032084",
        ("test_kernels_elementary.py",),
    ),
    Fault(
        "second moments of a panel halved",
        "kernels/*.py",
        "outer / 12.0",
        "outer / 24.0",
        TARGETS,
    ),
    Fault(
        "energy of a test function lacks its norm",
        "kernels/*.py",
        "square[:, 0] * 3.0",
        "square[:, 0]",
        TARGETS,
    ),
)

UNITS_AND_SIGNS = (
    Fault(
        "mil ten times too long",
        "units.py",
        '"mil": 2.54e-5',
        '"mil": 2.54e-4',
        ("test_units*.py", "test_invariants*.py"),
    ),
    Fault(
        "two digits of the electric constant swapped",
        "units.py",
        "EPS0 = 8.8541878188e-12",
        "EPS0 = 8.8451878188e-12",
        ("test_units*.py", "test_readme*.py", "test_exact*.py"),
    ),
    Fault(
        "permittivity of the surroundings ignored",
        "extraction/scaled.py",
        "EPS0 * scene.relative_permittivity * length",
        "EPS0 * length",
        (*WHOLE, "test_cli_extract.py"),
    ),
    Fault(
        "bodies turned the wrong way",
        "scene/placing.py",
        "+ sin * across",
        "- sin * across",
        ("test_scene*.py",),
    ),
    Fault(
        "mutual capacitances with the sign of the matrix",
        "results/result.py",
        "0.0 - self.capacitance",
        "0.0 + self.capacitance",
        ("test_results.py",),
    ),
    Fault(
        "allowance of an entry without the root",
        "results/result.py",
        "size = np.sqrt(np.abs(np.diagonal(self.capacitance)))",
        "size = np.abs(np.diagonal(self.capacitance))",
        ("test_results.py",),
    ),
)

BARS = (
    Fault(
        "indicator of couplings summed without signs",
        "extraction/solution.py",
        "signed=w.T @ every",
        "signed=np.abs(w).T @ np.abs(every)",
        WHOLE,
    ),
    Fault(
        "extrapolation in the wrong direction",
        "extraction/estimate.py",
        "+ _kappa(rounds)[0] * last.signed",
        "- _kappa(rounds)[0] * last.signed",
        WHOLE,
    ),
    Fault(
        "faceting effect of curved bodies with the wrong sign",
        "extraction/estimate.py",
        "* last.signed + last.faceting",
        "* last.signed - last.faceting",
        WHOLE,
    ),
    Fault(
        "bar without its parts of discretisation",
        "extraction/estimate.py",
        "wide * (SHARE + DOUBT * doubt) * last.absolute",
        "0.0 * (SHARE + DOUBT * doubt) * last.absolute",
        WHOLE,
    ),
    Fault(
        "bar without the trend of the value",
        "extraction/estimate.py",
        '"trend": wide * trend',
        '"trend": 0.0 * trend',
        WHOLE,
    ),
    Fault(
        "bar of a row sum left out",
        "extraction/extract.py",
        "row_sum_error=bar[:, -1]",
        "row_sum_error=0.0 * bar[:, -1]",
        WHOLE,
    ),
    Fault(
        "panels halved in the worse direction",
        "extraction/marking.py",
        "(promise[1] > promise[0])",
        "(promise[1] < promise[0])",
        ("test_extraction_estimate.py",),
    ),
    Fault(
        "density keeps the scaling of the solver",
        "solve/dense.py",
        "density = scale[:, None] * cho_solve",
        "density = cho_solve",
        WHOLE,
    ),
)

PANELS_AND_EXPORTS = (
    Fault(
        "a half of each cut quadrilateral lost, the other doubled",
        "panels/flat.py",
        "[self.corners[kept], near, rest]",
        "[self.corners[kept], near, near]",
        ("test_panels_flat.py",),
    ),
    Fault(
        "starting mesh blind to facing conductors",
        "panels/flat.py",
        "GRADE_STOP = 1.5",
        "GRADE_STOP = 1e9",
        ("test_panels_flat.py",),
    ),
    Fault(
        "cut through one corner too far",
        "panels/split.py",
        "np.where(first, c1, high), c2",
        "np.where(first, c1, high), high",
        ("test_panels_flat.py",),
    ),
    Fault(
        "saved row sums without their bars",
        "exports/record.py",
        '"row_sum_error_F": result.row_sum_error',
        '"row_sum_error_F": result.row_sum',
        ("test_results.py",),
    ),
    Fault(
        "columns of the CSV file exchanged",
        "exports/csv_file.py",
        "result.capacitance[i, j], result.error[i, j]",
        "result.error[i, j], result.capacitance[i, j]",
        ("test_exports_csv.py",),
    ),
)

COMPARISON = (
    Fault(
        "change of the indicator not extrapolated",
        "extraction/change.py",
        "r.value + kappa * r.signed + r.faceting",
        "r.value + r.faceting",
        ("test_compare_bars.py",),
    ),
    Fault(
        "changes of opposite sign cancel in the bar",
        "extraction/change.py",
        "np.abs(b[:, i, None] * all_b - a[:, i, None] * all_a).sum(axis=0)",
        "np.abs((b[:, i, None] * all_b - a[:, i, None] * all_a).sum(axis=0))",
        ("test_compare_bars.py",),
    ),
    Fault(
        "panels count as unmoved though a plane moved",
        "panels/transport.py",
        "if before.planes != after.planes:",
        "if before.planes is None:",
        ("test_compare_panels.py",),
    ),
    Fault(
        "panels of a curve in another order than before",
        "panels/curved.py",
        'order[np.argsort(self.leaf, kind="stable")] = np.argsort(leaf, kind="stable")',
        'order[:] = np.argsort(leaf, kind="stable")',
        ("test_compare_panels.py",),
    ),
    Fault(
        "the way back has the sign of the way there",
        "extraction/compare.py",
        "change=0.0 - found.change",
        "change=found.change",
        ("test_compare.py::test_the_finer_start_serves_both_ways",),
    ),
    Fault(
        "the limit is held against the change without its bar",
        "results/comparison.py",
        "if not size[i, j] + bar[i, j] <= limit",
        "if not size[i, j] <= limit",
        ("test_compare_results.py",),
    ),
)

REDUCTION = (
    Fault(
        "floating conductors a hundredth short of their potentials",
        "results/reduction.py",
        "self.kept - self.floating @ np.linalg.solve(inner, drive)",
        "self.kept - self.floating @ np.linalg.solve(inner, 0.99 * drive)",
        ("test_reduce.py",),
    ),
    Fault(
        "bars of floating conductors left out of those of the terminals",
        "results/reduction.py",
        "first = np.abs(weights).T @ applied",
        "first = nodes.kept.T @ applied",
        ("test_reduce.py",),
    ),
    Fault(
        "second order of the floating potentials left out of the bars",
        "results/reduction.py",
        "np.asarray(moved[:, :-1].T @ inverse @ moved)",
        "np.asarray(0.0 * moved[:, :-1].T @ inverse @ moved)",
        ("test_reduce.py",),
    ),
    Fault(
        "bars of row sums counted as nothing in those of the terminals",
        "results/reduction.py",
        "np.column_stack([matrix.bar, matrix.row_bar])",
        "np.column_stack([matrix.bar, 0.0 * matrix.row_bar])",
        ("test_reduce.py",),
    ),
    Fault(
        "what is tied to ground stays a terminal",
        "results/wiring.py",
        "(GROUNDED, TERMINAL, FLOATING) if s in states",
        "(TERMINAL, GROUNDED, FLOATING) if s in states",
        ("test_reduce.py",),
    ),
)

PLANES = (
    Fault(
        "images behind the ground have the sign of the charge",
        "geometry/planes.py",
        "np.array([(-1.0) ** sum(np.logical_and",
        "np.array([1.0 ** sum(np.logical_and",
        ("test_planes.py", "test_published.py::test_records_at_a_thousandth"),
    ),
    Fault(
        "the half reported for the whole",
        "extraction/scaled.py",
        "farad * planes.multiplicity",
        "farad",
        ("test_planes.py",),
    ),
    Fault(
        "lids in a mirror plane stay",
        "geometry/clip.py",
        "((high > 0.0) | in_plane)",
        "((high >= 0.0) | in_plane)",
        ("test_planes.py",),
    ),
    Fault(
        "a sheet in a mirror plane counts once in its energy",
        "kernels/images.py",
        "np.where(apart <= COINCIDENT * panels.radius[: len(layer)], weight, 0.0).sum(axis=0)",
        "weight[0]",
        ("test_planes.py",),
    ),
    Fault(
        "the kept part of a turn begins at the wrong angle",
        "geometry/symmetry.py",
        "np.arctan2(-a, b)",
        "np.arctan2(a, b)",
        ("test_planes.py",),
    ),
    Fault(
        "panels do not see how near the ground is",
        "panels/facing.py",
        "patch.owner if sign > 0.0 else opposite for sign in signs",
        "patch.owner for _ in signs",
        ("test_planes.py",),
    ),
)

FILES_AND_FITS = (
    Fault(
        "a file's own unit is not looked at",
        "geometry/reading/files.py",
        "_check_unit(mesh.unit, metres_per_unit)",
        "_check_unit(None, metres_per_unit)",
        ("test_geometry_files*.py",),
    ),
    Fault(
        "moves of welded seams are not in the bar",
        "geometry/repair/seams.py",
        "max(surface.rounding, move)",
        "surface.rounding",
        ("test_repair*.py",),
    ),
    Fault(
        "fitted surfaces without doubt",
        "geometry/fit/fit.py",
        "FIT = 1.0 / 3.0",
        "FIT = 0.0",
        ("test_fit*.py", "test_faceted_files.py"),
    ),
    Fault(
        "normals weighted by the area of facets",
        "geometry/fit/normals.py",
        "np.maximum(np.sin(angle), 0.0) * np.exp(-sides)",
        "np.maximum(np.sin(angle), 0.0) * np.exp(sides)",
        ("test_fit.py",),
    ),
)

MIXED = ("test_operators_mixed.py",)
LOSSES = ("test_extraction_lossy.py",)
REGIONS = ("test_regions.py",)

DIELECTRICS = (
    Fault(
        "interface: sides of the step in permittivity exchanged",
        "operators/mixed.py",
        "return back - front",
        "return front - back",
        MIXED,
    ),
    Fault(
        "interface: sum of both permittivities for their mean",
        "operators/mixed.py",
        "return self.share[:, 0] * back + self.share[:, 1] * front",
        "return back + front",
        MIXED,
    ),
    Fault(
        "double layer of the surroundings lacks the sphere at infinity",
        "operators/mixed.py",
        "seen[:, SURROUNDINGS] += FOUR_PI",
        "seen[:, SURROUNDINGS] += 0.0",
        MIXED,
    ),
    Fault(
        "what the double layer misses is added to the system instead of put right",
        "operators/mixed.py",
        "out[rows, column[rows]] -= weight * self.missed[rows, region]",
        "out[rows, column[rows]] += weight * self.missed[rows, region]",
        MIXED,
    ),
    Fault(
        "adjoint residual of conductors with the wrong sign",
        "operators/mixed.py",
        "np.concatenate([-on_metal, on_interfaces])",
        "np.concatenate([on_metal, on_interfaces])",
        MIXED,
    ),
    Fault(
        "interface moved: its tangential field takes away what it should add",
        "extraction/mixed.py",
        "((back - front) / (FOUR_PI * direct**2))[:, None]",
        "((front - back) / (FOUR_PI * direct**2))[:, None]",
        MIXED,
    ),
    Fault(
        "interface moved: its normal field counts by the inverse permittivities",
        "extraction/mixed.py",
        "back * front / np.where(apart, back - front, 1.0)",
        "1.0 / np.where(apart, back - front, 1.0)",
        MIXED,
    ),
    Fault(
        "hollow conductor moved: media on its sides taken for one",
        "extraction/mixed.py",
        "half = 0.5 * FOUR_PI * direct * self.charge[rows, 0, column]",
        "half = 0.0 * FOUR_PI * direct * self.charge[rows, 0, column]",
        LOSSES,
    ),
    Fault(
        "loss with the sign of a gain",
        "extraction/lossy.py",
        "0.0 - omega * value.imag",
        "omega * value.imag",
        LOSSES,
    ),
    Fault(
        "bars of conductances are those of capacitances",
        "extraction/lossy.py",
        "omega * bar[square]",
        "bar[square]",
        LOSSES,
    ),
    Fault(
        "complex permittivities not taken relative to the surroundings",
        "extraction/lossy.py",
        "for medium in media]) / scene.relative_permittivity",
        "for medium in media])",
        LOSSES,
    ),
    Fault(
        "conductivity over the frequency instead of the angular frequency",
        "scene/material.py",
        "/ (2.0 * math.pi * frequency * EPS0)",
        "/ (frequency * EPS0)",
        ("test_scene_dielectrics.py", *LOSSES),
    ),
    Fault(
        "a dielectric counts before the conductor that it overlaps",
        "geometry/regions/sides.py",
        "np.where(metal, METAL, highest)",
        "np.where(metal & (highest == SURROUNDINGS), METAL, highest)",
        REGIONS,
    ),
    Fault(
        "faces that coincide are given by both bodies",
        "geometry/regions/sides.py",
        "kept = (lies_on.argmax(axis=1) == index) &",
        "kept = (lies_on.argmax(axis=1) >= 0) &",
        REGIONS,
    ),
    Fault(
        "insides of bodies with triangles in common on the wrong side",
        "geometry/regions/matching.py",
        "np.where(ahead, BEHIND, BEFORE)",
        "np.where(ahead, BEFORE, BEHIND)",
        REGIONS,
    ),
    Fault(
        "a sheet in a mirror plane keeps the region of the other side",
        "geometry/part_folding.py",
        "part.front if normal[mirror.axis] > 0.0",
        "part.front if normal[mirror.axis] < 0.0",
        ("test_part_folding.py",),
    ),
    Fault(
        "mirrored interfaces with normals that are not mirrored",
        "geometry/planes.py",
        "(-1.0) ** sum(f) for f in flipped",
        "1.0 ** sum(f) for f in flipped",
        ("test_planes_dielectric.py",),
    ),
    Fault(
        "second moment of the double layer lacks the solid angle",
        "kernels/moments.py",
        "h * xx - flat + x * (kx - gx)",
        "h * xx + x * (kx - gx)",
        ("test_kernels_moments.py",),
    ),
    Fault(
        "panels of both kinds in one plane do not see each other",
        "kernels/mixed_near.py",
        "if not flat or metal != charged:",
        "if not flat:",
        ("test_kernels_mixed.py",),
    ),
    Fault(
        "layers: a wave begins with the permittivity where it ends",
        "kernels/reflection.py",
        "found = found / permittivity[first]",
        "found = found / permittivity[last]",
        ("test_layers.py",),
    ),
    Fault(
        "layers: the way back has the heights of the way there",
        "kernels/layered.py",
        "self._replace(shift=-self.flip * self.shift, pair",
        "self._replace(shift=self.shift, pair",
        ("test_layers.py",),
    ),
    Fault(
        "layers not taken relative to the surroundings",
        "scene/layering.py",
        "tuple(value / scene.relative_permittivity for value in values)",
        "tuple(values)",
        ("test_layers_values.py::test_relative_to_the_surroundings",),
    ),
    Fault(
        "a half-space on the other side of its plane",
        "scene/stack.py",
        "both[::-1] if self.above else both",
        "both if self.above else both[::-1]",
        ("test_scene_dielectrics.py",),
    ),
)

FAULTS: tuple[Fault, ...] = (
    KERNELS
    + UNITS_AND_SIGNS
    + BARS
    + PANELS_AND_EXPORTS
    + PLANES
    + FILES_AND_FITS
    + DIELECTRICS
    + REDUCTION
    + COMPARISON
)
