"""Questions to the worker, and what is done with each answer."""

import bpy

from . import handlers, reading, results, session


def load(scene, then=None):
    """Hand the scene over; ``then(scene)`` is called when it stands."""
    graph = bpy.context.evaluated_depsgraph_get()
    session.start()
    content = reading.export(scene, graph, session.folder())

    def done(job, answer):
        now = job.scene_now()
        if now is None:
            return
        handlers.loaded[now.name] = (answer, results.read_arrays(answer["arrays"]))
        now.causticload.assumed = "\n".join(
            [*answer["assumed"], *(f["message"] for f in answer["faults"])]
        )
        if then is not None:
            then(now)

    return session.ask("load", scene, done, scene=content, ground=scene.causticload.lay_ground)


def instant(scene):
    """Solve the instant that the scene's settings say."""
    return session.ask(
        "instant", scene, _show_instant, at=reading.local_time(scene), show=scene.causticload.shown
    )


def _show_instant(job, answer):
    scene = job.scene_now()
    if scene is None or scene.name not in handlers.loaded:
        return
    loaded, geometry = handlers.loaded[scene.name]
    if answer["key"] != loaded["key"]:
        return
    hot = answer["hottest"]
    arrays = results.read_arrays(answer["arrays"])
    values = {
        "irradiance": ("reflected", "FLOAT"),
        "images": ("images", "INT"),
        "total irradiance": ("total", "FLOAT"),
    }
    results.receivers(scene, loaded, geometry, arrays, answer["show"], values)
    text = "No reflected light on any receiver"
    if hot:
        text = (
            f"{hot['reflected_W_m2']:,.0f} W/m², {hot['suns']:.2f} suns, "
            f"{hot['images']} images on {hot['receiver']}"
        )
    results.describe(scene, answer, f"{answer['time']}: {text}")
    if scene.causticload.rays and hot:
        session.ask("contributors", scene, show_contributors)
    else:
        results.remove(scene, "rays")
        results.push("Sunlight: instant")


def show_contributors(job, answer):
    scene = job.scene_now()
    if scene is None or scene.name not in handlers.loaded:
        return
    loaded, geometry = handlers.loaded[scene.name]
    arrays = results.read_arrays(answer["arrays"])
    results.facade(scene, loaded, geometry, arrays)
    results.rays(scene, arrays["rays"], loaded["key"])
    results.push("Sunlight: panels")


def year(scene, folder):
    def note(job, content):
        left = content["seconds_left"]
        job.message = f"{content['stage']} {content['done']} of {content['total']}"
        if left is not None:
            job.message += f", about {max(1, round(left / 60))} min left"
        session.redraw()

    params = {"out": folder} if folder else {}
    return session.ask("year", scene, _show_year, note, **params)


def _show_year(job, answer):
    scene = job.scene_now()
    if scene is None:
        return
    s = scene.causticload
    s.rows.clear()
    for season in answer["seasons"]:
        row = s.rows.add()
        row.text, row.episode = season["text"], season["worst"]
        row.found = "\n".join(season["found"])
    s.folder = answer["folder"] or ""
    show_painted(job, answer)
    s.headline = f"{len(answer['seasons'])} findings in {answer['summary']['year']['year']}"
    if not answer["seasons"]:
        s.headline = "No exceedance found under these assumptions."
    s.cautions = "\n".join(answer["cautions"])


def show_painted(job, answer):
    scene = job.scene_now()
    if scene is None or scene.name not in handlers.loaded:
        return
    loaded, geometry = handlers.loaded[scene.name]
    arrays = results.read_arrays(answer["arrays"])
    values = {
        "peak irradiance": ("peak", "FLOAT"),
        "hours": ("hours", "FLOAT"),
        "images": ("images", "INT"),
    }
    results.receivers(scene, loaded, geometry, arrays, answer["show"], values)
    cautions = scene.causticload.cautions
    results.describe(scene, answer, scene.causticload.headline)
    scene.causticload.cautions = cautions
    results.push("Sunlight: year")


def moment(scene, episode):
    """Jump to an episode's peak."""

    def done(job, answer):
        now = job.scene_now()
        if now is None:
            return
        s, live = now.causticload, now.causticload.live
        date, clock = answer["local"].split("T")
        s.live = False  # setting the sliders must not ask again
        s.year, s.month, s.day = (int(x) for x in date.split("-"))
        hour, minute = clock.split(":")[:2]
        s.hour = int(hour) + int(minute) / 60.0
        s.live = live
        _show_instant(job, answer)
        frame(now, answer["place_m"], answer["size_m"])
        session.ask("contributors", now, show_contributors, episode=episode)

    return session.ask("moment", scene, done, episode=episode, show=scene.causticload.shown)


def frame(scene, place, size):
    """Turn every 3D view to a spot; the camera and the cursor stay."""
    from . import units

    metres = units.metres_per_unit(scene)
    for window in bpy.context.window_manager.windows:
        for area in window.screen.areas:
            if area.type == "VIEW_3D" and window.scene == scene:
                view = area.spaces.active.region_3d
                view.view_location = [x / metres for x in place]
                view.view_distance = max(8.0 * size, 25.0) / metres
