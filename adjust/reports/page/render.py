"""The page put together: templates, style sheet, script and figures in one file."""

from __future__ import annotations

import base64
import hashlib
from collections.abc import Sequence
from functools import cache
from pathlib import Path
from typing import TYPE_CHECKING, Any

from adjust.adjustment import Adjustment
from adjust.network.closures.check import Check
from adjust.reports.blunder_words import UNSETTLED, none_found
from adjust.reports.decision_words import sentence
from adjust.reports.listing import STANDING_CAUTION, job_facts, numerical_facts
from adjust.reports.page import content
from adjust.reports.page.blunders import blunder_words
from adjust.reports.page.charts import histogram, strips
from adjust.reports.page.drawing import Drawing, draw
from adjust.reports.page.observations import observations_table
from adjust.reports.page.table import packed
from adjust.reports.page.tables import lines_table, marks_table
from adjust.reports.specification import specified
from adjust.reports.weights import component_sentences

if TYPE_CHECKING:
    import jinja2

    from adjust.blunders import Findings
    from adjust.variance_components import VarianceComponent

TEMPLATES = Path(__file__).parent / "templates"


def write_page(
    adjustment: Adjustment,
    path: Path,
    check: Check | None = None,
    findings: Findings | None = None,
    components: Sequence[VarianceComponent] | None = None,
) -> None:
    """Write the page of an adjustment; `check` is what was said of the job before it was adjusted, `findings` what a
    search for blunders found, `components` are the variance components."""
    path.write_text(render_page(adjustment, check, findings, components), encoding="utf-8", newline="\n")


def render_page(
    adjustment: Adjustment,
    check: Check | None = None,
    findings: Findings | None = None,
    components: Sequence[VarianceComponent] | None = None,
) -> str:
    """The page as text. It holds every figure it shows and loads nothing."""
    held, drawing = specified(adjustment), draw(adjustment)
    tables = [marks_table(adjustment), observations_table(adjustment), lines_table(adjustment)]
    styles, script = _style(adjustment), _script()
    return (
        _environment()
        .get_template("report.html.j2")
        .render(
            job=adjustment.job,
            policy=content_security_policy(styles, script),
            styles=styles,
            script=script,
            verdict=content.page_verdict(adjustment, held),
            cards=content.cards(adjustment, held),
            drawing=drawing,
            percent=f"{100 * adjustment.job.statistics.confidence:g} %",
            suspects=content.suspects(adjustment),
            searched=findings is not None,
            none_found="" if findings is None else none_found(adjustment.job, findings),
            unsettled="" if findings is None or findings.settled else UNSETTLED,
            blunders=blunder_words(adjustment, findings),
            suspect_count=len(adjustment.suspects),
            test_words=content.test_words(adjustment),
            tables={table.name: table for table in tables},
            histogram=histogram(adjustment),
            strips=strips(adjustment),
            specification=content.specification(held),
            check=check,
            closures=[] if check is None else content.closure_rows(check),
            closure_words=content.closure_words(check),
            weights=content.weight_rows(adjustment),
            components=content.component_rows(components or ()),
            component_words=component_sentences(components or ()),
            facts=job_facts(adjustment),
            numerical=numerical_facts(adjustment),
            decisions=list(map(sentence, adjustment.job.decisions)),
            notes=adjustment.notes,
            cautions=content.page_cautions(adjustment, STANDING_CAUTION),
            figures={
                "names": list(adjustment.job.marks.names),
                "tables": {table.name: table.data() for table in tables},
                "map": _map_data(drawing),
            },
        )
    )


def _map_data(drawing: Drawing) -> dict[str, Any]:
    """What the script needs to find, choose and label marks; positions in hundredths of a unit."""
    places = drawing.places
    cells = [
        ["" if value != value else f"{value:.0f}" for value in (places.positions[:, axis] * 100).tolist()]
        for axis in (0, 1)
    ]
    return {
        "x": packed(cells[0], "text"),
        "y": packed(cells[1], "text"),
        "width": drawing.width,
        "height": places.height,
        "metres": places.metres,
        "origin": places.origin,
        "exaggeration": drawing.exaggeration,
        "ellipseFactor": drawing.ellipse_factor,
        "barFactor": drawing.bar_factor,
    }


@cache
def _environment() -> jinja2.Environment:
    import jinja2

    from adjust.reports.page.compiled import CompiledTemplates

    environment = jinja2.Environment(
        loader=jinja2.FileSystemLoader(TEMPLATES),
        bytecode_cache=CompiledTemplates(TEMPLATES),
        autoescape=True,
        undefined=jinja2.StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.policies["json.dumps_kwargs"] = {"ensure_ascii": False, "separators": (",", ":"), "allow_nan": False}
    return environment


@cache
def _file(name: str) -> str:
    return (TEMPLATES / name).read_text(encoding="utf-8")


@cache
def _script() -> str:
    """One script of its two parts, in a scope of its own."""
    return '"use strict";\n(() => {\n' + _file("tables.js") + _file("map.js") + "})();\n"


def _style(adjustment: Adjustment) -> str:
    """The style sheet, with the job's title for the head of every printed page."""
    job = adjustment.job
    heading = job.title if job.date is None else f"{job.title}, {job.date}"
    return _file("page.css").replace('"JOB TITLE"', css_text(heading))


def css_text(text: str) -> str:
    """Text as a string of a style sheet: every character that is not a plain letter or digit by its number."""
    return '"' + "".join(c if c.isascii() and c.isalnum() else f"\\{ord(c):x} " for c in text) + '"'


def content_security_policy(styles: str, script: str) -> str:
    """Nothing may be loaded, sent or run but the page's own style sheet and script, known by their digests."""
    return (
        f"default-src 'none'; style-src '{_digest(styles)}'; script-src '{_digest(script)}'; "
        "base-uri 'none'; form-action 'none'"
    )


def _digest(text: str) -> str:
    return "sha256-" + base64.b64encode(hashlib.sha256(text.encode("utf-8")).digest()).decode("ascii")
