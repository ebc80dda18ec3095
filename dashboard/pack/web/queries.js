// Queries of a team's pack: pins on the map, and new ones written here to be carried back to the review as a file.
"use strict";

const QUERIES = (() => {
  const SCHEMA = "leewater/pack-queries/1";
  let pack = null, fresh = [];
  const $ = (id) => document.getElementById(id);

  const name = () => `leewater-queries-${pack.digest}`;

  // A browser may refuse to keep anything for a page opened from a file; then what was written lasts as long as the page.
  function remembered() {
    try {
      return JSON.parse(localStorage.getItem(name())) ?? [];
    } catch {
      return [];
    }
  }

  function remember() {
    try {
      localStorage.setItem(name(), JSON.stringify(fresh));
    } catch {
      $("query-note").textContent = "This browser keeps nothing for this page: download before you close it.";
    }
  }

  function shown() {
    $("query-new").replaceChildren(...fresh.map((q) => {
      const line = document.createElement("li");
      line.textContent = `${q.text} (${q.importance}; ${q.author || "no name"})`;
      return line;
    }));
    $("query-download").disabled = fresh.length === 0;
    $("query-download").textContent = fresh.length ? `Download ${fresh.length} new ${fresh.length === 1 ? "query" : "queries"}` : "Download new queries";
  }

  function begin(content, where, draw) {
    pack = content;
    if (!pack.team) return;
    fresh = remembered();
    shown();
    $("query-ask").addEventListener("click", () => {
      const text = $("query-text").value.trim();
      if (!text) {
        $("query-note").textContent = "A query needs a text; write what should be asked.";
        $("query-text").focus();
        return;
      }
      fresh.push({ text, importance: $("query-importance").value, author: $("query-author").value.trim(), written: new Date().toISOString(), ...where() });
      $("query-text").value = "";
      $("query-note").textContent = "Kept in this page, pinned to the middle of the map; download it and send it to the review.";
      remember();
      shown();
      draw();
    });
    $("query-download").addEventListener("click", () => {
      const content = JSON.stringify({ schema: SCHEMA, pack: pack.digest, queries: fresh }, null, 1);
      const link = document.createElement("a");
      link.href = URL.createObjectURL(new Blob([content], { type: "application/json" }));
      link.download = "queries.json";
      link.click();
      URL.revokeObjectURL(link.href);
    });
  }

  // Pins of one run, m from the corner.
  function pins(run, corner) {
    if (!pack?.team) return [];
    const asked = pack.queries.map((q) => ({ ...q, answered: q.state !== "asked" }));
    const written = fresh.map((q, i) => ({ ...q, number: `+${i + 1}`, answered: false }));
    return [...asked, ...written].filter((q) => q.run === run && Number.isFinite(q.x) && Number.isFinite(q.y))
      .map((q) => ({ ...q, x: q.x - corner[0], y: q.y - corner[1] }));
  }

  return { begin, pins };
})();
