// What a browser finds on a page. Each function gives sentences, one for each fault; none is well.
"use strict";
({
  // Tables can be read by their heads, plots without being seen, and there is nothing on a page but what the weaver writes.
  structure() {
    const faults = [];
    const all = (selector, within = document) => [...within.querySelectorAll(selector)];
    for (const e of all("*")) {
      for (const a of e.attributes) if (/^on/i.test(a.name)) faults.push(`<${e.localName}> has ${a.name}`);
    }
    const known = new Set(("html head meta title style body main h1 h2 h3 h4 h5 h6 p ul ol li blockquote hr a strong em code pre " +
      "details summary section div table caption thead tbody tr th td span b bdi figure svg path text figcaption footer dl dt dd").split(" "));
    const served = new Set(["link", "script"]); // of a page that is watched
    for (const e of all("*")) {
      if (known.has(e.localName) || (served.has(e.localName) && location.protocol !== "file:")) continue;
      faults.push(`there is a <${e.localName}> on the page: ${e.outerHTML.slice(0, 120)}`);
    }
    for (const a of all("a")) {
      if (!a.hash || !document.getElementById(a.hash.slice(1))) faults.push(`a link leads to ${a.getAttribute("href")}`);
    }
    if (all("h1").length !== 1 || document.documentElement.lang === "" || document.title === "") {
      faults.push("the page has not one heading, a language and a title");
    }
    for (const t of all("table")) {
      const name = t.caption?.innerText.trim();
      if (!/^Table \d+\s+\S/.test(name)) faults.push(`a table has no caption: ${t.outerHTML.slice(0, 120)}`);
      const heads = all("thead th", t);
      if (heads.length === 0) faults.push(`${name}: no heads`);
      for (const th of all("th", t)) {
        const scope = th.closest("thead") ? "col" : "row";
        if (th.scope !== scope) faults.push(`${name}: the scope of head ${th.innerText} is ${th.scope}, not ${scope}`);
        if (scope === "col" && th.innerText.trim() === "") faults.push(`${name}: a head is empty`);
      }
      for (const row of all("tbody tr", t)) {
        const cells = [...row.cells].reduce((n, c) => n + c.colSpan, 0);
        if (cells !== heads.length) faults.push(`${name}: ${cells} cells under ${heads.length} heads`);
      }
    }
    for (const svg of all("svg")) {
      if (svg.getAttribute("role") !== "img") faults.push("a plot has no role");
      if (!svg.closest("figure")?.querySelector("figcaption")?.innerText.trim()) faults.push("a plot has no caption");
    }
    return faults;
  },

  // Nothing lies beyond the window's sides, or the sheet's, but what can be scrolled to within its own box.
  overflow() {
    const faults = [];
    const root = document.scrollingElement;
    if (root.scrollWidth > innerWidth) faults.push(`the page is ${root.scrollWidth} px wide in a window of ${innerWidth}`);
    const onPaper = matchMedia("print").matches; // where nothing scrolls
    const scrolls = (e) => !onPaper && /auto|scroll/.test(getComputedStyle(e).overflowX);
    for (const e of document.querySelectorAll("body *")) {
      if (e.closest(".unseen")) continue;
      const r = e.getBoundingClientRect();
      if (r.width === 0 || (r.left >= -0.5 && r.right <= innerWidth + 0.5)) continue;
      let box = e.parentElement;
      while (box && !scrolls(box)) box = box.parentElement;
      if (!box) faults.push(`<${e.localName} class="${e.getAttribute("class") ?? ""}"> lies from ${r.left} to ${r.right} px: ${e.textContent.slice(0, 60)}`);
    }
    for (const e of document.querySelectorAll("svg text")) { // what a plot's own frame would cut off
      const r = e.getBoundingClientRect(), frame = e.ownerSVGElement.getBoundingClientRect();
      if (r.left < frame.left - 1 || r.right > frame.right + 1 || r.top < frame.top - 1 || r.bottom > frame.bottom + 1) {
        faults.push(`the plot cuts off its text ${e.textContent.slice(0, 60)}`);
      }
    }
    return faults.slice(0, 10);
  },

  // Text stands out from what is behind it by 4.5 to 1 at least (WCAG 2.1, 1.4.3; its relative luminance).
  contrast() {
    const colour = (css) => {
      const m = css.match(/^rgba?\(([\d.]+), ([\d.]+), ([\d.]+)(?:, ([\d.]+))?\)$/);
      if (!m) throw new Error(`colour ${css}`);
      return [+m[1], +m[2], +m[3], m[4] === undefined ? 1 : +m[4]];
    };
    const over = (top, under) => [0, 1, 2].map((i) => top[i] * top[3] + under[i] * (1 - top[3])).concat(1);
    const luminance = (c) => {
      const [r, g, b] = c.slice(0, 3).map((v) => ((v /= 255) <= 0.03928 ? v / 12.92 : ((v + 0.055) / 1.055) ** 2.4));
      return 0.2126 * r + 0.7152 * g + 0.0722 * b;
    };
    const behind = (e) => {
      const layers = [];
      for (; e; e = e.parentElement) {
        const c = colour(getComputedStyle(e).backgroundColor);
        if (c[3] > 0) layers.push(c);
        if (c[3] === 1) return layers.reduceRight((under, top) => over(top, under));
      }
      throw new Error("nothing is behind the text");
    };
    const worst = new Map();
    const walk = document.createTreeWalker(document.body, NodeFilter.SHOW_TEXT);
    let seen = 0;
    while (walk.nextNode()) {
      const e = walk.currentNode.parentElement;
      if (walk.currentNode.data.trim() === "" || e.getClientRects().length === 0 || e.closest("script")) continue;
      seen++;
      const style = getComputedStyle(e), inPlot = e.ownerSVGElement;
      const ink = colour(inPlot ? style.fill : style.color);
      ink[3] *= style.opacity * (inPlot ? style.fillOpacity : 1);
      const paper = behind(inPlot ? inPlot.parentElement : e);
      const [a, b] = [luminance(over(ink, paper)), luminance(paper)];
      const ratio = (Math.max(a, b) + 0.05) / (Math.min(a, b) + 0.05);
      if (ratio < 4.5) worst.set(`${e.localName} ${e.className.baseVal ?? e.className}`, `contrast ${ratio.toFixed(2)}: ${walk.currentNode.data.trim().slice(0, 60)}`);
    }
    if (seen === 0) return ["no text"];
    return [...worst.values()];
  },

  // Unfolds the code, and says how much of it there is.
  open() {
    const all = document.querySelectorAll("details");
    for (const d of all) d.open = true;
    return all.length;
  },

  // What must come whole out of a printer: the tables with their rows, the plots, the foot.
  printed() {
    const text = (e) => e.innerText ?? e.textContent;
    return {
      tables: [...document.querySelectorAll("table")].map((t) => ({
        short: t.closest(".short") !== null,
        caption: text(t.caption), head: [...t.tHead.rows[0].cells].filter((th) => !th.querySelector(".unseen")).map(text).join(""), rows: [...t.tBodies[0].rows].map(text),
      })),
      foot: text(document.querySelector("footer") ?? document.createElement("footer")),
      plots: [...document.querySelectorAll("figure")].map((f) => [...f.querySelectorAll("text")].map(text).join("") + text(f.querySelector("figcaption"))),
    };
  },
})
