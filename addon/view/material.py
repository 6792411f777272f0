"""The material that shows temperatures: emission in the scale's colour of the ``temperature`` attribute."""

from __future__ import annotations

import bpy

from .colours import ColourMap
from .scale import Scale

TEMPERATURE = "temperature"

# What light and mirrors see of a part in place of its colours, so that the colours do not glow on what stands by.
SEEN_BY_LIGHT = (0.2, 0.2, 0.2, 1.0)


def paint(material: bpy.types.Material, scale: Scale) -> None:
    """Make ``material`` show the temperatures of ``scale``; its nodes are built anew.

    The range is mapped and the colour looked up at each pixel, so that the colour is that of the temperature there and
    not a blend of the corners' colours. To the camera the surface is the plain colour, whatever the light.
    """
    tree = _emptied(material)
    temperature = tree.nodes.new("ShaderNodeAttribute")
    temperature.attribute_name = TEMPERATURE
    fraction = tree.nodes.new("ShaderNodeMapRange")
    fraction.inputs["From Min"].default_value = scale.low
    fraction.inputs["From Max"].default_value = scale.high
    ramp = tree.nodes.new("ShaderNodeValToRGB")
    _fill(ramp.color_ramp, scale.colour_map)
    tree.links.new(temperature.outputs["Fac"], fraction.inputs["Value"])
    tree.links.new(fraction.outputs["Result"], ramp.inputs["Fac"])
    _show_to_camera(tree, ramp.outputs["Color"])


def paint_plain(material: bpy.types.Material, colour: tuple[float, float, float]) -> None:
    """Make ``material`` one colour (linear light) whatever the light."""
    tree = _emptied(material)
    plain = tree.nodes.new("ShaderNodeRGB")
    plain.outputs[0].default_value = (*colour, 1.0)
    _show_to_camera(tree, plain.outputs[0])


def _emptied(material: bpy.types.Material) -> bpy.types.NodeTree:
    if not material.use_nodes:  # always on in later hosts, where setting it is deprecated
        material.use_nodes = True
    # Else every coloured face would be sampled as a lamp.
    material.cycles.emission_sampling = "NONE"
    material.node_tree.nodes.clear()
    return material.node_tree


def _fill(ramp: bpy.types.ColorRamp, colour_map: ColourMap) -> None:
    ramp.color_mode, ramp.interpolation = "RGB", "LINEAR"
    stops = colour_map.stops.tolist()
    last = len(stops) - 1
    while len(ramp.elements) > 1:
        ramp.elements.remove(ramp.elements[-1])
    ramp.elements[0].position, ramp.elements[0].color = 0.0, (*stops[0], 1.0)
    for index, colour in enumerate(stops[1:], start=1):
        ramp.elements.new(index / last).color = (*colour, 1.0)


def _show_to_camera(tree: bpy.types.NodeTree, colour: bpy.types.NodeSocket) -> None:
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
