"""What the actions of the bench have in common."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

from textual.screen import Screen

from phaseid.errors import InputError
from phaseid.ui.actions import Action

if TYPE_CHECKING:
    from phaseid.session.answers import Candidate, ClusterAnswer
    from phaseid.session.state import State
    from phaseid.session.work import Session
    from phaseid.ui.work import Answer

    Base = Screen[None]
else:
    Base = object


class Acting(Base):
    """What an action can rely on; the bench provides it."""

    if TYPE_CHECKING:
        session: Session | None
        answered: Answer | None
        actions: tuple[Action, ...]
        index: int
        selected: int | None
        corner: tuple[int, int] | None
        run: int
        unanswered: int

        @property
        def cluster(self) -> ClusterAnswer | None: ...
        @property
        def clusters(self) -> tuple[ClusterAnswer, ...]: ...
        @property
        def chosen(self) -> Candidate | None: ...
        def take(self, label: str, state: State) -> None: ...
        def with_state(self, **changes: Any) -> State: ...
        def say(self, text: str) -> None: ...
        def rank(self, quiet: bool = False) -> None: ...
        def aside(self, job: Callable[[], Any], then: Callable[[Any], None]) -> Any: ...
        def select(self, cluster: int) -> None: ...
        def refresh_selected(self) -> None: ...

    def is_about(self, mark: Any, cluster: ClusterAnswer) -> bool:
        """Whether a mark speaks of a cluster of the image that is shown."""
        if mark.image != self.index or mark.kind in ("standard", "dark"):
            return False
        nearest = min(self.clusters, key=lambda c: abs(c.grey_mean - mark.grey))
        return nearest.id == cluster.id

    def mark(self, kind: Any, value: str = "", note: str = "", grey: float | None = None) -> None:
        """Say something about the selected cluster, or about a grey."""
        session, cluster = self.session, self.cluster
        if session is None or (grey is None and cluster is None):
            return
        at = grey if grey is not None else round(cluster.grey_mean, 4)  # type: ignore[union-attr]
        where = f"grey {at:.4g}"
        label = f"{where}: {kind} {value}".strip()
        try:
            self.take(label, session.with_mark(kind, at, value, note, self.index))
        except InputError as error:
            self.say(str(error))


def number(text: str) -> float | None:
    try:
        value = float(text)
    except ValueError:
        return None
    return value if abs(value) < 1e12 else None
