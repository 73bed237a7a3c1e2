"""What if: the lesion larger or smaller, oedema gone, months later, an element whole or cut; before and after."""

from __future__ import annotations

from typing import Any, ClassVar

import traitlets as t

from byway.knowledge.faults import BywayError, Fault
from byway.knowledge.reasoning.whatif import Change, WhatIf, what_if
from byway.widgets.accounts.imagined import imagined
from byway.widgets.front import load_css, load_esm
from byway.widgets.panel import Panel, element_words
from byway.widgets.wire import plain

__all__ = ["WhatIfPanel"]

STAGES = ("acute", "subacute", "chronic")
MOST_GROWTH_MM = 10.0
MOST_ROWS = 14
LEAST_CHANGE = 0.005
NOTHING: dict[str, Any] = {"growth_mm": 0.0, "oedema_share": 1.0, "stage": "", "restored": [], "severed": []}


class WhatIfPanel(Panel):
    """Sliders for what might be different, and the expected signs and capacities before and after.

    ``result`` is the :class:`~byway.knowledge.reasoning.whatif.WhatIf` that is shown, or None. An explanation that
    stands alone has no geometry: its lesion can then not be grown, but stage and elements can be changed.
    """

    _esm = load_esm("accounts/whatif.js")
    _css = load_css("front/panel.css", "accounts/profile.css", "accounts/whatif.css")
    sections: ClassVar[tuple[str, ...]] = ("evidence", "findings", "bench", "whatif")

    settings = t.Dict(NOTHING).tag(sync=True)
    offered: Any = t.List().tag(sync=True)
    can_draw = t.Bool(False).tag(sync=True)
    stage = t.Unicode("").tag(sync=True)
    told = t.Dict().tag(sync=True)
    busy = t.Bool(False).tag(sync=True)

    def __init__(self, source: Any) -> None:
        super().__init__(source)
        self.result: WhatIf | None = None
        self.show_case()
        self.when(["accounts_seq"], self.show_case)
        self.observe(lambda _: self.show_change(), ["settings"])

    def show_case(self) -> None:
        """What can be changed, and the change as it stands."""
        explanation, graph = self.state.explanation, self.graph
        with self.hold_sync():
            self.can_draw = hasattr(self.state.science, "draws_of")
            if explanation is None:
                self.offered = []
            else:
                self.stage = explanation.situation.stage
                self.offered = [element_words(graph, element) for element in explanation.damage["element"]]
            self.show_change()

    def show_change(self) -> None:
        """Reckon the change and show it."""
        explanation = self.state.explanation
        if explanation is None or self.settings == NOTHING:
            self.result, self.told = None, {}
            self.stamp += 1
            return
        self.busy = True
        try:
            self.result = what_if(explanation, self._change(), given_findings=True)
            self.told = _told(self.result)
        except BywayError as error:
            self.state.tell(error)
            self.result, self.told = None, {}
        finally:
            self.busy = False
            self.stamp += 1

    def _change(self) -> Change:
        asked = {**NOTHING, **self.settings}
        growth, oedema = float(asked["growth_mm"]), float(asked["oedema_share"])
        if not -MOST_GROWTH_MM <= growth <= MOST_GROWTH_MM or not 0 <= oedema <= 1:
            raise BywayError(Fault("what-if", "lesion", f"growth {growth} mm, oedema {oedema}",
                                   "10 mm at most, 0 to 1"))
        if asked["stage"] not in ("", *STAGES):
            raise BywayError(Fault("what-if", "stage", str(asked["stage"]), ", ".join(STAGES)))
        draws = None
        if growth or oedema != 1.0:
            draws = self.draws_of(imagined(self.state.lesion, growth, oedema))
        return Change(str(asked["stage"]) or None, draws, tuple(asked["restored"]), tuple(asked["severed"]))


def _told(result: WhatIf) -> dict[str, Any]:
    """Signs and functions that change, largest first."""
    signs = result.signs[result.signs["change"].abs() >= LEAST_CHANGE].head(MOST_ROWS)
    functions = result.functions[result.functions["change"].abs() >= LEAST_CHANGE].head(MOST_ROWS)
    return dict(plain({
        "signs": [{"id": f"{row['sign']}@{row['side']}", **{k: row[k] for k in ("name", "side", "before", "after")},
                   "found": row["found"] if isinstance(row["found"], str) else None}
                  for row in signs.to_dict("records")],
        "functions": [{"id": row["function"], **{k: row[k] for k in ("name", "before", "after")}}
                      for row in functions.to_dict("records")],
    }))  # fmt: skip
