"""Facets that stand for a smooth surface: fitted, or as they are with a bar that holds the rest.

Exact values: sphere 4 pi eps0 R, disc 8 eps0 R (any textbook).
"""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from faceted_bodies import bowl, cylinder, disc, icosphere, uneven_sphere
from made_bodies import cube, soup, stl_binary, turned
from reference_formulas import two_spheres
from scenes import in_lengths

import bem
from bem.cli.main import main
from bem.extraction.solution import file_facet_bound, solve_round, sums
from bem.geometry.surface import Surface
from bem.panels.fitted import FittedFamily
from bem.panels.flat import FlatFamily
from bem.panels.mesh import Mesh
from bem.panels.rims import Rims
from bem.scene.placing import rotation

PART = "facets of the file"
DISC = 2.0 / np.pi


def solved(
    surface: Surface, smooth: bool | None, tolerance: float = 1e-2, **settings
) -> bem.CapacitanceResult:
    scene = bem.Scene(unit="m").add_conductor("ball", surface, smooth=smooth)
    return bem.extract(scene, tolerance, threads=1, **settings)


def miss(result: bem.CapacitanceResult, exact: float = 1.0) -> float:
    return abs(in_lengths(result.capacitance[0, 0]) - exact)


def bar(result: bem.CapacitanceResult) -> float:
    return float(in_lengths(result.error[0, 0]))


def share(result: bem.CapacitanceResult) -> float:
    """Of the bar, what the facets of the file make."""
    return float(in_lengths(result.budget[PART][0, 0]))


@pytest.fixture(scope="module")
def balls(tmp_path_factory: pytest.TempPathFactory) -> dict[tuple[int, bool | None], object]:
    """Results of spheres of 320 and 1280 facets, through binary STL files."""
    folder = tmp_path_factory.mktemp("balls")
    results = {}
    for times, facets in ((2, 320), (3, 1280)):
        path = folder / f"ball{facets}.stl"
        path.write_bytes(stl_binary(soup(turned(icosphere(times), times))))
        for smooth in (True, None):
            scene = bem.Scene(unit="m").add_conductor("ball", mesh=path, smooth=smooth)
            results[facets, smooth] = bem.extract(scene, 5e-3, threads=1)
    return results


@pytest.mark.parametrize("smooth", [True, None])
def test_sphere_files_approach_the_sphere(balls: dict, smooth: bool | None) -> None:
    coarse, fine = balls[320, smooth], balls[1280, smooth]
    assert miss(coarse) <= bar(coarse) and miss(fine) <= bar(fine)
    assert share(fine) < 0.3 * share(coarse)
    assert bar(fine) < bar(coarse)


def test_a_fit_is_worth_two_orders(balls: dict) -> None:
    for facets in (320, 1280):
        assert miss(balls[facets, True]) < 0.02 * miss(balls[320, None])
        assert balls[facets, True].converged


def test_facets_left_as_they_are_stop_the_run_when_only_they_matter(balls: dict) -> None:
    """Their share alone is above what 320 facets allow at this tolerance; 1280 do not hold up."""
    coarse, fine = balls[320, None], balls[1280, None]
    assert not coarse.converged and coarse.stopped_by == "faceting"
    assert share(coarse) > 0.9 * 5e-3
    assert "smooth = true" in str(coarse).replace("\n  ", " ")
    assert fine.converged


def test_the_statement_tells_sagitta_and_effect(balls: dict) -> None:
    """Estimated from the facets alone, within a tenth of what it is."""
    coarse = balls[320, None]
    (line,) = [w for w in coarse.warnings if "facets of" in w]
    assert line.startswith('facets of "ball" are up to 17.6')
    assert "larger" in line and "smooth = true" in line and "smooth = false" in line
    found = coarse.settings["facets"]["ball"]
    assert found["smooth"] is None and found["crease_degrees"] == pytest.approx(40.0)
    assert found["change"] == pytest.approx(miss(coarse), rel=0.1)
    assert found["largest_sagitta_m"] == pytest.approx(0.0178, rel=0.02)


