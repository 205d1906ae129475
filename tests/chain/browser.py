"""browser.py - Chromium without a window over pages in files: what it drew, complained of, and would print."""
import contextlib
import re
import subprocess
import tempfile

from selenium import webdriver
from selenium.webdriver.chrome.options import Options
from selenium.webdriver.chrome.service import Service

FLAGS = ["--headless", "--no-sandbox", "--disable-gpu", "--disable-quic", "--disable-dev-shm-usage", "--no-first-run",
         "--disable-background-networking", "--disable-component-update", "--disable-sync"]
PAPERS = {"A4": (210 / 25.4, 297 / 25.4), "Letter": (8.5, 11.0)}  # inches; ISO 216, ANSI/ASME Y14.1

# Where things were drawn, in pixels of the window: what the coordinates in the file became on the way through
# the layout. Middles of the disc, of its mark and of every weight and position, with the words beside them.
DRAWN = """
const middle = e => { const b = e.getBoundingClientRect(); return [b.left + b.width / 2, b.top + b.height / 2]; };
return [...document.querySelectorAll('svg')].filter(s => s.querySelector('[data-what=disc]')).map(s => ({
    label: s.getAttribute('aria-label'),
    disc: middle(s.querySelector('[data-what=disc] circle')),
    mark: middle(s.querySelector('[data-what=mark] path')),
    turns: s.querySelector('[data-what=rotation]') !== null,
    groups: [...s.querySelectorAll('[data-what=placement], [data-what=position]')].map(g => ({
        what: g.dataset.what, position: Number(g.dataset.position),
        at: middle(g.querySelector('circle, path')), text: [...g.querySelectorAll('text')].map(t => t.textContent),
        name: g.querySelector('text') ? middle(g.querySelector('text')) : null})),
}));
"""

# Words that stick out of their drawing.
CUT = """
const cut = [];
for (const s of document.querySelectorAll('svg')) {
    const b = s.getBoundingClientRect();
    for (const t of s.querySelectorAll('text')) {
        const r = t.getBoundingClientRect();
        if (r.width && (r.left < b.left - 1 || r.right > b.right + 1 || r.top < b.top - 1 || r.bottom > b.bottom + 1))
            cut.push(s.getAttribute('aria-label') + ': ' + t.textContent);
    }
}
return cut;
"""

# Cells of the answer, and verdicts of an audit, that are seen only after scrolling sideways.
HIDDEN = """
return [...document.querySelectorAll('.answer td, .verdicts td:last-child')].filter(e => {
    const r = e.getBoundingClientRect();
    return r.width === 0 || r.left < 0 || r.right > document.scrollingElement.clientWidth + 0.5;
}).map(e => e.textContent);
"""

# Pairs of numbers in one polar plot that are written over each other.
OVERLAID = """
const pairs = [];
for (const s of document.querySelectorAll('svg')) {
    const t = [...s.querySelectorAll('[data-what=reading] text')];
    const boxes = t.map(e => e.getBoundingClientRect());
    for (let i = 0; i < t.length; i++) for (let k = 0; k < i; k++) {
        const a = boxes[i], b = boxes[k];
        const w = Math.min(a.right, b.right) - Math.max(a.left, b.left);
        const h = Math.min(a.bottom, b.bottom) - Math.max(a.top, b.top);
        if (w > 0.1 * a.width && h > 0.3 * a.height)
            pairs.push(s.getAttribute('aria-label') + ': ' + t[i].textContent + ', ' + t[k].textContent);
    }
}
return pairs;
"""


class Browser:
    def __init__(self, driver):
        self.driver = driver

    def open(self, path, width):
        """Opens the page in a window of that width; what it complained of."""
        self.driver.execute_cdp_cmd("Emulation.setDeviceMetricsOverride", {
            "width": width, "height": 900, "deviceScaleFactor": 1, "mobile": width < 600})
        self.driver.get(path.as_uri())
        return [line["message"] for line in self.driver.get_log("browser")]

    def script(self, text):
        return self.driver.execute_script(text)

    def widths(self):
        """Of the content and of the window."""
        return self.script("const e = document.scrollingElement; return [e.scrollWidth, e.clientWidth]")

    def words(self):
        return " ".join(self.script("return document.body.innerText").split())

    def printed(self, paper):
        """The page as PDF: bytes."""
        wide, high = PAPERS[paper]
        return self.driver.print_page_bytes(wide, high)


class Printing(webdriver.Chrome):
    def print_page_bytes(self, wide, high):
        import base64
        done = self.execute_cdp_cmd("Page.printToPDF", {"paperWidth": wide, "paperHeight": high,
                                                        "printBackground": False, "preferCSSPageSize": False})
        return base64.b64decode(done["data"])


@contextlib.contextmanager
def chromium():
    with tempfile.TemporaryDirectory(prefix="lopside-", ignore_cleanup_errors=True) as profile:
        options = Options()
        options.binary_location = "/usr/bin/chromium"
        for flag in [*FLAGS, f"--user-data-dir={profile}"]:
            options.add_argument(flag)
        options.set_capability("goog:loggingPrefs", {"browser": "ALL"})
        driver = Printing(service=Service("/usr/bin/chromedriver"), options=options)
        try:
            yield Browser(driver)
        finally:
            driver.quit()


def pdf_pages(pdf):
    """[(width, height, [(left, top, right, bottom, word)])] in points."""
    done = subprocess.run(["pdftotext", "-bbox", "-", "-"], input=pdf, capture_output=True, check=True, timeout=60)
    pages = []
    number = r'"([-\d.]+)"'
    for line in done.stdout.decode().splitlines():
        if page := re.search(rf"<page width={number} height={number}", line):
            pages.append((float(page[1]), float(page[2]), []))
        elif word := re.search(rf"<word xMin={number} yMin={number} xMax={number} yMax={number}>(.*)</word>", line):
            pages[-1][2].append((*(float(word[i]) for i in range(1, 5)), word[5]))
    return pages
