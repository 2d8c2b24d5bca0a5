"use strict";
// Put at the end of a page under test: uses it as a reader would, and leaves what happened in an element.
window.addEventListener("load", async () => {
  const heard = window.heard;
  const all = (selector) => Array.from(document.querySelectorAll(selector));
  const found = {};
  const act = (name, what) => {
    try { found[name] = what(); } catch (error) { heard.push(name + ": " + error); }
  };
  found.ready = document.documentElement.dataset.ready;
  found.requests = performance.getEntriesByType("resource").map((entry) => entry.name).filter((name) => !name.startsWith("data:"));
  found.overflow = document.documentElement.scrollWidth - innerWidth;
  const tip = document.getElementById("tip");
  const said = document.getElementById("said");
  const chosen = document.getElementById("chosen");
  const lit = () => ({ marks: all("svg .lit").length, names: all("button.lit").length, text: chosen.hidden ? null : chosen.textContent });
  act("hover", () => {
    const mark = document.querySelector("#data svg g.mark");
    mark.firstElementChild.dispatchEvent(new PointerEvent("pointermove", { bubbles: true, clientX: 50, clientY: 50 }));
    const shown = tip.hidden ? null : tip.textContent;
    document.body.dispatchEvent(new PointerEvent("pointermove", { bubbles: true }));
    return { shown, gone: tip.hidden };
  });
  act("keys", () => {
    const svg = document.querySelector("#data svg");
    const press = (key) => svg.dispatchEvent(new KeyboardEvent("keydown", { key, bubbles: true, cancelable: true }));
    svg.focus();
    press("ArrowRight");
    const first = said.textContent;
    press("ArrowRight");
    const second = said.textContent;
    press("Enter");
    const highlighted = lit();
    press("Escape");
    svg.blur();
    return { first, second, here: all("svg .here").length, highlighted, after: lit() };
  });
  act("choose", () => {
    document.querySelector('#data button.key[data-key="BIN"]').click();
    const on = lit();
    const parameters = all('button.lit[data-key="BIN.first.evolution"]').length;
    chosen.querySelector("button").click();
    return { on, parameters, off: lit() };
  });
  act("parameter", () => {
    document.querySelector('#limits button.key[data-key="PARAMETER"]').click();
    const on = lit();
    document.querySelector('#limits svg [data-key~="PARAMETER"]').dispatchEvent(new MouseEvent("click", { bubbles: true }));
    return { on, off: lit() };
  });
  act("save", () => {
    const saved = {};
    URL.createObjectURL = (blob) => { saved.size = blob.size; saved.type = blob.type; return "data:,"; };
    HTMLAnchorElement.prototype.click = function () { saved.name = this.download; };
    document.querySelector("figure .save").click();
    saved.buttons = all("figure .save").length;
    saved.figures = all("figure").length;
    return saved;
  });
  act("print", () => {
    const closed = () => all("details:not([open])").length;
    const before = closed();
    window.dispatchEvent(new Event("beforeprint"));
    const during = closed();
    window.dispatchEvent(new Event("afterprint"));
    return { before, during, after: closed() };
  });
  if (window.axe) {
    all("details").forEach((node) => { node.open = true; });
    const checked = await axe.run(document, { runOnly: ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa", "best-practice"] });
    found.axe = {
      passes: checked.passes.length,
      violations: checked.violations.map((one) => one.id + ": " + one.nodes.slice(0, 3).map((node) => node.html.slice(0, 160)).join(" | ")),
    };
  }
  const timing = performance.getEntriesByType("navigation")[0];
  found.milliseconds = timing.domContentLoadedEventEnd - timing.startTime;
  found.heard = heard;
  const out = document.createElement("pre");
  out.id = "driver";
  out.textContent = JSON.stringify(found);
  document.body.append(out);
});
