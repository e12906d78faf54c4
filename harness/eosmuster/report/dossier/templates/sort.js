"use strict";
for (const table of document.querySelectorAll("table.sortable")) {
  const heads = [...table.tHead.rows[0].cells];
  heads.forEach((head, column) => {
    const button = document.createElement("button");
    button.type = "button";
    button.append(...head.childNodes);
    head.append(button);
    button.addEventListener("click", () => {
      const down = head.getAttribute("aria-sort") === "ascending";
      const numeric = head.classList.contains("n");
      const keyed = [...table.tBodies[0].rows].map((row) => {
        const text = row.cells[column].textContent;
        return [row, numeric ? parseFloat(text) : text];
      });
      keyed.sort(([, a], [, b]) => {
        if (!numeric) return (down ? -1 : 1) * a.localeCompare(b, "en");
        if (isNaN(a) || isNaN(b)) return isNaN(a) - isNaN(b);
        return (down ? -1 : 1) * (a - b);
      });
      table.tBodies[0].append(...keyed.map(([row]) => row));
      heads.forEach((other) => other.removeAttribute("aria-sort"));
      head.setAttribute("aria-sort", down ? "descending" : "ascending");
    });
  });
}
