#!/usr/bin/env python3
"""Opens report pages in headless Chromium and looks at what a reader would.

Usage: report_test.py SAMPLE_PAGES_PROGRAM STILLZONE CASES_FOLDER
Pages of invented results of 2 to 30 zones, and those of shipped cases as the program writes them.
Checks of every page: no script error, no request, nothing wider than the window at 400 and 1600,
no texts of the network figure over each other, no text outside its drawing, hover shows a value,
dragging zooms and the reset undoes it, the PDF holds every section. Size of the long history.
"""
import html
import json
import pathlib
import re
import shutil
import subprocess
import sys
import tempfile

PROBE = """<script>addEventListener("load", () => setTimeout(() => {
const found = {overlaps: [], outside: [], wide: 0, requests: 0, hover: "", zoom: "", charts: 0};
const net = document.querySelector("svg.net");
if (net) { const seen = [...net.querySelectorAll("text")].map(t => [t.textContent, t.getBoundingClientRect()]);
  const all = net.getBoundingClientRect();
  for (let i = 0; i < seen.length; i++) { const [a, r] = seen[i];
    if (r.left < all.left - 1 || r.right > all.right + 1 || r.top < all.top - 1 || r.bottom > all.bottom + 1) found.outside.push(a);
    for (let j = i + 1; j < seen.length; j++) { const [b, s] = seen[j];
      const w = Math.min(r.right, s.right) - Math.max(r.left, s.left), h = Math.min(r.bottom, s.bottom) - Math.max(r.top, s.top);
      if (w > 0.5 && h > 3.5) found.overlaps.push(a + " | " + b); } } found.texts = seen.length; }
for (const svg of document.querySelectorAll("figure.chart svg[viewBox]")) { if (svg.parentNode.tagName !== "FIGURE") continue;
  const all = svg.getBoundingClientRect(); found.charts++;
  for (const t of svg.querySelectorAll("text")) { const r = t.getBoundingClientRect();
    if (r.left < all.left - 1 || r.right > all.right + 1 || r.bottom > all.bottom + 2) found.outside.push(t.textContent); } }
found.wide = document.documentElement.scrollWidth - innerWidth;
found.inner = innerWidth;
found.requests = performance.getEntriesByType("resource").length;
const live = document.querySelector("svg.live[data-zoom]");
if (live) { live.setPointerCapture = () => {}; const b = live.getBoundingClientRect(), y = b.top + b.height / 3;
  const go = (type, share) => live.dispatchEvent(new PointerEvent(type, {clientX: b.left + share * b.width, clientY: y, bubbles: true}));
  const line = live.querySelector("[data-name]"), before = line.getAttribute("d");
  go("pointermove", 0.5); found.hover = [...live.querySelectorAll("g[pointer-events] text")].map(t => t.textContent).join("; ");
  go("pointerdown", 0.4); go("pointermove", 0.6); go("pointerup", 0.6);
  found.zoom = line.getAttribute("d") === before ? "nothing" : "moved";
  const button = live.parentNode.querySelector("button"); found.button = button && !button.hidden;
  button.click(); found.reset = line.getAttribute("d") === before; }
const out = document.createElement("script"); out.type = "application/json"; out.id = "found"; out.textContent = JSON.stringify(found);
document.body.append(out); }, 200));</script>"""

faults = []


def check(holds, page, what):
    if not holds:
        faults.append(f"{page}: {what}")


def chromium(browser, *arguments):
    with tempfile.TemporaryDirectory(ignore_cleanup_errors=True) as profile:
        return subprocess.run(
            [browser, "--headless", "--no-sandbox", "--disable-gpu", "--no-first-run",
             "--disable-background-networking", "--enable-logging=stderr",
             "--virtual-time-budget=20000", f"--user-data-dir={profile}", *arguments],
            capture_output=True, text=True, timeout=120, check=False)