def test_who_says_what_the_facets_are_hears_nothing(balls: dict) -> None:
    result = solved(icosphere(2), smooth=False)
    assert result.converged
    assert not [w for w in (*result.warnings, *balls[320, True].warnings) if "facets" in w]
    assert share(result) == 0.0
    assert miss(result) > bar(result)
    assert result.settings["facets"] == {}
    assert balls[320, True].settings["facets"]["ball"]["smooth"] is True


def test_flat_bodies_are_solved_as_ever() -> None:
    """Whatever is said of them: a cube has no soft edge."""
    plain, smooth = (solved(cube(), value) for value in (None, True))
    assert plain.capacitance == pytest.approx(smooth.capacitance, abs=0.0)
    assert share(plain) == 0.0 and plain.settings["facets"] == {}


def test_the_crease_angle_decides() -> None:
    """Twelve sides turn by 30 degrees."""
    scene = bem.Scene(unit="m").add_conductor("rod", cylinder(12), crease_degrees=25.0)
    result = bem.extract(scene, 2e-2, threads=1)
    assert result.settings["facets"] == {}
    assert solved(cylinder(12), None, 2e-2).settings["facets"]["ball"]["largest_sagitta_m"] > 0.03


@pytest.mark.parametrize("smooth", [True, None])
def test_polygons_for_a_disc(smooth: bool | None) -> None:
    result = solved(turned(disc(24), 2), smooth, 1e-2)
    assert miss(result, DISC) <= bar(result)
    assert share(result) > 1e-4


@pytest.mark.parametrize("smooth", [True, None])
def test_an_uneven_mesh_of_a_cylinder_and_a_sphere(smooth: bool | None) -> None:
    """Couplings too: both bodies against the same two as shapes with a true surface."""
    bodies = {
        "rod": (bem.cylinder(1.0, 2.0), cylinder(24)),
        "ball": (bem.sphere(1.0), uneven_sphere(160)),
    }
    results = []
    for k, say in ((0, None), (1, smooth)):
        scene = bem.Scene(unit="m")
        for shift, (name, pair) in enumerate(bodies.items()):
            place = bem.Place(shift=(3.0 * shift, 0.0, 0.0))
            scene.add_conductor(name, pair[k], smooth=say, place=place)
        results.append(bem.extract(scene, 1e-2, threads=1))
    exact, found = results
    apart = np.abs(exact.capacitance - found.capacitance)
    assert np.all(apart <= exact.error + found.error)


def test_one_family_for_each_fitted_body() -> None:
    ball, box = replace(icosphere(1), smooth=True), cube(center=(3.0, 0.0, 0.0))
    mesh = Mesh.start([box, ball])
    kinds = [type(family) for family in mesh.families]
    assert kinds == [FlatFamily, FittedFamily]
    assert mesh.bodies[0].sagitta == 0.0 and mesh.bodies[1].sagitta > 0.06
    assert mesh.faceting().offset[mesh.conductor == 1].min() > 0.0
    doubt = mesh.doubtful().offset
    assert np.all(doubt[mesh.conductor == 0] == 0.0) and np.all(doubt[mesh.conductor == 1] > 0.0)


def test_panels_of_facets_keep_sagitta_and_rims_when_cut() -> None:
    mesh = Mesh.start([disc(16), icosphere(1).placed(np.eye(3), np.array([0, 0, 3.0]))])
    before = mesh.doubtful()
    rng = np.random.default_rng(4)
    for _ in range(3):
        count = len(mesh.conductor)
        mesh, _ = mesh.refine(rng.random(count) < 0.4, rng.integers(0, 2, count))
    after = mesh.doubtful()
    area = [
        np.linalg.norm(_normals(m), axis=1) for m in (Mesh.start([disc(16)]).corners, mesh.corners)
    ]
    sheet = mesh.conductor == 0
    beyond = (after.rim_offset * area[1])[sheet].sum()
    assert beyond == pytest.approx(np.pi - area[1][sheet].sum(), rel=1e-3)
    assert np.unique(after.offset[~sheet]) == pytest.approx(
        np.unique(before.offset[before.offset > 0])
    )


