"use strict";
for (const table of document.querySelectorAll("table.sortable")) {
  const body = table.tBodies[0];
  const heads = Array.from(table.tHead.rows[0].cells);
  heads.forEach((head, column) => {
    const title = head.querySelector(".title");
    if (!title) return;
    const button = document.createElement("button");
    button.type = "button";
    button.textContent = title.textContent;
    title.replaceWith(button);
    button.addEventListener("click", () => {
      const upwards = head.getAttribute("aria-sort") !== "ascending";
      heads.forEach((other) => other.removeAttribute("aria-sort"));
      head.setAttribute("aria-sort", upwards ? "ascending" : "descending");
      const key = (row) => row.cells[column].dataset.sort || row.cells[column].textContent.trim();
      const rows = Array.from(body.rows);
      rows.sort((one, other) => {
        const a = key(one), b = key(other);
        const x = Number(a), y = Number(b);
        const numbers = a !== "" && b !== "" && !Number.isNaN(x) && !Number.isNaN(y);
        const order = numbers ? x - y : a.localeCompare(b, "en", { numeric: true });
        return upwards ? order : -order;
      });
      body.append(...rows);
    });
  });
}
