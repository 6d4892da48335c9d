// SPDX-License-Identifier: GPL-3.0-or-later
/* Added to copies of report.html (page.sh): tells what is wrong with the page as it is shown. `page` is
 * its name. */
addEventListener("load", function () {
  const root = document.documentElement;
  const say = function (words) {
    parent.postMessage(page + " " + innerWidth + " " + words, "*");
  };

  // Relative luminance and contrast: WCAG 2.1, definitions.
  const parts = function (color) {
    return color.match(/[\d.]+/g).map(Number);
  };
  const luminance = function (color) {
    const [r, g, b] = parts(color).map(function (c) {
      const s = c / 255;
      return s <= 0.04045 ? s / 12.92 : ((s + 0.055) / 1.055) ** 2.4;
    });
    return 0.2126 * r + 0.7152 * g + 0.0722 * b;
  };
  const behind = function (element) {
    for (let e = element; e; e = e.parentElement) {
      const color = getComputedStyle(e).backgroundColor;
      if (parts(color)[3] !== 0) return color;
    }
    return "rgb(255, 255, 255)";
  };
  const contrast = function (one, other) {
    const [a, b] = [luminance(one), luminance(other)].sort((x, y) => y - x);
    return (a + 0.05) / (b + 0.05);
  };

  document.querySelectorAll("details").forEach((d) => (d.open = true));
  if (root.scrollWidth > root.clientWidth) say("too wide: " + root.scrollWidth);
  say("paper " + (luminance(behind(document.body)) > 0.7 ? "light" : luminance(behind(document.body)) < 0.1 ? "dark" : "grey"));

  document.querySelectorAll("body *").forEach(function (e) {
    const own = Array.from(e.childNodes).some((n) => n.nodeType === Node.TEXT_NODE && n.data.trim());
    if (!own || !e.getClientRects().length) return;
    const style = getComputedStyle(e);
    const ink = e instanceof SVGElement ? style.fill : style.color;
    if (ink !== "none" && contrast(ink, behind(e)) < 4.5)
      say("faint: " + e.tagName + " " + ink + " on " + behind(e) + " " + e.textContent.slice(0, 30));
  });

  document.querySelectorAll("figure").forEach(function (f) {
    const box = f.querySelector("svg").getBoundingClientRect();
    const words = f.querySelector("[role=img]").getAttribute("aria-label") || "";
    say("picture" + (box.width < 200 || box.height < 80 ? " without size" : words.length < 20 ? " without words" : ""));
  });

  const seen = new Set();
  document.querySelectorAll("[id]").forEach(function (e) {
    if (seen.has(e.id)) say("twice: " + e.id);
    seen.add(e.id);
  });
  document.querySelectorAll("a").forEach(function (a) {
    if (!seen.has(decodeURIComponent(a.hash.slice(1)))) say("link: " + a.getAttribute("href"));
  });

  // Besides this one there is one at most, and only where it sorts.
  const table = document.querySelector("#all-genes");
  if (document.scripts.length !== (table ? 2 : 1)) say("script too many: " + document.scripts.length);
  if (table) {
    const column = 1, numbers = () => Array.from(table.tBodies[0].rows, (r) => parseFloat(r.cells[column].textContent));
    const before = numbers();
    table.querySelectorAll("thead th")[column].querySelector("button").click();
    const after = numbers(), wanted = before.filter((x) => !isNaN(x)).sort((x, y) => y - x);
    if (wanted.every((x, i) => x === after[i]) && wanted.some((x, i) => x !== before[i])) say("sorted");
  }
  say("done");
});
