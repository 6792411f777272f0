"""The studio: a scene of its own for one picture, which leaves nothing behind."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path

import bpy
import numpy as np
from mathutils import Matrix

from ...solver.errors import Trouble
from .. import host
from .framing import Frame
from .material import Colour, light_evenly, paint_matt, paint_plain, show_image
from .result_object import mesh_of, write_colours

# Enough for smooth edges of lines and letters; within plain surfaces, which need few, sampling stops by itself.
SAMPLES, LEAST_SAMPLES, NOISE = 32, 6, 0.01

# The shadow is soft: it is rendered coarser and smoothed, which surfaces whose colour is measured must not be.
SHADOW_SAMPLES, SHADOW_PERCENTAGE = 48, 25
SMOOTHING = 0.012

# Of the eye's distance to what is seen: the pane that holds the legend, and the reach of the ground.
PANE = 0.1
GROUND = 8.0


# (P, 3) linear light at the vertices of a mesh.
VertexColours = Callable[[bpy.types.Mesh], np.ndarray]


@dataclass
class Studio:
    """scene: where the picture is taken. scaled: world to studio, so that parts of every size are lit and cut alike.

    made: what has been made for it and goes when it is closed. colours: what the vertices of a mesh look like in a
    material, by its name, for engines that look at vertices alone.
    """

    scene: bpy.types.Scene
    frame: Frame
    scaled: Matrix
    made: list[bpy.types.ID] = field(default_factory=list)
    colours: dict[str, VertexColours] = field(default_factory=dict)

    @property
    def pane(self) -> Matrix:
        """From pixels to the studio, on a pane that nothing stands before."""
        return self.scaled @ Matrix(self.frame.pane(PANE * self.frame.distance).tolist())

    def keep(self, made: bpy.types.ID) -> bpy.types.ID:
        self.made.append(made)
        return made

    def new_material(self) -> bpy.types.Material:
        return self.keep(bpy.data.materials.new("studio"))

    def ink(self, colour: Colour) -> bpy.types.Material:
        material = self.new_material()
        paint_plain(material, colour)
        self.colours[material.name] = lambda mesh: np.tile(colour, (len(mesh.vertices), 1))
        return material

    def place(self, data: bpy.types.ID, matrix: Matrix, material: bpy.types.Material) -> bpy.types.Object:
        """An object of ``data`` at ``matrix`` (in the studio's measure), seen in ``material``."""
        object_ = self.keep(bpy.data.objects.new("studio", data))
        object_.matrix_world = matrix
        self.scene.collection.objects.link(object_)
        if not data.materials:
            data.materials.append(material)
        object_.material_slots[0].link = "OBJECT"
        object_.material_slots[0].material = material
        return object_

    def draw(
        self, places: np.ndarray, triangles: np.ndarray, matrix: Matrix, material: bpy.types.Material
    ) -> bpy.types.Mesh:
        """Triangles (T, 3) of ``places`` (P, 3) that are seen and cast no shadow."""
        mesh = self.keep(mesh_of("studio", places, triangles))
        _cast_no_shadow(self.place(mesh, matrix, material))
        return mesh

    def write(
        self, text: str, pixel: tuple[float, float], size: float, material: bpy.types.Material, widest: float
    ) -> None:
        """A line of text from ``pixel`` on, ``size`` pixels high, smaller where it would be wider than ``widest``."""
        curve = self.keep(bpy.data.curves.new("studio", "FONT"))
        curve.body, curve.size = text, size
        written = self.place(curve, self.pane @ Matrix.Translation((*pixel, 0.0)), material)
        _cast_no_shadow(written)
        self.scene.view_layers[0].update()
        curve.size *= min(1.0, widest / max(max(corner[0] for corner in written.bound_box), 1e-9))

    def cast_shadow(self, height: float, colour: Colour, folder: Path) -> None:
        """Set what stands here on a ground at world ``height``: a backdrop of ``colour`` that holds the shadow.

        folder: for the time of the call.
        """
        standing = list(self.scene.objects)
        ground = self._lay_ground(height, colour)
        render, cycles = self.scene.render, self.scene.cycles
        engine, render.engine = render.engine, host.engine("CYCLES")
        for object_ in standing:
            object_.visible_camera = False
        cycles.samples, render.resolution_percentage = SHADOW_SAMPLES, SHADOW_PERCENTAGE
        render.image_settings.file_format = "OPEN_EXR"
        self.render(folder / "shadow.exr")
        render.image_settings.file_format = "PNG"
        cycles.samples, render.resolution_percentage, render.engine = SAMPLES, 100, engine
        for object_ in standing:
            object_.visible_camera = True
        ground.hide_render = True
        show_image(self.scene.world, self.keep(_smoothed(folder / "shadow.exr")))

    def _lay_ground(self, height: float, colour: Colour) -> bpy.types.Object:
        """Matt and without end, so far as the eye can tell; of ``colour`` where no shadow falls."""
        reach = GROUND * self.frame.distance
        (x, y), corners = self.frame.eye[:2], ((-1, -1), (1, -1), (1, 1), (-1, 1))
        matt = self.new_material()
        paint_matt(matt, colour)
        places = np.array([(x + reach * i, y + reach * j, height) for i, j in corners])
        mesh = self.keep(mesh_of("studio", places, np.array([[0, 1, 2], [0, 2, 3]])))
        return self.place(mesh, self.scaled, matt)

    @property
    def sees_vertices_alone(self) -> bool:
        """Whether the engine knows no shaders and shows the colours of vertices."""
        return self.scene.render.engine == host.engine("WORKBENCH")

    def colour_vertices(self) -> None:
        """Give all that stands here the colours of its materials, vertex by vertex."""
        for object_ in list(self.scene.objects):
            if object_.type == "FONT":
                mesh = self.keep(bpy.data.meshes.new_from_object(object_.evaluated_get(self._depsgraph())))
                self.place(mesh, object_.matrix_world, object_.material_slots[0].material)
                self.scene.collection.objects.unlink(object_)
        for object_ in self.scene.objects:
            if object_.type == "MESH" and object_.data.color_attributes.active_color is None:
                write_colours(object_.data, self.colours[object_.material_slots[0].material.name](object_.data))

    def _depsgraph(self) -> bpy.types.Depsgraph:
        layer = self.scene.view_layers[0]
        layer.update()
        return layer.depsgraph

    def render(self, path: Path) -> None:
        """Render to ``path``. Raises Trouble when that does not come to its end."""
        if self.sees_vertices_alone:
            self.colour_vertices()
        self.scene.render.filepath = str(path)
        try:
            bpy.ops.render.render(write_still=True, scene=self.scene.name)
        except RuntimeError as error:
            raise Trouble("limits", f"The picture could not be rendered: {str(error).strip()}", "Try again.") from error
        if not path.is_file():
            raise Trouble("limits", "The rendering of the picture was cut short.", "Try again.")


def _smoothed(file: Path) -> bpy.types.Image:
    """A new image of what ``file`` shows, blurred by SMOOTHING of its width."""
    sharp = bpy.data.images.load(str(file))
    width, height = sharp.size
    values = np.empty(width * height * 4, dtype=np.float32)
    sharp.pixels.foreach_get(values)
    bpy.data.images.remove(sharp)
    values = values.reshape(height, width, 4)
    reach = max(1, round(SMOOTHING * width / 2))
    for axis in (0, 1, 0, 1):
        values = _mean_along(values, reach, axis)
    smooth = bpy.data.images.new("studio", width, height, float_buffer=True)
    smooth.pixels.foreach_set(np.ascontiguousarray(values, dtype=np.float32).ravel())
    return smooth


def _mean_along(values: np.ndarray, reach: int, axis: int) -> np.ndarray:
    """Running means over ``reach`` to either side; the outermost values go on beyond the rim."""
    rim = [(0, 0)] * values.ndim
    rim[axis] = (reach, reach)
    windows = np.lib.stride_tricks.sliding_window_view(np.pad(values, rim, mode="edge"), 2 * reach + 1, axis)
    return windows.mean(axis=-1)


def _cast_no_shadow(object_: bpy.types.Object) -> None:
    object_.visible_diffuse = object_.visible_glossy = object_.visible_shadow = False


@contextmanager
def opened(frame: Frame, engine: str, backdrop: Colour) -> Iterator[Studio]:
    """A studio with its camera and even light, gone again afterwards, whatever happens in it."""
    size = 1.0 / frame.distance
    known_fonts = set(bpy.data.fonts)
    scaled = Matrix.Scale(size, 4) @ Matrix.Translation((-frame.eye).tolist())
    studio = Studio(bpy.data.scenes.new("studio"), frame, scaled)
    try:
        _set_up(studio, engine, backdrop)
        yield studio
    finally:
        bpy.data.scenes.remove(studio.scene)
        bpy.data.batch_remove(studio.made)
        # The plain typeface comes with the first text.
        bpy.data.batch_remove([font for font in bpy.data.fonts if font not in known_fonts])


def _set_up(studio: Studio, engine: str, backdrop: Colour) -> None:
    scene, frame = studio.scene, studio.frame
    width, height = frame.size
    camera = studio.keep(bpy.data.cameras.new("studio"))
    camera.sensor_fit, camera.sensor_width = "HORIZONTAL", 36.0
    camera.lens = camera.sensor_width * frame.focal / width
    camera.shift_x, camera.shift_y = (width / 2 - frame.middle[0]) / width, (height / 2 - frame.middle[1]) / width
    camera.clip_start, camera.clip_end = 0.5 * PANE, 4.0 * GROUND
    scene.camera = studio.keep(bpy.data.objects.new("studio", camera))
    scene.camera.matrix_world = Matrix(frame.axes.T.tolist()).to_4x4()
    scene.collection.objects.link(scene.camera)

    scene.world = studio.keep(bpy.data.worlds.new("studio"))
    light_evenly(scene.world, backdrop)
    scene.world.color = backdrop

    render = scene.render
    render.engine = host.engine(engine)
    render.resolution_x, render.resolution_y, render.resolution_percentage = width, height, 100
    render.use_compositing = render.use_sequencer = False
    render.use_file_extension = False
    render.dither_intensity = 0.0
    # What a file tells of where and when it was made is the designer's to tell.
    for told in ("camera", "date", "filename", "frame", "hostname", "memory", "render_time", "scene", "time"):
        setattr(render, f"use_stamp_{told}", False)
    render.image_settings.file_format, render.image_settings.color_mode = "PNG", "RGB"
    scene.display_settings.display_device = "sRGB"
    scene.view_settings.view_transform, scene.view_settings.look = "Standard", "None"
    scene.view_settings.exposure, scene.view_settings.gamma = 0.0, 1.0

    scene.display.render_aa = "16"
    scene.display.shading.light, scene.display.shading.color_type = "FLAT", "VERTEX"

    cycles = scene.cycles
    cycles.device, cycles.use_denoising = "CPU", False
    cycles.samples, cycles.use_adaptive_sampling = SAMPLES, True
    cycles.adaptive_min_samples, cycles.adaptive_threshold = LEAST_SAMPLES, NOISE
    cycles.max_bounces, cycles.diffuse_bounces = 2, 1
