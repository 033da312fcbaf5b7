"""The page of `tiltgap handout` in a real browser: its calculator against `tiltgap apply`, no request, no error, print.

    python tests/browser/handout.py PROGRAM [--browser chromium] [--keep FOLDER]

Talks to a Chromium over its debugging pipe; needs Python's standard library only. Exit code 0: all good.
"""

import argparse
import base64
import json
import math
import os
import pathlib
import re
import shutil
import subprocess
import sys
import tempfile

# Calculator and `apply` are the same formulas in two languages: they differ by rounding. Uncertainties come from
# difference quotients over 1e-4 of an axis, which magnify rounding by 1e4.
LIMIT = 1e-9
# A page of A4 and one of Letter, in inches.
PAPERS = {"A4": (8.27, 11.69), "Letter": (8.5, 11.0)}

BENCH = {
    "title": "</script><script>document.title='harm'</script> & \"quotes\"",
    "lower_plate": {"length": "100 mm", "width": "80 mm"},
    "upper_plate": {"length": "90 mm", "width": "80 mm"},
    "pose": {"gap": "6 mm", "tilt": "0.5 deg", "shift": ["2 mm", "0 mm"]},
    "hinge": {"arm": "140 mm", "height": "3 mm"},
    "drive": {"voltage": "500 V"},
}

# Name, options of `tabulate`, readings: what is typed, with its unit.
FREE = ["--gaps", "4mm..12mm/9", "--tilts", "-0.3deg..0.9deg/7"]
TABLES = [
    ("free", FREE + ["--accuracy", "1e-3"], [
        {"gap": "6.3 mm", "tilt": "0.41 deg", "voltage": "380 V"},
        {"gap": "4 mm", "tilt": "0.9 deg", "voltage": "-250 V", "u_gap": "0.01 mm", "u_tilt": "0.02 deg", "u_voltage": "0.5 V"},
        {"gap": "11,97 mm", "tilt": "-0.3 deg", "voltage": "1e3 V", "u_gap": "0.03 mm"},
    ]),
    ("rolled", ["--rolls", "-0.2deg..0.3deg", "--gaps", "5mm..9mm", "--accuracy", "1e-2"], [
        {"roll": "0.11 deg", "gap": "7.7 mm", "voltage": "400 V", "u_roll": "0.01 deg", "u_gap": "0.02 mm"},
        {"roll": "-0.2 deg", "gap": "5 mm", "voltage": "400 V", "u_roll": "0.01 deg"},
    ]),
    ("along", ["--along-hinge", "--angles", "-10mrad..8mrad", "--accuracy", "1e-3"], [
        {"angle": "-3.3 mrad", "voltage": "400 V", "u_angle": "0.1 mrad", "u_voltage": "1 V"},
        {"angle": "8 mrad", "voltage": "400 V"},
    ]),
]


class Browser:
    """A Chromium on a pipe: commands out, answers and events in."""

    def __init__(self, program, profile):
        to_read, self.to = os.pipe()
        self.fro, to_write = os.pipe()

        def ends():
            # The browser reads from 3 and writes to 4.
            os.dup2(to_read, 103)
            os.dup2(to_write, 104)
            os.dup2(103, 3)
            os.dup2(104, 4)

        self.process = subprocess.Popen(
            [program, "--headless", "--no-sandbox", "--disable-gpu", "--no-first-run", f"--user-data-dir={profile}",
             "--remote-debugging-pipe", "about:blank"],
            preexec_fn=ends, close_fds=False, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL)
        os.close(to_read)
        os.close(to_write)
        self.buffer, self.number, self.events, self.session = b"", 0, [], None
        target = self.call("Target.createTarget", url="about:blank")["targetId"]
        self.session = self.call("Target.attachToTarget", targetId=target, flatten=True)["sessionId"]
        for domain in ("Page", "Runtime", "Log", "Network"):
            self.call(f"{domain}.enable")

    def message(self):
        while b"\0" not in self.buffer:
            more = os.read(self.fro, 1 << 16)
            if not more:
                raise RuntimeError("the browser has ended")
            self.buffer += more
        text, self.buffer = self.buffer.split(b"\0", 1)
        return json.loads(text)

    def call(self, method, **params):
        self.number += 1
        command = {"id": self.number, "method": method, "params": params}
        if self.session:
            command["sessionId"] = self.session
        os.write(self.to, json.dumps(command).encode() + b"\0")
        while True:
            answer = self.message()
            if answer.get("id") == self.number:
                if "error" in answer:
                    raise RuntimeError(f"{method}: {answer['error']}")
                return answer["result"]
            self.events.append(answer)

    def wait(self, event):
        while not any(e.get("method") == event for e in self.events):
            self.events.append(self.message())

    def open(self, url):
        self.events = []
        self.call("Page.navigate", url=url)
        self.wait("Page.loadEventFired")

    def value(self, expression):
        answer = self.call("Runtime.evaluate", expression=expression, returnByValue=True)
        if "exceptionDetails" in answer:
            raise RuntimeError(answer["exceptionDetails"])
        return answer["result"].get("value")

    def type(self, values):
        """Types texts into the fields, as a person would, and clears the others."""
        self.value(f"""(() => {{
            const values = {json.dumps(values)};
            for (const input of document.querySelectorAll("#calculator-form input")) {{
                input.value = values[input.name] ?? "";
                input.dispatchEvent(new Event("input", {{ bubbles: true }}));
            }}
        }})()""")

    def close(self):
        try:
            self.call("Browser.close")
        except (RuntimeError, OSError):
            pass
        self.process.wait(timeout=20)


