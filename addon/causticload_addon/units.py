"""The one place where Blender's units become metres, and back."""


def metres_per_unit(scene):
    """Metres that one Blender unit of a scene stands for."""
    return float(scene.unit_settings.scale_length) or 1.0
