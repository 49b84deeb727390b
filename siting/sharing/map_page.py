r"""
The page around the map: one file that needs no network and in which no text of the user's is ever markup or code.

folium lays out the map and its layers, which all have fixed names. What the user typed travels as one JSON element with
`<` written `\u003c`, added verbatim: folium and branca would evaluate it as a template. The page's own script reads it
and builds every element from text. The Content-Security-Policy lets only the page's own scripts run and nothing load.
"""

from __future__ import annotations

import base64
import json
import re
import secrets
from functools import lru_cache
from importlib.metadata import distribution
from importlib.resources import files
from typing import TYPE_CHECKING

import folium
from branca.element import Element, Figure, MacroElement
from folium.template import Template

from siting.sharing.looks import css_colours

if TYPE_CHECKING:
    from siting.sharing.map_data import Json

SCRIPTS = ("symbols.js", "labels.js", "draw.js", "panels.js")
"""In the order in which they build on each other."""
LAYERS = ("inbound", "direct", "outbound", "customers", "suppliers", "sites")
"""Every layer that can be switched, lowest first."""
LEAFLET = "django-js-lib-leaflet"


class _Verbatim(Element):
    """Text that goes into the page as it is, without being read as a template."""

    _template = Template("{{ this.text }}")

    def __init__(self, text: str) -> None:
        super().__init__()
        self.text = text


class _Page(Figure):
    """The document: panels of fixed structure around the map, every script with the page's nonce."""

    _template = Template(
        "<!DOCTYPE html>\n"
        '<html lang="en">\n<head>\n<meta charset="utf-8">\n'
        '<meta http-equiv="Content-Security-Policy" content="'
        "default-src 'none'; script-src 'nonce-{{ this.nonce }}'; style-src 'unsafe-inline'; img-src data:; "
        "base-uri 'none'; form-action 'none'\">\n"
        '<meta name="viewport" content="width=device-width, initial-scale=1">\n<title>Map</title>\n'
        "{{ this.header.render(**kwargs) }}\n</head>\n<body>\n"
        '<a class="skip" href="#tables">To the tables</a>\n<div class="sheet">\n'
        '<header><p id="title"></p><h1 id="headline"></h1></header>\n'
        '<nav id="verdicts" aria-label="Verdicts"></nav>\n'
        '<main class="stage">{{ this.html.render(**kwargs) }}<button id="all" type="button">Show all</button>'
        '<p id="said" role="status"></p></main>\n'
        '<aside id="legend" aria-label="Legend and layers"></aside>\n'
        '<footer><p id="notes"></p><p id="sources"></p></footer>\n</div>\n'
        '<section id="tables" aria-label="The numbers as tables"></section>\n'
        "<noscript>This map is drawn by a script inside the file; please allow it to run.</noscript>\n"
        '<script nonce="{{ this.nonce }}">\n{{ this.script.render(**kwargs) }}\n</script>\n</body>\n</html>\n'
    )

    def __init__(self, nonce: str) -> None:
        super().__init__()
        self.nonce = nonce
        self.header._children.clear()  # noqa: SLF001 - branca adds a charset there; the document above has its own


class _Sheet(folium.Map):
    """The map: only its own element and script, no assets from elsewhere."""

    _template = Template(
        "{% macro html(this, kwargs) %}"
        '<div class="map" id="{{ this.get_name() }}" role="region" aria-label="Map"></div>'
        "{% endmacro %}"
        "{% macro script(this, kwargs) %}"
        'const {{ this.get_name() }} = L.map("{{ this.get_name() }}", siting.options);'
        "{% endmacro %}"
    )


class _Switched(folium.map.Layer):
    """A layer that the legend switches; its name is fixed, its content comes from the payload."""

    _template = Template(
        "{% macro script(this, kwargs) %}"
        'const {{ this.get_name() }} = siting.group("{{ this.layer_name }}");'
        "{% endmacro %}"
    )

    def __init__(self, name: str) -> None:
        super().__init__(name=name, overlay=True, control=False)
        self._name = f"layer_{name}"


class _Start(MacroElement):
    """Draws the payload once map and layers are there."""

    _template = Template("{% macro script(this, kwargs) %}siting.start({{ this._parent.get_name() }});{% endmacro %}")

    def __init__(self) -> None:
        super().__init__()  # type: ignore[no-untyped-call]  # branca leaves it without types


@lru_cache(maxsize=1)
def _leaflet() -> tuple[str, str]:
    """Return Leaflet's script and style, the licence as a comment in front, pictures as data URIs."""
    folder = files("js_lib_leaflet") / "static" / "js_lib_leaflet"
    notice = next((str(file.locate()) for file in distribution(LEAFLET).files or () if file.name == "LICENSE"), "")
    if not notice:
        msg = f"{LEAFLET} is installed without its licence, which every map must carry. Install it again."
        raise FileNotFoundError(msg)
    with open(notice, encoding="utf-8") as file:  # noqa: PTH123 - a path of an installed distribution, as text
        licence = file.read().replace("*/", "* /")
    script = (folder / "leaflet.js").read_text("utf-8")
    script = re.sub(r"//# sourceMappingURL=\S*", "", script)

    def inlined(match: re.Match[str]) -> str:
        picture = base64.b64encode((folder / "images" / match[1]).read_bytes()).decode("ascii")
        return f"url(data:image/png;base64,{picture})"

    style = re.sub(r"url\(images/([\w-]+\.png)\)", inlined, (folder / "leaflet.css").read_text("utf-8"))
    return f"/* Leaflet:\n{licence}*/\n{script}", style


@lru_cache(maxsize=1)
def _own_files() -> tuple[str, str]:
    """Return the page's own scripts and style."""
    folder = files("siting.sharing") / "web"
    script = "\n".join((folder / name).read_text("utf-8") for name in SCRIPTS)
    return script, css_colours() + (folder / "map.css").read_text("utf-8")


def payload_text(payload: Json) -> str:
    """Return the payload as JSON in which no `<` is left, so that nothing in it can end its element."""
    text = json.dumps(payload, ensure_ascii=False, allow_nan=False, separators=(",", ":"))
    return text.replace("<", "\\u003c").replace("\u2028", "\\u2028").replace("\u2029", "\\u2029")


def page_of(payload: Json) -> str:
    """
    Return the map as one HTML document.

    Parameters
    ----------
    payload
        From `map_data.plan_json` or `map_given.given_json`.

    Returns
    -------
    html
        Opens from a file without a network; element names and the nonce differ from call to call.
    """
    page = _Page(secrets.token_urlsafe(16))
    drawn = _Sheet(tiles=None)
    drawn.default_js, drawn.default_css = [], []
    for name in LAYERS:
        drawn.add_child(_Switched(name))
    drawn.add_child(_Start())
    page.add_child(drawn)
    leaflet, leaflet_style = _leaflet()
    script, style = _own_files()
    page.header.add_child(_Verbatim(f"<style>\n{leaflet_style}\n{style}\n</style>"))
    page.html.add_child(_Verbatim(f'<script type="application/json" id="payload">{payload_text(payload)}</script>'))
    page.script.add_child(_Verbatim(f"{leaflet}\n{script}\n"), name="program", index=0)
    return str(page.render())