failures = []


def check(good, words):
    if not good:
        failures.append(words)
        print(f"FAILED {words}")


def applied(program, table, reading):
    texts = [f"{name}={text.replace(',', '.').replace(' ', '')}" for name, text in reading.items()]
    answer = subprocess.run([program, "apply", table, "--at", ",".join(texts), "--json"], capture_output=True, text=True,
                            check=True)
    return json.loads(answer.stdout)


def compare(browser, program, table, reading, name):
    browser.type({key: text.split(" ")[0] for key, text in reading.items()})
    message = browser.value("document.getElementById('calculator-message').textContent")
    check(message == "", f"{name} {reading}: {message}")
    expected = applied(program, table, reading)
    worst = 0.0
    for quantity, key in (("capacitance", "capacitance_f"), ("force", "force_n"), ("torque", "torque_nm")):
        cells = {}
        for column in ("ideal", "factor", "corrected"):
            text = browser.value(f"document.getElementById('out-{quantity}-{column}')?.dataset.value ?? ''")
            check(text != "", f"{name}: {quantity} {column} is empty")
            cells[column] = [float(v) for v in (text or "nan nan").split(" ")]
        pairs = [(cells["ideal"][0], expected["ideal"][key])]
        for column, group in (("factor", "factors"), ("corrected", "corrected")):
            there = expected[group][quantity if group in ("factors", "corrected") else key]
            pairs += [(cells[column][0], there["value"]), (cells[column][1], there["uncertainty"])]
        for here, there in pairs:
            off = abs(here - there) / abs(there) if there else abs(here)
            worst = max(worst, off)
            check(off <= LIMIT and math.isfinite(off), f"{name} {reading} {quantity}: page {here!r}, apply {there!r}")
    return worst


def quiet(browser, url, name):
    """No error, no word on the console, no request but the page itself."""
    for event in browser.events:
        method, params = event.get("method"), event.get("params", {})
        check(method not in ("Runtime.exceptionThrown", "Runtime.consoleAPICalled", "Log.entryAdded"), f"{name}: {params}")
        if method == "Network.requestWillBeSent":
            asked = params["request"]["url"]
            check(asked == url or asked.startswith("data:"), f"{name}: request {asked[:80]}")


def printed(browser, name, keep):
    """On paper nothing is wider than the page, and no table of factors is cut where it could be whole."""
    for paper, (width, height) in PAPERS.items():
        pdf = base64.b64decode(browser.call(
            "Page.printToPDF", paperWidth=width, paperHeight=height, printBackground=True, preferCSSPageSize=False)["data"])
        pages = len(re.findall(rb"/Type\s*/Page\b", pdf))
        check(pdf.startswith(b"%PDF") and 1 <= pages <= 8, f"{name}: {pages} pages of {paper}")
        if keep:
            (keep / f"{name}-{paper}.pdf").write_bytes(pdf)
        print(f"{name}: {pages} pages of {paper}")
        # The same layout on the screen: as wide as the paper between its margins of 13 mm.
        pixels = int((width - 2 * 13 / 25.4) * 96)
        browser.call("Emulation.setEmulatedMedia", media="print")
        browser.call("Emulation.setDeviceMetricsOverride", width=pixels, height=1000, deviceScaleFactor=1, mobile=False)
        wide = browser.value("""[...document.querySelectorAll("table, svg, p, dl")]
            .filter((e) => e.getBoundingClientRect().right > document.documentElement.clientWidth + 1)
            .map((e) => e.tagName + " " + e.textContent.slice(0, 40))""")
        check(wide == [], f"{name}: wider than {paper}: {wide}")
        # A height between the margins of 14 mm holds every table whole.
        tallest = browser.value("Math.max(...[...document.querySelectorAll('.scroll')].map((e) => e.offsetHeight))")
        check(tallest < (height - 2 * 14 / 25.4) * 96, f"{name}: a table is {tallest} px high, more than {paper}")
        kept = browser.value("""[...document.querySelectorAll('.scroll')]
            .every((e) => getComputedStyle(e).breakInside === 'avoid')""")
        check(kept, f"{name}: tables may be cut")
        check(browser.value("document.getElementById('calculator').offsetHeight") == 0, f"{name}: calculator in print")
    browser.call("Emulation.setEmulatedMedia", media="")


