"""The window's commands on the session: undo, view, layers, time, and showing what was found."""

from collections.abc import Callable
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from colure.session import Session
from colure_viewer.filing import Filing

if TYPE_CHECKING:
    from colure.targets import Target


class Acting(Filing):
    """A window whose commands make new sessions."""

    # Acting on the session

    def _do(self, make: Callable[[Session], Session], what: str) -> None:
        reason = self.desk.edit(make, what)
        if reason is not None:
            self.say(reason)

    def undo(self) -> None:
        """Take the last action back."""
        self._stop()
        self.desk.undo()

    def redo(self) -> None:
        """Do the undone action again."""
        self._stop()
        self.desk.redo()

    def _stop(self) -> None:
        if self.top is not None:
            self.top.moment.stop()

    def zoom_in(self) -> None:
        """Magnify about the middle."""
        if self.hand is not None:
            self.hand.zoom(1.5)

    def zoom_out(self) -> None:
        """Show more of the sky."""
        if self.hand is not None:
            self.hand.zoom(1.0 / 1.5)

    def whole_sky(self) -> None:
        """Show as much of the sky as the projection can, or of all of it where none of a hemisphere fits."""
        from colure.session import WIDEST

        self._do(lambda s: replace(s, view=replace(s.view, width_deg=WIDEST[s.view.projection])), "show the whole sky")

    def centre_selection(self) -> None:
        """Centre the chart on the selection."""
        if self.desk.selection is not None and self.hand is not None:
            self.hand.centre_on(self.desk.selection)
        else:
            self.say("Nothing is selected: click an object, or find one by name")

    def mirror(self) -> None:
        """Turn a sky chart into a map and back."""
        self._do(lambda s: replace(s, view=replace(s.view, east_left=not s.view.east_left)), "mirror the chart")

    def turn_up(self) -> None:
        """Let the next frame's north be up."""
        from colure_viewer.panels.viewbar import UPS

        names = [name for _, name in UPS]
        now = self.desk.session.view.up
        following = names[(names.index(now) + 1) % len(names)] if now in names else names[0]
        self._do(lambda s: replace(s, view=replace(s.view, up=following)), "turn the chart")

    def _toggle(self, layer: str, what: str) -> None:
        def make(s: Session) -> Session:
            changes: dict[str, Any] = {layer: not getattr(s.layers, layer)}
            return replace(s, layers=replace(s.layers, **changes))

        self._do(make, f"show or hide {what}")

    def toggle_belt(self) -> None:
        """Show or hide the belt."""
        self._do(lambda s: replace(s, belt=replace(s.belt, visible=not s.belt.visible)), "show or hide the belt")

    def toggle_edges(self) -> None:
        """Show or hide the constellations' edges."""
        self._toggle("edges", "edges")

    def toggle_milky_way(self) -> None:
        """Show or hide the Milky Way."""
        self._toggle("milky_way", "the Milky Way")

    def toggle_deep_sky(self) -> None:
        """Show or hide the deep-sky objects."""
        self._toggle("deep_sky", "deep sky")

    def toggle_grid(self) -> None:
        """Show the grid of the frame that is up, or hide the grid."""

        def make(s: Session) -> Session:
            up = "horizon" if s.view.up == "zenith" else s.view.up
            return replace(s, layers=replace(s.layers, grid=None if s.layers.grid else up))

        self._do(make, "show or hide the grid")

    def step_on(self) -> None:
        """Go one step on."""
        if self.top is not None:
            self.top.moment.go(1)

    def step_back(self) -> None:
        """Go one step back."""
        if self.top is not None:
            self.top.moment.go(-1)

    def run_on(self) -> None:
        """Let time run on, or stand."""
        if self.top is not None:
            self.top.moment.run(self.top.moment.running or 1)

    def run_back(self) -> None:
        """Let time run back, or stand."""
        if self.top is not None:
            self.top.moment.run(self.top.moment.running or -1)

    def now(self) -> None:
        """Go to the clock's moment."""
        from colure.moment import Moment

        self._stop()
        self._do(lambda s: replace(s, moment=Moment.now()), "go to now")

    def show_target(self, target: "Target") -> None:
        """Select what a search found and bring it to the middle."""
        from colure import pointing

        found = pointing.target(self.chart.sky, target) if self.chart.current is not None else None
        if found is None or self.hand is None:
            self.say(f"{target.name} cannot be shown at this moment")
            return
        self.desk.select(found)
        self.hand.centre_on(found)
        self.chart.use_jobs(self.jobs)
        self.chart.setFocus()
