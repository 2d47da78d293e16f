"""Who gets an answer, and what every answer says to the browser.

The dashboard shows a company's schematics, so another web page must not read it through the viewer's browser:
requests are answered only under the dashboard's own names (against DNS rebinding), only GET and HEAD exist, no
answer may be embedded or read across origins, and pages run no script and no style but the served files.
"""

from __future__ import annotations

from collections.abc import Iterable

from flask import Flask, Response, request

POLICY = "; ".join(
    (
        "default-src 'none'",
        "script-src 'self'",
        "style-src 'self'",
        "img-src 'self' data:",
        "connect-src 'self'",
        "form-action 'self'",
        "base-uri 'none'",
        "frame-ancestors 'none'",
    )
)
HEADERS = (
    ("Content-Security-Policy", POLICY),
    ("Cross-Origin-Resource-Policy", "same-origin"),
    ("Cross-Origin-Opener-Policy", "same-origin"),
    ("X-Content-Type-Options", "nosniff"),
    ("X-Frame-Options", "DENY"),
    ("Referrer-Policy", "no-referrer"),
)


def protect(app: Flask, hosts: Iterable[str]) -> None:
    """Has `app` refuse strange requests and send the headers above with every answer."""
    own = frozenset(host.casefold() for host in hosts)

    @app.before_request
    def refuse() -> Response | None:
        if request.headers.get("Host", "").casefold() not in own:
            return _plain("This address is not one of the dashboard's own names.\n", 421)
        if request.method not in ("GET", "HEAD"):
            refused = _plain("The dashboard only shows; it takes no changes.\n", 405)
            refused.headers["Allow"] = "GET, HEAD"
            return refused
        # A link from elsewhere may open a page; a page from elsewhere may not fetch one.
        site = request.headers.get("Sec-Fetch-Site", "none")
        if site not in ("none", "same-origin") and request.headers.get("Sec-Fetch-Mode") != "navigate":
            return _plain("The dashboard answers to its own pages only.\n", 403)
        return None

    @app.after_request
    def armour(response: Response) -> Response:
        for name, value in HEADERS:
            response.headers[name] = value
        response.headers.setdefault("Cache-Control", "no-store")
        return response


def _plain(text: str, status: int) -> Response:
    return Response(text, status=status, mimetype="text/plain")
