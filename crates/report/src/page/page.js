"use strict";
(() => {
  const all = (selector, root) => Array.from((root || document).querySelectorAll(selector));
  const said = document.getElementById("said");

  // What a mark says moves from the browser's own slow tooltip to ours; without scripts the former stays.
  const tip = document.createElement("div");
  tip.id = "tip";
  tip.hidden = true;
  document.body.append(tip);
  const tips = new WeakMap();
  for (const title of all("figure svg g > title")) {
    tips.set(title.parentNode, title.textContent);
    title.parentNode.classList.add("mark");
    title.remove();
  }
  const marked = (node) => node.closest && node.closest("svg g.mark");
  const show = (text, x, y) => {
    tip.textContent = text;
    tip.hidden = false;
    const box = tip.getBoundingClientRect();
    tip.style.left = Math.max(4, Math.min(x + 14, innerWidth - box.width - 4)) + "px";
    tip.style.top = (y + 18 + box.height > innerHeight ? y - box.height - 10 : y + 18) + "px";
  };
  const hide = () => { tip.hidden = true; };
  document.addEventListener("pointermove", (event) => {
    const mark = marked(event.target);
    if (mark) show(tips.get(mark), event.clientX, event.clientY);
    else if (document.activeElement.tagName !== "svg") hide();
  });

  // Arrow keys go from mark to mark of the figure that has the focus.
  for (const svg of all("figure svg")) {
    let at = -1;
    const marks = all("g.mark", svg);
    const leave = () => { hide(); marks.forEach((mark) => mark.classList.remove("here")); };
    svg.addEventListener("blur", leave);
    svg.addEventListener("keydown", (event) => {
      const step = { ArrowRight: 1, ArrowDown: 1, ArrowLeft: -1, ArrowUp: -1 }[event.key];
      if (event.key === "Escape") leave();
      if ((event.key === "Enter" || event.key === " ") && at >= 0 && marks[at].dataset.key) {
        event.preventDefault();
        choose(marks[at].dataset.key.split(" ")[0]);
      }
      if (!step || !marks.length) return;
      event.preventDefault();
      leave();
      at = (at + step + marks.length + (at < 0 && step < 0 ? 1 : 0)) % marks.length;
      marks[at].classList.add("here");
      const box = marks[at].getBoundingClientRect();
      show(tips.get(marks[at]), box.right, box.bottom);
      said.textContent = tips.get(marks[at]);
    });
  }

  // A bin or parameter that is chosen lights up everywhere, with what belongs to it.
  const chosen = document.getElementById("chosen");
  let current = null;
  const choose = (key) => {
    current = key === current ? null : key;
    const belongs = (one) => one === current || (current && (one.startsWith(current + ".") || one.endsWith("." + current)));
    for (const node of all("[data-key]")) {
      const lit = current !== null && node.dataset.key.split(" ").some(belongs);
      node.classList.toggle("lit", lit);
      if (node.tagName === "BUTTON") {
        node.setAttribute("aria-pressed", String(current !== null && node.dataset.key === current));
        const row = node.closest("tr");
        if (row) row.classList.toggle("lit", all("[data-key].lit", row).length > 0);
      }
    }
    // Enclosing groups of a lit mark must not fade it.
    for (const node of all("svg .lit")) {
      for (let up = node.parentNode; up.tagName === "g"; up = up.parentNode) if (up.dataset.key) up.classList.add("lit");
    }
    document.body.classList.toggle("choosing", current !== null);
    chosen.hidden = current === null;
    chosen.firstElementChild.textContent = current === null ? "" : "Highlighted: " + current;
    said.textContent = current === null ? "Nothing highlighted" : "Highlighted: " + current;
  };
  document.addEventListener("click", (event) => {
    const node = event.target.closest("[data-key]");
    if (node && node.dataset.key) choose(node.dataset.key.split(" ")[0]);
  });
  chosen.lastElementChild.addEventListener("click", () => choose(current));
  document.addEventListener("keydown", (event) => { if (event.key === "Escape" && current) choose(current); });

  // Every figure can be saved as a file.
  for (const figure of all("figure")) {
    const svg = figure.querySelector("svg");
    const button = document.createElement("button");
    button.type = "button";
    button.className = "save";
    button.textContent = "Save as SVG";
    button.setAttribute("aria-label", "Save as SVG: " + svg.querySelector("title").textContent);
    button.addEventListener("click", () => {
      const copy = svg.cloneNode(true);
      copy.removeAttribute("tabindex");
      const file = new Blob(['<?xml version="1.0" encoding="UTF-8"?>\n', new XMLSerializer().serializeToString(copy)], { type: "image/svg+xml" });
      const link = document.createElement("a");
      link.href = URL.createObjectURL(file);
      link.download = figure.id.replace(/^figure-/, "") + ".svg";
      link.click();
      setTimeout(() => URL.revokeObjectURL(link.href), 1000);
      said.textContent = "Saved " + link.download;
    });
    figure.append(button);
  }

  // On paper nothing can be asked for, so everything is open.
  let opened = [];
  addEventListener("beforeprint", () => {
    opened = all("details:not([open])");
    opened.forEach((node) => { node.open = true; });
  });
  addEventListener("afterprint", () => opened.forEach((node) => { node.open = false; }));
  document.documentElement.dataset.ready = "yes";
})();
