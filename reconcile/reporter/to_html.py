"""report.html: one file that works offline."""

from __future__ import annotations

import base64

from jinja2 import Environment, PackageLoader, StrictUndefined

from reconcile import __version__
from reconcile.records.results import Audit
from reconcile.reporter.cautions import CAUTIONS
from reconcile.reporter.drawn import Drawn
from reconcile.reporter.gist import gist
from reconcile.reporter.lookups import Lookups
from reconcile.reporter.manifest import report_id


def page(audit: Audit, lookups: Lookups, drawn: list[Drawn]) -> bytes:
    """The page as bytes."""
    environment = Environment(
        loader=PackageLoader("reconcile.reporter"), autoescape=True, undefined=StrictUndefined, trim_blocks=True
    )
    text = environment.get_template("report.html").render(
        report_id=report_id(audit),
        version=__version__,
        gist=gist(audit, lookups),
        cautions=CAUTIONS,
        pictures=[
            {"uri": "data:image/svg+xml;base64," + base64.b64encode(d.svg).decode(), "alt": d.alt, "caption": d.caption}
            for d in drawn
        ],
    )
    return text.encode("utf-8")
