"""Scenes of figured panes for the tests of light, by way of the engine's own reader."""

from scenes import UniformDisc, table_finish

from causticload.light.prepare import prepare
from causticload.scene.build import build_scene
from causticload.study.model import FigureSpec, Model, Site, Study, SurfaceRule


def sheet(a, b, z=0.0, middle=(0.0, 0.0)):
    """Corners of a level rectangle that faces up."""
    x, y = middle
    return [(x - a / 2, y - b / 2, z), (x + a / 2, y - b / 2, z), (x + a / 2, y + b / 2, z),
            (x - a / 2, y + b / 2, z)]  # fmt: skip


def figured(folder, panes, settings, *, receiver=None, spacing=0.1, finish=None, more=(), **kw):
    """A lit scene of panes (polygons) with one figure.

    ``receiver`` is a polygon; ``more`` polygons of a flat mirror without figure.
    """
    lines, count = [], 0
    named = [(f"pane{k}", p) for k, p in enumerate(panes)]
    named += [("ground", receiver)] if receiver is not None else []
    named += [(f"plain{k}", p) for k, p in enumerate(more)]
    for name, corners in named:
        lines.append(f"o {name}")
        lines += ["v " + " ".join(repr(float(x)) for x in c) for c in corners]
        lines.append("f " + " ".join(str(count + i + 1) for i in range(len(corners))))
        count += len(corners)
    (folder / "panes.obj").write_text("\n".join(lines) + "\n")
    scene = build_scene(
        Study(
            title="",
            path=None,
            site=Site(latitude=50.0, longitude=0.0),
            model=Model(files=(folder / "panes.obj",)),
            surfaces=(
                SurfaceRule(match="pane*", roles=("reflector",), figure="f"),
                SurfaceRule(match="plain*", roles=("reflector",)),
                SurfaceRule(match="ground", roles=("receiver",), spacing=spacing),
            ),
            figures={"f": FigureSpec(name="f", settings=settings)},
        )
    )
    finishes = [finish or table_finish()] * len(scene.surfaces)
    return prepare(scene, finishes=finishes, disc=kw.get("disc", UniformDisc()))
