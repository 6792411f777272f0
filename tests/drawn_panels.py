"""The panels, drawn on a layout that writes down what it is given and refuses what the host would not know."""

from __future__ import annotations

from types import SimpleNamespace

import bpy
from fluxface.addon import language
from fluxface.addon.panels import contacts, history, look, part, result, run, shape, tags
from fluxface.addon.panels import study as study_panels

ICONS = {item.identifier for item in bpy.types.UILayout.bl_rna.functions["label"].parameters["icon"].enum_items}
# Without a window the host's own scale is nought.
PREFERENCES = SimpleNamespace(system=SimpleNamespace(ui_scale=1.0))
PANELS = (
    study_panels.StudyPanel,
    study_panels.AccuracyPanel,
    shape.ShapePanel,
    part.MaterialPanel,
    part.MaterialDetailsPanel,
    part.VolumeHeatPanel,
    tags.TagsPanel,
    tags.TagMeshPanel,
    tags.UntaggedPanel,
    contacts.ContactsPanel,
    run.RunPanel,
    look.LookPanel,
    result.ResultPanel,
    result.WaysPanel,
    result.TagRowsPanel,
    result.PartRowsPanel,
    result.ContactRowsPanel,
    history.RunsPanel,
)
LISTS = {
    "FLUXFACE_UL_tags": tags.TagList,
    "FLUXFACE_UL_contacts": contacts.ContactList,
    "FLUXFACE_UL_table": part.TableList,
    "FLUXFACE_UL_runs": history.RunList,
}


class Page:
    """Stands in for the host's layout. ``lines`` is shared by a layout and all within it."""

    def __init__(self, context: SimpleNamespace, lines: list[str]) -> None:
        self.context, self.lines = context, lines

    def row(self, **_options) -> Page:
        return Page(self.context, self.lines)

    column = box = split = row

    def separator(self, **_options) -> None:
        pass

    def label(self, text: str = "", icon: str = "NONE", translate: bool = True) -> None:
        assert icon in ICONS
        # As the host does, which a composed text must not count on.
        self.lines.append(language.label(text) if translate else text)

    def prop(self, data, name: str, text: str | None = None, icon: str = "NONE", **_options) -> None:
        assert icon in ICONS
        prop = data.bl_rna.properties[name]
        self.lines.append(f"[{prop.name if text is None else text}]")

    def operator(self, name: str, text: str | None = None, icon: str = "NONE") -> SimpleNamespace:
        assert icon in ICONS
        module, _, function = name.partition(".")
        label = getattr(getattr(bpy.ops, module), function).get_rna_type().name
        self.lines.append(f"({label if text is None else text})")
        return SimpleNamespace()

    def menu(self, name: str, **_options) -> None:
        self.lines.append(f"({getattr(bpy.types, name).bl_label})")
        getattr(bpy.types, name).draw(SimpleNamespace(layout=self), self.context)

    def progress(self, factor: float, text: str) -> None:
        self.lines.append(f"{100 * factor:.0f} % {text}")

    def template_list(self, kind: str, _id, data, items: str, active_data, active: str, rows: int) -> None:
        assert rows > 0
        assert active in active_data.bl_rna.properties
        for index, item in enumerate(getattr(data, items)):
            LISTS[kind].draw_item(None, self.context, self, data, item, 0, active_data, active, index)


def drawn(scene: bpy.types.Scene, *panels) -> str:
    """What the panels show, a line each."""
    context = SimpleNamespace(
        scene=scene,
        view_layer=bpy.context.view_layer,
        window_manager=bpy.context.window_manager,
        preferences=PREFERENCES,
        region=SimpleNamespace(width=280),
    )
    page = Page(context, [])
    for panel in panels or PANELS:
        if not hasattr(panel, "poll") or panel.poll(context):
            panel.draw(SimpleNamespace(layout=page), context)
    return "\n".join(page.lines)