def probe(browser, page, width):
    """The page in a frame-less window; below Chromium's least window an <iframe> gives the width."""
    text = page.read_text(encoding="utf-8")
    probed = page.with_name(page.stem + f"_{width}.html")
    probed.write_text(text.replace("</body>", PROBE + "</body>"), encoding="utf-8")
    if width >= 600:
        run = chromium(browser, f"--window-size={width},1200", "--dump-dom", probed.as_uri())
    else:
        frame = page.with_name(page.stem + "_frame.html")
        frame.write_text(f"""<body><iframe id=f width={width} height=900 style="border:0" src="{probed.name}"></iframe>
<script>const wait = setInterval(() => {{ const d = document.getElementById("f").contentDocument.getElementById("found");
if (d) {{ clearInterval(wait); document.body.append(d.cloneNode(true)); }} }}, 100);</script>""", encoding="utf-8")
        run = chromium(browser, "--allow-file-access-from-files", "--dump-dom", frame.as_uri())
    errors = [line for line in run.stderr.splitlines() if "CONSOLE" in line]
    match = re.search(r'id="found">(.*?)</script>', run.stdout, re.S)
    return errors, json.loads(html.unescape(match.group(1))) if match else None


def look(browser, page, width):
    name = f"{page.name} at {width}"
    for _ in range(3):  # a browser on a busy machine may end before it has looked
        errors, found = probe(browser, page, width)
        if errors or found is not None:
            break
    check(not errors, name, f"console: {errors[:3]}")
    check(found is not None, name, "the probe gave no answer")
    if found is None:
        return
    check(found["inner"] == width, name, f"the window is {found['inner']} wide")
    check(found["texts"] > 3, name, "no network figure")
    check(not found["overlaps"], name, f"texts over each other: {found['overlaps'][:6]}")
    check(not found["outside"], name, f"texts outside their drawing: {found['outside'][:6]}")
    check(found["wide"] <= 0, name, f"{found['wide']} px wider than the window")
    check(found["requests"] == 0, name, f"{found['requests']} requests")
    if "button" in found:
        check("time" in found["hover"] and len(found["hover"].split("; ")) >= 2, name,
              f"hover shows {found['hover']!r}")
        check(found["zoom"] == "moved" and found["button"], name, "dragging does not zoom")
        check(found["reset"], name, "reset does not bring the whole history back")


def prints(browser, page):
    pdf = page.with_suffix(".pdf")
    chromium(browser, "--no-pdf-header-footer", f"--print-to-pdf={pdf}", page.as_uri())
    check(pdf.exists(), page.name, "no PDF")
    if not pdf.exists():
        return
    text = subprocess.run(["pdftotext", "-layout", pdf, "-"], capture_output=True, text=True,
                          check=True).stdout
    headings = re.findall(r"<h2>(.*?)</h2>", page.read_text(encoding="utf-8"))
    check(len(headings) >= 9, page.name, f"{len(headings)} sections")
    for heading in headings:
        check(html.unescape(heading) in text, page.name, f"the PDF lacks {heading!r}")
    if "class=printed" in page.read_text(encoding="utf-8"):
        check(re.search(r"^ *\u22123 .*before the dose|^ *1\.6 ", text, re.M), page.name, "the PDF lacks the samples")
    for word in ("prepared by", "checked by"):
        check(word in text, page.name, f"the PDF lacks {word!r}")
    check(3 <= text.count("\f") <= 25, page.name, f"the PDF has {text.count(chr(12))} pages")


def main():
    browser = shutil.which("chromium")
    if not browser or not shutil.which("pdftotext"):
        print("chromium or pdftotext is missing: not tested")
        return 77
    with tempfile.TemporaryDirectory() as folder:
        subprocess.run([sys.argv[1], folder], check=True)
        pages = sorted(pathlib.Path(folder).glob("*.html"))
        check(len(pages) == 6, "sample pages", f"{len(pages)} written")
        for case in ("pulse_feeding", "short_circuit_stagnant"):
            out = pathlib.Path(folder) / case
            subprocess.run([sys.argv[2], "run", f"{sys.argv[3]}/{case}.json", "--quiet", "--out", out],
                           check=True, capture_output=True)
            page = pathlib.Path(folder) / f"{case}.html"
            shutil.copy(out / "report.html", page)
            pages.append(page)
        for page in pages:
            text = page.read_text(encoding="utf-8")
            check(len(text.encode()) < 1_000_000, page.name, f"{len(text.encode())} bytes")
            check(not re.search(r"(src|href)\s*=\s*[\"']?(https?:)?//", text), page.name, "an address")
            for width in (400, 1600):
                look(browser, page, width)
            prints(browser, page)
            print(f"{page.name}: {len(text.encode())} bytes")
    print("\n".join(faults) or "all well")
    return 1 if faults else 0


sys.exit(main())