def _normals(corners: np.ndarray) -> np.ndarray:
    return 0.5 * np.cross(corners[:, 2] - corners[:, 0], corners[:, 3] - corners[:, 1])


def test_sides_that_lie_on_a_rim() -> None:
    ends = np.array([[[0.0, 0, 0], [1, 0, 0]], [[1.0, 0, 0], [1.5, 0.5, 0]]])
    rims = Rims(0, ends, np.array([0.1, 0.2]), 1e-6)
    panels = np.array(
        [
            [[0.25, 0, 0], [0.5, 0, 0], [0.5, 1, 0], [0.25, 1, 0]],
            [[1.0, 0, 0], [1.25, 0.25, 0], [1.0, 1.0, 0], [1.0, 1.0, 0]],
            [[2.0, 0, 0], [3.0, 0, 0], [3.0, 1, 0], [2.0, 1, 0]],
        ]
    )
    found = rims.beyond(panels)
    np.testing.assert_array_equal(found, [[0.1, 0, 0, 0], [0.2, 0, 0, 0], [0, 0, 0, 0]])


def test_the_bound_is_a_plain_sum() -> None:
    """Twin of the first-order formula, panel by panel, on two solids."""
    mesh = Mesh.start([icosphere(1), icosphere(1).placed(np.eye(3), np.array([3.0, 0, 0]))])
    solution = solve_round(mesh, 2, 1.0, None)
    offset, area = mesh.doubtful().offset, solution.panels.area
    plain = np.zeros((2, 3))
    for s, d, a in zip(solution.density, offset, area, strict=True):
        columns = [*s, s.sum()]
        for i in range(2):
            for j in range(3):
                plain[i, j] += 4.0 * np.pi * a * abs(d * s[i] * columns[j])
    np.testing.assert_allclose(file_facet_bound(solution), plain, rtol=1e-12)
    np.testing.assert_allclose(sums(solution).files, plain, rtol=1e-12)


def scene_file(folder: Path, *lines: str) -> Path:
    (folder / "ball.stl").write_bytes(stl_binary(soup(icosphere(2))))
    text = ['unit = "mm"', "[[conductor]]", 'name = "ball"', 'mesh = "ball.stl"', *lines]
    path = folder / "scene.toml"
    path.write_text("\n".join(text), encoding="utf-8")
    return path


def test_keys_of_the_scene_file(tmp_path: Path) -> None:
    scene = bem.load_scene(scene_file(tmp_path, "smooth = true", "crease_degrees = 30"))
    surface = scene.conductors[0].surface
    assert surface.smooth is True
    assert surface.crease == pytest.approx(np.radians(30.0))
    plain = bem.load_scene(scene_file(tmp_path)).conductors[0].surface
    assert plain.smooth is None and plain.crease == pytest.approx(np.radians(40.0))


@pytest.mark.parametrize(
    ("line", "message"),
    [
        ("smooth = 1", "smooth: found 1, needs true or false"),
        ('smooth = "yes"', 'smooth: found "yes", needs true or false'),
        ("crease_degrees = 0", "crease_degrees: found 0, needs a number above 0"),
        ("crease_degrees = 120", "crease_degrees: found 120.0, needs an angle of at most 90"),
        ("smoth = true", 'unknown key "smoth"; did you mean "smooth"?'),
    ],
)
def test_values_that_do_not_fit(tmp_path: Path, line: str, message: str) -> None:
    with pytest.raises(bem.InputError) as problem:
        bem.load_scene(scene_file(tmp_path, line))
    assert message in str(problem.value)


