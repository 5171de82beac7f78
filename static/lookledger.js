// What the pages can do beyond reading: the arrow keys turn the sheets, and a figure can be zoomed into.
// Without this file everything else works, and neither is offered.
(() => {
  "use strict";

  const home = document.currentScript.src;

  // --- arrow keys ---

  const writing = "input, textarea, select, [contenteditable], [role=region], .chart";

  function turn(event) {
    if (event.defaultPrevented || event.altKey || event.ctrlKey || event.metaKey || event.shiftKey) return;
    if (event.target instanceof Element && event.target.closest(writing)) return;
    const way = { ArrowLeft: "prev", ArrowRight: "next" }[event.key];
    const there = way && document.querySelector(`.neighbours a[rel=${way}]`);
    if (there) window.location.assign(there.href);
  }

  if (document.querySelector(".neighbours a")) {
    document.addEventListener("keydown", turn);
    document.querySelectorAll(".keys").forEach((hint) => { hint.hidden = false; });
  }

  // --- figures ---

  const remembered = "lookledger.zoom";

  function loaded(element) {
    return new Promise((resolve, reject) => {
      element.addEventListener("load", resolve, { once: true });
      element.addEventListener("error", () => reject(new Error("a file of the chart did not arrive")), { once: true });
      document.head.append(element);
    });
  }

  let library = null;

  // plotly.js comes only when somebody asks for it; its own rules come as a file, because the page allows no others.
  function plotly() {
    if (library === null) {
      const rules = Object.assign(document.createElement("link"), {
        id: "plotly.js-style-global",
        className: "no-inline-styles",
        rel: "stylesheet",
        href: new URL("plotly/plotly.css", home).href,
      });
      const script = document.createElement("script");
      script.src = new URL("plotly/plotly-basic.min.js", home).href;
      library = Promise.all([loaded(rules), loaded(script)]).then(() => window.Plotly);
    }
    return library;
  }

  // Lengths in the figure are for a root of 16 px; the page grows with the room, and the chart with it.
  const lengths = new Set(["size", "width", "l", "r", "t", "b", "xshift", "yshift", "ticklen", "ticklabelstandoff", "standoff"]);

  function scaled(part, factor, name = "") {
    if (typeof part === "number") return lengths.has(name) ? part * factor : part;
    if (Array.isArray(part)) return part.map((each) => scaled(each, factor, name));
    if (part === null || typeof part !== "object") return part;
    return Object.fromEntries(Object.entries(part).map(([key, value]) => [key, scaled(value, factor, key)]));
  }

  const config = {
    displaylogo: false,
    showSendToCloud: false,
    plotlyServerURL: "",
    responsive: false,
    showTips: false,
    modeBarButtonsToRemove: ["select2d", "lasso2d", "autoScale2d"],
  };

  // Ticks stand where the drawing has them until somebody zooms; then they follow.
  function freeTicks(chart, Plotly, start) {
    chart.on("plotly_relayout", () => {
      const axis = chart.layout.xaxis;
      const isStart = axis.range.every((end, index) => String(end) === String(start[index]));
      const wanted = isStart ? "array" : "auto";
      if (axis.tickvals && axis.tickmode !== wanted) Plotly.relayout(chart, { "xaxis.tickmode": wanted });
    });
  }

  class Exhibit {
    constructor(figure) {
      this.figure = figure;
      this.drawing = figure.querySelector(".drawing");
      this.chart = null;
      this.button = Object.assign(document.createElement("button"), { type: "button", className: "text-button" });
      this.button.addEventListener("click", () => (this.zoomed ? this.back() : this.zoom()));
      const tools = Object.assign(document.createElement("div"), { className: "figure-tools" });
      tools.append(this.button);
      figure.prepend(tools);
      this.say();
    }

    get zoomed() { return this.chart !== null; }

    say() { this.button.textContent = this.zoomed ? "Back to the drawing" : "Zoom and read values"; }

    // The chart takes the place and the size of the drawing that is shown.
    async zoom() {
      this.button.disabled = true;
      try {
        const [Plotly, answer] = await Promise.all([plotly(), fetch(this.figure.dataset.figure, { credentials: "same-origin" })]);
        if (!answer.ok) throw new Error(`the figure was answered with ${answer.status}`);
        await this.draw(Plotly, await answer.json());
        sessionStorage.setItem(remembered, "yes");
      } catch (error) {
        this.remove();
        this.button.title = `The chart could not be shown: ${error.message}.`;
      }
      this.button.disabled = false;
      this.say();
    }

    async draw(Plotly, figures) {
      const shown = [...this.drawing.children].find((each) => each.offsetParent !== null);
      const place = shown.getBoundingClientRect();
      const isNarrow = shown.classList.contains("narrow");
      const svg = shown.querySelector("svg");
      const { data, layout } = scaled(isNarrow ? figures.narrow : figures.wide, place.width / svg.viewBox.baseVal.width);
      this.chart = Object.assign(document.createElement("div"), { className: "chart" });
      this.chart.setAttribute("role", "group");
      this.chart.setAttribute("aria-label", svg.querySelector("title").textContent);
      this.drawing.after(this.chart);
      this.drawing.hidden = true;
      const size = { width: place.width, height: place.height, autosize: false };
      await Plotly.newPlot(this.chart, data, { ...layout, ...size }, config);
      freeTicks(this.chart, Plotly, layout.xaxis.range.slice());
    }

    remove() {
      if (this.chart !== null) {
        if (window.Plotly) window.Plotly.purge(this.chart);
        this.chart.remove();
      }
      this.chart = null;
      this.drawing.hidden = false;
    }

    back() {
      this.remove();
      sessionStorage.removeItem(remembered);
      this.say();
    }

    async refit() {
      if (!this.zoomed) return;
      this.remove();
      await this.zoom();
    }
  }

  const exhibits = [...document.querySelectorAll("[data-figure]")].map((figure) => new Exhibit(figure));
  if (sessionStorage.getItem(remembered) === "yes") exhibits.forEach((exhibit) => exhibit.zoom());

  let width = window.innerWidth;
  let resting = 0;
  window.addEventListener("resize", () => {
    if (window.innerWidth === width) return;
    width = window.innerWidth;
    clearTimeout(resting);
    resting = setTimeout(() => exhibits.forEach((exhibit) => exhibit.refit()), 150);
  });
})();
