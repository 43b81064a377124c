// Draws every <div class="plot" data-chart="key"> from <script type="application/json" id="chart-key">, which
// stands beside it in the same figure, so that a block swapped in brings its own numbers.
// A figure never carries a height (CSS owns it) or a colour (it names tokens: "@ink", "@s1/.14").
(() => {
  "use strict";
  const NARROW = 560, PAPER = 640;
  const CONFIG = {
    displayModeBar: false, displaylogo: false, showSendToCloud: false, plotlyServerURL: "",
    responsive: false, scrollZoom: false, doubleClick: false, showTips: false,
  };

  // Tokens are read through the computed colour of a hidden element: a system colour of a forced palette
  // comes out as numbers too, which is all that Plotly understands.
  const probes = { page: document.createElement("i"), paper: document.createElement("i") };
  const known = new Map();
  function colour(name, alpha, ground) {
    if (ground === "print") return name === "ground" ? "#fff" : colour(name, alpha, "paper");  // the sheet is white
    const key = `${ground} ${name} ${alpha}`;
    if (!known.has(key)) {
      probes[ground].style.color = `var(--${name})`;
      const [r, g, b] = getComputedStyle(probes[ground]).color.match(/[\d.]+/g);
      known.set(key, `rgba(${r},${g},${b},${alpha ?? 1})`);
    }
    return known.get(key);
  }
  const TOKEN = /^@([a-z0-9-]+)(?:\/(\.?\d+))?$/;
  function inked(value, ground) {
    if (typeof value === "string") {
      const found = TOKEN.exec(value);
      return found ? colour(found[1], found[2], ground) : value;
    }
    if (Array.isArray(value)) return value.map(one => inked(one, ground));
    if (value && typeof value === "object") {
      return Object.fromEntries(Object.entries(value).map(([key, one]) => [key, inked(one, ground)]));
    }
    return value;
  }

  const figures = new WeakMap();
  function figureOf(box) {
    if (!figures.has(box)) figures.set(box, JSON.parse(document.getElementById("chart-" + box.dataset.chart).textContent));
    return figures.get(box);
  }
  const boxes = () => document.querySelectorAll(".plot[data-chart]");
  function draw(box, onPaper) {
    const figure = figureOf(box);
    const width = onPaper ? PAPER : box.clientWidth;
    const over = onPaper ? figure.print : width < NARROW ? figure.narrow : {};
    const ground = onPaper ? "print" : "page";
    const layout = inked({ ...figure.layout, ...over }, ground);
    layout.width = width;
    layout.height = onPaper ? figure.print_height : box.clientHeight;
    box.dataset.drawn = width;
    return Plotly.react(box, inked(figure.data, ground), layout, CONFIG);
  }
  function drawAll(onPaper) {
    known.clear();
    for (const box of boxes()) draw(box, onPaper);
  }

  // The picture leaves the page with its finding, unit line and source on it, always on paper colours.
  function picture(box) {
    const plate = box.closest("figure"), figure = figureOf(box);
    const layout = structuredClone(figure.layout), margin = layout.margin, below = margin.b;
    const lines = (selector, most) => {
      const out = [""];
      for (const word of plate.querySelector(selector).textContent.trim().split(/\s+/)) {
        if ((out.at(-1) + word).length > most) out.push(word);
        else out.push(`${out.pop()} ${word}`.trim());
      }
      return out.map(line => line.replaceAll("&", "&amp;").replaceAll("<", "&lt;"));
    };
    const finding = lines(".finding", 84), unit = lines(".unit", 130), source = lines(".foot > span", 140);
    const overUnit = 44 + 18 * unit.length, added = overUnit + 26 * finding.length + 12 - margin.t;
    const under = 18 * source.length + 22;
    Object.assign(margin, { t: margin.t + added, b: below + under, l: margin.l + 18, r: margin.r + 12 });
    for (const note of layout.annotations) {
      const isScale = note.xref === "paper" && note.x === 0 && note.yref === "paper" && note.y === 1;
      if (isScale) Object.assign(note, { yshift: 14, xshift: 16 - margin.l });
    }
    const write = (text, y, yanchor, yshift, font) => layout.annotations.push({
      text: text.join("<br>"), x: 0, xref: "paper", xanchor: "left", xshift: 16 - margin.l,
      y, yref: "paper", yanchor, yshift, showarrow: false, align: "left", font,
    });
    write(finding, 1, "bottom", overUnit, { family: "Vollkorn Ebb, Georgia, serif", size: 20, color: "@ink" });
    write(unit, 1, "bottom", 38, { size: 14, color: "@ink-2" });
    write(source, 0, "top", -below - 4, { size: 13, color: "@ink-2" });
    layout.paper_bgcolor = "@ground";
    const whole = inked({ data: figure.data, layout }, "paper");
    const size = { width: 942, height: box.clientHeight + added + under };
    return Plotly.downloadImage({ ...whole, config: CONFIG }, { format: "svg", filename: "ebbline-" + box.dataset.chart, ...size });
  }

  // A link to a table inside a closed fold opens the fold.
  function unfold(hash) {
    const fold = document.getElementById(hash.slice(1))?.closest("details");  // our ids are plain letters
    if (fold) fold.open = true;
  }
  const offerPictures = () => document.querySelectorAll("a[data-picture][hidden]").forEach(link => { link.hidden = false; });

  async function start() {
    for (const probe of Object.values(probes)) { probe.hidden = true; document.body.append(probe); }
    probes.paper.className = "on-paper";
    await Promise.all(["480 14px 'Ysabeau Ebb'", "italic 480 14px 'Ysabeau Ebb'"].map(face => document.fonts.load(face).catch(() => 0)));
    drawAll(false);
    offerPictures();
    unfold(location.hash);
    let wait;
    const redraw = () => boxes().forEach(box => +box.dataset.drawn !== box.clientWidth && draw(box, false));
    new ResizeObserver(() => { clearTimeout(wait); wait = setTimeout(redraw, 120); }).observe(document.body);
    for (const query of ["(prefers-color-scheme: dark)", "(forced-colors: active)"]) {
      matchMedia(query).addEventListener("change", () => drawAll(false));
    }
    addEventListener("beforeprint", () => drawAll(true));
    addEventListener("afterprint", () => drawAll(false));
    document.addEventListener("htmx:before:swap", event => {
      const target = event.detail?.ctx?.target;
      if (target instanceof Element) target.querySelectorAll(".plot[data-drawn]").forEach(box => Plotly.purge(box));
    });
    document.addEventListener("htmx:after:swap", () => {
      boxes().forEach(box => box.dataset.drawn || draw(box, false));
      offerPictures();
    });
    document.addEventListener("click", event => {
      const link = event.target.closest("a[href^='#']");
      if (!link) return;
      if (link.dataset.picture) {
        event.preventDefault();
        picture(document.querySelector(`.plot[data-chart="${CSS.escape(link.dataset.picture)}"]`));
      } else unfold(link.hash);
    });
  }
  if (document.readyState === "loading") addEventListener("DOMContentLoaded", start);
  else start();
})();
