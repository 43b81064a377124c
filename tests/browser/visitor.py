"""A reader with a browser, and everything on a page that must not happen."""

from dataclasses import dataclass, field
from pathlib import Path
from urllib.parse import urlsplit

from playwright.sync_api import Browser, BrowserContext, ConsoleMessage, Page, Request

AXE = (Path(__file__).parent / "axe" / "axe.min.js").read_text(encoding="utf-8")
RULES = ("wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa", "best-practice")
SIZES = {"wide": (1280, 900), "narrow": (390, 844)}
_WATCH = """document.addEventListener("securitypolicyviolation", event =>
  reportViolation(event.violatedDirective + " " + event.blockedURI))"""

# what is in order is most of what axe has to say, and is not sent
_VIOLATIONS = """async rules =>
  (await axe.run(document, {runOnly: rules, resultTypes: ["violations"]})).violations"""


@dataclass  # no slots: Playwright marks the owner of a handler
class Visitor:
    """`page` is a Playwright page; `complaints` must be empty at the end of every test."""

    address: str
    context: BrowserContext
    page: Page
    complaints: list[str] = field(default_factory=list)
    refusals_expected: bool = False  # the page itself is meant to be answered with 4xx

    def goto(self, path: str) -> Page:
        self.page.goto(self.address + path)
        return self.page

    def heard(self, message: ConsoleMessage) -> None:
        refused = "the server responded with a status of 4" in message.text
        if message.type in ("error", "warning") and not (refused and self.refusals_expected):
            self.complaints.append(f"console: {message.text} ({message.location['url']})")

    def asked(self, request: Request) -> None:
        there = urlsplit(request.url)
        if there.scheme in ("http", "https", "ws") and not request.url.startswith(self.address):
            self.complaints.append(f"outside request: {request.url}")

    def violated(self, source: object, what: str) -> None:
        self.complaints.append(f"content security policy: {what}")

    def axe(self) -> list[str]:
        """What axe finds on the page as it stands, one line each."""
        if not self.page.evaluate("() => 'axe' in window"):
            self.page.evaluate(AXE + "; 0")
        violations = self.page.evaluate(_VIOLATIONS, list(RULES))
        return [
            f"{found['id']}: {found['help']} {[node['html'][:120] for node in found['nodes'][:3]]}"
            for found in violations
        ]

    def drawn(self) -> None:
        """Wait until every plot on the page has its picture."""
        self.page.wait_for_load_state("load")
        for _ in range(600):
            if self.page.evaluate(
                "() => [...document.querySelectorAll('.plot')]"
                ".every(plot => plot.querySelector('svg.main-svg'))"
            ):
                return
            self.page.wait_for_timeout(100)
        raise AssertionError(f"a chart was not drawn on {self.page.url}: {self.complaints}")


def enter(browser: Browser, address: str, *, size: str = "wide", scripts: bool = True) -> Visitor:
    """A fresh visitor without cookies or cache."""
    width, height = SIZES[size]
    context = browser.new_context(
        viewport={"width": width, "height": height},
        java_script_enabled=scripts,
        accept_downloads=True,
        reduced_motion="reduce",
    )
    context.set_default_timeout(60_000)  # a busy machine is slow, not wrong
    visitor = Visitor(address, context, context.new_page())
    context.expose_binding("reportViolation", visitor.violated)
    if scripts:
        context.add_init_script(_WATCH)
    visitor.page.on("console", visitor.heard)
    visitor.page.on("pageerror", lambda error: visitor.complaints.append(f"script: {error}"))
    visitor.page.on("request", visitor.asked)
    return visitor