def looked_at(browser, name, keep):
    """On a phone nothing but tables scrolls sideways; pictures of all looks for whoever wants to see them."""
    for look, width, scheme in (("light", 1000, "light"), ("dark", 1000, "dark"), ("phone", 390, "light")):
        browser.call("Emulation.setEmulatedMedia", features=[{"name": "prefers-color-scheme", "value": scheme}])
        browser.call("Emulation.setDeviceMetricsOverride", width=width, height=900, deviceScaleFactor=1, mobile=look == "phone")
        over = browser.value("document.documentElement.scrollWidth - document.documentElement.clientWidth")
        check(over <= 0, f"{name}: the page is {over} px too wide at {width} px")
        contrast = browser.value(CONTRAST)
        check(contrast >= 4.5, f"{name}: contrast {contrast:.2f} in {look}")
        if keep:
            shot = browser.call("Page.captureScreenshot", captureBeyondViewport=True)["data"]
            (keep / f"{name}-{look}.png").write_bytes(base64.b64decode(shot))
    browser.call("Emulation.setEmulatedMedia", features=[])
    browser.call("Emulation.clearDeviceMetricsOverride")


# Least contrast of a text to its ground over the whole page (WCAG 2.1, 1.4.3: 4.5 for AA).
CONTRAST = r"""(() => {
    const parts = (c) => (c.match(/[\d.]+/g) ?? []).map(Number);
    const light = (c) => {
        const [r, g, b] = parts(c).slice(0, 3).map((v) => v / 255)
            .map((v) => (v <= 0.03928 ? v / 12.92 : Math.pow((v + 0.055) / 1.055, 2.4)));
        return 0.2126 * r + 0.7152 * g + 0.0722 * b;
    };
    let least = 21;
    for (const e of document.querySelectorAll("main *:not(svg *)")) {
        if (![...e.childNodes].some((n) => n.nodeType === 3 && n.data.trim())) continue;
        let ground = e;
        while (ground.parentElement && parts(getComputedStyle(ground).backgroundColor)[3] === 0) ground = ground.parentElement;
        const [a, b] = [getComputedStyle(e).color, getComputedStyle(ground).backgroundColor].map(light);
        least = Math.min(least, (Math.max(a, b) + 0.05) / (Math.min(a, b) + 0.05));
    }
    return least;
})()"""


def refusals(browser):
    """What cannot be calculated is a sentence, and no number is left."""
    for values, words in (
        ({"gap": "3.9", "tilt": "0.4", "voltage": "400"}, "The gap is outside the table, 4 to 12 mm"),
        ({"gap": "", "tilt": "0.4", "voltage": "400"}, "Gap: type a number."),
        ({"gap": "5", "tilt": "0.4", "voltage": "4o0"}, "Voltage: type a number."),
        ({"gap": "5", "tilt": "1.2", "voltage": "400"}, "outside the table, \u22120.3 to 0.9 deg"),
        ({"gap": "5", "tilt": "0.4", "voltage": "400", "u_gap": "-1"}, "no standard uncertainty is negative"),
    ):
        browser.type(values)
        message = browser.value("document.getElementById('calculator-message').textContent")
        check(words in message, f"{values}: {message!r} does not say {words!r}")
        left = browser.value("document.querySelectorAll('[data-value]').length")
        check(left == 0, f"{values}: {left} numbers are left")


def main():
    arguments = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    arguments.add_argument("program")
    arguments.add_argument("--browser", default=None)
    arguments.add_argument("--keep", type=pathlib.Path, default=None, help="folder for pages, pictures and PDFs")
    options = arguments.parse_args()
    found = options.browser or next(filter(None, map(shutil.which, ("chromium", "chromium-browser", "google-chrome"))), None)
    if not found:
        sys.exit("no Chromium was found; install one (apt-get install chromium) or name it with --browser")
    program = str(pathlib.Path(options.program).resolve())
    if options.keep:
        options.keep.mkdir(parents=True, exist_ok=True)
    with tempfile.TemporaryDirectory(ignore_cleanup_errors=True) as folder:
        folder = pathlib.Path(folder)
        (folder / "bench.json").write_text(json.dumps(BENCH))
        browser = Browser(found, folder / "profile")
        try:
            for name, ranges, readings in TABLES:
                table, page = folder / f"{name}.json", (options.keep or folder) / f"{name}.html"
                page = page.resolve()
                subprocess.run([program, "tabulate", str(folder / "bench.json"), *ranges, "-o", str(table)], check=True,
                               capture_output=True)
                subprocess.run([program, "handout", str(table), "-o", str(page)], check=True)
                browser.open(page.as_uri())
                check(browser.value("document.title") == BENCH["title"], f"{name}: the title is not what was typed")
                worst = max(compare(browser, program, str(table), reading, name) for reading in readings)
                print(f"{name}: page and apply differ by {worst:.1e} at most")
                if name == "free":
                    refusals(browser)
                    compare(browser, program, str(table), readings[0], name)
                looked_at(browser, name, options.keep)
                printed(browser, name, options.keep)
                quiet(browser, page.as_uri(), name)
        finally:
            browser.close()
    if failures:
        sys.exit(f"{len(failures)} checks failed")
    print("browser: all good")


if __name__ == "__main__":
    main()
