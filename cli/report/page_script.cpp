#include "cli/report/page_look.hpp"

namespace stillzone::cli {

// Curves are read back from their paths (integers, tenths of a unit, relative after the first
// point), so the page carries each number once.
std::string_view page_script() {
  return R"js(
"use strict";
for (const [when, open] of [["beforeprint", true], ["afterprint", false]])
  addEventListener(when, () => { for (const d of document.querySelectorAll("details.printed")) d.open = open; });
for (const svg of document.querySelectorAll("svg.live")) {
  const NS = "http://www.w3.org/2000/svg", plot = svg.querySelector("svg"), num = s => s.split(" ").map(Number);
  const [px, py, pw, ph] = num(svg.dataset.plot), X = num(svg.dataset.x), Y = num(svg.dataset.y);
  const add = (tag, attrs, text, into = svg) => { const e = document.createElementNS(NS, tag);
    for (const k in attrs) e.setAttribute(k, attrs[k]); if (text !== undefined) e.textContent = text; into.append(e); return e; };
  const value = (a, f) => a[2] ? Math.pow(10, Math.log10(a[0]) + f * (Math.log10(a[1]) - Math.log10(a[0]))) : a[0] + f * (a[1] - a[0]);
  const show = v => { const a = Math.abs(v); return a && (a < 1e-3 || a >= 1e6) ? v.toExponential(3) : String(+v.toPrecision(4)); };
  const lines = [...svg.querySelectorAll("[data-name]")].map(el => { let x = 0, y = 0; const at = [];
    const n = el.getAttribute("d").match(/-?\d+/g).map(Number);
    for (let i = 0; i < n.length; i += 2) { x += n[i]; y += n[i + 1]; at.push([x, y]); }
    return { el, at, name: el.dataset.name }; });
  let view = [0, 1], down = null, pick = null;
  const layer = add("g", { "pointer-events": "none" });
  const where = ev => { const m = svg.getScreenCTM().inverse(); return (m.a * ev.clientX + m.e - px) / pw; };
  const real = f => view[0] + f * (view[1] - view[0]);
  const draw = () => { const w = 10 * pw, s = 1 / (view[1] - view[0]);
    for (const l of lines) { let d = "", a = 0, b = 0;
      l.at.forEach((p, i) => { const x = Math.round((p[0] - view[0] * w) * s); d += (i ? i > 1 ? " " : "l" : "M") + (x - a) + " " + (p[1] - b); a = x; b = p[1]; });
      l.el.setAttribute("d", d); }
    const whole = view[0] === 0 && view[1] === 1;
    for (const e of svg.querySelectorAll(".mk,.xt")) e.style.display = whole ? "" : "none";
    svg.querySelector(".zt")?.remove(); if (whole) return;
    const g = add("g", { class: "zt" });
    for (let i = 0; i <= 4; i++) add("text", { x: px + i * pw / 4, y: py + ph + 20, class: i ? i < 4 ? "c" : "e" : "" }, show(value(X, real(i / 4))), g); };
  const hover = f => { layer.replaceChildren(); if (f < 0 || f > 1) return;
    const g = real(f) * 10 * pw; let best = null;
    for (const l of lines) for (const p of l.at) if (best === null || Math.abs(p[0] - g) < Math.abs(best - g)) best = p[0];
    if (best === null) return;
    const rows = [];
    for (const l of lines) { let p = null; for (const q of l.at) if (p === null || Math.abs(q[0] - best) < Math.abs(p[0] - best)) p = q;
      rows.push(l.name + "  " + show(value(Y, 1 - p[1] / (10 * ph)))); }
    const cx = px + (best / (10 * pw) - view[0]) / (view[1] - view[0]) * pw, shown = rows.slice(0, 12);
    shown.unshift(svg.dataset.xname + " " + show(value(X, best / (10 * pw)))); if (rows.length > 12) shown.push("and " + (rows.length - 12) + " more");
    add("line", { x1: cx, x2: cx, y1: py, y2: py + ph, class: "cursor" }, undefined, layer);
    const box = add("rect", { class: "tip", rx: 5 }, undefined, layer);
    const texts = shown.map((t, i) => add("text", { x: 0, y: py + 20 + 17 * i, class: i ? "" : "b" }, t, layer));
    const wide = Math.max(...texts.map(t => t.getComputedTextLength())) + 14, left = cx + wide + 8 > px + pw ? Math.max(2, cx - wide - 8) : cx + 8;
    texts.forEach(t => t.setAttribute("x", left + 7));
    for (const [k, v] of [["x", left], ["y", py + 3], ["width", wide], ["height", 17 * shown.length + 10]]) box.setAttribute(k, v); };
  svg.addEventListener("pointermove", ev => { const f = where(ev);
    if (down !== null && pick) { const a = Math.max(0, Math.min(down, f)), b = Math.min(1, Math.max(down, f));
      pick.setAttribute("x", px + a * pw); pick.setAttribute("width", (b - a) * pw); } else hover(f); });
  svg.addEventListener("pointerleave", () => { if (down === null) layer.replaceChildren(); });
  if (!("zoom" in svg.dataset)) continue;
  const reset = document.createElement("button"); reset.type = "button"; reset.textContent = "Show whole history"; reset.hidden = true;
  svg.after(reset); svg.style.touchAction = "pan-y"; plot.style.cursor = "crosshair";
  reset.onclick = () => { view = [0, 1]; reset.hidden = true; draw(); };
  svg.addEventListener("pointerdown", ev => { const f = where(ev); if (f < 0 || f > 1) return; ev.preventDefault(); down = f;
    svg.setPointerCapture(ev.pointerId); layer.replaceChildren(); pick = add("rect", { x: px + f * pw, y: py, width: 0, height: ph, class: "pick" }, undefined, layer); });
  svg.addEventListener("pointerup", ev => { if (down === null) return; const f = Math.min(1, Math.max(0, where(ev))), a = Math.min(down, f), b = Math.max(down, f);
    down = null; layer.replaceChildren(); if (b - a < 0.01) return; view = [real(a), real(b)]; reset.hidden = false; draw(); });
}
)js";
}

}  // namespace stillzone::cli