def test_the_command_line_ends_with_the_remedy(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = str(scene_file(tmp_path))
    assert main(["extract", path, "--tolerance", "5e-3", "--threads", "1"]) == 4
    out = " ".join(capsys.readouterr().out.split())
    assert "give the conductor smooth = true" in out
    assert 'warning: facets of "ball" are up to' in out


@pytest.mark.parametrize(
    ("line", "note"),
    [
        ("", "off the curve that they seem to follow; give smooth = true to refine onto it"),
        ("smooth = true", "off the smooth surface fitted to them"),
        ("smooth = false", None),
    ],
)
def test_inspection_states_the_sagitta(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], line: str, note: str | None
) -> None:
    assert main(["inspect", str(scene_file(tmp_path, line))]) == 0
    out = capsys.readouterr().out
    if note is None:
        assert "facets of" not in out
    else:
        assert 'facets of "ball" are up to 17.63 um ' + note in out


def test_inspection_stops_looking_at_very_many_facets(monkeypatch: pytest.MonkeyPatch) -> None:
    from bem.scene import facet_notes

    scene = bem.Scene(unit="m")
    for k in range(3):
        scene.add_conductor(f"b{k}", icosphere(2), place=bem.Place(shift=(3.0 * k, 0.0, 0.0)))
    monkeypatch.setattr(facet_notes, "MOST_FACETS", 700)
    lines = facet_notes.facet_notes(scene.conductors)
    assert len(lines) == 3 and lines[-1].startswith("facets of the last 1 body not compared")


@pytest.mark.parametrize("count", [16, 32])
def test_a_bowl_is_inside_its_bar(count: int) -> None:
    """Open half sphere: a (1/2 + 1/pi) (Kelvin 1869, from memory)."""
    result = solved(bowl(count), True, 3e-3)
    assert result.converged
    assert miss(result, 0.5 + 1.0 / np.pi) <= bar(result)


def test_a_mirror_plane_along_edges_or_through_facets() -> None:
    """Half of a cylinder is solved; a plane through the middle of its facets is refused."""
    values = []
    for mirrored in (False, True):
        scene = bem.Scene(unit="m").add_conductor("rod", cylinder(24), smooth=True)
        if mirrored:
            scene.add_mirror_plane(x=0.0)
        values.append(bem.extract(scene, 5e-3, threads=1))
    whole, half = values
    apart = abs(whole.capacitance[0, 0] - half.capacitance[0, 0])
    assert apart <= whole.error[0, 0] + half.error[0, 0]
    assert half.panels < 0.75 * whole.panels
    turned_a_little = cylinder(24).placed(rotation((0.0, 0.0, 1.0), 7.5), np.zeros(3))
    scene = bem.Scene(unit="m").add_conductor("rod", turned_a_little, smooth=True)
    scene.add_mirror_plane(x=0.0)
    with pytest.raises(bem.InputError, match="half a facet does not show the smooth surface"):
        bem.extract(scene, 5e-3, threads=1)


def test_fitted_bodies_go_over_to_another_scene() -> None:
    """A gap that changes: both scenes on the same panels, so that nearly all errors cancel."""
    scenes = []
    for gap in (1.0, 1.01):
        scene = bem.Scene(unit="m")
        for k in range(2):
            place = bem.Place(shift=((2.0 + gap) * k, 0.0, 0.0))
            scene.add_conductor(f"ball {k}", icosphere(1), smooth=True, place=place)
        scenes.append(scene)
    found = bem.compare(*scenes, 2e-2, threads=1)
    exact = [two_spheres(1.0, 1.0, 2.0 + gap) for gap in (1.0, 1.01)]
    change = in_lengths(found.change[0, 1])
    assert abs(change - (exact[1] - exact[0])[0, 1]) <= in_lengths(found.change_error[0, 1])
    assert in_lengths(found.change_error[0, 1]) < 0.2 * abs(change)
