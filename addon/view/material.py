"""The material that shows temperatures: emission in the scale's colour of the kelvin on each vertex."""

from __future__ import annotations

import bpy

from .colours import NO_VALUE, ColourMap
from .scale import Scale

# The renderer takes an attribute named ``temperature`` for that of a volume, and finds none on a surface; the material
# therefore reads the same kelvin under a name of their own.
SHOWN = "shown_temperature"

FRACTION = "fraction of the range"

# Where nothing is known this is written for kelvin: far below KNOWN, which is below any difference of temperatures.
UNKNOWN, KNOWN = -1e7, -1e4

# Linear light, 0..1.
Colour = tuple[float, float, float]

# What light and mirrors see of a part in place of its colours, so that the colours do not glow on what stands by.
SEEN_BY_LIGHT = (0.2, 0.2, 0.2, 1.0)


def paint(material: bpy.types.Material, scale: Scale) -> None:
    """Make ``material`` show the temperatures of ``scale``; its nodes are built anew.

    The range is mapped and the colour looked up at each pixel, so that the colour is that of the temperature there and
    not a blend of the corners' colours. To the camera the surface is the plain colour, whatever the light.
    """
    tree = _emptied(material)
    temperature = tree.nodes.new("ShaderNodeAttribute")
    temperature.attribute_name = SHOWN
    fraction = tree.nodes.new("ShaderNodeMapRange")
    fraction.name = FRACTION
    set_range(material, scale)
    ramp = tree.nodes.new("ShaderNodeValToRGB")
    _fill(ramp.color_ramp, scale.colour_map)
    tree.links.new(temperature.outputs["Fac"], fraction.inputs["Value"])
    tree.links.new(fraction.outputs["Result"], ramp.inputs["Fac"])
    is_known = tree.nodes.new("ShaderNodeMath")
    is_known.operation = "GREATER_THAN"
    is_known.inputs[1].default_value = KNOWN
    tree.links.new(temperature.outputs["Fac"], is_known.inputs[0])
    either = tree.nodes.new("ShaderNodeMix")
    either.data_type = "RGBA"
    unknown, known = (socket for socket in either.inputs if socket.type == "RGBA")
    unknown.default_value = (*NO_VALUE, 1.0)
    tree.links.new(is_known.outputs[0], either.inputs[0])
    tree.links.new(ramp.outputs["Color"], known)
    _show_to_camera(material, next(socket for socket in either.outputs if socket.type == "RGBA"))


def set_range(material: bpy.types.Material, scale: Scale) -> None:
    """Let a material that was painted show another range; its nodes stay, so that nothing is compiled anew."""
    fraction = material.node_tree.nodes[FRACTION]
    fraction.inputs["From Min"].default_value = scale.low
    fraction.inputs["From Max"].default_value = scale.high


def paint_plain(material: bpy.types.Material, colour: Colour) -> None:
    """Make ``material`` one colour whatever the light."""
    tree = _emptied(material)
    plain = tree.nodes.new("ShaderNodeRGB")
    plain.outputs[0].default_value = (*colour, 1.0)
    _show_to_camera(material, plain.outputs[0])


def paint_matt(material: bpy.types.Material, colour: Colour) -> None:
    """Make ``material`` matt, and just of ``colour`` where an even light of strength one reaches it unhindered."""
    tree = _emptied(material)
    body = tree.nodes.new("ShaderNodeBsdfDiffuse")
    body.inputs["Color"].default_value = (*colour, 1.0)
    output = tree.nodes.new("ShaderNodeOutputMaterial")
    tree.links.new(body.outputs[0], output.inputs["Surface"])


def light_evenly(world: bpy.types.World, backdrop: Colour) -> None:
    """Make ``world`` give the same light from everywhere, of strength one, and look like ``backdrop``."""
    tree = _emptied(world)
    seen_by = tree.nodes.new("ShaderNodeLightPath")
    either = tree.nodes.new("ShaderNodeMix")
    either.data_type = "RGBA"
    light, seen = (socket for socket in either.inputs if socket.type == "RGBA")
    light.default_value, seen.default_value = (1.0, 1.0, 1.0, 1.0), (*backdrop, 1.0)
    background = tree.nodes.new("ShaderNodeBackground")
    output = tree.nodes.new("ShaderNodeOutputWorld")
    tree.links.new(seen_by.outputs["Is Camera Ray"], either.inputs[0])
    mixed = next(socket for socket in either.outputs if socket.type == "RGBA")
    tree.links.new(mixed, background.inputs["Color"])
    tree.links.new(background.outputs[0], output.inputs["Surface"])
    either.name = "seen"
    # Aimed sampling of an even light would only add noise.
    world.cycles.sampling_method = "NONE"


def show_image(world: bpy.types.World, image: bpy.types.Image) -> None:
    """Make an even light look like ``image``, spread over the whole picture."""
    tree = world.node_tree
    pixel = tree.nodes.new("ShaderNodeTexCoord")
    texture = tree.nodes.new("ShaderNodeTexImage")
    texture.image, texture.extension = image, "EXTEND"
    seen = [socket for socket in tree.nodes["seen"].inputs if socket.type == "RGBA"][1]
    tree.links.new(pixel.outputs["Window"], texture.inputs["Vector"])
    tree.links.new(texture.outputs["Color"], seen)


def _emptied(owner: bpy.types.Material | bpy.types.World) -> bpy.types.NodeTree:
    if owner.node_tree is None:  # later hosts make one by themselves
        owner.use_nodes = True
    owner.node_tree.nodes.clear()
    return owner.node_tree


def _fill(ramp: bpy.types.ColorRamp, colour_map: ColourMap) -> None:
    ramp.color_mode, ramp.interpolation = "RGB", "LINEAR"
    stops = colour_map.stops.tolist()
    last = len(stops) - 1
    while len(ramp.elements) > 1:
        ramp.elements.remove(ramp.elements[-1])
    ramp.elements[0].position, ramp.elements[0].color = 0.0, (*stops[0], 1.0)
    for index, colour in enumerate(stops[1:], start=1):
        ramp.elements.new(index / last).color = (*colour, 1.0)


def _show_to_camera(material: bpy.types.Material, colour: bpy.types.NodeSocket) -> None:
    tree = material.node_tree
    # Else every coloured face would be sampled as a lamp.
    material.cycles.emission_sampling = "NONE"
    emission = tree.nodes.new("ShaderNodeEmission")
    body = tree.nodes.new("ShaderNodeBsdfDiffuse")
    body.inputs["Color"].default_value = SEEN_BY_LIGHT
    seen_by = tree.nodes.new("ShaderNodeLightPath")
    either = tree.nodes.new("ShaderNodeMixShader")
    output = tree.nodes.new("ShaderNodeOutputMaterial")
    tree.links.new(colour, emission.inputs["Color"])
    tree.links.new(seen_by.outputs["Is Camera Ray"], either.inputs[0])
    tree.links.new(body.outputs[0], either.inputs[1])
    tree.links.new(emission.outputs[0], either.inputs[2])
    tree.links.new(either.outputs[0], output.inputs["Surface"])
    for column, node in enumerate(tree.nodes):
        node.location = (260 * column, 0)
