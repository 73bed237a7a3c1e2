"""A hundred script-injection strings. Were any of them to run, ``window.ran`` would be set."""

from __future__ import annotations

import itertools

__all__ = ["INJECTIONS"]

_WHOLE = (
    "<script>window.ran=1</script>",
    "<img src=x onerror=window.ran=1>",
    "<svg onload=window.ran=1>",
    "<svg><script>window.ran=1</script></svg>",
    "<iframe srcdoc='<script>parent.ran=1</script>'></iframe>",
    "<body onload=window.ran=1>",
    "<details open ontoggle=window.ran=1>x</details>",
    "<input autofocus onfocus=window.ran=1>",
    "<video src=x onerror=window.ran=1></video>",
    "<a href='javascript:window.ran=1'>x</a>",
    "<math><mtext><script>window.ran=1</script></mtext></math>",
    "<style>@import 'javascript:window.ran=1';</style>",
    "<object data='javascript:window.ran=1'></object>",
    "<form action='javascript:window.ran=1'><input type=submit></form>",
    "<marquee onstart=window.ran=1>x</marquee>",
    "<template><script>window.ran=1</script></template>",
    "<link rel=stylesheet href='javascript:window.ran=1'>",
    "<embed src='javascript:window.ran=1'>",
    "<button onclick=window.ran=1 autofocus>x</button>",
    "<div style='animation-name:x' onanimationstart=window.ran=1>x</div>",
    "${window.ran=1}",
    "{{constructor.constructor('window.ran=1')()}}",
    "');window.ran=1;//",
    "\\u003cscript\\u003ewindow.ran=1\\u003c/script\\u003e",
    "&lt;script&gt;window.ran=1&lt;/script&gt;",
)
_AROUND = ("{}", '">{}', "</option></select>{}", "--></title></textarea>{}<!--")

INJECTIONS = tuple(outer.format(inner) if outer == "{}" else outer.replace("{}", inner)
                   for outer, inner in itertools.product(_AROUND, _WHOLE))  # fmt: skip
